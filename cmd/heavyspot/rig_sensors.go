package main

import (
	"fmt"
	"math"

	"heavyspot/acquire/rig"
	"heavyspot/config"
)

// noiseG is the density of an accelerometer's noise, g per root hertz: common
// for the micromachined ones (from memory).
const noiseG = 2e-5

// directions holds the machine axis of each direction's word.
var directions = map[string]rig.Direction{"vertical": rig.Vertical, "horizontal": rig.Horizontal, "axial": rig.Axial}

// instrument gives a machine the sensors and the phase reference of a
// configuration.
func instrument(c *rig.Config, cfg *config.Config) error {
	dc := cfg.ADS131M08()
	if cfg.Channels() > dc.Channels {
		return fmt.Errorf("cannot simulate channel %d: the converter has %d", cfg.Channels()-1, dc.Channels)
	}
	drawn := c.Sensors
	c.StepHz, c.Channels, c.Sensors = stepHz(dc.ClockHz, dc.RateHz), dc.Channels, nil
	for _, p := range cfg.Points {
		s := rig.Sensor{
			Name: p.Name, Direction: directions[p.Direction], Channel: p.Channel,
			VoltsPerG: p.VoltsPerG, Inverted: p.Inverted, HighpassHz: p.HighpassHz,
			NoiseV: noiseG * p.VoltsPerG, ClipV: 1.2,
		}
		if p.Bearing == "non-drive-end" {
			s.End = rig.NonDriveEnd
		}
		c.Sensors = append(c.Sensors, s)
	}
	// Neighbours are given for the sensors that were drawn.
	for i := range c.Faults.Neighbours {
		n := &c.Faults.Neighbours[i]
		old := n.Velocity
		n.Velocity = make([]rig.Vector, len(c.Sensors))
		for k, s := range c.Sensors {
			for j, d := range drawn {
				if d.End == s.End && d.Direction == s.Direction {
					n.Velocity[k] = old[j]
				}
			}
		}
	}
	place := 0.0
	if c.Reference != nil {
		place = c.Reference.PickupDeg
	}
	c.Reference = pickup(cfg, place)
	return nil
}

// pickup returns a phase reference at a place, degrees, whose pulses cross the
// configured levels and are wide enough for the configured rate at rated speed.
func pickup(cfg *config.Config, place float64) *rig.Reference {
	r := cfg.Reference
	if r == nil {
		return nil
	}
	width := max(40, 4*360/cfg.Source.RateHz*cfg.Machine.RatedRPM/60)
	// Well past the levels, but within the converter's range.
	reach := max(0.3, 2*r.HysteresisV)
	return &rig.Reference{
		Channel: r.Channel, PickupDeg: place, WidthDeg: min(width, 200), Falling: r.Edge == "falling",
		LowV: math.Max(r.ThresholdV-reach, -1.15), HighV: math.Min(r.ThresholdV+reach, 1.15),
		JitterDeg: 0.01, NoiseV: 1e-5,
	}
}
