package dsp

import "math"

// pulses finds the leading edges of the phase-reference pulse in the samples
// of its channel, to a fraction of a sample.
//
// An edge is located by area: behind a converter filter whose response has
// zeros at the multiples of the data rate, a step gives samples whose summed
// height above the low level tells its place exactly, wherever it falls
// between two samples. Interpolating the threshold crossing does not have this
// property and is biased when the speed is locked to the sample clock; it is
// used only for edges that are slow against the sampling.
type pulses struct {
	ref  Reference
	sign float64 // -1 when the leading edge falls, so that it rises below
	thr  float64
	hys  float64

	next  int64 // the row to look at next
	armed bool  // the signal has been behind the threshold by the hysteresis
	start int64 // the first row over the threshold of the pulse under way
	high  bool  // a pulse is under way
	end   int64 // the first row behind the last pulse
	peak  float64
	// top is the level of the pulses, width their width in rows; 0 until a
	// pulse has been seen whole.
	top, width float64
}

const (
	rowsBefore = 2 // rows ahead of the crossing that a sharp edge reaches into
	rowsAfter  = 2 // rows after it
	lowRows    = 6 // rows ahead of those that give the low level, if there are
	// settled is the share of the pulse height within which a level counts as
	// reached.
	settled = 0.1
	// levelGain is the weight of the newest pulse in the learnt levels.
	levelGain = 0.2
)

func newPulses(ref Reference) *pulses {
	p := &pulses{ref: ref, sign: 1, thr: ref.ThresholdV, hys: ref.HysteresisV}
	if ref.Falling {
		p.sign, p.thr = -1, -ref.ThresholdV
	}
	return p
}

// restart forgets the pulse under way, after a gap; at is the next row.
func (p *pulses) restart(at int64) { p.next, p.armed, p.high, p.end = at, false, false, at-1 }

// narrowRows is the width under which a pulse does not reach its height behind
// the converter's filter at every place between two samples, so that its edges
// are located too late.
const narrowRows = 2.5

// narrow reports whether the pulses are too narrow for the sampling.
func (p *pulses) narrow() bool { return p.width > 0 && p.width < narrowRows }

// scan looks at the rows not seen yet, as far as an edge could be located, and
// calls found with each edge's place on the sample clock in rows.
func (p *pulses) scan(b *rows, found func(at float64)) {
	last := b.end() - rowsAfter - 1
	for ; p.next <= last; p.next++ {
		s := p.at(b, p.next)
		switch {
		case p.high && s < p.thr-p.hys:
			p.finish(b)
			p.armed = true
		case p.high:
			p.peak = max(p.peak, s)
		case !p.armed:
			p.armed = s < p.thr-p.hys
		case s >= p.thr:
			p.armed, p.high, p.start, p.peak = false, true, p.next, s
			found(p.locate(b, p.next))
		}
	}
}

func (p *pulses) at(b *rows, row int64) float64 {
	return p.sign * b.value(row, p.ref.Channel)
}

// locate returns the place of the edge whose first row over the threshold is i.
func (p *pulses) locate(b *rows, i int64) float64 {
	linear := p.crossing(b, i)
	if i-rowsBefore-1 < b.base {
		return linear
	}
	low := p.lowLevel(b, i)
	after := int64(rowsAfter)
	if p.width > 0 && p.width < 5 {
		after = 1 // the trailing edge comes too soon for more
	}
	top := p.top
	if top == 0 {
		top = max(p.at(b, i+1), p.at(b, i+2))
	}
	height := top - low
	first, final := p.at(b, i-rowsBefore), p.at(b, i+after)
	if first-low > settled*height || top-final > settled*height && after == rowsAfter {
		return linear
	}
	area := 0.0
	for k := i - rowsBefore; k <= i+after; k++ {
		area += p.at(b, k) - low
	}
	edge := float64(i+after) + 0.5 - area/height
	if math.Abs(edge-linear) > 1 {
		return linear
	}
	return edge
}

// lowLevel returns the level between the last pulse's end and the edge at i.
func (p *pulses) lowLevel(b *rows, i int64) float64 {
	sum, n := 0.0, 0
	for k := max(b.base, p.end+1, i-rowsBefore-lowRows); k < i-rowsBefore; k++ {
		sum += p.at(b, k)
		n++
	}
	if n == 0 {
		return p.at(b, i-rowsBefore)
	}
	return sum / float64(n)
}

// crossing interpolates the threshold between the rows i-1 and i.
func (p *pulses) crossing(b *rows, i int64) float64 {
	y1 := p.at(b, i)
	if i-1 < b.base {
		return float64(i)
	}
	y0 := p.at(b, i-1)
	if y1 == y0 {
		return float64(i)
	}
	return float64(i-1) + (p.thr-y0)/(y1-y0)
}

// finish learns the level and the width from the pulse that ends at p.next.
func (p *pulses) finish(b *rows) {
	p.high, p.end = false, p.next
	width := float64(p.next - p.start)
	level, n := 0.0, 0
	for k := max(p.start+rowsAfter, b.base); k < p.next-rowsBefore; k++ {
		level += p.at(b, k)
		n++
	}
	if n > 0 {
		level /= float64(n)
	} else {
		level = p.peak
		if level < p.top { // too narrow to reach its level each time
			level += 0.9 * (p.top - level)
		}
	}
	if p.top == 0 {
		p.top, p.width = level, width
		return
	}
	p.top += levelGain * (level - p.top)
	p.width += levelGain * (width - p.width)
}
