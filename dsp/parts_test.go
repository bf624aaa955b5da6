package dsp

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// fitOnce fits turns of the given period over n rows of x as one part.
func fitOnce(x []float32, period float64, turns int) part {
	cfg := Config{RateHz: 1000, Channels: 1, Points: []Point{{VoltsPerG: 1}}}
	buf := newRows(1, len(x))
	buf.push(x)
	var got part
	f := newFitter(&cfg, buf, func(p *part) { got = *p })
	f.minRows = float64(turns) * period * 0.999
	for k := range turns {
		f.turn(turn{float64(k) * period, float64(k+1) * period})
	}
	return got
}

// TestFitBound: a part's fit of one sine in noise reaches the bound. The set-up
// is A 1, sigma 0.1, w = 2 pi 0.0371, phi 0.7; with the frequency known the exact
// information matrix over N = 1000 rows gives var A 2.0012e-5 and var phi
// 1.9989e-5, and 1500 trials of the three-parameter fit of IEEE 1057 gave
// standard deviations of 4.551e-3 and 4.511e-3 (both recomputed). Here 37 turns
// are 997.3 rows, and two more orders are fitted, which costs nothing.
func TestFitBound(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	const period, trials = 1 / 0.0371, 1500
	var a, p float64
	x := make([]float32, 1000)
	for range trials {
		for i := range x {
			x[i] = float32(math.Cos(2*math.Pi*0.0371*float64(i)+0.7) + 0.1*r.NormFloat64())
		}
		v := fitOnce(x, period, 37).vector[0][0]
		da, dp := cmplx.Abs(v)-1, cmplx.Phase(v)-0.7
		a += da * da
		p += dp * dp
	}
	scale := math.Sqrt(1000 / (37 * period))
	sda, sdp := math.Sqrt(a/trials), math.Sqrt(p/trials)
	// The scatter of a standard deviation over 1500 trials is 1.8 %.
	if wa, wp := math.Sqrt(2.0012e-5)*scale, math.Sqrt(1.9989e-5)*scale; math.Abs(sda/wa-1) > 0.06 || math.Abs(sdp/wp-1) > 0.06 {
		t.Errorf("sd of amplitude %.4g, phase %.4g, bound %.4g, %.4g", sda, sdp, wa, wp)
	}
}

// TestFitExact: without noise the fit is exact for any fraction of a row at the
// ends, any constant, and orders up to what the rate allows.
func TestFitExact(t *testing.T) {
	for _, period := range []float64{7.3, 9.01, 40.123, 333.3} {
		x := make([]float32, 1200)
		for i := range x {
			th := 2 * math.Pi * float64(i) / period
			x[i] = float32(0.9 + 0.5*math.Cos(th-1) + 0.3*math.Cos(2*th-2) + 0.2*math.Cos(3*th-3))
		}
		p := fitOnce(x, period, int(1190/period))
		if p.orders != 3 {
			continue
		}
		for n, want := range []complex128{cmplx.Rect(0.5, -1), cmplx.Rect(0.3, -2), cmplx.Rect(0.2, -3)} {
			if cmplx.Abs(p.vector[0][n]-want) > 1e-6 {
				t.Errorf("period %v, order %d: %v, want %v", period, n+1, p.vector[0][n], want)
			}
		}
		if math.Abs(p.level[0]-0.9) > 1e-6 {
			t.Errorf("period %v: constant %v, want 0.9", period, p.level[0])
		}
	}
}
