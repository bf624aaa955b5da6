package rig

import (
	"context"
	"fmt"
	"io"
	"math"
	"slices"
	"time"

	"heavyspot/acquire"
)

// Signal is a stream of volts in small steps: a Machine or Phasors.
type Signal interface {
	// Channels is the number of inputs and StepHz that of steps per second.
	Channels() int
	StepHz() float64
	// Next writes the mean volts of every input over the next step.
	Next(dst []float32)
}

// Sampling says how a Source samples a signal.
type Sampling struct {
	// RateHz is the number of rows per second; the signal's StepHz must be a
	// whole multiple of it.
	RateHz float64
	// Smooth is the number of moving averages, each one row long, that the
	// signal passes, 0 to 3, like a converter's sinc filter. Zero means that a
	// row is the mean of the last step alone.
	Smooth int
	// Duration is the length of the stream; zero means endless.
	Duration time.Duration
	// BlockRows is the number of rows in a block; zero means a quarter of a second.
	BlockRows int
	// Start is the wall time of row 0; zero means unknown.
	Start time.Time
	// Losses are stretches that do not arrive, in rising order.
	Losses []Loss
}

// Loss is a stretch of rows that does not arrive.
type Loss struct {
	// First is the first row lost and Rows their number.
	First, Rows int64
	// Misjudged is what the source adds to the number it reports; when it is not
	// zero the gap is reported as not exact.
	Misjudged int64
	Cause     acquire.Cause
}

// Source samples a signal. It does not wait for real time.
type Source struct {
	signal   Signal
	sampling Sampling
	// ratio is the number of steps to a row and weights the filter over them.
	ratio   int
	weights []float64
	// window holds the steps under the filter, oldest first.
	window []float32
	row    int64 // the next row of the signal
	shift  int64 // rows by which losses were misjudged so far
	end    int64 // rows in all, 0 = endless
	losses []Loss
}

// NewSource returns a source that takes its rows from a signal.
func NewSource(signal Signal, s Sampling) (*Source, error) {
	ratio := signal.StepHz() / s.RateHz
	if !(s.RateHz > 0) || ratio < 1 || math.Abs(ratio-math.Round(ratio)) > 1e-9*ratio {
		return nil, fmt.Errorf("rig: cannot sample %g steps per second at %g Hz: the ratio must be whole", signal.StepHz(), s.RateHz)
	}
	if s.Smooth < 0 || s.Smooth > 3 {
		return nil, fmt.Errorf("rig: smoothing is %d, allowed are 0 to 3", s.Smooth)
	}
	if s.BlockRows == 0 {
		s.BlockRows = max(1, int(s.RateHz/4))
	}
	for i, l := range s.Losses {
		if l.Rows <= 0 || l.First < 0 || i > 0 && l.First <= s.Losses[i-1].First+s.Losses[i-1].Rows {
			return nil, fmt.Errorf("rig: loss %d at row %d: losses must rise, hold rows and not touch", i, l.First)
		}
	}
	src := &Source{signal: signal, sampling: s, ratio: int(math.Round(ratio)), losses: slices.Clone(s.Losses)}
	src.weights = boxes(src.ratio, s.Smooth)
	src.window = make([]float32, max(len(src.weights), src.ratio)*signal.Channels())
	src.end = int64(math.Round(s.Duration.Seconds() * s.RateHz))
	for range len(src.window)/signal.Channels() - src.ratio {
		src.push()
	}
	return src, nil
}

// boxes returns n moving averages of length d, one after another.
func boxes(d, n int) []float64 {
	w := []float64{1}
	for range n {
		next := make([]float64, len(w)+d-1)
		for i, a := range w {
			for j := range d {
				next[i+j] += a / float64(d)
			}
		}
		w = next
	}
	return w
}

// Format implements acquire.Source. Its response is exact: the mean over a step
// and the moving averages.
func (s *Source) Format() acquire.Format {
	step, d, n := s.signal.StepHz(), float64(s.ratio), s.sampling.Smooth
	return acquire.Format{
		RateHz:   s.sampling.RateHz,
		Channels: s.signal.Channels(),
		Response: func(hz float64) float64 {
			x := math.Pi * hz / step
			if x == 0 {
				return 1
			}
			return math.Sin(x) / x * math.Pow(math.Sin(d*x)/(d*math.Sin(x)), float64(n))
		},
	}
}

// Delay returns the instant of the signal, s after its first step began, that
// the middle of the filter has at row 0; row i follows i / RateHz later.
func (s *Source) Delay() float64 {
	steps := len(s.window) / s.signal.Channels()
	return (float64(steps) - float64(len(s.weights))/2) / s.signal.StepHz()
}

// Read implements acquire.Source.
func (s *Source) Read(ctx context.Context, b *acquire.Block) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	b.Gap = s.lose()
	rows := int64(s.sampling.BlockRows)
	if len(s.losses) > 0 {
		rows = min(rows, s.losses[0].First-s.row)
	}
	if s.end > 0 {
		rows = min(rows, s.end-s.row)
	}
	if rows <= 0 {
		return io.EOF
	}
	b.First, b.Volts = s.row+s.shift, b.Volts[:0]
	b.Time, b.ClockSet = time.Time{}, !s.sampling.Start.IsZero()
	if b.ClockSet {
		b.Time = s.sampling.Start.Add(time.Duration(float64(s.row) / s.sampling.RateHz * float64(time.Second)))
	}
	for range rows {
		s.advance()
		b.Volts = s.filter(b.Volts)
	}
	return nil
}

// Close implements acquire.Source; there is nothing to release.
func (s *Source) Close() error { return nil }

// lose drops the rows of a loss that begins at the next row.
func (s *Source) lose() acquire.Gap {
	if len(s.losses) == 0 || s.losses[0].First != s.row {
		return acquire.Gap{}
	}
	l := s.losses[0]
	s.losses = s.losses[1:]
	for range l.Rows {
		s.advance()
	}
	s.shift += l.Misjudged
	return acquire.Gap{Lost: l.Rows + l.Misjudged, Exact: l.Misjudged == 0, Cause: l.Cause}
}

// advance moves the filter on by one row.
func (s *Source) advance() {
	for range s.ratio {
		s.push()
	}
	s.row++
}

// push takes the next step into the window.
func (s *Source) push() {
	n := s.signal.Channels()
	copy(s.window, s.window[n:])
	s.signal.Next(s.window[len(s.window)-n:])
}

// filter appends the filtered row.
func (s *Source) filter(dst []float32) []float32 {
	n := s.signal.Channels()
	tail := s.window[len(s.window)-len(s.weights)*n:]
	for c := range n {
		sum := 0.0
		for i, w := range s.weights {
			sum += w * float64(tail[i*n+c])
		}
		dst = append(dst, float32(sum))
	}
	return dst
}
