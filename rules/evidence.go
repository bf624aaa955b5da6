package rules

import (
	"math"
	"strconv"
)

// truth is the outcome of a test: no, open (near the border, or not
// measurable) or yes. The connectives are those of Kleene's strong three-valued
// logic, so that what is open stays open unless the rest decides.
type truth int8

const (
	no truth = iota - 1
	open
	yes
)

func all(list ...truth) truth {
	t := yes
	for _, v := range list {
		t = min(t, v)
	}
	return t
}

func either(list ...truth) truth {
	t := no
	for _, v := range list {
		t = max(t, v)
	}
	return t
}

func not(t truth) truth { return -t }

// confidence is the number of standard deviations that a measured value must
// stand clear of a border, beyond the guard.
const confidence = 2

// value is a measured quantity. ok is false when it could not be measured.
type value struct {
	x, sd float64
	ok    bool
}

// atLeast tells whether v is limit or more: near the limit, within the guard
// and the uncertainty, it is open.
func (v value) atLeast(limit, guard float64) truth {
	d := v.x - limit
	clear := guard + confidence*v.sd
	switch {
	case !v.ok || math.Abs(d) < clear:
		return open
	case d > 0:
		return yes
	}
	return no
}

// atMost tells whether v is limit or less, likewise.
func (v value) atMost(limit, guard float64) truth { return not(v.atLeast(limit, guard)) }

// value returns the angle as a measured quantity, in degrees.
func (a angle) value() value { return value{a.deg, a.sd, a.ok} }

// bound is an expected range; an infinite end is none.
type bound struct{ lo, hi float64 }

func from(lo float64) bound     { return bound{lo, math.Inf(1)} }
func upTo(hi float64) bound     { return bound{math.Inf(-1), hi} }
func span(lo, hi float64) bound { return bound{lo, hi} }

// String returns the range in words.
func (b bound) String() string {
	lo, hi := plain(b.lo), plain(b.hi)
	switch {
	case math.IsInf(b.lo, 0):
		return "at most " + hi
	case math.IsInf(b.hi, 0):
		return "at least " + lo
	}
	return lo + " to " + hi
}

func plain(x float64) string { return strconv.FormatFloat(x, 'g', 4, 64) }

// evidence states the test of v against a range; missing says why v was not
// measured, if so. purpose, which may be empty, says what the range is that of.
func evidence(test string, v value, unit string, b bound, purpose, missing string) Evidence {
	e := Evidence{Test: test, Unit: unit, Expected: b.String()}
	if purpose != "" {
		e.Expected += " " + purpose
	}
	if !v.ok {
		e.Missing = missing
		return e
	}
	e.Measured, e.SD = v.x, v.sd
	e.Margin = min(v.x-b.lo, b.hi-v.x)
	e.Holds = e.Margin >= 0
	return e
}
