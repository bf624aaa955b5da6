package rig

import (
	"math"
	"math/cmplx"
)

// maxOrder is the highest order of the turn rate with a load of its own.
const maxOrder = 3

// phasor holds one complex amplitude per degree of freedom: the quantity is
// the real part of phasor * exp(j n theta).
type phasor [dofs]complex128

// loads are the exciting forces, in the complex form in which the transient and
// the steady solution both use them.
type loads struct {
	// unbalance is multiplied by (w^2 - j dw/dt); loose likewise, after it was
	// turned by the creep of the loose part.
	unbalance, loose phasor
	// still[n] is the force of order n that does not depend on the speed;
	// bowDamping is multiplied by j w.
	still      [maxOrder + 1]phasor
	bowDamping phasor
	// half is the peak force at half the turn rate on the rotor, vertical, N.
	half float64
}

// newLoads collects the loads of a machine.
func newLoads(c *Config) *loads {
	l := &loads{half: c.Faults.LooseRotor.HalfOrderN}
	for _, u := range c.Unbalances {
		l.unbalance.addMass(c, u)
	}
	l.loose.addMass(c, c.Faults.LooseRotor.Unbalance)
	for e := range c.Supports {
		l.addBow(c, End(e))
	}
	l.addMisalignment(c)
	p := c.Faults.Pull
	l.still[1].addForce(c, p.PositionM, cmplx.Rect(p.ForceN, -radians(p.LagDeg)), p.DirectionDeg)
	return l
}

// turning returns the vertical and horizontal phasors of a unit vector fixed in
// the rotor. The mark passes the pick-up at theta = 0 and the vector follows it
// by its angle.
func turning(c *Config, angleDeg float64) (v, h complex128) {
	s := c.Rotor.sense()
	pickup := 0.0
	if c.Reference != nil {
		pickup = c.Reference.PickupDeg
	}
	v = cmplx.Rect(1, radians(s*pickup-angleDeg))
	return v, complex(0, -s) * v
}

// addMass adds the force of a mass for unit squared speed.
func (p *phasor) addMass(c *Config, u Unbalance) {
	v, h := turning(c, u.AngleDeg)
	k := complex(u.KgM, 0)
	p.addAt(u.PositionM-c.Rotor.CentreM, k*v, k*h)
}

// addForce adds a force along a direction fixed in space.
func (p *phasor) addForce(c *Config, positionM float64, f complex128, directionDeg float64) {
	sin, cos := math.Sincos(radians(directionDeg))
	p.addAt(positionM-c.Rotor.CentreM, f*complex(cos, 0), f*complex(sin, 0))
}

// addAt adds a radial force on the rotor at z from its centre of mass.
func (p *phasor) addAt(z float64, v, h complex128) {
	p[rotorV] += v
	p[rotorH] += h
	p[tiltH] += complex(z, 0) * v
	p[tiltV] -= complex(z, 0) * h
}

// addBow adds the forces by which a bearing's springs answer the run-out and
// the slope of a bent journal.
func (l *loads) addBow(c *Config, e End) {
	bow, s := c.Faults.Bow, c.Supports[e]
	v, h := turning(c, bow.AngleDeg)
	off, slope := complex(bow.OffsetM[e], 0), complex(bow.SlopeRad[e], 0)
	f := bearingForms(c, e)
	l.addElongation(f.v, s.BearingV, off*v)
	l.addElongation(f.h, s.BearingH, off*h)
	l.addElongation(f.tiltH, s.BearingTilt, slope*v)
	l.addElongation(f.tiltV, s.BearingTilt, -slope*h)
}

// addElongation adds the force of a spring that is stretched by d once a turn.
func (l *loads) addElongation(form vector, s Spring, d complex128) {
	for i, a := range form {
		l.still[1][i] -= complex(a*s.K, 0) * d
		l.bowDamping[i] -= complex(a*s.C, 0) * d
	}
}

// addMisalignment adds the forces of the coupling.
func (l *loads) addMisalignment(c *Config) {
	m := c.Faults.Misalignment
	for i := range m.RadialN {
		turn := cmplx.Rect(1, -radians(m.LagDeg[i]))
		p := &l.still[i+1]
		p.addForce(c, m.PositionM, complex(m.RadialN[i], 0)*turn, m.DirectionDeg)
		p[rotorA] += complex(m.AxialN[i], 0) * turn
		sin, cos := math.Sincos(radians(m.DirectionDeg))
		p[tiltH] += complex(m.MomentNM[i]*cos, 0) * turn
		p[tiltV] -= complex(m.MomentNM[i]*sin, 0) * turn
	}
}

// at returns the complex load of order n at a steady speed w, rad/s.
func (l *loads) at(n int, w float64) phasor {
	p := l.still[n]
	if n != 1 {
		return p
	}
	for i := range p {
		p[i] += complex(w*w, 0)*(l.unbalance[i]+l.loose[i]) + complex(0, w)*l.bowDamping[i]
	}
	return p
}
