package main

import (
	"fmt"
	"math"
	"math/rand/v2"

	"heavyspot/acquire/rig"
	"heavyspot/config"
)

// stepHz returns the steps per second of the simulated signal: what the
// simulated converter's filter takes (its modulator, at half the clock, divided
// by 128 to 1024), at least the sampling rate and fast enough for 3x of 6000
// r/min.
func stepHz(clockHz, rateHz float64) float64 {
	const enough = 4000
	step := math.Min(1024, clockHz/2/rateHz)
	for step > 128 && clockHz/2/step < enough {
		step /= 2
	}
	return clockHz / 2 / step
}

// kindOf holds the kind of machine for each word of [rig] fault.
var kindOf = map[string]rig.Kind{
	"none": rig.Quiet, "static": rig.Static, "couple": rig.Couple, "dynamic": rig.Dynamic,
	"overhung": rig.OverhungRotor, "bent-shaft": rig.BentShaft, "misalignment": rig.Misaligned,
	"eccentricity": rig.Eccentric, "resonance": rig.Resonant, "looseness": rig.Loose,
	"rub": rig.RubOrLooseRotor, "neighbour": rig.NeighbourMachine,
}

// newRig returns the simulated machine of a configuration: one drawn at random
// by its seed, brought to the configured speed, level and sensors.
func newRig(cfg *config.Config) (*rig.Machine, error) {
	c, err := drawRig(cfg)
	if err != nil {
		return nil, err
	}
	toSpeed(c, cfg.Machine.RatedRPM)
	if err := toLevel(c, cfg.Rig, kindOf[cfg.Rig.Fault]); err != nil {
		return nil, err
	}
	noise(c, cfg.Rig.NoiseMMS)
	if err := instrument(c, cfg); err != nil {
		return nil, err
	}
	return rig.New(*c, uint64(cfg.Rig.Seed))
}

// drawRig draws machines until one is of the configured build and turns the
// configured way round.
func drawRig(cfg *config.Config) (*rig.Config, error) {
	const draws = 100
	overhung := cfg.Machine.Rotor == "overhung"
	kind, ok := kindOf[cfg.Rig.Fault]
	if !ok {
		return nil, fmt.Errorf("cannot simulate fault %q", cfg.Rig.Fault)
	}
	if kind == rig.Static && overhung {
		kind = rig.OverhungRotor // what a heavy spot on an overhung impeller is
	}
	r := rand.New(rand.NewPCG(uint64(cfg.Rig.Seed), 0))
	for range draws {
		c := rig.Random(kind, r)
		if c.Overhung == overhung && c.Config.Rotor.CounterClockwise == (cfg.Machine.Rotation == "counter-clockwise") {
			return &c.Config, nil
		}
	}
	return nil, fmt.Errorf("cannot simulate rig.fault %q with machine.rotor %q: choose another fault", cfg.Rig.Fault, cfg.Machine.Rotor)
}

// toSpeed brings a machine to another speed by similarity: stiffnesses and
// forces with the square of the ratio and dampings with the ratio leave every
// displacement as it was.
func toSpeed(c *rig.Config, rpm float64) {
	ratio := rpm / c.Drive.RPM
	square := ratio * ratio
	c.Drive.RPM = rpm
	springs := []*rig.Spring{&c.Frame.V, &c.Frame.H, &c.Frame.A, &c.Frame.Pitch, &c.Frame.Yaw}
	for i := range c.Supports {
		s := &c.Supports[i]
		springs = append(springs, &s.BearingV, &s.BearingH, &s.BearingA, &s.BearingTilt, &s.V, &s.H, &s.A)
	}
	for _, s := range springs {
		s.K *= square
		s.C *= ratio
	}
	c.Shaft.Translation *= square
	c.Shaft.Coupling *= square
	c.Shaft.Tilt *= square
	forces(c, square)
	f := &c.Faults
	f.LooseRotor.HalfOrderN *= square
	f.Flow.CornerHz *= ratio
	for i := range f.Neighbours {
		f.Neighbours[i].RPM *= ratio
		f.Neighbours[i].WanderRPM *= ratio
	}
}

// forces multiplies the forces that do not come from masses or displacements.
func forces(c *rig.Config, by float64) {
	m, p := &c.Faults.Misalignment, &c.Faults.Pull
	for n := range m.RadialN {
		m.RadialN[n] *= by
		m.AxialN[n] *= by
		m.MomentNM[n] *= by
	}
	p.ForceN *= by
}

// toLevel brings the worst 1x to the configured one: the neighbour's where that
// is the fault, none where there is no fault.
func toLevel(c *rig.Config, story *config.Rig, kind rig.Kind) error {
	switch kind {
	case rig.Quiet:
		return nil
	case rig.NeighbourMachine:
		for _, n := range c.Faults.Neighbours {
			most := 0.0
			for _, v := range n.Velocity {
				most = max(most, v.RMS)
			}
			for i := range n.Velocity {
				n.Velocity[i].RMS *= story.MMS / most
			}
		}
		return nil
	}
	points, err := c.Steady(c.Drive.RPM)
	if err != nil {
		return err
	}
	most := 0.0
	for _, p := range points {
		most = max(most, p.Order[0].RMS)
	}
	by := story.MMS / most
	for i := range c.Unbalances {
		c.Unbalances[i].KgM *= by
	}
	f := &c.Faults
	for e := range f.Bow.OffsetM {
		f.Bow.OffsetM[e] *= by
		f.Bow.SlopeRad[e] *= by
	}
	forces(c, by)
	f.LooseRotor.KgM *= by
	f.LooseRotor.HalfOrderN *= by
	f.Looseness.LiftM *= by
	return nil
}

// noise sets the random force of the gas to what shakes the rotor with a
// velocity in mm/s rms: a mass m with damping c under white noise of standard
// deviation s and correlation time T has the variance s^2 T/(c m).
func noise(c *rig.Config, level float64) {
	if c.Faults.Flow.CornerHz == 0 {
		c.Faults.Flow.CornerHz = 100
	}
	damping := c.Supports[0].V.C + c.Supports[1].V.C
	if c.Frame.MassKg > 0 {
		damping = c.Frame.V.C
	}
	mass := c.Rotor.MassKg + c.Frame.MassKg
	c.Faults.Flow.ForceN = 1e-3 * level * math.Sqrt(damping*mass*2*math.Pi*c.Faults.Flow.CornerHz)
}
