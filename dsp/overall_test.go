package dsp

import (
	"math"
	"testing"
)

// TestBandResponse: the analysis of the filter agrees with its running, and
// both with an ideal integrator inside the band.
func TestBandResponse(t *testing.T) {
	for _, c := range []struct{ rate, rpm, hz, low, high float64 }{
		// Ends of the band and outside (tolerances of ISO 2954, from memory).
		{1000, 1500, 2.5, 0.01, 0.027}, {1000, 1500, 5, 0.15, 0.25}, {1000, 1500, 10, 0.8, 1.1}, {1000, 1500, 20, 0.97, 1.01},
		{1000, 1500, 100, 0.99, 1.01}, {1000, 1500, 200, 0.99, 1.01}, {1000, 1500, 400, 0.9, 1.13},
		{4000, 1500, 1000, 0.97, 1.03}, {32000, 1500, 1000, 0.99, 1.01}, {32000, 1500, 10, 0.8, 1.1},
		{1000, 400, 2, 0.8, 1.1}, {1000, 400, 0.5, 0.005, 0.03}, {1000, 400, 6.7, 0.99, 1.01},
	} {
		cfg := Config{RateHz: c.rate, Channels: 1, RatedRPM: c.rpm, Points: []Point{{VoltsPerG: 1}}}
		b := newBand(&cfg)
		r := b.response(c.hz)
		if r < c.low || r > c.high {
			t.Errorf("%v Hz at %v/s: response %.4f, want %v to %v", c.hz, c.rate, r, c.low, c.high)
		}
		n := int(60 * c.rate)
		x := make([]float32, n)
		for i := range x {
			x[i] = float32(1 + math.Sin(2*math.Pi*c.hz*float64(i)/c.rate))
		}
		b.push(x)
		want := r / (2 * math.Pi * c.hz) / math.Sqrt2
		if got := math.Sqrt(b.meanSquare(0)); math.Abs(got/want-1) > 0.02 {
			t.Errorf("%v Hz at %v/s: rms %.6g, by the response %.6g", c.hz, c.rate, got, want)
		}
	}
}
