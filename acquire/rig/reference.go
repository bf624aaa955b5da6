package rig

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// Reference is the phase reference: a pulse of WidthDeg once a turn, whose
// leading edge stands at shaft angle zero, the moment the mark passes the pick-up.
type Reference struct {
	// Channel is the converter's input, from 0.
	Channel int
	// PickupDeg is the pick-up's place, from vertical, clockwise seen from the
	// drive end.
	PickupDeg float64
	// WidthDeg is the pulse's width; zero means 10.
	WidthDeg float64
	// Falling is true when the leading edge falls: the pulse is then LowV in HighV.
	Falling bool
	// LowV and HighV are the levels, V.
	LowV, HighV float64
	// JitterDeg is the standard deviation of each edge's place, degrees.
	JitterDeg float64
	// Missing and Extra are the probabilities of a turn without its pulse
	// and of a further, narrow pulse at a random place.
	Missing, Extra float64
	// NoiseV is the density of its analogue noise, V per root hertz.
	NoiseV float64
}

// check says what is wrong with a reference.
func (r *Reference) check() error {
	if r.WidthDeg < 0 || r.WidthDeg >= 300 {
		return fmt.Errorf("rig: phase reference: width is %g degrees, allowed are 0 to below 300", r.WidthDeg)
	}
	if !(r.HighV > r.LowV) {
		return fmt.Errorf("rig: phase reference: high level %g V is not above low level %g V", r.HighV, r.LowV)
	}
	if r.JitterDeg < 0 || r.JitterDeg > 20 || r.NoiseV < 0 {
		return fmt.Errorf("rig: phase reference: jitter is %g degrees, allowed are 0 to 20, and noise %g V, not negative", r.JitterDeg, r.NoiseV)
	}
	return nil
}

// interval is where a pulse is active, rad of shaft angle.
type interval struct{ from, to float64 }

// pulses is the state of a phase reference: the pulses of the turns before, at
// and after the present angle.
type pulses struct {
	Reference
	sigma float64
	width float64
	// near holds for each of three turns the pulse and the extra one; top is
	// the start of the turn after the last drawn.
	near [3][2]interval
	top  float64
}

// newPulses prepares a reference for steps of 1/stepHz, starting at theta.
func newPulses(r Reference, stepHz, theta float64, rnd *rand.Rand) *pulses {
	p := &pulses{Reference: r, sigma: r.NoiseV * math.Sqrt(stepHz/2), width: radians(r.WidthDeg)}
	if p.width == 0 {
		p.width = radians(10)
	}
	p.top = 2 * math.Pi * (math.Floor(theta/(2*math.Pi)) - 1)
	for range p.near {
		p.draw(rnd)
	}
	return p
}

// draw adds the pulses of the next turn and drops the oldest.
func (p *pulses) draw(r *rand.Rand) {
	var turn [2]interval
	if p.Missing == 0 || r.Float64() >= p.Missing {
		turn[0] = interval{p.top + p.jitter(r), p.top + p.width + p.jitter(r)}
	}
	if p.Extra > 0 && r.Float64() < p.Extra {
		at := p.top + p.width*1.5 + r.Float64()*(2*math.Pi-3*p.width)
		turn[1] = interval{at, at + p.width/2}
	}
	p.near[0], p.near[1], p.near[2] = p.near[1], p.near[2], turn
	p.top += 2 * math.Pi
}

// jitter returns an edge's displacement, rad.
func (p *pulses) jitter(r *rand.Rand) float64 {
	if p.JitterDeg == 0 {
		return 0
	}
	return radians(p.JitterDeg) * r.NormFloat64()
}

// rebase shifts the origin of the shaft angle by -turn rad.
func (p *pulses) rebase(turn float64) {
	p.top -= turn
	for i := range p.near {
		for j := range p.near[i] {
			p.near[i][j].from -= turn
			p.near[i][j].to -= turn
		}
	}
}

// mean returns the mean volts of a step in which the shaft turns from a to b.
// The speed hardly changes within a step, so shares of angle are shares of time.
func (p *pulses) mean(a, b float64, r *rand.Rand) float64 {
	// Keep a whole turn drawn ahead, since jitter may put an edge early.
	for b > p.top-2*math.Pi {
		p.draw(r)
	}
	share := 0.0
	for i := range p.near {
		share += p.near[i][0].share(a, b) + p.near[i][1].share(a, b)
	}
	share = min(share, 1)
	if p.Falling {
		share = 1 - share
	}
	v := p.LowV + share*(p.HighV-p.LowV)
	if p.sigma > 0 {
		v += p.sigma * r.NormFloat64()
	}
	return v
}

// share returns the part of a to b in which the pulse is active.
func (iv interval) share(a, b float64) float64 {
	if iv.to <= a || iv.from >= b && iv.from > a {
		return 0
	}
	if b <= a {
		return 1
	}
	return (min(b, iv.to) - max(a, iv.from)) / (b - a)
}
