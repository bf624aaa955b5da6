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
	if c.StepHz > 1e6 || c.Channels < 0 || c.Channels > 64 {
		return fmt.Errorf("rig: %g steps per second on %d channels, allowed are up to 1e6 and 64", c.StepHz, c.Channels)
	}
	for e, s := range c.Supports {
		if s.HousingKg < 0 || (s.HousingKg == 0 && (s.V.K != 0 || s.H.K != 0 || s.A.K != 0)) {
			return fmt.Errorf("rig: bearing %d: a housing on springs must have a mass, it is %g kg", e, s.HousingKg)
		}
	}
	if f := c.Frame; f.MassKg < 0 || f.MassKg > 0 && !(f.PitchKgM2 > 0 && f.YawKgM2 > 0) {
		return fmt.Errorf("rig: frame of %g kg: mass and moments of inertia must be above 0", f.MassKg)
	}
	if err := c.checkSprings(); err != nil {
		return err
	}
	return c.Faults.check(len(c.Sensors))
}

// checkSprings says which spring feeds energy in, and whether a number is none.
func (c *Config) checkSprings() error {
	f := c.Frame
	list := []Spring{f.V, f.H, f.A, f.Pitch, f.Yaw}
	for _, s := range c.Supports {
		list = append(list, s.BearingV, s.BearingH, s.BearingA, s.BearingTilt, s.V, s.H, s.A)
	}
	for _, s := range list {
		if s.K < 0 || s.C < 0 {
			return fmt.Errorf("rig: spring of %g N/m with damping %g N s/m: neither may be negative", s.K, s.C)
		}
	}
	m, l := assemble(c), newLoads(c)
	sum := complex(m.polar, 0)
	for i := range dofs {
		sum += l.unbalance[i] + l.loose[i] + l.bowDamping[i] + complex(m.mass[i], 0)
		for n := range l.still {
			sum += l.still[n][i]
		}
		for j := range dofs {
			sum += complex(m.k[i][j], m.c[i][j])
		}
	}
	// A sum with a part that is not finite is not finite.
	if x := real(sum) + imag(sum); math.IsNaN(x) || math.IsInf(x, 0) {
		return fmt.Errorf("rig: a mass, spring, position or load is not a finite number")
	}
	return nil
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
