package recording

import (
	"fmt"
	"math"
	"slices"
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
)

// timebase follows column t_s. It keeps the interval in which the true time of
// the last row must lie if steps are uniform and written times are cut or
// rounded to the column's resolution; an empty interval is a wrong time.
type timebase struct {
	res resolution
	// step is the time between rows and spread what is not known of it, s.
	step, spread float64
	lo, hi       float64
	last         float64
	started      bool
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

// follow takes the time of the next row and returns how many rows are missing
// ahead of it and whether that number is sure. A reason is a wrong time.
func (t *timebase) follow(n number) (lost int64, exact bool, reason string) {
	q := t.res.at(n)
	if !(math.Abs(n.value) <= maxTime) {
		return 0, false, fmt.Sprintf("the time %g s is out of range, allowed is up to %g s", n.value, maxTime)
	}
	if !t.started {
		t.started, t.last = true, n.value
		t.lo, t.hi = n.value-q/2, n.value+q/2
		return 0, true, ""
	}
	steps := math.Round((n.value - (t.lo+t.hi)/2) / t.step)
	if n.value <= t.last || steps < 1 {
		return 0, false, t.wrong(n, q)
	}
	slack := t.step * drift
	if steps > 1 {
		slack += steps * t.spread
	}
	lo := max(t.lo+steps*t.step-slack, n.value-q/2)
	hi := min(t.hi+steps*t.step+slack, n.value+q/2)
	if lo > hi {
		return 0, false, t.wrong(n, q)
	}
	t.lo, t.hi, t.last = lo, hi, n.value
	return int64(steps) - 1, steps*t.spread < sure*t.step, ""
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

// findStep sets the step from the times of the first rows, which must be two
// or more. expectHz is preferred where the column cannot tell it from what it
// shows; 0 means none. A reason means that the times do not increase.
func (t *timebase) findStep(times []number, expectHz float64) (rateHz float64, reason string) {
	about := medianStep(times)
	if !(about > 0) {
		return 0, fmt.Sprintf("the time does not increase: %g s follows %g s", times[1].value, times[0].value)
	}
	run := longestRun(times, about)
	var res resolution
	q := 0.0
	for _, n := range run {
		q = max(q, res.at(n))
	}
	n := float64(len(run) - 1)
	mean := (run[len(run)-1].value - run[0].value) / n
	rateHz = chooseRate(run, mean, q/n, expectHz)
	t.step, t.spread = 1/rateHz, q/n
	return rateHz, ""
}

// medianStep returns a step that holes and rounding have little influence on:
// the median over many rows at once.
func medianStep(times []number) float64 {
	lag := max(1, min(16, (len(times)-1)/4))
	steps := make([]float64, 0, len(times))
	for i := lag; i < len(times); i++ {
		steps = append(steps, (times[i].value-times[i-lag].value)/float64(lag))
	}
	slices.Sort(steps)
	return steps[len(steps)/2]
}

// longestRun returns the longest part of times without holes; step is about
// the step.
func longestRun(times []number, step float64) []number {
	var best []number
	start := 0
	for i := 1; i <= len(times); i++ {
		if i < len(times) {
			d := times[i].value - times[i-1].value
			if d > 0 && d < 1.5*step {
				continue
			}
		}
		if i-start > len(best) {
			best = times[start:i]
		}
		start = i
	}
	if len(best) < 2 {
		return times[:2]
	}
	return best
}

// chooseRate returns the most likely rate, Hz, among those that a mean step of
// mean seconds, known to within spread, allows: the one expected, a whole
// number, the inverse of a step that never varies, the roundest decimal.
func chooseRate(run []number, mean, spread, expectHz float64) float64 {
	rate := 1 / mean
	low, high := 1/(mean+spread), math.Inf(1)
	if spread < mean {
		high = 1 / (mean - spread)
	}
	inside := func(hz float64) bool { return hz > 0 && hz >= low && hz <= high }
	if inside(expectHz) {
		return expectHz
	}
	whole := math.Round(rate)
	// A wide interval holds whole numbers by chance.
	if inside(whole) && spread < 1e-4*mean {
		return whole
	}
	if hz, ok := steadyRate(run); ok {
		return hz
	}
	for scale := 1.0; scale <= 1e9; scale *= 10 {
		if hz := math.Round(rate*scale) / scale; inside(hz) {
			return hz
		}
	}
	return rate
}

// steadyRate returns the rate of times which all are a whole number of last
// places apart, always the same.
func steadyRate(run []number) (hz float64, ok bool) {
	var res resolution
	for _, n := range run {
		res.at(n)
	}
	if res.decimals < 0 || res.decimals > 15 {
		return 0, false
	}
	scale := pow10[res.decimals]
	step := math.Round((run[1].value - run[0].value) * scale)
	for i := 1; i < len(run); i++ {
		if math.Round((run[i].value-run[i-1].value)*scale) != step {
			return 0, false
		}
	}
	return scale / step, step > 0
}
