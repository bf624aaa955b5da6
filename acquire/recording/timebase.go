package recording

import (
	"fmt"
	"math"
)

const (
	// drift is how far the length of a step may wander, as a share of a step:
	// what two quartz clocks do against each other with the weather.
	drift = 1e-5
	// maxTime bounds t_s, seconds (31 years), so that no time and no row number
	// overflows.
	maxTime = 1e9
	// sure is the share of a step by which a hole's length may be off before
	// its number of rows is no longer called exact.
	sure = 0.25
	// narrow is the spread of a step, as a share of it, up to which a rate that
	// fits is no accident: a tenth of the tolerance of a rate.
	narrow = rateTolerance / 10
)

// timebase follows column t_s. It keeps the interval in which the true time of
// the last row must lie if steps are uniform and written times are cut or
// rounded to the column's resolution; an empty interval is a wrong time.
type timebase struct {
	res resolution
	// step is the time between rows, seconds; spread is how far it may be from
	// that by what the column shows, doubt by how the rate was chosen as well.
	step, spread, doubt float64
	lo, hi              float64
	last                float64
	started             bool
}

// resolution learns how finely a column of times is written: to a fixed number
// of decimals, or to a fixed number of significant digits.
type resolution struct{ decimals, digits int }

// at takes note of n and returns the distance of neighbouring times that can
// be written near it, seconds, the rounding of float64 included.
func (r *resolution) at(n number) float64 {
	significant := n.significant()
	decimals := max(-18, min(n.decimals, 22))
	r.decimals = max(r.decimals, decimals)
	r.digits = max(r.digits, significant)
	place := r.decimals
	if significant > 0 {
		place = min(place, r.digits-significant+decimals)
	}
	noise := 4 * (math.Nextafter(math.Abs(n.value), math.Inf(1)) - math.Abs(n.value))
	if place < 0 {
		return pow10[min(-place, 22)] + noise
	}
	return 1/pow10[min(place, 22)] + noise
}

// coarsest learns from run and returns the largest distance within it, seconds.
func (r *resolution) coarsest(run []number) float64 {
	for _, n := range run {
		r.at(n)
	}
	q := 0.0
	for _, n := range run {
		q = max(q, r.at(n))
	}
	return q
}

// follow takes the time of the next row and returns how many rows are missing
// ahead of it and whether that number is sure. A reason is a wrong time.
func (t *timebase) follow(n number) (lost int64, exact bool, reason string) {
	q := t.res.at(n)
	if !t.started {
		t.started, t.last = true, n.value
		t.lo, t.hi = n.value-q/2, n.value+q/2
		return 0, true, ""
	}
	steps := math.Round((n.value - (t.lo+t.hi)/2) / t.step)
	if n.value <= t.last || steps < 1 {
		return 0, false, t.wrong(n, q)
	}
	slack := t.step*drift + t.spread
	if steps > 1 {
		slack += steps * t.doubt
	}
	lo := max(t.lo+steps*t.step-slack, n.value-q/2)
	hi := min(t.hi+steps*t.step+slack, n.value+q/2)
	if lo > hi {
		return 0, false, t.wrong(n, q)
	}
	t.lo, t.hi, t.last = lo, hi, n.value
	return int64(steps) - 1, steps*t.doubt < sure*t.step, ""
}

// wrong words what is the matter with the time n.
func (t *timebase) wrong(n number, q float64) string {
	next := (t.lo+t.hi)/2 + t.step
	places := max(0, min(t.res.decimals, 9))
	s := fmt.Sprintf("expected %.*f s, found %.*f s", places, next, places, n.value)
	switch {
	case n.value == t.last:
		s += ": the time repeats"
	case n.value < t.last:
		s += ": the time goes back"
	default:
		s += fmt.Sprintf(": the steps are not uniform and no whole number of steps of %.6g s", t.step)
	}
	if q > t.step/2 {
		s += ", or t_s has too few decimals"
	}
	return s
}
