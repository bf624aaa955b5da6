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

// kindOf holds the kind of machine for each word of [rig] fault. What does not
// turn with the shaft is a quiet machine in rough gas.
var kindOf = map[string]rig.Kind{
	"none": rig.Quiet, "static": rig.Static, "couple": rig.Couple, "dynamic": rig.Dynamic,
	"overhung": rig.OverhungRotor, "bent-shaft": rig.BentShaft, "misalignment": rig.Misaligned,
	"eccentricity": rig.Eccentric, "resonance": rig.Resonant, "looseness": rig.Loose,
	"rub-or-loose-rotor": rig.RubOrLooseRotor, "neighbour-machine": rig.NeighbourMachine,
	notTurnRelated: rig.Quiet,
}

const notTurnRelated = "not-turn-related"

// newRig returns the simulated machine of a configuration: speed, level, noise,
// build and sensors as configured, the rest drawn by its seed.
func newRig(cfg *config.Config) (*rig.Machine, error) {
	kind, ok := kindOf[cfg.Rig.Fault]
	if !ok {
		return nil, fmt.Errorf("cannot simulate rig.fault %q", cfg.Rig.Fault)
	}
	c, err := rig.RandomLike(kind, wish(cfg, kind), rand.New(rand.NewPCG(uint64(cfg.Rig.Seed), 0)))
	if err != nil {
		return nil, fmt.Errorf("cannot simulate rig.fault %q with machine.rotor %q: %w", cfg.Rig.Fault, cfg.Machine.Rotor, err)
	}
	if kind == rig.NeighbourMachine {
		level(c.Config.Faults.Neighbours, cfg.Rig.MMS)
	}
	if err := instrument(&c.Config, cfg); err != nil {
		return nil, err
	}
	return rig.New(c.Config, uint64(cfg.Rig.Seed))
}

// wish is what a configuration demands of its machine.
func wish(cfg *config.Config, kind rig.Kind) rig.Wish {
	// buried is how far above 1x the noise must lie to hide it, and beside the
	// machine's own 1x as a share of its neighbour's.
	const buried, beside = 2.5, 0.4
	w := rig.Wish{
		RPM: cfg.Machine.RatedRPM, MMS: cfg.Rig.MMS, NoiseMMS: cfg.Rig.NoiseMMS,
		Overhung:         cfg.Machine.Rotor == "overhung",
		CounterClockwise: cfg.Machine.Rotation == "counter-clockwise",
	}
	switch {
	case cfg.Rig.Fault == notTurnRelated:
		w.NoiseMMS = max(w.NoiseMMS, buried*w.MMS)
	case kind == rig.NeighbourMachine:
		w.MMS *= beside
	case kind == rig.Quiet:
		w.MMS = 0 // as quiet as it is drawn
	}
	return w
}

// level brings neighbours to a velocity of mms at the point that feels them
// most.
func level(list []rig.Neighbour, mms float64) {
	for _, n := range list {
		most := 0.0
		for _, v := range n.Velocity {
			most = max(most, v.RMS)
		}
		for i := range n.Velocity {
			n.Velocity[i].RMS *= mms / most
		}
	}
}
