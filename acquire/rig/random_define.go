package rig

// fit scales every load so that the worst radial velocity of an order is level
// mm/s rms. It reports false when the loads do not cause that order.
func fit(c *Config, order int, level float64) bool {
	points, err := c.Steady(c.Drive.RPM)
	if err != nil {
		return false
	}
	w := worst(points, order, false)
	if !(w > 0) {
		return false
	}
	f := level / w
	for i := range c.Unbalances {
		c.Unbalances[i].KgM *= f
	}
	x := &c.Faults
	for e := range x.Bow.OffsetM {
		x.Bow.OffsetM[e] *= f
		x.Bow.SlopeRad[e] *= f
	}
	for n := range x.Misalignment.RadialN {
		x.Misalignment.RadialN[n] *= f
		x.Misalignment.AxialN[n] *= f
		x.Misalignment.MomentNM[n] *= f
	}
	x.Pull.ForceN *= f
	x.LooseRotor.KgM *= f
	return true
}

// worst returns the greatest velocity of an order among the radial points or
// the axial ones, mm/s rms.
func worst(points []Point, order int, axial bool) float64 {
	w := 0.0
	for _, p := range points {
		if (p.Direction == Axial) == axial {
			w = max(w, p.Order[order-1].RMS)
		}
	}
	return w
}

// vectorOf returns the 1x of a point.
func vectorOf(points []Point, e End, dir Direction) Vector {
	for _, p := range points {
		if p.End == e && p.Direction == dir {
			return p.Order[0]
		}
	}
	return Vector{}
}

// defines reports whether the steady response shows what makes the kind by
// its definition. Static, couple and most others are defined by their loads
// alone.
func (d *draw) defines(c *Config) bool {
	points, err := c.Steady(c.Drive.RPM)
	if err != nil {
		return false
	}
	g := faultRanges
	radial, axial := worst(points, 1, false), worst(points, 1, true)
	switch d.kind {
	case Dynamic:
		return g.dynamicPhase.holds(ends(points, Vertical)) && g.dynamicPhase.holds(ends(points, Horizontal))
	case OverhungRotor:
		de, nde := radialWorst(points, DriveEnd), radialWorst(points, NonDriveEnd)
		return g.overhungAxial.holds(axial/radial) && g.overhungEnds.holds(min(de, nde)/max(de, nde))
	case BentShaft:
		return g.bentAxial.holds(axial/radial) && g.bentEnds.holds(ends(points, Vertical)) &&
			g.bentEnds.holds(ends(points, Horizontal)) && g.bentEnds.holds(180-ends(points, Axial))
	case Misaligned:
		de, nde := radialWorst(points, DriveEnd), radialWorst(points, NonDriveEnd)
		return g.misalEnds.holds(min(de, nde)/max(de, nde)) &&
			g.fixedPlane.holds(offPlane(points, DriveEnd)) && g.fixedPlane.holds(offPlane(points, NonDriveEnd))
	case Resonant:
		return d.resonates(points)
	}
	return true
}

// offPlane returns how far V and H of an end are from moving in one plane, 0 to
// 90 degrees.
func offPlane(points []Point, e End) float64 {
	a := lagBetween(vectorOf(points, e, Vertical), vectorOf(points, e, Horizontal))
	return min(a, 180-a)
}

// radialWorst returns the greater radial 1x of an end.
func radialWorst(points []Point, e End) float64 {
	return max(vectorOf(points, e, Vertical).RMS, vectorOf(points, e, Horizontal).RMS)
}

// holds reports whether x lies in the range.
func (s span) holds(x float64) bool { return x >= s.lo && x <= s.hi }

// ends returns the phase between the two bearings in a direction, 0 to 180 degrees.
func ends(points []Point, dir Direction) float64 {
	return lagBetween(vectorOf(points, DriveEnd, dir), vectorOf(points, NonDriveEnd, dir))
}

// resonates reports whether a natural frequency lies at the speed and one
// direction moves much more than the other.
func (d *draw) resonates(points []Point) bool {
	list, err := d.c.NaturalRPM(d.c.Drive.RPM)
	if err != nil {
		return false
	}
	g := faultRanges
	near := false
	for _, f := range list {
		near = near || g.detuning.holds(f/d.c.Drive.RPM)
	}
	v, h := 0.0, 0.0
	for e := DriveEnd; e <= NonDriveEnd; e++ {
		v = max(v, vectorOf(points, e, Vertical).RMS)
		h = max(h, vectorOf(points, e, Horizontal).RMS)
	}
	return near && g.resonanceRatio.holds(max(v, h)/min(v, h))
}
