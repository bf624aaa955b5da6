package dsp

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/dsp/fourier"
)

// tracker finds the turn rate from the vibration itself when there is no usable
// reference: the strongest line of velocity, summed over the points, near the
// rated speed. It passes on turns at an arbitrary mark that keeps the line's
// phase only roughly; the phases between points remain right.
type tracker struct {
	cfg    *Config
	buf    *rows
	fft    *fourier.FFT
	window []float64
	in     []float64
	out    []complex128
	power  []float64
	sorted []float64

	hop  int64
	next int64   // row at which the next window ends
	hz   float64 // of the last window; 0 while there is no line
	at   float64 // middle of the last window, rows
	mark float64 // last mark, rows
	// angle is the shaft angle at `at`, turns since the mark.
	angle float64
}

const (
	trackSeconds = 4.0 // least length of a window
	// Where 1x is looked for, as a share of the rated speed.
	lowestShare, highestShare = 0.25, 1.15
	// Without a rated speed: 60 to 6000 r/min.
	lowestHz, highestHz = 1.0, 100.0
	// trackShare is how far the speed may move from window to window.
	trackShare = 0.1
	// lineOver is how many times the median power a line must have.
	lineOver = 30.0
	// leastLine is the velocity, mm/s rms at the strongest point, under which
	// a line is not taken for the machine's own turning.
	leastLine = 0.1
)

func newTracker(cfg *Config, buf *rows) *tracker {
	n := 1
	for float64(n) < trackSeconds*cfg.RateHz {
		n *= 2
	}
	t := &tracker{cfg: cfg, buf: buf, hop: int64(math.Ceil(cfg.RateHz))}
	t.fft = fourier.NewFFT(n)
	t.window = make([]float64, n)
	for i := range t.window {
		s := math.Sin(math.Pi * (float64(i) + 0.5) / float64(n))
		t.window[i] = s * s
	}
	t.in = make([]float64, n)
	t.out = make([]complex128, n/2+1)
	t.power = make([]float64, n/2+1)
	t.sorted = make([]float64, n/2+1)
	return t
}

// restart drops the line and waits for a window of new rows.
func (t *tracker) restart() {
	t.hz = 0
	t.next = t.buf.end() + int64(len(t.window))
	if kept := t.buf.base + int64(len(t.window)); t.buf.end() > kept {
		t.next = t.buf.end()
	} else {
		t.next = max(kept, t.buf.end())
	}
}

// scan looks at each window that has become full and passes on the turns up to
// its middle; lost tells that the line went away.
func (t *tracker) scan(emit func(turn), lost func()) {
	for t.next <= t.buf.end() {
		if t.next-int64(len(t.window)) < t.buf.base {
			t.next = t.buf.base + int64(len(t.window))
			continue
		}
		middle := float64(t.next) - float64(len(t.window))/2
		hz := t.line(t.next - int64(len(t.window)))
		switch {
		case hz == 0:
			if t.hz != 0 {
				lost()
			}
		case t.hz == 0:
			t.mark, t.angle = middle, 0
		default:
			t.advance(middle, hz, emit)
		}
		t.hz, t.at = hz, middle
		t.next += t.hop
	}
}

// advance passes on the turns between the last middle and this one, the turn
// rate changing evenly in between.
func (t *tracker) advance(middle, hz float64, emit func(turn)) {
	span := middle - t.at
	f0, f1 := t.hz/t.cfg.RateHz, hz/t.cfg.RateHz // turns a row
	slope := (f1 - f0) / span
	total := t.angle + (f0+f1)/2*span
	for k := 1.0; k <= total; k++ {
		// Solve angle + f0*x + slope*x^2/2 = k for x.
		need := k - t.angle
		x := 2 * need / (f0 + math.Sqrt(f0*f0+2*slope*need))
		emit(turn{t.mark, t.at + x})
		t.mark = t.at + x
	}
	t.angle = total - math.Floor(total)
}

// line returns the frequency of the line in the window that starts at a row,
// or 0 when there is none.
func (t *tracker) line(start int64) float64 {
	clear(t.power)
	strongest := 0.0
	low, high := t.limits()
	for i := range t.cfg.Points {
		strongest = max(strongest, t.add(start, i, low, high))
	}
	if high-low < 3 {
		return 0
	}
	best := low
	for m := low; m < high; m++ {
		if t.power[m] > t.power[best] {
			best = m
		}
	}
	all := t.sorted[:copy(t.sorted, t.power[low:high])]
	if t.power[best] < lineOver*median(all) || strongest < leastLine || best == 0 {
		return 0
	}
	return (float64(best) + t.between(best)) * t.binHz()
}

// between interpolates the peak of a Hann window's main lobe on the logarithm.
func (t *tracker) between(m int) float64 {
	a, b, c := math.Log(t.power[m-1]+1e-300), math.Log(t.power[m]+1e-300), math.Log(t.power[m+1]+1e-300)
	d := a - 2*b + c
	if d >= 0 {
		return 0
	}
	return max(-0.5, min(0.5, (a-c)/2/d))
}

func (t *tracker) binHz() float64 { return t.cfg.RateHz / float64(len(t.window)) }

// limits returns the bins to look in: around the line while there is one, else
// around the rated speed.
func (t *tracker) limits() (low, high int) {
	from, to := lowestHz, highestHz
	if t.cfg.RatedRPM > 0 {
		from, to = lowestShare*t.cfg.RatedRPM/60, highestShare*t.cfg.RatedRPM/60
	}
	if t.hz > 0 {
		width := max(trackShare*t.hz, 12*t.binHz())
		from, to = max(from, t.hz-width), min(to, t.hz+width)
	}
	low = max(2, int(from/t.binHz()))
	high = min(len(t.power)-1, int(math.Ceil(to/t.binHz()))+1)
	return low, high
}

// add adds a point's velocity spectrum and returns its largest line in the
// range, mm/s rms.
func (t *tracker) add(start int64, point, low, high int) float64 {
	p := &t.cfg.Points[point]
	x := t.buf.from(start)[p.Channel:]
	mean := 0.0
	for i := range t.in {
		t.in[i] = float64(x[i*t.buf.stride])
		mean += t.in[i]
	}
	mean /= float64(len(t.in))
	for i, w := range t.window {
		t.in[i] = (t.in[i] - mean) * w
	}
	t.fft.Coefficients(t.out, t.in)
	largest := 0.0
	for m := low - 1; m <= high && m < len(t.out); m++ {
		v := t.out[m] * toVelocity(t.cfg, point, float64(m)*t.binHz())
		a := cmplx.Abs(v) * 4 / float64(len(t.in)) // 2/n, and 1/2 for the window's mean
		t.power[m] += a * a
		if m >= low && m < high {
			largest = max(largest, a)
		}
	}
	return largest
}
