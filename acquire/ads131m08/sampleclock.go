package ads131m08

import (
	"math"
	"time"
)

const (
	memory    = 4096 // edges over which the clock is averaged
	inPlace   = 0.2  // largest distance of an edge from its place, periods
	wander    = 2e-6 // change of the two clocks' ratio to reckon with
	exactness = 0.25 // largest uncertainty of an exact gap, periods
)

// sampleClock says when each row is complete, from the times of the edges. It
// fits a straight line through all edges at first and forgets slowly later: a
// growing-memory g-h filter, whose gains are those of the least-squares line.
type sampleClock struct {
	nominal float64 // ns
	period  float64 // ns
	row     int64   // a row and the time of its completion
	time    float64 // ns
	n       float64 // edges averaged
	spread  float64 // mean square distance of edges from their place, ns^2
}

// newClock starts from n edges with a mean distance of period (ns), of which
// the last, at mono, belongs to row.
func newClock(nominal, period float64, n int, row int64, mono time.Duration) sampleClock {
	return sampleClock{nominal: nominal, period: period, row: row, time: float64(mono), n: float64(n)}
}

// at returns the time at which a row is complete, ns.
func (k *sampleClock) at(row int64) float64 {
	return k.time + float64(row-k.row)*k.period
}

// rows returns the index of the row complete at t, with a fraction.
func (k *sampleClock) rows(t time.Duration) float64 {
	return float64(k.row) + (float64(t)-k.time)/k.period
}

// nearest returns the row whose completion is nearest to t.
func (k *sampleClock) nearest(t time.Duration) int64 {
	return int64(math.Round(k.rows(t)))
}

// update learns from the edge of a row and says whether it was in its place.
// One which is not is left out: the host was late to see it.
func (k *sampleClock) update(row int64, t time.Duration) bool {
	place := k.at(row)
	d := float64(t) - place
	if math.Abs(d) > inPlace*k.period {
		return false
	}
	k.n = math.Min(k.n+1, memory)
	n := k.n
	k.spread += (d*d - k.spread) / n
	k.time = place + d*2*(2*n-1)/(n*(n+1))
	k.period += d * 6 / (n * (n + 1)) / math.Max(1, float64(row-k.row))
	k.row = row
	return true
}

// exact says whether rows can be counted over a gap of lost rows without
// being off by one.
func (k *sampleClock) exact(lost int64) bool {
	sd := math.Sqrt(k.spread)
	perRow := sd*math.Sqrt(12/(k.n*k.n*k.n)) + wander*k.period
	return 3*sd+2*perRow*float64(lost) < exactness*k.period
}

// place puts row at time t after a gap, and learns faster for a while, for
// the clock may have drifted in the gap.
func (k *sampleClock) place(row int64, t time.Duration) {
	k.row, k.time = row, float64(t)
	k.n = math.Min(k.n, 64)
}
