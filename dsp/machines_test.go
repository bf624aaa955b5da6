package dsp_test

import (
	"context"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/rig"
	"heavyspot/dsp"
	"heavyspot/rules"
)

// rateFor returns the sample rate at which a machine's pulse is three rows wide,
// as the reference needs it.
func rateFor(c rig.Config) float64 {
	rate := 1000.0
	for rate < 4000 && c.Reference != nil && c.Reference.WidthDeg/360*rate/(c.Drive.RPM/60) < 3 {
		rate *= 2
	}
	return rate
}

// dspConfig tells the signal path what is wired to a simulated machine.
func dspConfig(c rig.Config, f acquire.Format) dsp.Config {
	d := dsp.Config{RateHz: f.RateHz, Channels: f.Channels, Gain: f.Response, RatedRPM: c.Drive.RPM}
	if r := c.Reference; r != nil {
		d.Reference = &dsp.Reference{Channel: r.Channel, Falling: r.Falling,
			ThresholdV: (r.LowV + r.HighV) / 2, HysteresisV: 0.2 * math.Abs(r.HighV-r.LowV)}
	}
	for _, s := range c.Sensors {
		d.Points = append(d.Points, dsp.Point{Name: s.Name, Channel: s.Channel, VoltsPerG: s.VoltsPerG, Inverted: s.Inverted, HighpassHz: s.HighpassHz})
	}
	return d
}

func rulesConfig(c *rig.Case) rules.Config {
	r := rules.Config{Overhung: c.Overhung, CounterClockwise: c.Config.Rotor.CounterClockwise, RatedRPM: c.Config.Drive.RPM}
	r.Limits, _ = rules.LimitsISO14694(3, false)
	for _, s := range c.Config.Sensors {
		r.Points = append(r.Points, rules.Point{Name: s.Name, NonDriveEnd: s.End == rig.NonDriveEnd, Direction: rules.Direction(s.Direction)})
	}
	return r
}

// minutesOf runs a machine in time through the signal path.
func minutesOf(t *testing.T, c rig.Config, seed uint64, n int, seconds float64) []dsp.Minute {
	t.Helper()
	m, err := rig.New(c, seed)
	if err != nil {
		t.Fatal(err)
	}
	rate := rateFor(c)
	src, err := rig.NewSource(m, rig.Sampling{RateHz: rate, Smooth: 1, Duration: time.Duration(float64(n) * seconds * 1e9)})
	if err != nil {
		t.Fatal(err)
	}
	e, err := dsp.NewEngine(dspConfig(c, src.Format()))
	if err != nil {
		t.Fatal(err)
	}
	var out []dsp.Minute
	var b acquire.Block
	rows := int64(0)
	for {
		if err := src.Read(context.Background(), &b); err == io.EOF {
			return out
		} else if err != nil {
			t.Fatal(err)
		}
		e.Push(b.First, b.Volts)
		rows += int64(b.Rows(src.Format().Channels))
		if rows >= int64(float64(len(out)+1)*seconds*rate) {
			out = append(out, e.Close(rows, time.Time{}, false))
		}
	}
}

// TestMachines leads random machines of each kind, integrated in time, through
// the signal path and the rules. The vectors must be those of the exact steady
// response, no verdict may be wrong, and few may stay undetermined.
func TestMachines(t *testing.T) {
	n := 1
	if raceDetector {
		t.Skip("machines share nothing: nothing to find for the race detector")
	}
	if s := os.Getenv("HEAVYSPOT_MACHINES"); s != "" {
		n, _ = strconv.Atoi(s)
	}
	want := map[rig.Kind]rules.Verdict{rig.Quiet: rules.Quiet, rig.Static: rules.StaticUnbalance, rig.Couple: rules.CoupleUnbalance,
		rig.Dynamic: rules.DynamicUnbalance, rig.OverhungRotor: rules.OverhungUnbal}
	for _, kind := range rig.Kinds() {
		t.Run(kind.String(), func(t *testing.T) {
			t.Parallel()
			r := rand.New(rand.NewPCG(77, uint64(kind)))
			verdict := want[kind]
			if verdict == "" {
				verdict = rules.NotUnbalance
			}
			got := map[rules.Verdict]int{}
			for k := range n {
				c := rig.Random(kind, r)
				minutes := minutesOf(t, c.Config, uint64(k)+1, 2, 60)
				j, err := rules.NewJudge(rulesConfig(&c))
				if err != nil {
					t.Fatal(err)
				}
				var f rules.Finding
				ok := false
				for _, m := range minutes {
					f, ok = j.Judge(m)
				}
				last := minutes[len(minutes)-1]
				if !ok {
					t.Errorf("%d: last minute not judged: %+v", k, last.Speed)
					continue
				}
				got[f.Verdict]++
				if f.Verdict != verdict && f.Verdict != rules.Undetermined && !(f.Verdict == rules.Quiet && f.Evidence[0].Holds) {
					t.Errorf("%d: verdict %s %v", k, f.Verdict, f.Suspects)
					tell(t, &c, last, f)
				}
				if f.Verdict == rules.Undetermined {
					tell(t, &c, last, f)
				}
			}
			t.Logf("%v", got)
			if u := got[rules.Undetermined]; u > max(1, n*3/100) {
				t.Errorf("%d of %d undetermined", u, n)
			}
		})
	}
}

func tell(t *testing.T, c *rig.Case, m dsp.Minute, f rules.Finding) {
	t.Helper()
	t.Logf("%s: %s %v; overhung %v, counter-clockwise %v, %+v, lines %v", c.Kind, f.Verdict, f.Suspects, c.Overhung, c.Config.Rotor.CounterClockwise, m.Speed, m.Lines)
	for i, p := range m.Points {
		t.Logf("   %-6s %-7s 1x %6.2f@%3.0f (exact %6.2f@%3.0f) 2x %5.2f 3x %5.2f overall %6.2f share %.2f wander %.1f", p.Name, p.State,
			p.Order[0].RMS, p.Order[0].Lag, c.Points[i].Order[0].RMS, c.Points[i].Order[0].Lag, p.Order[1].RMS, p.Order[2].RMS, p.Overall, p.Share, p.Wander)
	}
	for _, e := range f.Evidence {
		t.Logf("   %s %.3g (sd %.2g) %s, expected %s: %v margin %.3g %s", e.Test, e.Measured, e.SD, e.Unit, e.Expected, e.Holds, e.Margin, e.Missing)
	}
}
