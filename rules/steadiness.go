package rules

import (
	"math"
	"math/cmplx"
	"slices"
	"time"

	"heavyspot/dsp"
)

const (
	// remembered is the number of steady minutes kept.
	remembered = 10
	// sameSpeed is how far two minutes' speeds may differ, as a share, for
	// their phases to be compared: near a resonance the phase follows the speed.
	sameSpeed = 0.003
	// fewestSteps is the number of steps from minute to minute from which they
	// tell anything.
	fewestSteps = 3
	// apart is how far apart two minutes may be for their phases to be compared:
	// over a longer hole a difference is no creep.
	apart = 2 * time.Minute
)

// memory holds the pictures of the latest steady minutes with a phase
// reference, oldest first.
type memory struct {
	pictures []picture
	rpm      []float64
	start    []time.Time
}

// add keeps a minute and drops the oldest beyond those remembered. Without a
// reference the phase of the whole is unknown, and nothing is kept.
func (h *memory) add(m *dsp.Minute, p *picture) {
	if m.LagFrom != "" {
		return
	}
	if len(h.rpm) == remembered {
		h.pictures = append(h.pictures[:0], h.pictures[1:]...)
		h.rpm = append(h.rpm[:0], h.rpm[1:]...)
		h.start = append(h.start[:0], h.start[1:]...)
	}
	h.pictures = append(h.pictures, *p)
	h.rpm = append(h.rpm, m.Speed.Mean)
	h.start = append(h.start, m.Start)
}

// creep returns the size of the phase's steps from minute to minute, degrees:
// the largest but for a quarter of them, at least one. A lump that lets go
// makes one large step and leaves the phase as steady as before, while a rotor
// that moves on its shaft or a rub makes many.
func (h *memory) creep() value {
	var steps []value
	for i := 1; i < len(h.rpm); i++ {
		if math.Abs(h.rpm[i]-h.rpm[i-1]) > sameSpeed*h.rpm[i] || h.start[i].Sub(h.start[i-1]).Abs() > apart {
			continue
		}
		if s := step(&h.pictures[i-1], &h.pictures[i]); s.ok {
			steps = append(steps, s.value())
		}
	}
	if len(steps) < fewestSteps {
		return value{}
	}
	slices.SortFunc(steps, func(a, b value) int {
		switch {
		case a.x < b.x:
			return -1
		case a.x > b.x:
			return 1
		}
		return 0
	})
	return steps[len(steps)-1-max(1, len(steps)/4)]
}

// step returns the size of the turn of all radial vectors together from one
// picture to the next, each weighed with its amplitudes.
func step(a, b *picture) angle {
	var sum complex128
	var weight, variance float64
	for e := range a.at {
		for d := Vertical; d <= Horizontal; d++ {
			p, q := &a.at[e][d], &b.at[e][d]
			product := q.z[0] * cmplx.Conj(p.z[0])
			w := cmplx.Abs(product)
			sum += product
			weight += w
			variance += w * w * (sq(p.lagSD) + sq(q.lagSD))
		}
	}
	if weight == 0 {
		return angle{}
	}
	return angle{math.Abs(degrees(cmplx.Phase(sum))), math.Sqrt(variance) / weight, true}
}
