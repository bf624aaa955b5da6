package dsp_test

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/pelletier/go-toml/v2"

	"heavyspot/dsp"
)

// The computed recordings that settle the contract's words lie beside the
// repository; without them the test is skipped, unless told to fail.
const known = "../../shared/data/known"

func needKnown(t *testing.T) {
	t.Helper()
	if _, err := os.Stat(known); err == nil {
		return
	} else if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
		t.Fatal(err)
	}
	t.Skip("recordings with known truth are not beside the repository")
}

type knownConfig struct {
	Machine   struct{ Rated_rpm float64 }
	Source    struct{ Rate_hz float64 }
	Reference struct {
		Channel                   int
		Edge                      string
		Threshold_v, Hysteresis_v float64
	}
	Point []struct {
		Name         string
		Channel      int
		Volts_per_g  float64
		Inverted     bool
		Highpass_hz  float64
		Full_scale_v float64
	}
}

func (k *knownConfig) dsp(channels int) dsp.Config {
	c := dsp.Config{RateHz: k.Source.Rate_hz, Channels: channels, RatedRPM: k.Machine.Rated_rpm,
		Reference: &dsp.Reference{Channel: k.Reference.Channel, Falling: k.Reference.Edge == "falling",
			ThresholdV: k.Reference.Threshold_v, HysteresisV: k.Reference.Hysteresis_v}}
	for _, p := range k.Point {
		c.Points = append(c.Points, dsp.Point{Name: p.Name, Channel: p.Channel, VoltsPerG: p.Volts_per_g,
			Inverted: p.Inverted, HighpassHz: p.Highpass_hz})
	}
	return c
}

type truth struct {
	Mean_rpm float64
	Points   map[string]map[string]struct{ MM_s_rms, Lag_deg float64 }
	Kind     string
}

// readCSV reads the volts of a recording; tests of the reader are elsewhere.
func readCSV(t *testing.T, path string) (volts []float32, channels int) {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(strings.TrimSpace(string(data)), "\n")
	channels = strings.Count(lines[0], ",")
	for _, l := range lines[1:] {
		for _, cell := range strings.Split(strings.TrimSpace(l), ",")[1:] {
			v, err := strconv.ParseFloat(cell, 32)
			if err != nil {
				t.Fatal(err)
			}
			volts = append(volts, float32(v))
		}
	}
	return volts, channels
}

// angle returns a-b wrapped to -180 .. 180.
func angle(a, b float64) float64 { return math.Remainder(a-b, 360) }

// TestKnown holds the readings against the computed recordings: every 1x
// within 0.5 % or 0.01 mm/s and within 1 degree, the turn rate within 0.03 %.
func TestKnown(t *testing.T) {
	needKnown(t)
	files, _ := filepath.Glob(known + "/*.csv")
	if len(files) < 8 {
		t.Fatalf("only %d recordings in %s", len(files), known)
	}
	for _, f := range files {
		base := strings.TrimSuffix(f, ".csv")
		t.Run(filepath.Base(base), func(t *testing.T) {
			var kc knownConfig
			raw, err := os.ReadFile(base + ".toml")
			if err != nil {
				t.Fatal(err)
			}
			if err := toml.Unmarshal(raw, &kc); err != nil {
				t.Fatal(err)
			}
			var tr truth
			raw, _ = os.ReadFile(base + ".truth.json")
			if err := json.Unmarshal(raw, &tr); err != nil {
				t.Fatal(err)
			}
			volts, channels := readCSV(t, f)
			e, err := dsp.NewEngine(kc.dsp(channels))
			if err != nil {
				t.Fatal(err)
			}
			e.Push(0, volts)
			m := e.Close(int64(len(volts)/channels), time.Time{}, false)
			if d := m.Speed.Mean/tr.Mean_rpm - 1; math.Abs(d) > 3e-4 {
				t.Errorf("mean rpm %.3f, true %.3f", m.Speed.Mean, tr.Mean_rpm)
			}
			for _, p := range m.Points {
				for n, name := range []string{"order1", "order2", "order3"} {
					want, ok := tr.Points[p.Name][name]
					if !ok {
						continue
					}
					got := p.Order[n]
					da, dl := got.RMS-want.MM_s_rms, angle(got.Lag, want.Lag_deg)
					if n == 0 && (math.Abs(da) > max(0.005*want.MM_s_rms, 0.01) || math.Abs(dl) > 1) {
						t.Errorf("%s (%s) %s %.4f mm/s at %.2f deg, true %.4f at %.2f", p.Name, p.State, name, got.RMS, got.Lag, want.MM_s_rms, want.Lag_deg)
					}
				}
			}
		})
	}
}
