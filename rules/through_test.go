package rules_test

import (
	"context"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/rig"
	"heavyspot/dsp"
	"heavyspot/rules"
)

// TestThrough runs simulated machines in time, with noise, flow, wandering
// load, jitter of the pulses and whatever the fault does, through the signal
// path and judges the minutes. No minute may be judged wrongly. The default run
// judges a part-minute of one machine of each kind.
func TestThrough(t *testing.T) {
	machines, minutes, seconds := 1, 1, 20
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		machines, minutes, seconds = 8, 5, 60
	}
	list := append(truths[:len(truths):len(truths)], truth{rig.Loose, rules.NotUnbalance, rules.Looseness})
	for i, want := range list {
		seconds := seconds
		if want.kind == rig.RubOrLooseRotor {
			seconds = 60 // the slowest creep does not show in less
		}
		t.Run(want.kind.String(), func(t *testing.T) {
			t.Parallel()
			r := rand.New(rand.NewPCG(21, uint64(i)))
			for range machines {
				c := rig.Random(want.kind, r)
				// The narrowest pulses are too short for the rate taken here.
				c.Config.Reference.WidthDeg = max(c.Config.Reference.WidthDeg, 30)
				for k, f := range through(t, c, r.Uint64(), minutes, seconds) {
					t.Logf("minute %d: %s %v", k, f.Verdict, f.Suspects)
					if f.Verdict != want.verdict && f.Verdict != rules.Undetermined && f.Verdict != rules.Quiet && !hidden(want.kind, &f) {
						t.Errorf("minute %d: %s", k, f.Verdict)
						report(t, c, f)
					}
				}
			}
		})
	}
}

// hidden tells whether a fault does not show: a support that lifts so little
// that its harmonics stay under 0.3 of 1x in either direction leaves the
// vectors of the unbalance beneath it.
func hidden(k rig.Kind, f *rules.Finding) bool {
	for _, e := range f.Evidence {
		if e.Test == "one-direction-harmonics-to-1x" {
			return k == rig.Loose && e.Measured < 0.3
		}
	}
	return false
}

// through returns the findings of a machine's first minutes, each of the given
// length in seconds.
func through(t *testing.T, c rig.Case, seed uint64, minutes, seconds int) []rules.Finding {
	t.Helper()
	m, err := rig.New(c.Config, seed)
	if err != nil {
		t.Fatal(err)
	}
	const rate = 1000
	source, err := rig.NewSource(m, rig.Sampling{RateHz: rate, Smooth: 3})
	if err != nil {
		t.Fatal(err)
	}
	engine, err := dsp.NewEngine(signalPath(&c, source.Format()))
	if err != nil {
		t.Fatal(err)
	}
	j := newJudge(t, &c)
	var list []rules.Finding
	var b acquire.Block
	step := int64(seconds * rate)
	for end := step; end <= int64(minutes)*step; end += step {
		for at := int64(0); at < end; {
			if err := source.Read(context.Background(), &b); err != nil {
				t.Fatal(err)
			}
			engine.Push(b.First, b.Volts)
			at = b.First + int64(b.Rows(m.Channels()))
		}
		if f, ok := j.Judge(engine.Close(end, time.Time{}, false)); ok {
			list = append(list, f)
		}
	}
	return list
}

// signalPath is the configuration that fits the machine's sensors.
func signalPath(c *rig.Case, f acquire.Format) dsp.Config {
	cfg := dsp.Config{RateHz: f.RateHz, Channels: f.Channels, Gain: f.Gain, RatedRPM: c.Config.Drive.RPM}
	ref := c.Config.Reference
	cfg.Reference = &dsp.Reference{Channel: ref.Channel, Falling: ref.Falling,
		ThresholdV: (ref.LowV + ref.HighV) / 2, HysteresisV: 0.2 * (ref.HighV - ref.LowV)}
	for _, s := range c.Config.Sensors {
		cfg.Points = append(cfg.Points, dsp.Point{Name: s.Name, Channel: s.Channel, VoltsPerG: s.VoltsPerG,
			Inverted: s.Inverted, HighpassHz: s.HighpassHz, FullScaleV: s.ClipV})
	}
	return cfg
}
