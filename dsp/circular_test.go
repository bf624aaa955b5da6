package dsp_test

import (
	"math"
	"testing"

	"heavyspot/dsp"
)

// TestDirections checks the circular statistics against printed examples, as
// reproduced by the public packages circstat and astropy, with further digits
// recomputed from the printed data: Z1 is Zar, Biostatistical Analysis (2010),
// examples 26.4 and 27.1; Z2 example 26.5 (grouped); Z3 example 27.2; F10 to F30
// are Fisher (1993), table 4.1 (B6, set 2); J is Jammalamadaka and SenGupta.
func TestDirections(t *testing.T) {
	f30 := []float64{294, 301, 329, 315, 277, 281, 254, 245, 272, 242,
		177, 257, 177, 229, 250, 166, 232, 245, 224, 186,
		257, 267, 241, 239, 287, 229, 290, 214, 215, 224}
	for _, c := range []struct {
		name           string
		deg, count     []float64
		mean, r, s, s0 float64
	}{
		{"Z1", []float64{45, 55, 81, 96, 110, 117, 132, 154}, nil, 98.9878, 0.825218, 33.876, 35.515},
		{"Z2", []float64{45, 75, 105, 135, 165, 195, 225, 255, 285}, []float64{6, 9, 13, 15, 22, 17, 12, 8, 3}, 161.5651, 0.550635, 54.317, 62.591},
		{"Z3", []float64{66, 75, 86, 88, 88, 93, 97, 101, 118, 130}, nil, 94.0482, 0.952137, 17.727, 17.945},
		{"F10", f30[:10], nil, 280.8194, 0.887470, 27.181, 27.997},
		{"F20", f30[:20], nil, 248.6975, 0.726252, 42.395, 45.826},
		{"F30", f30, nil, 247.6166, 0.782833, 37.760, 40.094},
		{"J", []float64{51, 67, 40, 109, 31, 358}, nil, 48.6272, 0.836436, 32.770, 34.244},
	} {
		var d dsp.Directions
		for i, a := range c.deg {
			w := 1.0
			if c.count != nil {
				w = c.count[i]
			}
			d.Add(a, w)
		}
		if math.Abs(d.Mean()-c.mean) > 6e-5 || math.Abs(d.Length()-c.r) > 6e-7 ||
			math.Abs(d.Deviation()-c.s) > 6e-4 || math.Abs(d.SD()-c.s0) > 6e-4 {
			t.Errorf("%s: mean %.5f r %.7f s %.4f s0 %.4f, want %v %v %v %v", c.name, d.Mean(), d.Length(), d.Deviation(), d.SD(), c.mean, c.r, c.s, c.s0)
		}
	}
	var none dsp.Directions
	if none.Length() != 0 || none.Mean() != 0 {
		t.Errorf("empty: length %v, mean %v", none.Length(), none.Mean())
	}
}
