package rig

import (
	"encoding/csv"
	"encoding/json"
	"errors"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"github.com/pelletier/go-toml/v2"
)

// known is the folder of recordings with known truth, outside the repository.
const known = "../../../shared/data/known"

// open reads a file of the known recordings or skips the test.
func open(t *testing.T, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(known, name))
	if errors.Is(err, fs.ErrNotExist) && os.Getenv("HEAVYSPOT_REQUIRE") != "1" {
		t.Skipf("the recording %s is not beside the repository", name)
	}
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// recording is a known recording with its configuration and truth.
type recording struct {
	Point []struct {
		Name      string
		Channel   int
		VoltsPerG float64 `toml:"volts_per_g"`
		Inverted  bool
	}
	Reference struct{ Threshold float64 }
	truth     struct {
		MeanRPM float64 `json:"mean_rpm"`
		Points  map[string]struct {
			Order1, Order2, Order3 struct {
				RMS float64 `json:"mm_s_rms"`
				Lag float64 `json:"lag_deg"`
			}
		}
	}
	channels [][]float64
}

// load reads a recording.
func load(t *testing.T, name string) recording {
	t.Helper()
	var r recording
	if err := toml.Unmarshal(open(t, name+".toml"), &r); err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(open(t, name+".truth.json"), &r.truth); err != nil {
		t.Fatal(err)
	}
	open(t, name+".csv")
	f, err := os.Open(filepath.Join(known, name+".csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	r.channels = make([][]float64, len(rows[0])-1)
	for _, row := range rows[1:] {
		for c := range r.channels {
			v, err := strconv.ParseFloat(row[c+1], 64)
			if err != nil {
				t.Fatal(err)
			}
			r.channels[c] = append(r.channels[c], v)
		}
	}
	return r
}

// turnsOf returns the shaft angle (rad) of each sample by linear interpolation
// between the rising edges of a pulse, and the range of samples it covers.
func turnsOf(x []float64, threshold float64) (angle []float64, from, to int) {
	var at []float64
	for i := 1; i < len(x); i++ {
		if x[i-1] < threshold && x[i] >= threshold {
			at = append(at, float64(i-1)+(threshold-x[i-1])/(x[i]-x[i-1]))
		}
	}
	angle = make([]float64, len(x))
	for k := 1; k < len(at); k++ {
		for i := int(math.Ceil(at[k-1])); float64(i) < at[k]; i++ {
			angle[i] = 2 * math.Pi * (float64(k) + (float64(i)-at[k-1])/(at[k]-at[k-1]))
		}
	}
	return angle, int(math.Ceil(at[0])), int(at[len(at)-1])
}

// TestSameMeaningAsTheKnownRecordings reads recordings made by others with the helper
// that measures our own signals. It ties our lags, polarity and pulse to theirs.
func TestSameMeaningAsTheKnownRecordings(t *testing.T) {
	for _, name := range []string{"clean", "overhung", "bent"} {
		r := load(t, name)
		angle, from, to := turnsOf(r.channels[6], 0.5)
		for _, p := range r.Point {
			x := r.channels[p.Channel][from:to]
			w := r.truth.MeanRPM * rpm
			got := fitOrders(t, x, w, func(i int) float64 { return angle[from+i] }, func(float64) float64 { return p.VoltsPerG / 0.1 })
			want := r.truth.Points[p.Name].Order1
			lag := got[0].Lag
			if p.Inverted {
				lag += 180
			}
			same(t, name+" "+p.Name, Vector{got[0].RMS, lag}, Vector{want.RMS, want.Lag}, 0.01, 1)
		}
	}
}
