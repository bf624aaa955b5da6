package ads131m08

import (
	"math"
	"time"
)

const (
	memory    = 4096 // edges over which the clock is averaged
	inPlace   = 0.2  // largest distance of an edge from its place, periods
	wander    = 4e-6 // change of the two clocks' ratio to reckon with
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

// at returns the time at which a row is complete, ns.
func (k *sampleClock) at(row int64) float64 {
	return k.time + float64(row-k.row)*k.period
}

// rows returns the index of the row complete at t, with a fraction.
func (k *sampleClock) rows(t time.Duration) float64 {
	return float64(k.row) + (float64(t)-k.time)/k.period
}

// nearest returns the row whose completion is nearest to t.
func (k *sampleClock) nearest(t time.Duration) int64 { return k.nearestTo(float64(t)) }

// nearestTo is nearest for a time in ns.
func (k *sampleClock) nearestTo(ns float64) int64 {
	return k.row + int64(math.Round((ns-k.time)/k.period))
}

// fits says whether an edge at t is in its place.
func (k *sampleClock) fits(t time.Duration) bool {
	return math.Abs(float64(t)-k.at(k.nearest(t))) <= inPlace*k.period
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
// being off by one: whether the errors of place and period, three standard
// deviations of each, and the wander of the clocks stay well within a row.
func (k *sampleClock) exact(lost int64) bool {
	sd := math.Sqrt(k.spread)
	place := 3 * sd * 2 / math.Sqrt(k.n)
	perRow := 3*sd*math.Sqrt(12/(k.n*k.n*k.n)) + wander*k.period
	return place+perRow*float64(lost) < exactness*k.period
}

// loosen makes the clock learn faster for a while, as it should after a gap.
func (k *sampleClock) loosen() { k.n = math.Min(k.n, 256) }
