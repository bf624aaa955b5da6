package dsp

import (
	"math"
	"math/cmplx"
	"sort"
)

const (
	// steadyChange and steadyRange: a minute is steady when the speed drifts
	// by less than the first and stays within the second, shares of the mean.
	steadyChange, steadyRange = 0.03, 0.06
	// runningShare is the share of the minute that turns must cover.
	runningShare = 0.5
	// wanderSeconds is the length of a stretch over which a lag is averaged
	// before its wander is judged.
	wanderSeconds = 5.0
	// taperGain: the tapered mean is taken when its variance is below this
	// share of the plain mean's.
	taperGain = 0.9
	// lineFloor is the share of the strongest 1x under which a line is not
	// worth telling.
	lineFloor = 0.02
)

// read fills m from what the minute gathered.
func (e *Engine) read(m *Minute) {
	tracked := e.series.keepOneKind()
	m.Points = make([]PointReading, len(e.cfg.Points))
	use := make([]bool, len(m.Points))
	first := -1
	for i := range m.Points {
		m.Points[i].Name = e.cfg.Points[i].Name
		m.Points[i].State = e.state(i)
		use[i] = m.Points[i].State == PointGood
		if use[i] && first < 0 {
			first = i
		}
	}
	m.Speed = Speed{State: Stopped, Reference: ReferenceNone, Missing: e.turns.missing, Extra: e.turns.extra}
	if len(e.series.centre) > 0 {
		e.readSpeed(m, tracked)
		if first >= 0 {
			e.readVectors(m, use, first, tracked)
		}
	}
	e.readOverall(m)
}

func (e *Engine) readSpeed(m *Minute, tracked bool) {
	mean, low, high, change := e.series.speeds()
	covered, turns := 0.0, 0.0
	for k, l := range e.series.length {
		covered += l
		turns += e.series.turns[k]
	}
	sp := &m.Speed
	sp.Mean, sp.Min, sp.Max, sp.Turns = 60*mean, 60*low, 60*high, int(turns)
	sp.State = Changing
	if math.Abs(change) < steadyChange*mean && high-low < steadyRange*mean &&
		covered > runningShare*m.Seconds*m.Coverage {
		sp.State = Steady
	}
	switch {
	case tracked:
	case sp.Missing+sp.Extra > 0 || e.pulses.narrow():
		sp.Reference = ReferenceDoubtful
	default:
		sp.Reference = ReferenceGood
	}
}

// readVectors fits the vectors of the good points.
func (e *Engine) readVectors(m *Minute, use []bool, first int, tracked bool) {
	s := e.series
	hz := m.Speed.Mean / 60
	var lines []aLine
	if tracked {
		strongest := e.strongest(use)
		correction := 60 * s.relativeTo(strongest)
		m.Speed.Mean += correction
		m.LagFrom = m.Points[first].Name
	} else if m.Speed.State == Steady {
		// While the speed changes a lot, so does the machine's own vector, and
		// there is no telling it from a neighbour's.
		lines = e.nb.find(s, use, hz)
	}
	if cap(e.taper) < len(s.centre) {
		e.taper = make([]float64, len(s.centre), 2*len(s.centre))
	}
	e.taper = e.taper[:len(s.centre)]
	hann(s, e.taper)
	fits := newFits(s, lines, hz, e.taper)
	e.spread.respond(fits.plain.weight, e.spread.plain)
	e.spread.respond(fits.tapered.weight, e.spread.tapered)
	stretch := int(math.Round(wanderSeconds * float64(len(s.centre)) / m.Seconds))
	for i := range m.Points {
		if !use[i] {
			continue
		}
		for n := range Orders {
			v, fit := e.vector(fits, i, n)
			m.Points[i].Order[n] = v
			if n == 0 && fit != nil {
				m.Points[i].Wander = wander(fit.residual, fit.vector[0], stretch)
			}
		}
	}
	if tracked {
		relate(m, first)
	}
	e.readLines(m, fits, lines, use, hz)
	for i := range m.Points {
		if o := &m.Points[i].Order[0]; use[i] && o.RMSSD > noisyShare*o.RMS && o.RMSSD > noisyFloor {
			m.Points[i] = PointReading{Name: m.Points[i].Name, State: PointNoisy}
		}
	}
}

// fits holds the plain and the tapered fit, with the lines for 1x and without
// for the higher orders.
type fits struct{ plain, tapered, highPlain, highTapered *combined }

func newFits(s *series, lines []aLine, hz float64, taper []float64) fits {
	f := fits{plain: newCombined(s, lines, hz, nil), tapered: newCombined(s, lines, hz, taper)}
	f.highPlain, f.highTapered = f.plain, f.tapered
	if len(lines) > 0 {
		f.highPlain, f.highTapered = newCombined(s, nil, hz, nil), newCombined(s, nil, hz, taper)
	}
	return f
}

// vector returns order n+1 of point i by the better of the two fits, and that
// fit; the fit is nil when the sample rate is too low for the order.
func (e *Engine) vector(f fits, i, n int) (Vector, *combined) {
	z := e.series.velocity[i][n]
	if z[0] == 0 {
		return Vector{}, nil
	}
	plain, tapered := f.plain, f.tapered
	if n > 0 {
		plain, tapered = f.highPlain, f.highTapered
	}
	plain.solve(z)
	best, variance := plain, 0.0
	if len(z) >= fewestParts {
		e.spread.measure(plain.residual, e.taper)
		variance = e.spread.variance(e.spread.plain)
		if v := e.spread.variance(e.spread.tapered); v < taperGain*variance {
			tapered.solve(z)
			best, variance = tapered, v
		}
	} else {
		variance = real(plain.dot(plain.residual, plain.residual)) / float64(max(len(z)-1, 1))
	}
	v := best.vector[0]
	a := cmplx.Abs(v)
	along, across := split(best.residual, v)
	out := Vector{RMS: a, Lag: wrap(-cmplx.Phase(v) * 180 / math.Pi), RMSSD: math.Sqrt(variance * along), LagSD: 180}
	if a > 0 {
		out.LagSD = min(180, math.Sqrt(variance*across)/a*180/math.Pi)
	}
	return out, best
}

// strongest returns the good point with the largest 1x.
func (e *Engine) strongest(use []bool) int {
	best, most := 0, -1.0
	for i, z := range e.series.velocity {
		sum := 0.0
		for _, v := range z[0] {
			sum += cmplx.Abs(v)
		}
		if use[i] && sum > most {
			best, most = i, sum
		}
	}
	return best
}

// relate makes all lags relative to the 1x of the first good point.
func relate(m *Minute, first int) {
	zero := m.Points[first].Order[0].Lag
	for i := range m.Points {
		if m.Points[i].State != PointGood {
			continue
		}
		for n := range Orders {
			o := &m.Points[i].Order[n]
			if o.RMS > 0 {
				o.Lag = wrap(o.Lag - float64(n+1)*zero)
			}
		}
	}
}

// readLines tells the neighbours that were fitted beside 1x.
func (e *Engine) readLines(m *Minute, f fits, lines []aLine, use []bool, hz float64) {
	strongest := 0.0
	for i := range m.Points {
		strongest = max(strongest, m.Points[i].Order[0].RMS)
	}
	for j, l := range lines {
		line := Line{RPM: 60 * (hz + l.offset), RMS: make([]float64, len(m.Points))}
		top := 0.0
		for i := range m.Points {
			if !use[i] {
				continue
			}
			f.plain.solve(e.series.velocity[i][0])
			// Fitted as velocity at the turn rate; put right for its own.
			line.RMS[i] = cmplx.Abs(f.plain.vector[1+j]) * hz / (hz + l.offset)
			top = max(top, line.RMS[i])
		}
		if top > lineFloor*strongest {
			m.Lines = append(m.Lines, line)
		}
	}
	sort.SliceStable(m.Lines, func(a, b int) bool { return sum(m.Lines[a].RMS) > sum(m.Lines[b].RMS) })
}

func sum(x []float64) (s float64) {
	for _, v := range x {
		s += v
	}
	return s
}

// readOverall measures the overall velocity of the good points. What the
// band's filter does to the orders is known and taken off, so that near the
// end of the band the share of 1x stays right.
func (e *Engine) readOverall(m *Minute) {
	low := e.band.low
	for i := range m.Points {
		p := &m.Points[i]
		if p.State != PointGood {
			continue
		}
		scale := gravity * 1000 / e.cfg.Points[i].VoltsPerG
		power := e.band.meanSquare(i) * scale * scale
		for n := range Orders {
			hz := m.Speed.Mean / 60 * float64(n+1)
			a := p.Order[n].RMS
			r := 0.0
			if hz > 0 {
				r = e.band.response(hz) * e.highpass(i, hz)
			}
			power -= a * a * r * r
			if hz >= low && hz <= bandHigh {
				power += a * a
			}
		}
		p.Overall = math.Sqrt(max(0, power))
		if p.Overall > 0 {
			p.Share = min(1, p.Order[0].RMS*p.Order[0].RMS/(p.Overall*p.Overall))
		}
	}
}

// highpass returns what the chain's high pass and the converter leave of an
// amplitude at hz.
func (e *Engine) highpass(point int, hz float64) float64 {
	r := 1 / math.Hypot(1, e.cfg.Points[point].HighpassHz/hz)
	if e.cfg.Gain != nil {
		r *= e.cfg.Gain(hz)
	}
	return r
}
