package dsp

import (
	"math"
	"math/cmplx"
)

// band measures the velocity of every point in the band of the standards: a
// high pass of third order, of which one order integrates the acceleration.
// It is free of the orders' fit, so that it also counts what does not turn
// with the shaft.
type band struct {
	stride int
	rate   float64
	low    float64 // lower end of the band, Hz
	// Coefficients of the sections of second and first order, common to all
	// points.
	a1, a2, b1 float64
	gain       float64
	chain      []chain
	begun      bool  // since the last restart
	settle     int64 // rows to pass before the output counts
	rows       int64 // rows counted in the power
	seen       int64 // rows looked at for the extremes
}

// chain is the state and the sums of one point.
type chain struct {
	channel   int
	s1, s2    float64 // state of the first section
	r1, r2    float64 // state of the second
	power     float64
	hold      float64 // the power while the filter settles
	low, high float64 // extreme samples, volts
	limit     float64 // full scale of the chain, volts
	atLimit   int     // samples at or beyond it
}

// Lower ends of the band, Hz: 10 Hz, and 2 Hz below 600 r/min (ISO 20816-3,
// from memory). The corner lies lower, so that the response is 0.85 at the end
// of the band, 0.2 at half and 0.025 at a quarter of it, the tolerance of
// ISO 2954 (from memory). What the filter takes off the orders is put back.
const (
	bandLow      = 10.0
	bandLowSlow  = 2.0
	slowRPM      = 600.0
	bandHigh     = 1000.0
	cornerShare  = 0.85
	slowMargin   = 0.02 // so that a speed near slowRPM does not go to and fro
	settlePeriod = 3.0  // of the corner
)

func newBand(cfg *Config) *band {
	b := &band{stride: cfg.Channels, rate: cfg.RateHz}
	for _, p := range cfg.Points {
		c := chain{channel: p.Channel, limit: p.FullScaleV}
		if c.limit == 0 {
			c.limit = math.Inf(1)
		}
		b.chain = append(b.chain, c)
	}
	b.clear()
	low := bandLow
	if cfg.RatedRPM > 0 && cfg.RatedRPM < slowRPM {
		low = bandLowSlow
	}
	b.begin(low)
	return b
}

// begin sets the lower end of the band, Hz, and what was measured aside.
func (b *band) begin(low float64) {
	b.low = low
	// Third-order Butterworth high pass, (s^2/(s^2+s+1)) * (s/(s+1)), by the
	// bilinear transform with the corner prewarped. In place of the last s
	// stands the differentiator that is left of it after integration.
	k := math.Tan(math.Pi * cornerShare * low / b.rate)
	g1 := 1 / (1 + k + k*k)
	b.a1, b.a2 = 2*(k*k-1)*g1, (1-k+k*k)*g1
	g2 := 1 / (1 + k)
	b.b1 = (k - 1) * g2
	b.gain = g1 * g2 / b.rate * outer
	b.rows = 0
	for i := range b.chain {
		b.chain[i].power = 0
	}
	b.restart()
}

// follow goes over to the band for a speed, r/min. The minute in which that
// happens is measured from there on.
func (b *band) follow(rpm float64) {
	switch {
	case b.low == bandLow && rpm < slowRPM*(1-slowMargin):
		b.begin(bandLowSlow)
	case b.low == bandLowSlow && rpm > slowRPM*(1+slowMargin):
		b.begin(bandLow)
	}
}

// restart lets the filter settle anew, after a gap.
func (b *band) restart() {
	for i := range b.chain {
		c := &b.chain[i]
		c.s1, c.s2, c.r1, c.r2 = 0, 0, 0, 0
	}
	b.settle = int64(settlePeriod * b.rate / (cornerShare * b.low))
	b.begun = false
}

// clear starts the sums anew, at a minute's end.
func (b *band) clear() {
	b.rows, b.seen = 0, 0
	for i := range b.chain {
		c := &b.chain[i]
		c.power, c.low, c.high, c.atLimit = 0, math.Inf(1), math.Inf(-1), 0
	}
}

// The last stage's numerator is a three-point weight, 1/24 outside and 22/24 in
// the middle, which makes the response of 1/(1-z) follow 1/frequency: its error
// is 0.8 % at a fifth and 12 % at two fifths of the sample rate. The outer
// weight is taken into the gain.
const (
	outer = 1.0 / 24
	ratio = 22.0
)

// push filters rows of samples.
func (b *band) push(volts []float32) {
	n := int64(len(volts) / b.stride)
	if n == 0 {
		return
	}
	b.seen += n
	if skip := min(n, b.settle); skip > 0 {
		if !b.begun {
			b.preset(volts)
		}
		head := volts[:int(skip)*b.stride]
		for i := range b.chain {
			b.chain[i].hold = b.chain[i].power
		}
		b.run(head)
		for i := range b.chain {
			b.chain[i].power = b.chain[i].hold
		}
		b.count(head)
		b.settle -= skip
		n -= skip
		volts = volts[len(head):]
	}
	b.rows += n
	b.run(volts)
	b.count(volts)
}

// preset puts the first section into the state that a steady signal of the
// first sample's level leaves, so that a bias does not ring.
func (b *band) preset(volts []float32) {
	b.begun = true
	for i := range b.chain {
		c := &b.chain[i]
		x := float64(volts[c.channel])
		c.s1, c.s2 = -x, x
	}
}

// run filters rows, all points of a row together: their recurrences are
// independent and run side by side in the processor.
func (b *band) run(volts []float32) {
	a1, a2, b1 := b.a1, b.a2, b.b1
	for at := 0; at+b.stride <= len(volts); at += b.stride {
		row := volts[at : at+b.stride]
		for i := range b.chain {
			c := &b.chain[i]
			x := float64(row[c.channel])
			if x < c.low {
				c.low = x
			}
			if x > c.high {
				c.high = x
			}
			w := x + c.s1
			c.s1 = c.s2 - (x + x) - a1*w
			c.s2 = x - a2*w
			u := w + c.r1
			c.r1 = ratio*w + c.r2 - b1*u
			c.r2 = w
			c.power += u * u
		}
	}
}

// count adds the samples at the end of a chain's range. It looks closely only
// in minutes in which there are any.
func (b *band) count(volts []float32) {
	for i := range b.chain {
		c := &b.chain[i]
		if c.high < c.limit && c.low > -c.limit {
			continue
		}
		for at := c.channel; at < len(volts); at += b.stride {
			if math.Abs(float64(volts[at])) >= c.limit {
				c.atLimit++
			}
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
	num := (1 - 2*z + z*z) * (1 + complex(ratio, 0)*z + z*z)
	den := (1 + complex(b.a1, 0)*z + complex(b.a2, 0)*z*z) * (1 + complex(b.b1, 0)*z)
	return cmplx.Abs(num/den) * b.gain * 2 * math.Pi * hz
}
