package rules

import (
	"math"

	"heavyspot/dsp"
)

// signs are the quantities that a verdict rests on.
type signs struct {
	overhung bool
	// referenced is false when lags are relative to a point.
	referenced bool
	// quiet is the worst 1x, mm/s rms.
	worst value
	// share is the part of the radial points' power that is at 1x.
	share value
	// second and third are the amplitudes of 2x and 3x against 1x over all points.
	second, third value
	// rough holds the harmonics at each radial point of a bearing that moves
	// much; roughest is the largest of them against 1x.
	rough    []roughness
	roughest value
	// neighbour is the strongest line beside 1x against 1x, over the radial points.
	neighbour value
	// turning is by how much horizontal lags vertical at each bearing in the
	// sense of rotation, degrees; uneven the larger of the two against the
	// smaller; forward the forward against the backward circle; weight the
	// bearing's share of the radial power.
	turning                 [2]angle
	uneven, forward, weight [2]value
	// ends is by how far the bearings are out of phase, 0 to 180 degrees,
	// vertical, horizontal and over both; disagreement is how far the two differ.
	// inPhase is the share of the radial power in which they move together; it
	// is known when all four radial points are.
	ends         [2]angle
	both         angle
	disagreement value
	inPhase      value
	// axial is the rms of the axial 1x of both bearings against the radial one;
	// axialEnds the ends' phase difference there, 0 to 180 degrees.
	axial     value
	axialEnds angle
	// wander is the unsteadiness of the 1x lag within the minute and creep that
	// from minute to minute, degrees.
	wander, creep value
}

// measure takes the signs from a minute. creep is the phase's step from minute
// to minute, from the memory.
func measure(cfg *Config, m *dsp.Minute, p *picture, creep value) *signs {
	s := &signs{overhung: cfg.Overhung, referenced: m.LagFrom == "", creep: creep}
	s.orders(p)
	s.lines(cfg, m, p)
	for b := range p.at {
		s.orbit(p, b)
	}
	for d := Vertical; d <= Horizontal; d++ {
		s.ends[d] = p.ends(d).size()
	}
	s.both = p.bothWays().size()
	if v, h := p.ends(Vertical), p.ends(Horizontal); v.ok && h.ok {
		s.disagreement = value{math.Abs(math.Remainder(v.deg-h.deg, 360)), math.Hypot(v.sd, h.sd), true}
	}
	if share, ok := p.inPhase(); ok {
		s.inPhase = value{x: share, ok: true}
	}
	s.axialEnds = p.ends(Axial).size()
	s.unsteadiness(p)
	return s
}

// orders measures the sizes of the orders against each other.
func (s *signs) orders(p *picture) {
	var overall, radialVar, axialVar float64
	for b := range p.at {
		for d := range p.at[b] {
			at := &p.at[b][d]
			if a := at.amplitude(); at.good && a >= s.worst.x {
				s.worst = value{a, at.rmsSD, true}
			}
			if Direction(d) == Axial {
				axialVar += sq(at.rmsSD * at.amplitude())
				continue
			}
			overall += sq(at.overall)
			radialVar += sq(at.rmsSD * at.amplitude())
		}
	}
	radial, nr := p.power(1, Vertical, Horizontal)
	axial, na := p.power(1, Axial)
	if radial == 0 {
		return
	}
	if overall > sq(still) {
		s.share = value{x: radial / overall, ok: true}
	}
	s.second, s.third = harmonic(p, 2), harmonic(p, 3)
	s.harmonics(p)
	if na < len(p.at) {
		return // a bearing that floats axially shows little, whatever the cause
	}
	s.axial = value{x: math.Sqrt(axial / float64(na) / (radial / float64(nr))), ok: true}
	if axial > 0 {
		// Of a ratio of root sums of squares, to first order.
		s.axial.sd = s.axial.x * math.Hypot(math.Sqrt(axialVar)/axial, math.Sqrt(radialVar)/radial)
	}
}

// harmonic returns the amplitude of an order against 1x over all points.
func harmonic(p *picture, order int) value {
	first, _ := p.power(1, Vertical, Horizontal, Axial)
	other, _ := p.power(order, Vertical, Horizontal, Axial)
	return value{x: math.Sqrt(other / first), ok: first > 0}
}

// roughness is the amplitude of 2x and 3x together at a radial point, against
// its 1x and against the other direction's at the same bearing.
type roughness struct{ toFirst, toOther value }

// harmonics measures them. A bearing that hardly moves is left out.
func (s *signs) harmonics(p *picture) {
	radial, _ := p.power(1, Vertical, Horizontal)
	for b := range p.at {
		v, h := &p.at[b][Vertical], &p.at[b][Horizontal]
		if !v.good || !h.good || sq(v.amplitude())+sq(h.amplitude()) < calm*radial {
			continue
		}
		for d, at := range [2]*place{v, h} {
			if !(at.amplitude() > 0) {
				continue
			}
			other := [2]*place{h, v}[d].harmonics()
			r := roughness{
				toFirst: value{x: at.harmonics() / at.amplitude(), ok: true},
				// The floor keeps a harmonic of zero from making the ratio infinite.
				toOther: value{x: at.harmonics() / max(other, 0.01*at.harmonics(), 1e-9), ok: true},
			}
			s.rough = append(s.rough, r)
			if r.toFirst.x >= s.roughest.x {
				s.roughest = r.toFirst
			}
		}
	}
}

// lines measures the strongest line of another machine against 1x.
func (s *signs) lines(cfg *Config, m *dsp.Minute, p *picture) {
	radial, _ := p.power(1, Vertical, Horizontal)
	if radial == 0 {
		return
	}
	s.neighbour.ok = true
	for _, l := range m.Lines {
		sum := 0.0
		for i, c := range cfg.Points {
			if i < len(l.RMS) && c.Direction != Axial && p.at[bearingOf(c)][c.Direction].good {
				sum += sq(l.RMS[i])
			}
		}
		s.neighbour.x = max(s.neighbour.x, math.Sqrt(sum/radial))
	}
}

// orbit measures the radial motion of one bearing.
func (s *signs) orbit(p *picture, b int) {
	s.turning[b] = p.turning(b)
	if !s.turning[b].ok {
		return
	}
	v, h := p.at[b][Vertical].amplitude(), p.at[b][Horizontal].amplitude()
	s.uneven[b] = value{x: max(v, h) / min(v, h), ok: true}
	f, w := p.circles(b)
	s.forward[b] = value{x: math.Hypot(real(f), imag(f)) / max(math.Hypot(real(w), imag(w)), 1e-9), ok: true}
	radial, _ := p.power(1, Vertical, Horizontal)
	s.weight[b] = value{x: (v*v + h*h) / radial, ok: true}
}

// telling is how well a lag must be known, degrees, for its wander relative to
// another point to tell anything.
const telling = 3.0

// unsteadiness weighs the wander of the radial points with their power. Without
// a reference the lags are relative to a point, and a vector that turns as a
// whole shows only against what does not turn with it: then the worst of all
// points counts.
func (s *signs) unsteadiness(p *picture) {
	var sum, weight, worst float64
	for b := range p.at {
		for d := range p.at[b] {
			at := &p.at[b][d]
			if at.good && at.lagSD < telling {
				worst = max(worst, at.wander)
			}
			if Direction(d) != Axial {
				w := sq(at.amplitude())
				sum += w * at.wander
				weight += w
			}
		}
	}
	switch {
	case weight == 0:
	case s.referenced:
		s.wander = value{x: sum / weight, ok: true}
	default:
		s.wander = value{x: worst, ok: true}
	}
}
