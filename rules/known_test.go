package rules

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"testing"

	"github.com/pelletier/go-toml/v2"

	"heavyspot/dsp"
)

// knownFolder holds recordings with their true vectors and verdicts.
const knownFolder = "../../shared/data/known"

// TestKnown judges the true vectors of the recordings that have a verdict.
func TestKnown(t *testing.T) {
	if _, err := os.Stat(knownFolder); err != nil {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatal(err)
		}
		t.Skip("known recordings are not here:", err)
	}
	tests := []struct {
		name    string
		verdict Verdict
		suspect Suspect
	}{
		{"static", StaticUnbalance, ""},
		{"dynamic", DynamicUnbalance, ""},
		{"overhung", OverhungUnbal, ""},
		{"bent", NotUnbalance, BentShaft},
	}
	for _, tt := range tests {
		s := readKnown(t, tt.name)
		f := s.finding()
		if f.Verdict != tt.verdict || tt.suspect != "" && f.Suspects[0] != tt.suspect {
			t.Errorf("%s: verdict %s %v, want %s %s\n%+v", tt.name, f.Verdict, f.Suspects, tt.verdict, tt.suspect, f.Evidence)
		}
		for _, e := range f.Evidence {
			if tt.suspect == "" && !e.Holds && e.Missing == "" {
				t.Errorf("%s: evidence %+v does not hold", tt.name, e)
			}
		}
	}
}

// readKnown takes the configuration and the true vectors of a recording.
func readKnown(t *testing.T, name string) *scene {
	t.Helper()
	var file struct {
		Machine struct{ Rotor, Rotation string }
		Point   []struct{ Name, Bearing, Direction string }
	}
	read(t, name+".toml", func(b []byte) error { return toml.Unmarshal(b, &file) })
	type vector struct {
		RMS float64 `json:"mm_s_rms"`
		Lag float64 `json:"lag_deg"`
	}
	var truth struct {
		RPM    float64 `json:"mean_rpm"`
		Points map[string]struct{ Order1, Order2, Order3 vector }
	}
	read(t, name+".truth.json", func(b []byte) error { return json.Unmarshal(b, &truth) })
	s := &scene{}
	s.cfg.Limits, _ = LimitsISO14694(3, false)
	s.cfg.Overhung = file.Machine.Rotor == "overhung"
	s.cfg.CounterClockwise = file.Machine.Rotation == "counter-clockwise"
	s.m.Speed = dsp.Speed{State: dsp.Steady, Mean: truth.RPM, Reference: dsp.ReferenceGood}
	direction := map[string]Direction{"vertical": Vertical, "horizontal": Horizontal, "axial": Axial}
	for _, p := range file.Point {
		s.cfg.Points = append(s.cfg.Points, Point{p.Name, p.Bearing == "non-drive-end", direction[p.Direction]})
		reading := dsp.PointReading{Name: p.Name, State: dsp.PointGood}
		sum := 0.0
		for n, v := range []vector{truth.Points[p.Name].Order1, truth.Points[p.Name].Order2, truth.Points[p.Name].Order3} {
			reading.Order[n] = dsp.Vector{RMS: v.RMS, Lag: v.Lag, RMSSD: 0.005, LagSD: 0.1}
			sum += v.RMS * v.RMS
		}
		reading.Overall = math.Sqrt(sum)
		reading.Share = sq(reading.Order[0].RMS / reading.Overall)
		s.m.Points = append(s.m.Points, reading)
	}
	return s
}

func read(t *testing.T, file string, parse func([]byte) error) {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(knownFolder, file))
	if err == nil {
		err = parse(b)
	}
	if err != nil {
		t.Fatalf("read %s: %v", file, err)
	}
}
