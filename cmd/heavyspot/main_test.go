package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/recording"
	"heavyspot/acquire/rig"
	"heavyspot/config"

	"go.uber.org/goleak"
)

// childVariable makes the test binary behave as the program itself, for tests
// that need a process of its own.
const childVariable = "HEAVYSPOT_TEST_CHILD"

func TestMain(m *testing.M) {
	if os.Getenv(childVariable) != "" {
		os.Exit(execute(os.Args[1:], os.Stdout, os.Stderr))
	}
	goleak.VerifyTestMain(m)
}

// heavyspot runs the program in this process.
func heavyspot(args ...string) (status int, out, talk string) {
	var o, e bytes.Buffer
	status = execute(args, &o, &e)
	return status, o.String(), e.String()
}

// plainOutput fails when output for people holds control characters or is wider
// than a screen.
func plainOutput(t *testing.T, text string) {
	t.Helper()
	for _, line := range strings.Split(text, "\n") {
		if i := strings.IndexFunc(line, func(r rune) bool { return r < ' ' || r == 0x7f || r == 0x9b }); i >= 0 {
			t.Errorf("control character in %q", line)
		}
		if n := len([]rune(line)); n > screenWidth && !strings.Contains(line, os.TempDir()) {
			t.Errorf("line of %d characters: %s", n, line)
		}
	}
}

// fanConfig is a configuration with six points and a reference.
const fanConfig = `
[machine]
site = "north-works"
name = "fan-1"
rotor = "between-bearings"
rotation = "clockwise"
rated_rpm = 1500
[limits]
standard = "own"
alarm_mm_s_rms = 7.1
trip_mm_s_rms = 9.0
[source]
driver = "ads131m08"
rate_hz = 500
[reference]
channel = 6
edge = "rising"
threshold_v = 0.5
hysteresis_v = 0.1
[[point]]
name = "de-v"
bearing = "drive-end"
direction = "vertical"
channel = 0
volts_per_g = 0.1
[[point]]
name = "de-h"
bearing = "drive-end"
direction = "horizontal"
channel = 1
volts_per_g = 0.1
[[point]]
name = "de-a"
bearing = "drive-end"
direction = "axial"
channel = 2
volts_per_g = 0.1
[[point]]
name = "nde-v"
bearing = "non-drive-end"
direction = "vertical"
channel = 3
volts_per_g = 0.1
[[point]]
name = "nde-h"
bearing = "non-drive-end"
direction = "horizontal"
channel = 4
volts_per_g = 0.1
[[point]]
name = "nde-a"
bearing = "non-drive-end"
direction = "axial"
channel = 5
volts_per_g = 0.1
`

// writeFile writes a file into the test's folder.
func writeFile(t *testing.T, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// scale prescribes the 1x of the points of fanConfig, a static unbalance whose
// worst point shows mms.
func scale(mms float64) [][3]rig.Vector {
	var orders [][3]rig.Vector
	for _, v := range []rig.Vector{
		{RMS: 0.7, Lag: 40}, {RMS: 0.9, Lag: 130}, {RMS: 0.1, Lag: 20},
		{RMS: 0.8, Lag: 44}, {RMS: 1, Lag: 135}, {RMS: 0.08, Lag: 60},
	} {
		v.RMS *= mms
		orders = append(orders, [3]rig.Vector{v, {RMS: 0.03 * mms, Lag: 200}, {RMS: 0.01 * mms, Lag: 90}})
	}
	return orders
}

// phasors returns the sampled signal of fanConfig's points at 1500 r/min.
func phasors(t testing.TB, mms float64, seed uint64, s rig.Sampling) *rig.Source {
	t.Helper()
	pc := rig.PhasorConfig{
		Law: rig.SpeedLaw{RPM: 1500, AngleDeg: 10}, Orders: scale(mms), Channels: 7, StepHz: 2000,
		Reference: &rig.Reference{Channel: 6, HighV: 1, WidthDeg: 120},
	}
	for i, name := range []string{"de-v", "de-h", "de-a", "nde-v", "nde-h", "nde-a"} {
		pc.Sensors = append(pc.Sensors, rig.Sensor{Name: name, End: rig.End(i / 3), Direction: rig.Direction(i % 3), Channel: i, VoltsPerG: 0.1, NoiseV: 2e-6})
	}
	p, err := rig.NewPhasors(pc, seed)
	if err != nil {
		t.Fatal(err)
	}
	s.RateHz, s.Smooth = 500, 1
	src, err := rig.NewSource(p, s)
	if err != nil {
		t.Fatal(err)
	}
	return src
}

// write appends a source to a recording from row at on and returns the row after
// its last.
func write(t *testing.T, w recording.Writer, src acquire.Source, at int64) int64 {
	t.Helper()
	var b acquire.Block
	end := at
	for {
		if err := src.Read(t.Context(), &b); err != nil {
			return end
		}
		b.First += at
		if err := w.Write(&b); err != nil {
			t.Fatal(err)
		}
		end = b.First + int64(b.Rows(src.Format().Channels))
	}
}

// fanRecording writes a minute of a quiet fan and 80 s of one with a static
// unbalance, with 1.5 s missing, and returns the file.
func fanRecording(t *testing.T) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "fan.csv")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	quiet := phasors(t, 0.8, 1, rig.Sampling{Duration: 60 * time.Second})
	w, err := recording.NewCSVWriter(f, quiet.Format())
	if err != nil {
		t.Fatal(err)
	}
	loud := phasors(t, 8.2, 2, rig.Sampling{Duration: 80 * time.Second, Losses: []rig.Loss{{First: 20000, Rows: 750, Cause: acquire.Late}}})
	write(t, w, loud, write(t, w, quiet, 0))
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return path
}

func mustConfig(t testing.TB, text string) *config.Config {
	t.Helper()
	cfg, err := config.Parse("fan.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return cfg
}
