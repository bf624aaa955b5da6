package rig

import (
	"math"
	"testing"
)

func TestNewRefuses(t *testing.T) {
	for name, spoil := range map[string]func(*Config){
		"no mass":              func(c *Config) { c.Rotor.MassKg = 0 },
		"infinite mass":        func(c *Config) { c.Rotor.MassKg = math.Inf(1) },
		"no inertia":           func(c *Config) { c.Rotor.TransverseKgM2 = math.NaN() },
		"no speed":             func(c *Config) { c.Drive.RPM = 0 },
		"negative steps":       func(c *Config) { c.StepHz = -1 },
		"too many steps":       func(c *Config) { c.StepHz = 1e7 },
		"negative channels":    func(c *Config) { c.Channels = -1 },
		"slip":                 func(c *Config) { c.Drive.Slip = 1 },
		"massless housing":     func(c *Config) { c.Supports[1].HousingKg = 0 },
		"frame inertia":        func(c *Config) { c.Frame.MassKg = 5 },
		"negative stiffness":   func(c *Config) { c.Supports[0].V.K = -1 },
		"stiffness no number":  func(c *Config) { c.Supports[0].V.K = math.NaN() },
		"load no number":       func(c *Config) { c.Unbalances = []Unbalance{{KgM: math.NaN()}} },
		"too stiff":            func(c *Config) { c.Supports[0].BearingV.K = 1e15 },
		"too stiff, damping":   func(c *Config) { c.Supports[0].BearingV.C = 1e12 },
		"two on a channel":     func(c *Config) { c.Sensors[1].Channel = 0 },
		"channel outside":      func(c *Config) { c.Sensors[1].Channel = 8 },
		"reference on another": func(c *Config) { c.Reference.Channel = 3 },
		"no such bearing":      func(c *Config) { c.Sensors[0].End = 2 },
		"no such direction":    func(c *Config) { c.Sensors[0].Direction = 3 },
		"sensitivity":          func(c *Config) { c.Sensors[0].VoltsPerG = 0 },
		"high pass":            func(c *Config) { c.Sensors[0].HighpassHz = 1000 },
		"negative noise":       func(c *Config) { c.Sensors[0].NoiseV = -1 },
		"pulse too wide":       func(c *Config) { c.Reference.WidthDeg = 350 },
		"pulse without height": func(c *Config) { c.Reference.HighV = 0 },
		"jitter":               func(c *Config) { c.Reference.JitterDeg = 90 },
		"looseness":            func(c *Config) { c.Faults.Looseness.Loss = 1 },
		"negative flow":        func(c *Config) { c.Faults.Flow.ForceN = -1 },
		"neighbour":            func(c *Config) { c.Faults.Neighbours = []Neighbour{{RPM: 1000}} },
	} {
		c := fan()
		spoil(&c)
		if _, err := New(c, 1); err == nil {
			t.Errorf("%s: want an error", name)
		}
	}
	if _, err := fan().Steady(0); err == nil {
		t.Error("steady response at standstill: want an error")
	}
}

func TestNewPhasorsRefuses(t *testing.T) {
	for name, c := range map[string]PhasorConfig{
		"orders":  {Sensors: sixSensors()},
		"speed":   {Law: SpeedLaw{RPM: -1}},
		"steps":   {StepHz: math.NaN()},
		"channel": {Reference: &Reference{Channel: 9, HighV: 1}},
	} {
		if _, err := NewPhasors(c, 1); err == nil {
			t.Errorf("%s: want an error", name)
		}
	}
}
