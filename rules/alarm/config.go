package alarm

import (
	"fmt"
	"math"
)

// Config is how strict and how patient the alarms are.
type Config struct {
	// Machine is the machine's name, the beginning of every text.
	Machine string
	// AlarmMMS is the limit of the overall velocity and of 1x, mm/s rms; 0
	// means there is none and neither high-overall nor high-1x ever comes.
	AlarmMMS float64
	// TripMMS is where unbalance becomes a matter of high priority, mm/s rms; 0
	// means never.
	TripMMS float64
	// QuietShare is the share of AlarmMMS under which 1x is not judged; 0 means
	// 0.25. It is the limit shown with the unbalance alarms.
	QuietShare float64
	// Deadband is the share of a limit by which a value must fall below it
	// before it counts as back; 0 means 0.05 (common practice).
	Deadband float64
	// Coverage is the share of a minute's samples that must have arrived; 0
	// means 0.99.
	Coverage float64
	// HasReference says that a phase reference is configured, so that its loss
	// is an alarm.
	HasReference bool
	// UnbalanceMinutes is how many steady minutes must show unbalance before
	// its alarm comes; 0 means 3.
	UnbalanceMinutes int
	// ClearMinutes is how many minutes must be free of a cause before its alarm
	// clears; 0 means 3.
	ClearMinutes int
}

// slowShare is the share of the last steady speed under which a machine whose
// speed changes is taken to be running down (our choice: a speed set by hand or
// by a drive seldom halves within a minute).
const slowShare = 0.5

func (c *Config) fill() error {
	for _, f := range []struct {
		name  string
		value *float64
		unset float64
		most  float64
	}{
		{"alarm limit", &c.AlarmMMS, 0, 1000},
		{"trip limit", &c.TripMMS, 0, 1000},
		{"quiet share", &c.QuietShare, 0.25, 1},
		{"deadband", &c.Deadband, 0.05, 0.5},
		{"coverage", &c.Coverage, 0.99, 1},
	} {
		if math.IsNaN(*f.value) || *f.value < 0 || *f.value > f.most {
			return fmt.Errorf("alarm: %s %v: must be from 0 to %v", f.name, *f.value, f.most)
		}
		if *f.value == 0 {
			*f.value = f.unset
		}
	}
	for _, f := range []struct {
		name  string
		value *int
	}{{"unbalance minutes", &c.UnbalanceMinutes}, {"clear minutes", &c.ClearMinutes}} {
		if *f.value < 0 || *f.value > 1440 {
			return fmt.Errorf("alarm: %s %d: must be from 0 to 1440", f.name, *f.value)
		}
		if *f.value == 0 {
			*f.value = 3
		}
	}
	return nil
}
