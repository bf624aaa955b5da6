package rig

import "math"

// instruments draws sensors and the phase reference.
func (d *draw) instruments() {
	r := d.r
	d.c.Rotor.CounterClockwise = r.Float64() < 0.5
	sensitivity := []float64{0.05, 0.1, 0.1, 0.1, 0.25}[r.IntN(5)]
	corner := []float64{0, 0, 0.1, 0.3, 0.5}[r.IntN(5)]
	for i, name := range []string{"de-v", "de-h", "de-a", "nde-v", "nde-h", "nde-a"} {
		d.c.Sensors = append(d.c.Sensors, Sensor{
			Name: name, End: End(i / 3), Direction: Direction(i % 3), Channel: i,
			VoltsPerG: sensitivity, Inverted: r.Float64() < 0.3, HighpassHz: corner,
			NoiseV: sensitivity * span{3e-6, 3e-5}.byRatio(r), // 3 to 30 micro-g per root hertz
			BiasV:  span{-0.05, 0.05}.even(r), DriftV: 1e-3, ClipV: 1.2,
		})
	}
	width := max(pulseWidths.byRatio(r), leastPulse*d.omega*180/math.Pi)
	d.c.Reference = &Reference{
		Channel: 6, PickupDeg: 360 * r.Float64(), WidthDeg: width, Falling: r.Float64() < 0.3,
		LowV: span{0, 0.1}.even(r), HighV: span{0.8, 1.1}.even(r), JitterDeg: span{0.005, 0.05}.byRatio(r), NoiseV: 1e-5,
	}
}

// spring returns a spring of stiffness k with a share of critical damping for a
// mode at w rad/s.
func (d *draw) spring(k, share, w float64) Spring {
	return Spring{K: k, C: 2 * share * k / w}
}

// mass draws the rotor's mass for its speed.
func (d *draw) mass() float64 {
	return massAt1000.byRatio(d.r) * math.Pow(1000/d.c.Drive.RPM, 1.2)
}

// bearings sets the springs between shaft and housings, the second axially
// floating; pedestals are set already.
func (d *draw) bearings(tilt span) {
	r, g := d.r, springRanges
	w := d.omega * g.bearing.even(r)
	k := d.c.Rotor.MassKg * w * w / 2
	z := g.bearingDamping.even(r)
	for e := range d.c.Supports {
		s := &d.c.Supports[e]
		s.BearingV, s.BearingH = d.spring(k, z, w), d.spring(k*span{0.85, 1}.even(r), z, w)
		axial := k * 0.5
		if e == 1 {
			axial *= betweenRanges.floating.byRatio(r)
		}
		s.BearingA = d.spring(axial, 3*z, w)
		s.BearingTilt = d.spring(s.A.K*s.PedestalM*s.PedestalM*tilt.byRatio(r), z, w)
	}
	d.c.Supports[1].PositionM = d.span
}

// buildBetween draws a rotor between its bearings.
func (d *draw) buildBetween() {
	r, g := d.r, betweenRanges
	d.span = d.radius * g.spanRadii.even(r)
	m := d.mass()
	ip := m * math.Pow(0.55*d.radius, 2)
	d.c.Rotor.MassKg, d.c.Rotor.PolarKgM2 = m, ip
	d.c.Rotor.TransverseKgM2 = 0.55*ip + m*math.Pow(0.15*d.span, 2)
	d.c.Rotor.CentreM = d.span * g.centre.even(r)
	ratio := g.stiff.byRatio(r)
	switch {
	case d.kind == Loose:
		// Lifting lowers the natural frequency; it must not fall to the speed.
		ratio = span{1.8, 3.2}.byRatio(r)
	case d.kind != Resonant && r.Float64() < g.softShare:
		ratio = g.soft.byRatio(r)
	}
	tilt := g.tilt
	if d.kind == BentShaft {
		tilt = faultRanges.bentTilt
	}
	w := d.omega * ratio
	z, flat, along := springRanges.damping.byRatio(r), g.anisotropy.even(r), g.axial.even(r)
	if d.kind == Resonant {
		flat = math.Pow(faultRanges.detuning.even(r)/ratio, 2) * 1.1
	}
	house := g.housing.even(r)
	for e := range d.c.Supports {
		k := m * w * w / 2 * span{0.85, 1.15}.even(r)
		s := &d.c.Supports[e]
		s.HousingKg, s.PedestalM = m*house, d.radius*g.pedestal.even(r)
		s.V, s.H, s.A = d.spring(k, z, w), d.spring(k*flat, z, w), d.spring(k*along, z, w)
	}
	d.bearings(tilt)
	if d.kind == Resonant && r.Float64() < 0.5 {
		for e := range d.c.Supports {
			s := &d.c.Supports[e]
			s.V, s.H = s.H, s.V
		}
	}
}

// buildOverhung draws an overhung rotor with both bearings on one frame.
func (d *draw) buildOverhung() {
	r, g := d.r, overhungRanges
	d.span = d.radius * g.spanRadii.even(r)
	m := d.mass()
	ip := m * math.Pow(0.55*d.radius, 2)
	over := d.span * g.overhang.even(r)
	d.c.Rotor.MassKg, d.c.Rotor.PolarKgM2 = m, ip
	d.c.Rotor.TransverseKgM2 = 0.55*ip + m*math.Pow(0.15*d.span, 2)
	d.c.Rotor.CentreM = d.span + over

	frame := m * g.frame.even(r)
	f := Frame{MassKg: frame, PitchKgM2: frame * math.Pow(0.45*d.span, 2), YawKgM2: frame * math.Pow(0.4*d.span, 2)}
	f.CentreM, f.HeightM = d.span*span{0.45, 0.75}.even(r), d.span*g.height.even(r)
	z := springRanges.damping.byRatio(r)
	arm := d.c.Rotor.CentreM - f.CentreM
	up, rock := d.omega*g.upright.even(r), d.omega*g.rocking.even(r)
	k := (m + frame) * up * up
	f.V, f.H, f.A = d.spring(k, z, up), d.spring(k*betweenRanges.anisotropy.even(r), z, up), d.spring(k*span{0.7, 1.2}.even(r), z, up)
	// Inertia about the rocking axis, the rotor taken as a mass at its place.
	pitch := f.PitchKgM2 + m*(arm*arm+f.HeightM*f.HeightM)
	yaw := f.YawKgM2 + m*arm*arm
	f.Pitch = d.spring(pitch*rock*rock, z, rock)
	w := rock * span{1, 1.4}.even(r)
	f.Yaw = d.spring(yaw*w*w, z, w)
	d.c.Frame = f

	stand := d.omega * g.stand.even(r)
	for e := range d.c.Supports {
		s := &d.c.Supports[e]
		k := m * stand * stand * span{0.85, 1.15}.even(r)
		s.HousingKg, s.PedestalM = m*betweenRanges.housing.even(r), f.HeightM*0.4
		s.V, s.H, s.A = d.spring(k, z, stand), d.spring(k*span{0.7, 1}.even(r), z, stand), d.spring(k*0.7, z, stand)
	}
	d.bearings(g.tilt)
}
