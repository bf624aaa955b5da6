package rig

import (
	"fmt"
	"math"
	"slices"
)

// clone returns a copy that shares nothing with c.
func (c Config) clone() Config {
	c.Unbalances = slices.Clone(c.Unbalances)
	c.Sensors = slices.Clone(c.Sensors)
	c.Faults.Neighbours = slices.Clone(c.Faults.Neighbours)
	for i := range c.Faults.Neighbours {
		c.Faults.Neighbours[i].Velocity = slices.Clone(c.Faults.Neighbours[i].Velocity)
	}
	if c.Reference != nil {
		r := *c.Reference
		c.Reference = &r
	}
	return c
}

// check says what makes the machine impossible.
func (c *Config) check() error {
	above := []struct {
		name  string
		value float64
	}{
		{"rotor mass", c.Rotor.MassKg},
		{"transverse inertia", c.Rotor.TransverseKgM2},
		{"speed", c.Drive.RPM},
		{"steps per second", c.StepHz},
	}
	for _, p := range above {
		if !(p.value > 0) || math.IsInf(p.value, 0) {
			return fmt.Errorf("rig: %s is %g, must be above 0", p.name, p.value)
		}
	}
	if d := c.Drive; d.Slip < 0 || d.Slip > 0.2 || d.LoadWander < 0 || d.LoadWander > 1 {
		return fmt.Errorf("rig: slip %g must lie in 0 to 0.2 and load wander %g in 0 to 1", d.Slip, d.LoadWander)
	}
	for e, s := range c.Supports {
		if s.HousingKg < 0 || (s.HousingKg == 0 && (s.V.K != 0 || s.H.K != 0 || s.A.K != 0)) {
			return fmt.Errorf("rig: bearing %d: a housing on springs must have a mass, it is %g kg", e, s.HousingKg)
		}
	}
	if f := c.Frame; f.MassKg > 0 && !(f.PitchKgM2 > 0 && f.YawKgM2 > 0) {
		return fmt.Errorf("rig: frame of %g kg: its moments of inertia must be above 0", f.MassKg)
	}
	return c.Faults.check(len(c.Sensors))
}

// check says what makes the faults impossible on a machine with n sensors.
func (f *Faults) check(n int) error {
	shares := []struct {
		name  string
		value float64
	}{
		{"loss of stiffness by looseness", f.Looseness.Loss},
		{"softening, vertical", f.Softening.V},
		{"softening, horizontal", f.Softening.H},
		{"softening, axial", f.Softening.A},
	}
	for _, s := range shares {
		if !(s.value >= 0 && s.value < 1) {
			return fmt.Errorf("rig: %s is %g, allowed are 0 to below 1", s.name, s.value)
		}
	}
	if f.Looseness.End > NonDriveEnd || f.Looseness.Unsteady < 0 || f.Flow.ForceN < 0 || f.Flow.CornerHz < 0 {
		return fmt.Errorf("rig: looseness or flow has a value outside its range")
	}
	for i, x := range f.Neighbours {
		if len(x.Velocity) != n || x.RPM < 0 || x.WanderRPM < 0 {
			return fmt.Errorf("rig: neighbour %d: needs one velocity for each of %d sensors and no negative speed", i, n)
		}
	}
	return nil
}
