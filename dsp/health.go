package dsp

import "math"

// health gathers what tells whether a point's signal can be believed.
type health struct {
	flat []flatTops
	// counter picks the parts that are looked at closely: each eighth.
	counter int
}

// flatTops counts, for one point, the turns looked at and those with a top or
// bottom too flat for any vibration.
type flatTops struct{ turns, flat int }

const (
	// flatBand is the share of the peak-to-peak value within which a top
	// counts as flat.
	flatBand = 0.0005
	// flatAngle is the shaft angle, degrees, over which a top of 1x cannot stay
	// within flatBand: a pure sine does so over 5, and one flattened as far as
	// its own 3x can over 26.
	flatAngle = 30.0
	// flatShare is the share of turns with flat tops from which a point is
	// clipped.
	flatShare = 0.05
	// clippedShare is the share of samples at the known limit of the chain from
	// which a point is clipped; single knocks do no harm.
	clippedShare = 1e-4
	// deadVolts and deadG: a signal under both has no sensor behind it. Input
	// noise of a converter is some 3.4 uV (data sheet), sensor noise over a few
	// hundred hertz at least 0.3 mg.
	deadVolts = 5e-6
	deadG     = 1e-4
	// noisyShare and noisyFloor: a point is noisy when one standard deviation
	// of its minute is over this share of its 1x and over this many mm/s.
	noisyShare = 0.3
	noisyFloor = 0.5
	// restless and restlessShare: a sensor's connection must be doubted when its
	// constant scatters from part to part by more than the first, g, and by more
	// than this share of the whole swing of the signal.
	restless      = 0.1
	restlessShare = 0.1
)

// look examines the rows of a part for flat tops.
func (h *health) look(f *fitter, p *part) {
	h.counter++
	if h.counter%8 != 0 {
		return
	}
	start := int64(math.Ceil(p.centre - p.length/2))
	n := int(p.length)
	if start < f.buf.base || start+int64(n) > f.buf.end() {
		return
	}
	x := f.buf.from(start)
	perTurn := p.length / float64(p.turns)
	run := max(3, 1+int(math.Ceil(flatAngle/360*perTurn)))
	for i, ch := range f.channels {
		h.flat[i].turns += p.turns
		if hasFlat(x[ch:], f.buf.stride, n, run) {
			h.flat[i].flat += p.turns
		}
	}
}

// hasFlat reports whether n samples have a flat top or bottom: a run of them
// within flatBand of the extreme, or, in noise that breaks up the runs, far more
// samples there than in the next band of the same width.
func hasFlat(x []float32, stride, n, run int) bool {
	low, high := x[0], x[0]
	for i := range n {
		v := x[i*stride]
		if v < low {
			low = v
		}
		if v > high {
			high = v
		}
	}
	band := (high - low) * flatBand
	if band == 0 {
		return false // flat altogether is another fault
	}
	var top, bottom tally
	for i := range n {
		v := x[i*stride]
		top.add(high-v, band)
		bottom.add(v-low, band)
	}
	return top.flat(run) || bottom.flat(run)
}

// tally counts the samples near one extreme.
type tally struct {
	run, longest int // in a row within a band of the extreme
	in, beside   int // within it, and within as much again
}

func (t *tally) add(distance, band float32) {
	if distance > band {
		t.run = 0
		if distance <= 2*band {
			t.beside++
		}
		return
	}
	t.in++
	t.run++
	if t.run > t.longest {
		t.longest = t.run
	}
}

func (t *tally) flat(run int) bool {
	// A pure sine has 2.4 times as many samples in the extreme band as beside
	// it, one flattened by its own 3x at most 6 times.
	return t.longest >= run || t.longest >= 3 && t.in > 8*t.beside+8
}

func (h *health) clear() { clear(h.flat) }

// state judges point i by what the minute gathered.
func (e *Engine) state(i int) PointState {
	c := &e.band.chain[i]
	cfg := &e.cfg.Points[i]
	swing := c.high - c.low
	switch {
	case e.band.seen == 0:
		return PointFlat
	case cfg.FullScaleV > 0 && math.Abs(c.high+c.low)/2 > 0.98*cfg.FullScaleV:
		return PointOpen // rests at the end of its range
	case float64(c.atLimit) > clippedShare*float64(e.band.seen):
		return PointClipped
	case swing < 6*deadVolts && swing < 6*deadG*cfg.VoltsPerG:
		return PointFlat
	}
	if f := e.health.flat[i]; f.flat > 0 && float64(f.flat) >= flatShare*float64(f.turns) {
		return PointClipped
	}
	if e.restless(i) {
		return PointNoisy
	}
	return PointGood
}

// restless reports whether the constant of point i jumps about from part to
// part, as a loose plug does. Slow drift is not counted.
func (e *Engine) restless(i int) bool {
	level := e.series.level[i]
	if len(level) < 8 {
		return false
	}
	sum := 0.0
	for k := 1; k < len(level); k++ {
		d := level[k] - level[k-1]
		sum += d * d / 2
	}
	scatter := math.Sqrt(sum / float64(len(level)-1))
	c := &e.band.chain[i]
	return scatter > max(restless*e.cfg.Points[i].VoltsPerG, restlessShare*(c.high-c.low))
}
