package rig

import "math"

// The degrees of freedom: translations in m, tilts in rad about the vertical
// and the horizontal axis.
const (
	rotorV = iota
	rotorH
	rotorA
	tiltV
	tiltH
	housingV // V, H, A at the drive end, then V, H, A at the non-drive end
)

const (
	frameV = housingV + 6 + iota
	frameH
	frameA
	framePitch
	frameYaw
	dofs
)

// vector holds one value per degree of freedom.
type vector [dofs]float64

// matrices are the coefficients of M q" + (C + w G) q' + K q = f.
type matrices struct {
	// mass is the diagonal of M; zero means held fast.
	mass vector
	c, k [dofs]vector
	// polar is the signed polar inertia: the shaft turning at w adds
	// +polar*w*tiltH' to the equation of tiltV and the opposite to tiltH.
	// No term in the acceleration of the shaft appears: the torque that causes it
	// acts along the tilted axis and cancels it.
	polar float64
	// held marks the degrees of freedom that do not move.
	held [dofs]bool
}

// housing returns the degree of freedom of an end's housing in a direction.
func housing(e End, d Direction) int { return housingV + 3*int(e) + int(d) }

// addSpring adds a spring across the elongation form.q.
func (m *matrices) addSpring(form vector, s Spring) {
	for i, a := range form {
		if a == 0 {
			continue
		}
		for j, b := range form {
			m.k[i][j] += s.K * a * b
			m.c[i][j] += s.C * a * b
		}
	}
}

// sense returns +1 for a clockwise rotor, -1 for a counter-clockwise one.
func (r Rotor) sense() float64 {
	if r.CounterClockwise {
		return -1
	}
	return 1
}

// assemble builds the matrices of a machine with its pedestals softened.
func assemble(c *Config) *matrices {
	m := &matrices{polar: c.Rotor.PolarKgM2 * c.Rotor.sense()}
	r := c.Rotor
	m.mass = vector{rotorV: r.MassKg, rotorH: r.MassKg, rotorA: r.MassKg, tiltV: r.TransverseKgM2, tiltH: r.TransverseKgM2}
	f := c.Frame
	m.mass[frameV], m.mass[frameH], m.mass[frameA] = f.MassKg, f.MassKg, f.MassKg
	m.mass[framePitch], m.mass[frameYaw] = f.PitchKgM2, f.YawKgM2
	for i, s := range []Spring{f.V, f.H, f.A, f.Pitch, f.Yaw} {
		m.addSpring(unit(frameV+i), s)
	}
	for e := range c.Supports {
		m.addSupport(c, End(e))
	}
	m.addShaft(c.Shaft)
	for i := range m.held {
		m.held[i] = m.mass[i] == 0
	}
	return m
}

// unit is the form of one degree of freedom.
func unit(i int) vector {
	var v vector
	v[i] = 1
	return v
}

// addSupport adds a bearing, its housing and its pedestal.
func (m *matrices) addSupport(c *Config, e End) {
	s := c.Supports[e]
	b := bearingForms(c, e)
	m.addSpring(b.v, s.BearingV)
	m.addSpring(b.h, s.BearingH)
	m.addSpring(b.a, s.BearingA)
	m.addSpring(b.tiltV, s.BearingTilt)
	m.addSpring(b.tiltH, s.BearingTilt)
	soft := c.Faults.Softening
	left := [3]float64{1 - soft.V, 1 - soft.H, 1 - soft.A}
	for d, sp := range []Spring{s.V, s.H, s.A} {
		if sp.K == 0 {
			continue
		}
		m.mass[housing(e, Direction(d))] = s.HousingKg
		sp.K *= left[d]
		m.addSpring(supportForm(c, e, Direction(d)), sp)
	}
}

// forms are the elongations of a bearing's springs.
type forms struct{ v, h, a, tiltV, tiltH vector }

// bearingForms returns the motion of the shaft against the housing. A tilt about the
// horizontal axis moves the shaft at z by +z vertically, one about the vertical
// axis by -z horizontally (both axes positive by the right-hand rule).
func bearingForms(c *Config, e End) forms {
	s := c.Supports[e]
	z := s.PositionM - c.Rotor.CentreM
	var f forms
	f.v[rotorV], f.v[tiltH], f.v[housing(e, Vertical)] = 1, z, -1
	f.h[rotorH], f.h[tiltV], f.h[housing(e, Horizontal)] = 1, -z, -1
	f.a[rotorA], f.a[housing(e, Axial)] = 1, -1
	f.tiltV[tiltV], f.tiltV[frameYaw] = 1, -1
	f.tiltH[tiltH], f.tiltH[framePitch] = 1, -1
	if s.PedestalM > 0 {
		// The pedestal's axial deflection against the frame tilts the housing.
		p := supportForm(c, e, Axial)
		for i, a := range p {
			f.tiltH[i] += a / s.PedestalM
		}
	}
	return f
}

// supportForm returns the motion of a housing against its place on the frame.
func supportForm(c *Config, e End, d Direction) vector {
	z := c.Supports[e].PositionM - c.Frame.CentreM
	f := unit(housing(e, d))
	switch d {
	case Vertical:
		f[frameV], f[framePitch] = -1, -z
	case Horizontal:
		f[frameH], f[frameYaw] = -1, z
	case Axial:
		f[frameA], f[framePitch] = -1, c.Frame.HeightM
	}
	return f
}

// addShaft adds the elastic shaft to ground in both planes; the slope of the
// shaft is +tiltH in the vertical and -tiltV in the horizontal plane.
func (m *matrices) addShaft(s Shaft) {
	for _, p := range []struct {
		u, slope int
		sign     float64
	}{{rotorV, tiltH, 1}, {rotorH, tiltV, -1}} {
		m.k[p.u][p.u] += s.Translation
		m.k[p.u][p.slope] += p.sign * s.Coupling
		m.k[p.slope][p.u] += p.sign * s.Coupling
		m.k[p.slope][p.slope] += s.Tilt
	}
}

// radians converts degrees.
func radians(deg float64) float64 { return deg * math.Pi / 180 }
