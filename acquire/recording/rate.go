package recording

import (
	"fmt"
	"math"
	"slices"
	"sort"
)

// The rates a recording may have, Hz; beyond them t_s is no time in seconds.
const (
	minRateHz = 1e-6
	maxRateHz = 1e9
)

// findStep sets the step from the times of the first rows, which must be two
// or more, and returns the rate, Hz. expectHz is preferred where the column
// cannot tell it from what it shows; 0 means none. A reason means that the
// times do not increase, or by steps that no converter makes; row is then the
// one to blame, counted from 0.
func (t *timebase) findStep(times []number, expectHz float64) (rateHz float64, row int, reason string) {
	about := medianStep(times)
	if !(about > 0) {
		row = 1
		for row < len(times)-1 && times[row].value > times[row-1].value {
			row++
		}
		return 0, row, fmt.Sprintf("the time does not increase: %g s follows %g s", times[row].value, times[row-1].value)
	}
	run := longestRun(times, about)
	// Ties rounded up and down would leave a single step, lost to the rounding
	// of float64, without a little more room.
	q := 1.01 * t.res.coarsest(run)
	mean := meanStep(run)
	if width(run, mean) > q {
		run, mean = fittingRows(run, q)
	}
	low, high := stepRange(run, mean, q)
	var sure bool
	rateHz, sure = chooseRate(run, low, high, expectHz)
	if !(rateHz >= minRateHz && rateHz <= maxRateHz) {
		return 0, 1, fmt.Sprintf("steps of %g s make %g Hz, allowed are %g to %g Hz", (low+high)/2, rateHz, minRateHz, maxRateHz)
	}
	t.step, t.spread = 1/rateHz, (high-low)/2
	if !sure {
		t.doubt = t.spread
	}
	return rateHz, 0, ""
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
	best := times[:2]
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
	return best
}

// width returns how far times lie apart from a line of the given step: what
// the resolution of the column must be for that step to be true.
func width(run []number, step float64) float64 {
	low, high := math.Inf(1), math.Inf(-1)
	for i, n := range run {
		off := n.value - run[0].value - float64(i)*step
		low, high = min(low, off), max(high, off)
	}
	return high - low
}

// meanStep returns the step from the first to the last row.
func meanStep(run []number) float64 {
	return (run[len(run)-1].value - run[0].value) / float64(len(run)-1)
}

// iterations are enough to find a step to a billionth of its uncertainty.
const iterations = 30

// bestStep returns the step of least width, by ternary search, as width is
// convex in the step.
func bestStep(run []number) float64 {
	mean := meanStep(run)
	reach := 2 * width(run, mean) / float64(len(run)-1)
	low, high := mean-reach, mean+reach
	for range 2 * iterations {
		a, b := low+(high-low)/3, high-(high-low)/3
		if width(run, a) <= width(run, b) {
			high = b
		} else {
			low = a
		}
	}
	return (low + high) / 2
}

// fittingRows returns the first rows of run that lie on one line within q, and
// its step. A time that does not fit thus cannot bend the rate.
func fittingRows(run []number, q float64) ([]number, float64) {
	n := 2 + sort.Search(len(run)-2, func(i int) bool {
		part := run[:3+i]
		return width(part, bestStep(part)) > q
	})
	run = run[:n]
	if n == 2 {
		return run, meanStep(run)
	}
	return run, bestStep(run)
}

// stepRange returns the steps, seconds, that are possible when times are cut
// or rounded to q: those whose width is at most q. inside is one of them.
func stepRange(run []number, inside, q float64) (low, high float64) {
	edge := func(outside float64) float64 {
		in := inside
		for range iterations {
			if middle := (in + outside) / 2; width(run, middle) <= q {
				in = middle
			} else {
				outside = middle
			}
		}
		return in
	}
	reach := 2 * q / float64(len(run)-1)
	return edge(inside - reach), edge(inside + reach)
}

// chooseRate returns the most likely rate, Hz, for a step between low and high
// seconds: the one expected, a whole number, the inverse of a step that never
// varies, the roundest decimal. sure says that it is no accident.
func chooseRate(run []number, low, high, expectHz float64) (hz float64, sure bool) {
	rate := 2 / (low + high)
	inside := func(hz float64) bool { return hz > 0 && 1 >= low*hz && 1 <= high*hz }
	// A wide range holds whole numbers, and what is expected, by chance.
	if high-low < 2*narrow*low {
		if inside(expectHz) {
			return expectHz, true
		}
		if whole := math.Round(rate); inside(whole) {
			return whole, true
		}
	}
	if hz, ok := steadyRate(run); ok {
		return hz, true
	}
	if inside(expectHz) {
		return expectHz, false
	}
	for place := 3; place >= 1; place-- {
		if hz := math.Round(rate/pow10[place]) * pow10[place]; inside(hz) {
			return hz, false
		}
	}
	for decimals := range 10 {
		if hz := math.Round(rate*pow10[decimals]) / pow10[decimals]; inside(hz) {
			return hz, false
		}
	}
	return rate, false
}

// steadyRate returns the rate of times which all are a whole number of last
// places apart, always the same.
func steadyRate(run []number) (hz float64, ok bool) {
	decimals := 0
	for _, n := range run {
		decimals = max(decimals, n.decimals)
	}
	if decimals > 15 {
		return 0, false
	}
	scale := pow10[decimals]
	step := math.Round((run[1].value - run[0].value) * scale)
	for i := 1; i < len(run); i++ {
		if math.Round((run[i].value-run[i-1].value)*scale) != step {
			return 0, false
		}
	}
	return scale / step, step > 0
}
