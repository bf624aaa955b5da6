package ads131m08

import (
	"math"
	"slices"
	"time"
)

// fit returns the clock that the times of edges show, of which some may be
// missing and some late. The last edge gets row 0.
func fit(times []time.Duration, nominal float64) sampleClock {
	last := times[len(times)-1]
	t := make([]float64, len(times))
	apart := make([]float64, len(times)-1)
	for i := range times {
		t[i] = float64(times[i] - last)
		if i > 0 {
			apart[i-1] = t[i] - t[i-1]
		}
	}
	slices.Sort(apart)
	period, at := comb(t, apart[len(apart)/2])
	k := sampleClock{nominal: nominal, period: period, time: at, n: 1}
	for range 3 {
		k.straighten(t)
	}
	k.row, k.time = 0, k.time+float64(last)
	return k
}

// comb returns the distance, near guess, and the place of the evenly spaced
// teeth that the times t meet best: where the sum of the unit vectors at the
// angles 2 pi t/period is longest. Times out of place add little to it, and no
// edge need be counted.
func comb(t []float64, guess float64) (period, at float64) {
	const width = 0.06
	step := 0.2 / float64(len(t)) // a fifth of a turn over all of t
	best := 0.0
	for r := -width; r <= width; r += step {
		p := guess * (1 + r)
		var re, im float64
		for _, v := range t {
			sin, cos := math.Sincos(2 * math.Pi * v / p)
			re, im = re+cos, im+sin
		}
		if length := math.Hypot(re, im); length > best {
			best, period, at = length, p, math.Atan2(im, re)*p/(2*math.Pi)
		}
	}
	return period, at
}

// straighten lays the least-squares line through the times that are in place,
// with row 0 the nearest to time 0.
func (k *sampleClock) straighten(t []float64) {
	var n, sr, st, srr, srt, sq float64
	for _, v := range t {
		row := math.Round((v - k.time) / k.period)
		d := v - k.time - row*k.period
		if math.Abs(d) > inPlace*k.period {
			continue
		}
		n++
		sr, st = sr+row, st+d
		srr, srt, sq = srr+row*row, srt+row*d, sq+d*d
	}
	det := n*srr - sr*sr
	if n < 3 || det == 0 {
		return
	}
	slope := (n*srt - sr*st) / det
	k.time += (st - slope*sr) / n
	k.period += slope
	k.n, k.spread = n, sq/n
	k.time += math.Round(-k.time/k.period) * k.period
}
