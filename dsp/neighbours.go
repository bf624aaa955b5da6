package dsp

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/dsp/fourier"
)

// neighbours finds lines close to 1x that keep their own frequency: another
// machine. Averaging cannot remove such a line, however long; as an unknown of
// the same fit as the machine's own vector it does no harm.
type neighbours struct {
	fft  *fourier.CmplxFFT
	slot []complex128
	out  []complex128
	// spectrum is the power summed over points, each over its noise.
	spectrum []float64
	sorted   []float64
	points   float64 // points in the spectrum
}

// aLine is a line under trial: its frequency against the mean turn rate, Hz,
// and how fast that changes, Hz/s.
type aLine struct{ offset, sweep float64 }

const (
	slots    = 256 // of the spectrum; a minute has up to 240 parts
	mostLine = 3   // lines fitted at the most
	// ownBins is the distance from 1x, in units of 1/duration, within which a
	// line cannot be told from the machine's own.
	ownBins = 1.5
	// fewestParts is the number of parts from which lines are looked for.
	fewestParts = 24
	// mostOwn is how many peaks are looked at that turn out to be the machine's.
	mostOwn = 4
	// alike is the correlation over the points from which a line has the
	// pattern of the machine's own vector: two unrelated patterns over six
	// points reach it once in 4,000.
	alike = 0.9
	// imageShare bounds the mirror image of a line: (f-f1)/2f per whole part of
	// one turn, less for more turns.
	imageShare = 0.03
	// farBins is the distance from which a slow change of the machine's own
	// vector is out of the question, and spreadOut the share of the power around
	// a line that a single frequency may leave.
	farBins   = 12.0
	spreadOut = 0.4
)

func newNeighbours() *neighbours {
	return &neighbours{
		fft:      fourier.NewCmplxFFT(slots),
		slot:     make([]complex128, slots),
		out:      make([]complex128, slots),
		spectrum: make([]float64, slots),
		sorted:   make([]float64, slots),
	}
}

// regressor returns what a line of unit amplitude and zero phase gives in part
// k: its phase against the shaft at the part's middle, and what averaging over
// the part leaves of it. The part starts at a reference edge, so that the shaft
// angle at its middle is half a turn for each turn.
func (s *series) regressor(l aLine, hz float64, k int) complex128 {
	t := s.centre[k] - s.mid()
	phase := 2*math.Pi*((hz+l.offset)*t+l.sweep*t*t/2) - math.Pi*s.turns[k]
	own := s.turns[k] / s.length[k]
	return cmplx.Rect(sinc((hz+l.offset+l.sweep*t-own)*s.length[k]), phase)
}

func (s *series) mid() float64 { return (s.centre[0] + s.centre[len(s.centre)-1]) / 2 }

// sinc returns sin(pi*x)/(pi*x).
func sinc(x float64) float64 {
	if math.Abs(x) < 1e-6 {
		return 1
	}
	return math.Sin(math.Pi*x) / (math.Pi * x)
}

// find returns the lines in the series, strongest first. use says which points
// to look at. hz is the mean turn rate.
func (nb *neighbours) find(s *series, use []bool, hz float64) []aLine {
	if len(s.centre) < fewestParts {
		return nil
	}
	var lines []aLine
	var own []stretch
	for len(lines) < mostLine && len(own) < mostOwn {
		offset, ok := nb.peak(s, use, hz, lines, own)
		if !ok {
			break
		}
		trial := append(lines[:len(lines):len(lines)], aLine{offset: offset})
		for round := 0; round < 1+len(trial); round++ {
			for i := range trial {
				nb.refine(s, use, hz, trial, i)
			}
		}
		switch bin := 1 / (slots * nb.step(s)); {
		case isImage(s, use, hz, trial):
			// The image sweeps when the machine's speed does.
			own = append(own, stretch{offset, 8 * bin})
		case nb.isOwn(s, use, hz, trial):
			own = append(own, stretch{offset, 2 * bin})
		default:
			lines = trial
		}
	}
	return lines
}

// isOwn reports whether the last of the lines is rather the machine's own
// vector changing within the minute: it then has the pattern of the machine's
// vector over the points, or is spread out close to 1x where a machine of
// steady speed gives one bin. A part of the 1x that creeps round the shaft, or a
// loose bearing, must be seen as such and not be fitted away.
func (nb *neighbours) isOwn(s *series, use []bool, hz float64, lines []aLine) bool {
	last := len(lines) - 1
	fit := newCombined(s, lines, hz, nil)
	var cross complex128
	var own, other, points float64
	for p := range s.velocity {
		if !use[p] {
			continue
		}
		fit.solve(s.velocity[p][0])
		v, n := fit.vector[0], fit.vector[1+last]
		cross += n * cmplx.Conj(v)
		own += sqAbs(v)
		other += sqAbs(n)
		points++
	}
	if points >= 3 && sqAbs(cross) > alike*alike*own*other {
		return true
	}
	step := nb.step(s)
	at := int(math.Round(lines[last].offset * slots * step))
	if math.Abs(lines[last].offset)*slots*step > farBins {
		return false
	}
	nb.look(s, use, hz, lines[:last])
	before := nb.around(at, s)
	nb.look(s, use, hz, lines)
	return nb.around(at, s) > spreadOut*before
}

// isImage reports whether the last of the lines is only the mirror image that
// another leaves on the other side of 1x, because a part is not an infinite
// average: it is at most a few hundredths of the line.
func isImage(s *series, use []bool, hz float64, lines []aLine) bool {
	last := len(lines) - 1
	fit := newCombined(s, lines, hz, nil)
	for j := range last {
		if math.Abs(lines[j].offset+lines[last].offset) > 2/s.duration() {
			continue
		}
		var image, line float64
		for p := range s.velocity {
			if use[p] {
				fit.solve(s.velocity[p][0])
				image += sqAbs(fit.vector[1+last])
				line += sqAbs(fit.vector[1+j])
			}
		}
		if image < imageShare*imageShare*line {
			return true
		}
	}
	return false
}

// around returns the power of the spectrum over its noise within a few bins.
func (nb *neighbours) around(at int, s *series) float64 {
	sum := 0.0
	own := int(math.Ceil(ownBins * slots * nb.step(s) / s.duration()))
	for m := at - 4; m <= at+4; m++ {
		if m > own || m < -own {
			sum += max(0, nb.spectrum[(m+slots)%slots]-nb.points)
		}
	}
	return sum
}

func (s *series) duration() float64 { return s.centre[len(s.centre)-1] - s.centre[0] }

// step returns the mean distance of the parts, s.
func (nb *neighbours) step(s *series) float64 { return s.duration() / float64(len(s.centre)-1) }

// look fills the spectrum with what is left of the 1x series after the mean
// and the lines, each point over its own noise.
func (nb *neighbours) look(s *series, use []bool, hz float64, lines []aLine) {
	step := nb.step(s)
	clear(nb.spectrum)
	nb.points = 0
	fit := newCombined(s, lines, hz, nil)
	for p := range s.velocity {
		if !use[p] {
			continue
		}
		nb.points++
		clear(nb.slot)
		fit.solve(s.velocity[p][0])
		for k, r := range fit.residual {
			at := int(math.Round((s.centre[k] - s.centre[0]) / step))
			if at >= slots {
				continue
			}
			// From the shaft's frame into that of a constant frequency.
			nb.slot[at] += r * cmplx.Rect(1, math.Pi*s.turns[k]-2*math.Pi*hz*s.centre[k])
		}
		nb.addSpectrum()
	}
}

// peak returns the offset of the highest line that stands out of the noise,
// other than where only the machine's own vector is.
func (nb *neighbours) peak(s *series, use []bool, hz float64, lines []aLine, not []stretch) (offset float64, ok bool) {
	nb.look(s, use, hz, lines)
	bin := 1 / (slots * nb.step(s))                 // Hz
	best := nb.points + 6*math.Sqrt(nb.points) + 10 // under 1e-4 false alarms a minute
	for m, v := range nb.spectrum {
		at := float64(m) * bin
		if m > slots/2 {
			at -= slots * bin
		}
		if v > best && math.Abs(at) > ownBins/s.duration() && !near(at, not) {
			best, offset, ok = v, at, true
		}
	}
	return offset, ok
}

// stretch is a piece of the spectrum, Hz from 1x.
type stretch struct{ at, within float64 }

func near(x float64, places []stretch) bool {
	for _, p := range places {
		if math.Abs(x-p.at) <= p.within {
			return true
		}
	}
	return false
}

// addSpectrum adds the spectrum of nb.slot over its own noise level, which is
// taken from the median bin so that lines do not raise it.
func (nb *neighbours) addSpectrum() {
	nb.fft.Coefficients(nb.out, nb.slot)
	for m, c := range nb.out {
		nb.sorted[m] = sqAbs(c)
	}
	level := median(nb.sorted) / math.Ln2
	if level == 0 {
		return
	}
	for m, c := range nb.out {
		nb.spectrum[m] += sqAbs(c) / level
	}
}

// refine moves line i to where the fit leaves least, first in frequency, then
// in sweep, then once more in frequency.
func (nb *neighbours) refine(s *series, use []bool, hz float64, lines []aLine, i int) {
	duration := s.duration()
	fit := newCombined(s, lines, hz, nil)
	cost := func(l aLine) float64 {
		fit.replace(i, l)
		total := 0.0
		for p := range s.velocity {
			if use[p] {
				total += fit.leftOver(s.velocity[p][0])
			}
		}
		return total
	}
	l := lines[i]
	l.offset = golden(l.offset-0.6/duration, l.offset+0.6/duration, func(x float64) float64 {
		return cost(aLine{x, l.sweep})
	})
	span := 1.5 / (duration * duration)
	l.sweep = golden(l.sweep-span, l.sweep+span, func(x float64) float64 {
		return cost(aLine{l.offset, x})
	})
	l.offset = golden(l.offset-0.2/duration, l.offset+0.2/duration, func(x float64) float64 {
		return cost(aLine{x, l.sweep})
	})
	lines[i] = l
}

// golden returns the place of the least value of f between a and b by golden
// section, to a thousandth of the interval.
func golden(a, b float64, f func(float64) float64) float64 {
	const ratio = 0.6180339887498949
	x1, x2 := b-ratio*(b-a), a+ratio*(b-a)
	f1, f2 := f(x1), f(x2)
	for range 15 {
		if f1 < f2 {
			b, x2, f2 = x2, x1, f1
			x1 = b - ratio*(b-a)
			f1 = f(x1)
		} else {
			a, x1, f1 = x1, x2, f2
			x2 = a + ratio*(b-a)
			f2 = f(x2)
		}
	}
	return (a + b) / 2
}
