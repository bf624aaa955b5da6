package dsp_test

import (
	"fmt"
	"math"
	"os"
	"testing"
	"time"

	"heavyspot/dsp"
)

// Recordings of a real fan with known weights on its blades, no reference
// pulse, 50 samples a second (UCI Machine Learning Repository, "Accelerometer",
// CC BY 4.0; Scalabrini Sampaio et al., Sensors 2019, 19(19), 4342).
const realFan = "../../shared/data/fan-weights"

// readFan reads a recording; fullScale is the sensor's range in volts (here g),
// 0 to leave it unknown.
func readFan(t *testing.T, layout, percent int, fullScale float64) dsp.Minute {
	t.Helper()
	volts, channels := readCSV(t, fmt.Sprintf("%s/layout%d-%d.csv", realFan, layout, percent))
	cfg := dsp.Config{RateHz: 50, Channels: channels, RatedRPM: 1200}
	for i, name := range []string{"x", "y", "z"} {
		cfg.Points = append(cfg.Points, dsp.Point{Name: name, Channel: i, VoltsPerG: 1, FullScaleV: fullScale})
	}
	e, err := dsp.NewEngine(cfg)
	if err != nil {
		t.Fatal(err)
	}
	e.Push(0, volts)
	return e.Close(int64(len(volts)/channels), time.Time{}, false)
}

// TestRealFan: the turn rate within 3 % of what was found independently, the
// amplitudes in the order of the weights, clipped recordings named as such.
func TestRealFan(t *testing.T) {
	if _, err := os.Stat(realFan); err != nil {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatal(err)
		}
		t.Skip("recordings of a real fan are not beside the repository")
	}
	found := map[string]float64{ // Hz, mean of twelve 5 s stretches
		"1-60": 9.56, "1-80": 12.47, "1-90": 14.31, "1-100": 15.48,
		"2-60": 10.20, "2-80": 13.73, "2-90": 15.64, "2-100": 17.40,
		"3-80": 15.90, "3-90": 18.33, "3-100": 19.73,
	}
	clipped := map[string]bool{"1-80": true, "1-90": true, "1-100": true, "2-90": true, "2-100": true}
	for _, percent := range []int{60, 80, 90, 100} {
		for layout := 1; layout <= 3; layout++ {
			key := fmt.Sprintf("%d-%d", layout, percent)
			m := readFan(t, layout, percent, 7.99)
			named := false
			for _, p := range m.Points {
				named = named || p.State == dsp.PointClipped
				if p.State != dsp.PointGood && p.Order[0].RMS != 0 {
					t.Errorf("%s %s: %s but has a vector", key, p.Name, p.State)
				}
			}
			if named != clipped[key] {
				t.Errorf("%s: clipped %v, want %v", key, named, clipped[key])
			}
			if hz, known := found[key]; known && math.Abs(m.Speed.Mean/60/hz-1) > 0.03 {
				t.Errorf("%s: %.2f Hz, found independently %.2f", key, m.Speed.Mean/60, hz)
			}
		}
	}
	// With the range unknown the few clipped samples pass unnoticed and cost
	// little; the order of the amplitudes on the y axis remains. The table
	// gives zero-to-peak acceleration.
	table := map[string]float64{"1-90": 0.993, "2-90": 0.921, "3-90": 0.151, "1-100": 1.473, "2-100": 1.099, "3-100": 0.192}
	for _, percent := range []int{90, 100} {
		last := math.Inf(1)
		for layout := 1; layout <= 3; layout++ {
			key := fmt.Sprintf("%d-%d", layout, percent)
			m := readFan(t, layout, percent, 0)
			g := m.Points[1].Order[0].RMS * math.Sqrt2 * 2 * math.Pi * m.Speed.Mean / 60 / 9806.65
			t.Logf("%s: %.3f g zero to peak at %.2f Hz, found independently %.3f", key, g, m.Speed.Mean/60, table[key])
			if g >= last || math.Abs(g/table[key]-1) > 0.2 {
				t.Errorf("%s: %.3f g, found independently %.3f (scatter up to 17 %%), the heavier layout %.3f", key, g, table[key], last)
			}
			last = g
		}
	}
}
