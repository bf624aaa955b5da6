package main

import (
	"heavyspot/acquire/rig"
	"heavyspot/config"
)

// The demo's plant is invented: a kiln's induced-draft fan between its
// bearings, with a six-blade double-inlet impeller.
const (
	blades = 6
	// planeM is how far from the impeller's middle the two sides' deposits lie
	// and radiusM how far from the axis, m.
	planeM, radiusM = 0.70, 0.95
	spanM           = 2.6
)

// plant returns the demo's fan with the sensors of its configuration, clean and
// well balanced.
func plant(cfg *config.Config) (*rig.Config, error) {
	const (
		rpm   = 990
		mass  = 1450.0 // kg, impeller and shaft
		omega = rpm * 2 * 3.14159265358979 / 60
	)
	c := &rig.Config{
		Rotor: rig.Rotor{MassKg: mass, PolarKgM2: mass * 0.27, TransverseKgM2: mass * 0.30, CentreM: spanM * 0.48},
		Drive: rig.Drive{RPM: rpm, Slip: 0.01, LoadWander: 0.04, WanderS: 20},
	}
	// A spring by the frequency of the rotor's half on it, as a share of the speed.
	spring := func(share, damping float64) rig.Spring {
		w := omega * share
		return rig.Spring{K: mass / 2 * w * w, C: 2 * damping * mass / 2 * w}
	}
	for e := range c.Supports {
		s := &c.Supports[e]
		s.PositionM = float64(e) * spanM
		s.HousingKg, s.PedestalM = 70, 0.6
		s.V, s.H, s.A = spring(2.2, 0.035), spring(1.9, 0.035), spring(2.0, 0.04)
		s.BearingV, s.BearingH = spring(4.6, 0.01), spring(4.4, 0.01)
		s.BearingA = spring(3.0, 0.02)
	}
	c.Supports[rig.NonDriveEnd].BearingA = spring(0.7, 0.02) // the floating bearing
	m := &c.Faults.Misalignment
	m.PositionM, m.DirectionDeg = -0.3, 35
	m.RadialN, m.AxialN = [3]float64{0, 20, 25}, [3]float64{15, 0, 0}
	m.LagDeg = [3]float64{40, 210, 95}
	c.Faults.Flow = rig.Flow{ForceN: 80, CornerHz: 100}
	return c, instrument(c, cfg)
}

// dust is a deposit on the blades of one side of the impeller.
type dust struct {
	// grams is its mass.
	grams float64
	// blade it lies on, 1 to blades, the first at the reference mark.
	blade int
	// side is -1 for the drive end's side, 0 for both alike, 1 for the other.
	side float64
}

// unbalances returns the masses of deposits, with what a good balance leaves.
func unbalances(list ...dust) []rig.Unbalance {
	masses := []rig.Unbalance{
		{KgM: 0.012, PositionM: spanM*0.48 - planeM, AngleDeg: 200},
		{KgM: 0.010, PositionM: spanM*0.48 + planeM, AngleDeg: 305},
	}
	for _, d := range list {
		masses = append(masses, rig.Unbalance{
			KgM:       d.grams / 1000 * radiusM,
			PositionM: spanM*0.48 + d.side*planeM,
			AngleDeg:  float64(d.blade-1) * 360 / blades,
		})
	}
	return masses
}
