package rig

import (
	"math"
	"math/cmplx"
	"testing"
)

// TestRigidMotionStretchesNothing: with the frame loose from the ground, moving the
// whole machine as one rigid body costs no force. A wrong sign or lever in any
// spring's elongation shows here.
func TestRigidMotionStretchesNothing(t *testing.T) {
	c := Random(OverhungRotor, newRand(4)).Config
	c.Frame.V, c.Frame.H, c.Frame.A, c.Frame.Pitch, c.Frame.Yaw = Spring{}, Spring{}, Spring{}, Spring{}, Spring{}
	m := assemble(&c)
	along := func(positionM float64) float64 { return positionM - c.Frame.CentreM }
	h := c.Frame.HeightM
	motions := map[string]vector{
		"up":    {rotorV: 1, housingV: 1, housingV + 3: 1, frameV: 1},
		"right": {rotorH: 1, housingV + 1: 1, housingV + 4: 1, frameH: 1},
		"along": {rotorA: 1, housingV + 2: 1, housingV + 5: 1, frameA: 1},
		// A rotation b about the horizontal axis moves the point (h up, z along) by
		// b x r = (b z up, -b h along); about the vertical axis by -b z to the right.
		"pitch": {rotorV: along(c.Rotor.CentreM), housingV: along(0), housingV + 3: along(c.Supports[1].PositionM),
			rotorA: -h, housingV + 2: -h, housingV + 5: -h, tiltH: 1, framePitch: 1},
		"yaw": {rotorH: -along(c.Rotor.CentreM), housingV + 1: -along(0), housingV + 4: -along(c.Supports[1].PositionM),
			tiltV: 1, frameYaw: 1},
	}
	for name, q := range motions {
		for i := range dofs {
			force, scale := 0.0, 0.0
			for j := range dofs {
				force += m.k[i][j] * q[j]
				scale += math.Abs(m.k[i][j] * q[j])
			}
			if math.Abs(force) > 1e-10*scale {
				t.Errorf("%s: degree of freedom %d feels %.3g of %.3g", name, i, force, scale)
			}
		}
	}
}

// TestPedestalBendsAboutItsFoot: a shaft that tilts with the housing of a pedestal
// bending about its foot does not twist the bearing.
func TestPedestalBendsAboutItsFoot(t *testing.T) {
	c := fan()
	f := bearingForms(&c, DriveEnd)
	if d := f.tiltH[tiltH] - c.Supports[0].PedestalM*f.tiltH[housingV+2]; math.Abs(d) > 1e-12 {
		t.Errorf("the bearing is twisted by %g, want 0", d)
	}
}

// TestMisalignmentKeepsItsPlane: alike in both planes and without gyroscopic effect, force
// and moment of a coupling move the housings along their direction.
func TestMisalignmentKeepsItsPlane(t *testing.T) {
	for _, m := range []Misalignment{
		{DirectionDeg: 30, PositionM: -0.3, RadialN: [3]float64{100, 100, 100}},
		{DirectionDeg: 30, PositionM: 0.9, MomentNM: [3]float64{100, 100, 100}},
	} {
		c := fan()
		c.Rotor.PolarKgM2 = 0
		for e := range c.Supports {
			s := &c.Supports[e]
			s.H, s.BearingH, s.PedestalM = s.V, s.BearingV, 0
		}
		c.Faults.Misalignment = m
		p, err := c.Steady(c.Drive.RPM)
		if err != nil {
			t.Fatal(err)
		}
		for n := range maxOrder {
			for e := range 2 {
				v, h := p[3*e].Order[n], p[3*e+1].Order[n]
				near(t, "horizontal over vertical", h.RMS/v.RMS, math.Tan(radians(30)), 1e-9)
				if apart(h.Lag, v.Lag) > 1e-6 {
					t.Errorf("order %d: V at %.1f and H at %.1f degrees, want alike", n+1, v.Lag, h.Lag)
				}
			}
		}
	}
}

// TestBowTurnsForward: alike in both planes, a bent journal's slope whirls with the
// rotation: the horizontal slope (-tiltV) a quarter turn after the vertical (tiltH).
func TestBowTurnsForward(t *testing.T) {
	for _, ccw := range []bool{false, true} {
		c := fan()
		for e := range c.Supports {
			s := &c.Supports[e]
			s.H, s.BearingH, s.PedestalM = s.V, s.BearingV, 0
		}
		c.Rotor.CounterClockwise = ccw
		c.Faults.Bow = Bow{OffsetM: [2]float64{1e-5, 0}, SlopeRad: [2]float64{1e-3, 0}}
		w := c.Drive.RPM * rpm
		q, err := respond(assemble(&c), newLoads(&c).at(1, w), w, w)
		if err != nil {
			t.Fatal(err)
		}
		quarter := complex(0, -c.Rotor.sense())
		if d := cmplx.Abs(q[rotorH] - quarter*q[rotorV]); d > 1e-9*cmplx.Abs(q[rotorV]) {
			t.Errorf("counter-clockwise %v: translation is off a circle by %g", ccw, d)
		}
		if d := cmplx.Abs(-q[tiltV] - quarter*q[tiltH]); d > 1e-9*cmplx.Abs(q[tiltH]) {
			t.Errorf("counter-clockwise %v: slope is off a circle by %g", ccw, d)
		}
	}
}
