package main

import (
	"fmt"
	"math"
	"os"
	"slices"
	"strings"
	"testing"

	"heavyspot/acquire"
	"heavyspot/acquire/rig"
	"heavyspot/config"
	"heavyspot/rules"
)

// verdictOf holds the right verdict on each of the rig's faults; the second word
// is the first suspect.
var verdictOf = map[string]string{
	"none": "quiet", "static": "static-unbalance", "couple": "couple-unbalance", "dynamic": "dynamic-unbalance",
	"overhung": "overhung-unbalance", "bent-shaft": "not-unbalance bent-shaft", "misalignment": "not-unbalance misalignment",
	"eccentricity": "not-unbalance eccentricity", "resonance": "not-unbalance resonance", "looseness": "not-unbalance looseness",
	"rub-or-loose-rotor": "not-unbalance rub-or-loose-rotor", "neighbour-machine": "not-unbalance neighbour-machine",
	"not-turn-related": "not-unbalance not-turn-related",
}

func rigOf(t *testing.T, fault, rotation string, rpm float64) *config.Config {
	t.Helper()
	rotor := "between-bearings"
	if fault == "overhung" {
		rotor = "overhung"
	}
	text := strings.NewReplacer(`"ads131m08"`, `"rig"`, `"between-bearings"`, `"`+rotor+`"`, `"clockwise"`, `"`+rotation+`"`,
		"rated_rpm = 1500", fmt.Sprintf("rated_rpm = %g", rpm), "rate_hz = 500", "rate_hz = 1000").Replace(fanConfig)
	return mustConfig(t, text+fmt.Sprintf("[rig]\nfault = %q\nmm_s_rms = 6.5\nseed = 3\n", fault))
}

// TestRigIsAsConfigured checks speed, rotation and level of every fault against
// the exact steady response of the machine.
func TestRigIsAsConfigured(t *testing.T) {
	speeds, rotations := []float64{300, 1480, 2950}, []string{"clockwise", "counter-clockwise"}
	for i, fault := range config.Faults() {
		if verdictOf[fault] == "" {
			t.Errorf("no verdict is known for the fault %s", fault)
		}
		rpm, rotation := speeds[i%3], rotations[i%2]
		m, err := newRig(rigOf(t, fault, rotation, rpm))
		if err != nil {
			t.Errorf("%s, %s, %g r/min: %v", fault, rotation, rpm, err)
			continue
		}
		if d := math.Abs(m.RPM() - rpm); d > 1e-6 || m.Config().Rotor.CounterClockwise != (rotation == "counter-clockwise") {
			t.Errorf("%s, %s, %g r/min: turns at %v, counter-clockwise %v", fault, rotation, rpm, m.RPM(), m.Config().Rotor.CounterClockwise)
		}
		low, high := 5.0, 8.0 // the main cause's level, beside a few per cent of others
		switch fault {
		case "none":
			low, high = 0.1, 1.5
		case "neighbour-machine":
			low, high = 2, 3.5
		}
		if worst := levelOf(t, m, rpm); worst < low || worst > high {
			t.Errorf("%s, %s, %g r/min: worst 1x %v mm/s, want %v to %v", fault, rotation, rpm, worst, low, high)
		}
	}
}

func levelOf(t *testing.T, m *rig.Machine, rpm float64) float64 {
	t.Helper()
	points, err := m.Steady(rpm)
	if err != nil {
		t.Fatal(err)
	}
	worst := 0.0
	for _, p := range points {
		worst = max(worst, p.Order[0].RMS)
	}
	return worst
}

// TestRigRefuses checks that a fault of another build of rotor is told.
func TestRigRefuses(t *testing.T) {
	cfg := rigOf(t, "couple", "clockwise", 1480)
	cfg.Machine.Rotor = "overhung"
	if _, err := newRig(cfg); err == nil || !strings.Contains(err.Error(), "rig.fault") {
		t.Errorf("a couple on an overhung rotor: %v", err)
	}
}

// TestRigVerdicts leads every fault through converter, driver and pipeline and
// expects its verdict after five minutes, or none with the right suspect among
// the open ones; the short run takes one fault.
func TestRigVerdicts(t *testing.T) {
	faults, speeds := []string{"couple"}, []float64{1480}
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		faults, speeds = config.Faults(), []float64{740, 1480, 2950}
	}
	for _, fault := range faults {
		for _, rpm := range speeds {
			t.Run(fmt.Sprintf("%s %g", fault, rpm), func(t *testing.T) {
				f := rigFinding(t, rigOf(t, fault, "counter-clockwise", rpm))
				verdict, suspect, _ := strings.Cut(verdictOf[fault], " ")
				open := f.Verdict == rules.Undetermined && slices.Contains(f.Suspects, rules.Suspect(suspect))
				right := string(f.Verdict) == verdict && (suspect == "" || f.Suspects[0] == rules.Suspect(suspect))
				if !open && !right {
					t.Errorf("%s %v, want %s\n%s", f.Verdict, f.Suspects, verdictOf[fault], evidenceTable(f.Evidence))
				}
			})
		}
	}
}

// rigFinding returns the fifth finding on the rig of a configuration.
func rigFinding(t *testing.T, cfg *config.Config) *rules.Finding {
	t.Helper()
	cfg.Rig.SpeedUp = 1000
	src, err := openSource(cfg, nil)
	if err != nil {
		t.Fatal(err)
	}
	defer src.Close()
	c := &collector{}
	p := newTestPipeline(t, cfg, src.Format(), c)
	var b acquire.Block
	for len(c.ticks) < 5 {
		if err := src.Read(t.Context(), &b); err != nil {
			t.Fatal(err)
		}
		b.ClockSet = false // whole minutes, whatever the time is
		if err := p.take(&b); err != nil {
			t.Fatal(err)
		}
	}
	if c.ticks[4].Finding == nil {
		t.Fatalf("no finding: %+v", c.ticks[4].Minute.Speed)
	}
	return c.ticks[4].Finding
}
