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
	for len(lines) < mostLine {
		offset, ok := nb.peak(s, use, hz, lines)
		if !ok {
			break
		}
		lines = append(lines, aLine{offset: offset})
		for round := 0; round < 1+len(lines); round++ {
			for i := range lines {
				nb.refine(s, use, hz, lines, i)
			}
		}
	}
	return lines
}

// peak looks for a line in what is left of the 1x series after the mean and
// the known lines.
func (nb *neighbours) peak(s *series, use []bool, hz float64, lines []aLine) (offset float64, ok bool) {
	duration := s.centre[len(s.centre)-1] - s.centre[0]
	step := duration / float64(len(s.centre)-1)
	clear(nb.spectrum)
	points := 0.0
	fit := newCombined(s, lines, hz, nil)
	for p := range s.velocity {
		if !use[p] {
			continue
		}
		points++
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
	own := ownBins * slots * step / duration
	best := points + 6*math.Sqrt(points) + 10 // under 1e-4 false alarms a minute
	for m, v := range nb.spectrum {
		signed := m
		if m > slots/2 {
			signed = m - slots
		}
		if math.Abs(float64(signed)) > own && v > best {
			best, offset, ok = v, float64(signed)/(slots*step), true
		}
	}
	return offset, ok
}

// addSpectrum adds the spectrum of nb.slot over its own noise level, which is
// taken from the median bin so that lines do not raise it.
func (nb *neighbours) addSpectrum() {
	nb.fft.Coefficients(nb.out, nb.slot)
	for m, c := range nb.out {
		nb.sorted[m] = real(c)*real(c) + imag(c)*imag(c)
	}
	level := median(nb.sorted) / math.Ln2
	if level == 0 {
		return
	}
	for m, c := range nb.out {
		nb.spectrum[m] += (real(c)*real(c) + imag(c)*imag(c)) / level
	}
}

// refine moves line i to where the fit leaves least, first in frequency, then
// in sweep, then once more in frequency.
func (nb *neighbours) refine(s *series, use []bool, hz float64, lines []aLine, i int) {
	duration := s.centre[len(s.centre)-1] - s.centre[0]
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
