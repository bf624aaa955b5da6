package dsp

import "math"

// A part is a few whole turns, long enough for a least-squares fit.
type part struct {
	centre float64 // middle, rows
	length float64 // rows
	turns  int
	// vector holds, for each point, the complex amplitudes of the signal in
	// volts peak, one an order: x = Re(sum vector[n] * exp(i*(n+1)*theta)).
	vector [][Orders]complex128
	// level is each point's constant, volts.
	level []float64
	// orders is how many orders the sample rate allowed, the rest are zero.
	orders int
}

// fitter collects turns into parts and fits each part.
type fitter struct {
	buf      *rows
	channels []int // one a point
	minRows  float64
	done     func(*part)

	pending []turn
	table   []trig
	out     part
}

// trig holds the cosines and sines of a row's shaft angle, orders 1 to 3.
type trig struct{ c1, s1, c2, s2, c3, s3 float64 }

const (
	// partSeconds is the least length of a part. A quarter of a second keeps
	// neighbours up to 2 Hz away apart from 1x in the sequence of parts.
	partSeconds = 0.25
	// partRows is the least number of rows of a part, several an unknown.
	partRows = 64
	// topOrder is the share of the sample rate up to which an order is fitted.
	topOrder = 0.45
)

func newFitter(cfg *Config, buf *rows, done func(*part)) *fitter {
	f := &fitter{
		buf: buf, done: done,
		minRows: max(partSeconds*cfg.RateHz, partRows),
		pending: make([]turn, 0, 256),
		table:   make([]trig, 0, 2*int(max(partSeconds*cfg.RateHz, partRows))),
	}
	for _, p := range cfg.Points {
		f.channels = append(f.channels, p.Channel)
	}
	f.out.vector = make([][Orders]complex128, len(f.channels))
	f.out.level = make([]float64, len(f.channels))
	return f
}

// turn adds a turn that follows the one before.
func (f *fitter) turn(t turn) {
	if n := len(f.pending); n > 0 && f.pending[n-1].end != t.start {
		f.broken()
	}
	f.pending = append(f.pending, t)
	if t.end-f.pending[0].start >= f.minRows {
		f.fit()
	}
}

// broken tells that the next turn does not follow the last.
func (f *fitter) broken() {
	n := len(f.pending)
	if n > 0 && f.pending[n-1].end-f.pending[0].start >= f.minRows/2 {
		f.fit()
	}
	f.pending = f.pending[:0]
}

// fit solves the pending turns and hands the part on.
func (f *fitter) fit() {
	first, last := f.pending[0].start, f.pending[len(f.pending)-1].end
	p := &f.out
	p.centre, p.length, p.turns = (first+last)/2, last-first, len(f.pending)
	p.orders = min(Orders, int(topOrder*p.length/float64(p.turns)))
	start := max(int64(math.Ceil(first)), f.buf.base)
	var c, s [2*Orders + 1]float64
	f.table = f.table[:0]
	if n := int(last-first) + 2; cap(f.table) < n {
		f.table = make([]trig, 0, n)
	}
	row := start
	for _, t := range f.pending {
		row = f.angles(row, t, &c, &s)
	}
	f.pending = f.pending[:0]
	var a normal
	a.build(1+2*p.orders, &c, &s)
	if p.orders < 1 || !a.factor() {
		return
	}
	x := f.buf.from(start)
	for i, ch := range f.channels {
		y := f.project(x[ch:])
		a.solve(&y)
		p.level[i] = y[0]
		for n := range p.orders {
			p.vector[i][n] = complex(y[2*n+1], -y[2*n+2])
		}
		for n := p.orders; n < Orders; n++ {
			p.vector[i][n] = 0
		}
	}
	f.done(p)
}

// angles tables the rows of one turn from row on, adds them to the sums c and
// s of cosines and sines, and returns the row after them.
func (f *fitter) angles(row int64, t turn, c, s *[2*Orders + 1]float64) int64 {
	step := 2 * math.Pi / (t.end - t.start)
	angle := (float64(row) - t.start) * step
	sin, cos := math.Sincos(angle)
	ds, dc := math.Sincos(step)
	end := int64(math.Ceil(t.end))
	n := int(end - row)
	sumAngles(n, complex(cos, sin), complex(dc, ds), angle+float64(n)*step, c, s)
	at := len(f.table)
	f.table = f.table[:at+n]
	rows := f.table[at:]
	for i := range rows {
		// Double and triple angles; the recurrence starts anew each turn, so
		// that rounding does not build up.
		t := &rows[i]
		c2, s2 := 2*cos*cos-1, 2*sin*cos
		t.c1, t.s1, t.c2, t.s2 = cos, sin, c2, s2
		t.c3, t.s3 = cos*c2-sin*s2, sin*c2+cos*s2
		cos, sin = cos*dc-sin*ds, sin*dc+cos*ds
	}
	return end
}

// sumAngles adds the sums of cos(k*angle) and sin(k*angle), k = 0 to 2*Orders,
// over n rows whose angles start at that of first, advance by that of step and
// end before last: geometric series, e^(jk*angle) summed is
// (e^(jk*last) - e^(jk*first)) / (e^(jk*step) - 1).
func sumAngles(n int, first, step complex128, last float64, c, s *[2*Orders + 1]float64) {
	sin, cos := math.Sincos(last)
	end := complex(cos, sin)
	c[0] += float64(n)
	e, f, d := end, first, step
	for k := 1; k <= 2*Orders; k++ {
		sum := (e - f) / (d - 1)
		c[k] += real(sum)
		s[k] += imag(sum)
		e, f, d = e*end, f*first, d*step
	}
}

// project returns the products of a channel's samples, the first of which is
// x[0], with the columns of the fit.
func (f *fitter) project(x []float32) (y [unknowns]float64) {
	stride, at := f.buf.stride, 0
	var k, c1, s1, c2, s2, c3, s3 float64
	for i := range f.table {
		t := &f.table[i]
		v := float64(x[at])
		at += stride
		k += v
		c1 += v * t.c1
		s1 += v * t.s1
		c2 += v * t.c2
		s2 += v * t.s2
		c3 += v * t.c3
		s3 += v * t.s3
	}
	return [unknowns]float64{k, c1, s1, c2, s2, c3, s3}
}
