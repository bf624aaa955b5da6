package dsp

import (
	"math"
	"math/cmplx"
)

// band measures the velocity of every point in the band of the standards: a
// high pass of fourth order, of which one order integrates the acceleration.
// It is free of the orders' fit, so that it also counts what does not turn
// with the shaft.
type band struct {
	stride int
	rate   float64
	corner float64
	// Coefficients of the two second-order sections, common to all points.
	a1, a2, b1, b2 float64
	gain           float64
	chain          []chain
	settle         int64 // rows to pass before the output counts
	rows           int64 // rows counted in the power
	seen           int64 // rows looked at for the extremes
}

// chain is the state and the sums of one point.
type chain struct {
	channel            int
	x1, x2, w1, w2, w3 float64
	u1, u2             float64
	power              float64
	low, high          float64 // extreme samples, volts
	limit              float64 // full scale of the chain, volts
	atLimit            int     // samples at or beyond it
}

// Lower ends of the band, Hz: 10 Hz, and 2 Hz below 600 r/min (ISO 20816-3,
// from memory). The corner lies lower, so that the response at the end of the
// band is 0.93 and at a quarter of it below 0.01, within the tolerance of
// ISO 2954 (from memory); what the filter takes off the orders is put back
// exactly.
const (
	bandLow      = 10.0
	bandLowSlow  = 2.0
	slowRPM      = 600.0
	bandHigh     = 1000.0
	cornerShare  = 0.8
	settlePeriod = 3.0 // of the corner
)

// The quality factors of a fourth-order Butterworth high pass.
var butterworth4 = [2]float64{0.541196100146197, 1.306562964876377}

func newBand(cfg *Config) *band {
	b := &band{stride: cfg.Channels, rate: cfg.RateHz, corner: cornerShare * bandLow}
	if cfg.RatedRPM > 0 && cfg.RatedRPM < slowRPM {
		b.corner = cornerShare * bandLowSlow
	}
	// Bilinear transform with the corner prewarped.
	k := math.Tan(math.Pi * b.corner / b.rate)
	section := func(q float64) (g, a1, a2 float64) {
		g = 1 / (1 + k/q + k*k)
		return g, 2 * (k*k - 1) * g, (1 - k/q + k*k) * g
	}
	var g1, g2 float64
	g1, b.a1, b.a2 = section(butterworth4[0])
	g2, b.b1, b.b2 = section(butterworth4[1])
	b.gain = g1 * g2 / b.rate
	for _, p := range cfg.Points {
		c := chain{channel: p.Channel, limit: p.FullScaleV}
		if c.limit == 0 {
			c.limit = math.Inf(1)
		}
		b.chain = append(b.chain, c)
	}
	b.restart()
	b.clear()
	return b
}

// restart lets the filter settle anew, after a gap.
func (b *band) restart() {
	for i := range b.chain {
		c := &b.chain[i]
		c.x1, c.x2, c.w1, c.w2, c.w3, c.u1, c.u2 = 0, 0, 0, 0, 0, 0, 0
	}
	b.settle = int64(settlePeriod * b.rate / b.corner)
}

// clear starts the sums anew, at a minute's end.
func (b *band) clear() {
	b.rows, b.seen = 0, 0
	for i := range b.chain {
		c := &b.chain[i]
		c.power, c.low, c.high, c.atLimit = 0, math.Inf(1), math.Inf(-1), 0
	}
}

// Weights of the last stage's numerator: (1-z)(c + (1-2c)z + c z^2), where the
// bracket with c = 1/24 makes the response of 1/(1-z) follow 1/frequency (its
// error is 0.8 % at a fifth and 12 % at two fifths of the sample rate).
const (
	outer = 1.0 / 24
	inner = 1 - 3*outer
)

// push filters rows of samples.
func (b *band) push(volts []float32) {
	n := int64(len(volts) / b.stride)
	b.seen += n
	skip := min(n, b.settle)
	if skip > 0 {
		if b.settle == int64(settlePeriod*b.rate/b.corner) {
			b.preset(volts)
		}
		b.settle -= skip
		for i := range b.chain {
			c := &b.chain[i]
			power := c.power
			b.run(c, volts[:int(skip)*b.stride])
			c.power = power
		}
		volts = volts[int(skip)*b.stride:]
	}
	b.rows += n - skip
	for i := range b.chain {
		b.run(&b.chain[i], volts)
	}
}

// preset makes the first sample the level before it, so that a bias does not
// ring.
func (b *band) preset(volts []float32) {
	for i := range b.chain {
		c := &b.chain[i]
		c.x1 = float64(volts[c.channel])
		c.x2 = c.x1
	}
}

func (b *band) run(c *chain, volts []float32) {
	x1, x2, w1, w2, w3, u1, u2 := c.x1, c.x2, c.w1, c.w2, c.w3, c.u1, c.u2
	power, low, high := c.power, c.low, c.high
	a1, a2, b1, b2 := b.a1, b.a2, b.b1, b.b2
	for at := c.channel; at < len(volts); at += b.stride {
		x := float64(volts[at])
		if x < low {
			low = x
		}
		if x > high {
			high = x
		}
		w := x - 2*x1 + x2 - a1*w1 - a2*w2
		u := outer*(w-w3) + inner*(w1-w2) - b1*u1 - b2*u2
		power += u * u
		x2, x1 = x1, x
		w3, w2, w1 = w2, w1, w
		u2, u1 = u1, u
	}
	c.x1, c.x2, c.w1, c.w2, c.w3, c.u1, c.u2 = x1, x2, w1, w2, w3, u1, u2
	c.power, c.low, c.high = power, low, high
	if high >= c.limit || low <= -c.limit {
		b.count(c, volts)
	}
}

// count adds the samples at the end of the chain's range. It runs only in
// minutes in which there are any.
func (b *band) count(c *chain, volts []float32) {
	for at := c.channel; at < len(volts); at += b.stride {
		if math.Abs(float64(volts[at])) >= c.limit {
			c.atLimit++
		}
	}
}

// meanSquare returns a point's mean square of the filtered, integrated signal,
// (volts*seconds) squared.
func (b *band) meanSquare(point int) float64 {
	if b.rows == 0 {
		return 0
	}
	return b.chain[point].power * b.gain * b.gain / float64(b.rows)
}

// response returns the amplitude response of the chain from acceleration to
// velocity against the ideal, at hz: 1 in the middle of the band.
func (b *band) response(hz float64) float64 {
	z := cmplx.Rect(1, -2*math.Pi*hz/b.rate)
	num := (1 - 2*z + z*z) * (complex(outer, 0)*(1-z*z*z) + complex(inner, 0)*(z-z*z))
	den := (1 + complex(b.a1, 0)*z + complex(b.a2, 0)*z*z) * (1 + complex(b.b1, 0)*z + complex(b.b2, 0)*z*z)
	return cmplx.Abs(num/den) * b.gain * 2 * math.Pi * hz
}
