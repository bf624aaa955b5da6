package dsp

import (
	"math"

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
	power  []float64 // velocity, (mm/s rms) squared, summed over points
	stands []float64 // power over the noise around, summed over points
	point  []float64 // power of the signal of one point
	sorted []float64

	hop  int64
	next int64   // row at which the next window ends
	hz   float64 // of the last window; 0 while there is no line
	seen float64 // a line seen once, not yet taken up; 0 = none
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
	// A line is taken up when it stands out from the noise around it by
	// n + 4*sqrt(n) + 8 over n points, twice in a row at places that agree, and
	// kept from n + 2*sqrt(n) + 2. In noise each point adds 1 on average and the
	// largest of a hundred bins at one point is 5.
	takeSD, takeOver = 4.0, 8.0
	keepSD, keepOver = 2.0, 2.0
	// noiseBins is the number of bins over which the noise is taken as level.
	noiseBins = 16
	// agree is how far the first two places of a line may differ, share.
	agree = 0.03
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
	t.stands = make([]float64, n/2+1)
	t.point = make([]float64, n/2+1)
	t.sorted = make([]float64, n/2+1)
	return t
}

// restart drops the line and waits for a window of new rows.
func (t *tracker) restart() {
	t.hz, t.seen = 0, 0
	t.next = max(t.buf.end(), t.buf.base+int64(len(t.window)))
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
		hz := t.take(t.line(t.next - int64(len(t.window))))
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

// take returns hz once a line has been seen there twice in a row.
func (t *tracker) take(hz float64) float64 {
	before := t.seen
	t.seen = hz
	if t.hz == 0 && math.Abs(hz-before) > agree*hz {
		return 0
	}
	return hz
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
	clear(t.stands)
	low, high := t.limits()
	if high-low < 3 {
		return 0
	}
	strongest := 0.0
	for i := range t.cfg.Points {
		strongest = max(strongest, t.add(start, i, low, high))
	}
	n := float64(len(t.cfg.Points))
	over := n + takeSD*math.Sqrt(n) + takeOver
	if t.hz > 0 {
		over = n + keepSD*math.Sqrt(n) + keepOver
		width := max(trackShare*t.hz, 6*t.binHz())
		low = max(low, int((t.hz-width)/t.binHz()))
		high = min(high, int((t.hz+width)/t.binHz())+2)
	}
	best := 0
	for m := low; m < high; m++ {
		if t.stands[m] > over && t.power[m] > t.power[best] {
			best = m
		}
	}
	if best == 0 || strongest < leastLine {
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

// limits returns the bins in which 1x can be.
func (t *tracker) limits() (low, high int) {
	from, to := lowestHz, highestHz
	if t.cfg.RatedRPM > 0 {
		from, to = lowestShare*t.cfg.RatedRPM/60, highestShare*t.cfg.RatedRPM/60
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
	for m := low - 1; m <= high && m < len(t.out); m++ {
		t.point[m] = sqAbs(t.out[m])
	}
	t.compare(low, high)
	largest := 0.0
	for m := low - 1; m <= high && m < len(t.out); m++ {
		v := t.out[m] * toVelocity(t.cfg, point, float64(m)*t.binHz())
		a := 4 / float64(len(t.in)) // 2/n, and 1/2 for the window's mean
		power := sqAbs(v) * a * a
		t.power[m] += power
		if m >= low && m < high {
			largest = max(largest, power)
		}
	}
	return math.Sqrt(largest)
}

// compare adds the point's power over the noise around each bin.
func (t *tracker) compare(low, high int) {
	for m := low; m < high; m += noiseBins {
		end := min(high, m+noiseBins)
		from := max(low, end-noiseBins)
		level := median(t.sorted[:copy(t.sorted, t.point[from:end])]) / math.Ln2
		if level == 0 {
			continue
		}
		for k := m; k < end; k++ {
			t.stands[k] += t.point[k] / level
		}
	}
}

func sqAbs(c complex128) float64 { return real(c)*real(c) + imag(c)*imag(c) }
