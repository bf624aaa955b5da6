package rig

import "math"

// turnEven draws an angle, degrees.
func (d *draw) turnEven() float64 { return 360 * d.r.Float64() }

// signed gives a value either sign.
func (d *draw) signed(x float64) float64 {
	if d.r.Float64() < 0.5 {
		return -x
	}
	return x
}

// addLoads adds the main cause, a little of the others, and the flow; it
// reports whether the response shows what defines the kind.
func (d *draw) addLoads() bool {
	main := d.mainCause()
	if !fit(&main, 1, d.severity) || !d.defines(&main) {
		return false
	}
	if d.kind == Misaligned && !d.balanceOrders(&main) {
		return false
	}
	share := faultRanges.residual
	switch d.kind {
	case BentShaft, Misaligned, Eccentric:
		share = faultRanges.bentResidual
	}
	rest := d.residual(share.even(d.r) * d.severity)
	main.Unbalances = append(main.Unbalances, rest...)
	if d.kind != Misaligned {
		main.Faults.Misalignment = d.harmonics()
	}
	d.c = main
	d.c.Faults.Flow = d.flow()
	d.unsteadyParts()
	return d.defines(&d.c) && (d.kind != Loose || d.lifts())
}

// mainCause returns the machine with the loads of its kind, not yet to scale.
func (d *draw) mainCause() Config {
	c := d.c.clone()
	centre := c.Rotor.CentreM
	one := Unbalance{KgM: 1, PositionM: centre, AngleDeg: d.turnEven()}
	switch d.kind {
	case Couple:
		c.Unbalances = d.couple(one.AngleDeg)
	case Dynamic:
		c.Unbalances = d.dynamic(one)
	case BentShaft:
		c.Faults.Bow = MidspanBow(1, d.span, one.AngleDeg)
	case Misaligned:
		m := &c.Faults.Misalignment
		m.RadialN = [3]float64{1, 1, 1}
		m.LagDeg = [3]float64{d.turnEven(), d.turnEven(), d.turnEven()}
		m.PositionM = -0.15 * d.span
		m.DirectionDeg = d.oblique()
		lever := d.signed(faultRanges.lever.even(d.r)) * d.span
		for i, f := range m.RadialN {
			m.MomentNM[i] = f * lever
		}
	case Eccentric:
		c.Faults.Pull = Pull{ForceN: 1, DirectionDeg: d.oblique(), LagDeg: d.turnEven(), PositionM: centre}
	case RubOrLooseRotor:
		c.Faults.LooseRotor.Unbalance = one
		if d.overhung {
			break
		}
		c.Faults.LooseRotor.PositionM += span{-0.2, 0.2}.even(d.r) * d.span
	case OverhungRotor:
		// Two planes of the impeller: usually static plus couple unbalance.
		other := Unbalance{KgM: span{0.1, 0.7}.even(d.r), PositionM: centre, AngleDeg: d.turnEven()}
		one.PositionM += span{0, 0.3}.even(d.r) * d.radius
		other.PositionM -= span{0, 0.3}.even(d.r) * d.radius
		c.Unbalances = []Unbalance{one, other}
	case Static, Resonant:
		c.Unbalances = []Unbalance{one}
	default:
		one.PositionM += span{-0.2, 0.2}.even(d.r) * d.radius
		c.Unbalances = []Unbalance{one}
	}
	return c
}

// oblique draws a direction in space that is neither vertical nor horizontal.
func (d *draw) oblique() float64 {
	return float64(d.r.IntN(4))*90 + span{20, 70}.even(d.r)
}

// couple returns two opposed masses on either side of the centre of mass.
func (d *draw) couple(angle float64) []Unbalance {
	z := d.radius * span{0.15, 0.4}.even(d.r)
	centre := d.c.Rotor.CentreM
	return []Unbalance{{1, centre - z, angle}, {1, centre + z, angle + 180}}
}

// dynamic returns a static and a couple part of comparable effect.
func (d *draw) dynamic(one Unbalance) []Unbalance {
	static, couple := d.c.clone(), d.c.clone()
	static.Unbalances = []Unbalance{one}
	turn := faultRanges.coupleTurn.even(d.r)
	couple.Unbalances = d.couple(one.AngleDeg + d.signed(turn))
	if !fit(&static, 1, 1) || !fit(&couple, 1, faultRanges.couple.byRatio(d.r)) {
		return nil
	}
	return append(static.Unbalances, couple.Unbalances...)
}

// residual returns other unbalance in two planes with a worst 1x of level mm/s.
func (d *draw) residual(level float64) []Unbalance {
	c := d.c.clone()
	z := 0.2 * d.radius
	c.Unbalances = []Unbalance{
		{d.r.Float64(), c.Rotor.CentreM - z, d.turnEven()},
		{d.r.Float64(), c.Rotor.CentreM + z, d.turnEven()},
	}
	fit(&c, 1, level)
	return c.Unbalances
}

// harmonics returns the small 2x and 3x and axial 1x that every machine has.
func (d *draw) harmonics() Misalignment {
	c := d.c.clone()
	m := &c.Faults.Misalignment
	m.PositionM, m.DirectionDeg = -0.15*d.span, d.turnEven()
	m.LagDeg = [3]float64{d.turnEven(), d.turnEven(), d.turnEven()}
	m.RadialN[1] = 1
	fit(&c, 2, d.severity*faultRanges.harmonic2.byRatio(d.r))
	twice := m.RadialN[1]
	m.RadialN[1], m.RadialN[2] = 0, 1
	fit(&c, 3, d.severity*faultRanges.harmonic3.byRatio(d.r))
	m.RadialN[1] = twice
	push := d.c.clone()
	push.Faults.Misalignment.AxialN[0] = 1
	if points, err := push.Steady(d.c.Drive.RPM); err == nil {
		m.AxialN[0] = d.severity * faultRanges.thrust.byRatio(d.r) / worst(points, 1, true)
	}
	return *m
}

// balanceOrders brings 2x and 3x of a misalignment into the wanted ratio to 1x, and
// the axial velocity of each order into that to the radial.
func (d *draw) balanceOrders(c *Config) bool {
	push := d.c.clone()
	push.Faults.Misalignment.AxialN = [3]float64{1, 1, 1}
	radial, err1 := c.Steady(c.Drive.RPM)
	axial, err2 := push.Steady(c.Drive.RPM)
	if err1 != nil || err2 != nil {
		return false
	}
	m := &c.Faults.Misalignment
	for n, share := range [maxOrder]float64{1, faultRanges.twice.byRatio(d.r), faultRanges.thrice.byRatio(d.r)} {
		f := share * d.severity / worst(radial, n+1, false)
		m.RadialN[n] *= f
		m.MomentNM[n] *= f
		m.AxialN[n] = faultRanges.misalignmentAxial.even(d.r) * share * d.severity / worst(axial, n+1, true)
	}
	return true
}

// flow returns random forces that shake the rotor with the wanted velocity. For a mass
// m with damping c under a force of deviation s and correlation time T the
// velocity's variance is s^2 T/(c m), white noise assumed.
func (d *draw) flow() Flow {
	s := d.c.Supports
	damping := s[0].V.C + s[1].V.C
	if d.overhung {
		damping = d.c.Frame.V.C
	}
	f := Flow{CornerHz: span{60, 200}.even(d.r)}
	v := 1e-3 * (0.02 + d.severity*faultRanges.flow.byRatio(d.r))
	f.ForceN = v * math.Sqrt(damping*(d.c.Rotor.MassKg+d.c.Frame.MassKg)*2*math.Pi*f.CornerHz)
	return f
}

// unsteadyParts adds what the steady response does not hold.
func (d *draw) unsteadyParts() {
	g, f := faultRanges, &d.c.Faults
	switch d.kind {
	case Loose:
		l := &f.Looseness
		l.End, l.Loss, l.Unsteady = End(d.r.IntN(2)), g.loss.even(d.r), g.unsteady.even(d.r)
		points, err := d.c.Steady(d.c.Drive.RPM)
		if err != nil {
			return
		}
		for _, p := range points {
			if p.End == l.End && p.Direction == Vertical {
				l.LiftM = g.lift.even(d.r) * p.Order[0].RMS * 1e-3 * math.Sqrt2 / d.omega
			}
		}
	case RubOrLooseRotor:
		l := &f.LooseRotor
		l.DegPerMinute, l.WalkDeg = d.signed(g.creep.byRatio(d.r)), g.walk.even(d.r)
		l.HalfOrderN = g.half.even(d.r) * l.KgM * d.omega * d.omega
	case NeighbourMachine:
		n := Neighbour{RPM: d.c.Drive.RPM * (1 + d.signed(g.neighbourOffset.byRatio(d.r)))}
		n.WanderRPM = n.RPM * 3e-4
		level := g.neighbourLevel.byRatio(d.r)
		for range d.c.Sensors {
			n.Velocity = append(n.Velocity, Vector{RMS: level * span{0.5, 1}.even(d.r), Lag: d.turnEven()})
		}
		f.Neighbours = []Neighbour{n}
	}
}
