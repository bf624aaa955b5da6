package main

import (
	"fmt"
	"math"
	"os"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/rig"
	"heavyspot/config"
	"heavyspot/dsp"
	"heavyspot/rules/alarm"

	"github.com/google/go-cmp/cmp"
)

// collector keeps ticks.
type collector struct{ ticks []*tick }

func (c *collector) take(t *tick) error {
	c.ticks = append(c.ticks, t)
	return nil
}

func newTestPipeline(t testing.TB, cfg *config.Config, f acquire.Format, sinks ...sink) *pipeline {
	t.Helper()
	a, err := alarm.New(cfg.Alarms())
	if err != nil {
		t.Fatal(err)
	}
	p, err := newPipeline(cfg, f, true, a, sinks...)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// stretch is a part of a stream: blocks of a quarter of a second at 200 Hz.
type stretch struct {
	seconds float64
	// lost are seconds missing ahead of it.
	lost float64
	// step is by how much the wall clock is set anew at its begin.
	step time.Duration
	// unknown blocks carry no time, unset ones one that cannot be believed.
	unknown, unset bool
}

const alignHz = 200

// alignConfig is one point and a reference at ten turns a second.
const alignConfig = `
[machine]
site = "north-works"
name = "fan-1"
rotor = "between-bearings"
rotation = "clockwise"
rated_rpm = 600
[limits]
standard = "own"
alarm_mm_s_rms = 7.1
trip_mm_s_rms = 9.0
[source]
driver = "ads131m08"
rate_hz = 200
[reference]
channel = 1
edge = "rising"
threshold_v = 0.5
hysteresis_v = 0.1
[[point]]
name = "de-h"
bearing = "drive-end"
direction = "horizontal"
channel = 0
volts_per_g = 0.1
`

// play leads stretches through a pipeline and returns its minutes. The sample
// clock is fast by ppm.
func play(t *testing.T, begin time.Time, ppm float64, list []stretch) *collector {
	t.Helper()
	c := &collector{}
	p := newTestPipeline(t, mustConfig(t, alignConfig), acquire.Format{RateHz: alignHz, Channels: 2}, c)
	const rows = alignHz / 4
	var row int64
	var step time.Duration
	for _, s := range list {
		row += int64(s.lost * alignHz)
		step += s.step
		for range int(s.seconds * 4) {
			b := acquire.Block{First: row, ClockSet: !s.unset}
			if !s.unknown {
				b.Time = begin.Add(step + time.Duration(float64(row)/alignHz/(1+ppm*1e-6)*1e9))
			}
			for i := range int64(rows) {
				turn := math.Mod(float64(row+i)*10/alignHz, 1)
				pulse := float32(0)
				if turn < 0.2 {
					pulse = 1
				}
				b.Volts = append(b.Volts, float32(0.02*math.Cos(2*math.Pi*turn)), pulse)
			}
			if err := p.take(&b); err != nil {
				t.Fatal(err)
			}
			row += rows
		}
	}
	if err := p.finish(); err != nil {
		t.Fatal(err)
	}
	return c
}

// lines are the minutes in short: start, seconds, share arrived.
func (c *collector) lines() []string {
	var list []string
	for _, t := range c.ticks {
		m := &t.Minute
		text := fmt.Sprintf("%s %.4g s", m.Start.UTC().Format("15:04:05.000"), m.Seconds)
		if m.Coverage < 1 {
			text += fmt.Sprintf(" %.3f", m.Coverage)
		}
		if !m.ClockSet {
			text += " unset"
		}
		list = append(list, text)
	}
	return list
}

func at(clock string) time.Time {
	t, err := time.Parse(time.RFC3339, "2026-03-01T"+clock+"Z")
	if err != nil {
		panic(err)
	}
	return t
}

// TestMinutes checks where minutes begin and end.
func TestMinutes(t *testing.T) {
	tests := []struct {
		name  string
		begin string
		list  []stretch
		want  []string
	}{
		{"on the minute", "06:31:00", []stretch{{seconds: 130}},
			[]string{"06:31:00.000 60 s", "06:32:00.000 60 s", "06:33:00.000 10 s"}},
		{"within a minute", "06:31:50.125", []stretch{{seconds: 80}},
			[]string{"06:31:50.125 9.875 s", "06:32:00.000 60 s", "06:33:00.000 10.12 s"}},
		{"a sample ahead of the minute", "06:30:59.9976", []stretch{{seconds: 60}},
			[]string{"06:31:00.000 60 s"}},
		{"too few turns at begin and end", "06:31:59.5", []stretch{{seconds: 61}},
			[]string{"06:32:00.000 60 s"}},
		{"no time", "06:31:50", []stretch{{seconds: 130, unknown: true}},
			[]string{"00:00:00.000 60 s unset", "00:01:00.000 60 s unset", "00:02:00.000 10 s unset"}},
		{"clock not set", "06:31:50", []stretch{{seconds: 70, unset: true}},
			[]string{"06:31:50.000 60 s unset", "06:32:50.000 10 s unset"}},
		{"clock set while running", "03:00:00", []stretch{{seconds: 70, unset: true}, {seconds: 80, step: 4*time.Hour + 5*time.Second}},
			[]string{"03:00:00.000 60 s unset", "07:01:05.000 55 s", "07:02:00.000 35 s"}},
		{"set late in a minute", "03:00:00", []stretch{{seconds: 55, unset: true}, {seconds: 125, step: time.Hour}},
			[]string{"04:00:00.000 60 s", "04:01:00.000 60 s", "04:02:00.000 60 s"}},
		{"time lost again", "06:31:00", []stretch{{seconds: 70}, {seconds: 80, unknown: true}},
			[]string{"06:31:00.000 60 s", "06:32:00.000 60 s", "06:33:00.000 30 s"}},
		{"set forward by hours", "06:31:00", []stretch{{seconds: 70}, {seconds: 110, step: 3*time.Hour + 20*time.Second}},
			[]string{"06:31:00.000 60 s", "09:32:20.000 40 s", "09:33:00.000 60 s", "09:34:00.000 20 s"}},
		{"set forward past the end of the minute", "06:31:00", []stretch{{seconds: 45}, {seconds: 60, step: 20 * time.Second}},
			[]string{"06:31:20.000 100 s", "06:33:00.000 5 s"}},
		{"set forward a little", "06:31:00", []stretch{{seconds: 20}, {seconds: 100, step: 10 * time.Second}},
			[]string{"06:31:00.000 50 s", "06:32:00.000 60 s", "06:33:00.000 10 s"}},
		{"set back a little", "06:31:00", []stretch{{seconds: 70}, {seconds: 100, step: -30 * time.Second}},
			[]string{"06:31:00.000 60 s", "06:32:00.000 90 s", "06:33:00.000 20 s"}},
		{"set back by hours", "06:31:00", []stretch{{seconds: 70}, {seconds: 110, step: -2 * time.Hour}},
			[]string{"06:31:00.000 60 s", "04:32:00.000 60 s", "04:33:00.000 60 s"}},
		{"slewed", "06:31:00", []stretch{{seconds: 30}, {seconds: 30, step: time.Second}, {seconds: 61, step: -time.Second}},
			[]string{"06:31:00.000 59 s", "06:32:00.000 61 s"}},
		{"gap within a minute", "06:31:00", []stretch{{seconds: 20}, {lost: 15, seconds: 85}},
			[]string{"06:31:00.000 60 s 0.750", "06:32:00.000 60 s"}},
		{"gap over an end", "06:31:00", []stretch{{seconds: 45}, {lost: 30, seconds: 45}},
			[]string{"06:31:00.000 60 s 0.750", "06:32:00.000 60 s 0.750"}},
		{"gap up to an end", "06:31:00", []stretch{{seconds: 45}, {lost: 15, seconds: 60}},
			[]string{"06:31:00.000 60 s 0.750", "06:32:00.000 60 s"}},
		{"gap of minutes", "06:31:00", []stretch{{seconds: 45}, {lost: 300, seconds: 75}},
			[]string{"06:31:00.000 60 s 0.750", "06:36:00.000 60 s 0.250", "06:37:00.000 60 s"}},
		{"gap of ten days", "06:31:00", []stretch{{seconds: 60}, {lost: 864000, seconds: 60}},
			[]string{"06:31:00.000 60 s", "06:32:00.000 60 s"}},
		{"gap of minutes, no time", "06:31:00", []stretch{{seconds: 45, unknown: true}, {lost: 300, seconds: 75, unknown: true}},
			[]string{"00:00:00.000 60 s 0.750 unset", "00:05:00.000 60 s 0.250 unset", "00:06:00.000 60 s unset"}},
		{"gap and clock set", "06:31:00", []stretch{{seconds: 30}, {lost: 60, seconds: 90, step: time.Hour}},
			[]string{"07:31:00.000 60 s 0.500", "07:32:00.000 60 s 0.500", "07:33:00.000 60 s"}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got := play(t, at("00:00:00").Add(clockPart(test.begin)), 0, test.list)
			if d := cmp.Diff(test.want, got.lines()); d != "" {
				t.Errorf("minutes (-want +got):\n%s", d)
			}
		})
	}
}

// TestStandingMachine checks that whole minutes of a machine that stands count,
// and a cut one does not.
func TestStandingMachine(t *testing.T) {
	c := &collector{}
	p := newTestPipeline(t, mustConfig(t, alignConfig), acquire.Format{RateHz: alignHz, Channels: 2}, c)
	b := acquire.Block{Volts: make([]float32, 2*alignHz)}
	for range 130 {
		if err := p.take(&b); err != nil {
			t.Fatal(err)
		}
		b.First += alignHz
	}
	if err := p.finish(); err != nil {
		t.Fatal(err)
	}
	want := []string{"00:00:00.000 60 s unset", "00:01:00.000 60 s unset"}
	if d := cmp.Diff(want, c.lines()); d != "" {
		t.Errorf("minutes (-want +got):\n%s", d)
	}
	for _, k := range c.ticks {
		if k.Finding != nil || k.Minute.Speed.State != dsp.Stopped {
			t.Errorf("a standing machine is %s and has the finding %v", k.Minute.Speed.State, k.Finding)
		}
	}
}

func clockPart(s string) time.Duration {
	var h, m int
	var sec float64
	if _, err := fmt.Sscanf(s, "%d:%d:%g", &h, &m, &sec); err != nil {
		panic(err)
	}
	return time.Duration(h)*time.Hour + time.Duration(m)*time.Minute + time.Duration(math.Round(sec*1e6))*time.Microsecond
}

// TestDrift lets the sample clock drift for hours: every minute begins within a
// sample of its UTC minute, and their lengths differ by the drift only.
func TestDrift(t *testing.T) {
	for _, ppm := range []float64{-200, 200} {
		got := play(t, at("06:31:00"), ppm, []stretch{{seconds: 3600}})
		if n := len(got.ticks); n != 60 {
			t.Fatalf("%g ppm: %d minutes in an hour", ppm, n)
		}
		for i, k := range got.ticks {
			want := at("06:31:00").Add(time.Duration(i) * time.Minute)
			place := float64(k.Minute.First) / alignHz / (1 + ppm*1e-6)
			if !k.Minute.Start.Equal(want) || math.Abs(place-60*float64(i)) > 1.0/alignHz {
				t.Errorf("%g ppm: minute %d: says %v, begins %.4f s after the first", ppm, i, k.Minute.Start, place)
			}
		}
	}
}

// TestRandomClock sets the clock at random and checks what must always hold:
// minutes follow each other without overlap, none is empty, and even two steps
// within one make it no longer than three.
func TestRandomClock(t *testing.T) {
	for seed := range int64(12) {
		list := []stretch{}
		x := seed*7919 + 1
		next := func(n int64) int64 {
			x = (x*6364136223846793005 + 1442695040888963407) & math.MaxInt64
			return x >> 20 % n
		}
		for range 8 {
			s := stretch{seconds: float64(10 + next(90)), unset: next(5) == 0}
			switch next(4) {
			case 0:
				s.step = time.Duration(next(300)-150) * time.Second
			case 1:
				s.lost = float64(next(200))
			}
			list = append(list, s)
		}
		got := play(t, at("06:31:17"), 0, list)
		end := int64(0)
		for i, k := range got.ticks {
			m := &k.Minute
			if m.First < end || m.Seconds <= 0 || m.Seconds > 185 || m.Coverage <= 0 || m.Coverage > 1 {
				t.Errorf("seed %d, minute %d: first row %d after %d, %v s, coverage %v; of %+v", seed, i, m.First, end, m.Seconds, m.Coverage, list)
			}
			end = m.First + int64(math.Round(m.Seconds*alignHz))
		}
	}
}

// TestPipelineAllocates nothing for a block within a minute.
func TestPipelineAllocatesNothing(t *testing.T) {
	cfg := mustConfig(t, fanConfig)
	src := phasors(t, 5, 1, rig.Sampling{Start: at("06:31:00")})
	p := newTestPipeline(t, cfg, src.Format())
	var b acquire.Block
	feed := func() {
		if err := src.Read(t.Context(), &b); err != nil {
			t.Fatal(err)
		}
		if err := p.take(&b); err != nil {
			t.Fatal(err)
		}
	}
	for range 4 * 130 { // two minutes fill what grows
		feed()
	}
	if n := testing.AllocsPerRun(100, feed); n > 0 {
		t.Errorf("%v allocations a block", n)
	}
}

// TestRefusesOldSamples checks that a block cannot come twice.
func TestRefusesOldSamples(t *testing.T) {
	p := newTestPipeline(t, mustConfig(t, alignConfig), acquire.Format{RateHz: alignHz, Channels: 2})
	b := acquire.Block{Volts: make([]float32, 20)}
	if err := p.take(&b); err != nil {
		t.Fatal(err)
	}
	if err := p.take(&b); err == nil {
		t.Error("the same rows twice were accepted")
	}
	b = acquire.Block{First: 10, Volts: make([]float32, 3)}
	if err := p.take(&b); err == nil {
		t.Error("half a row was accepted")
	}
}

// shared returns the path of a file of the shared data, or skips.
func shared(t *testing.T, path string) string {
	t.Helper()
	path = "../../../shared/data/" + path
	if _, err := os.Stat(path); err != nil {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatalf("shared data are required: %v", err)
		}
		t.Skipf("shared data are not here: %v", err)
	}
	return path
}
