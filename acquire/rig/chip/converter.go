package chip

import "math"

const (
	// reference is the internal reference: full scale at gain 1, volts.
	reference = 1.2
	codeMax   = 0x7FFFFF
	codeMin   = -0x800000
	// testSignal is the multiplexer's DC test signal as a part of full scale.
	testSignal = 2.0 / 15

	ringRows = 256 // more than the longest kernel, 144 units
)

// row holds one value of each channel.
type row [channels]float64

// converter is the analogue side: what the inputs carry, the modulator seen
// as a mean over short units, and the decimation filter.
type converter struct {
	signal Signal
	step   int // modulator periods of a step of the signal
	volts  [channels]float32

	unit    int // modulator periods of a unit, the step or less
	left    int // units left of the present step
	weights []float64
	perOut  int // units between conversions
	toOut   int // units until the next conversion
	ring    [ringRows]row
	at      int // where the next unit goes

	restart bool // start anew at the next step
	fast    int  // samples still to come from the fast path after a reset
	block   row  // state of the DC block
	osr     int
	sd      row // noise of a sample as a part of full scale, rms
}

func (v *converter) init(s Signal, step int) {
	v.signal, v.step, v.unit = s, step, step
}

// begin makes the filter what osr asks for, empty.
func (v *converter) begin(osr int) {
	v.restart = false
	if osr != v.osr {
		v.osr = osr
		v.unit = min(v.step, osr)
		v.weights = kernel(osr, v.unit)
		v.perOut = osr / v.unit
	}
	v.toOut = v.perOut
	v.ring = [ringRows]row{}
	v.block = row{}
}

// unitStep lets one unit of time pass and says whether a conversion is done.
func (c *Chip) unitStep() bool {
	v := &c.conv
	if v.left == 0 {
		v.left = v.step / v.unit
		v.signal.Next(v.volts[:v.signal.Channels()])
	}
	v.left--
	if v.restart {
		if v.left == 0 {
			v.begin(c.regs.osr())
			c.setNoise()
		}
		return false
	}
	if c.standby || c.regs.enabled() == 0 {
		return false
	}
	c.modulate(&v.ring[v.at])
	v.at = (v.at + 1) % ringRows
	v.toOut--
	if v.toOut > 0 {
		return false
	}
	v.toOut = v.perOut
	return true
}

// setNoise computes the noise of every channel for its gain and the present rate.
func (c *Chip) setNoise() {
	for ch := range c.conv.sd {
		gain := c.regs.gain(ch)
		c.conv.sd[ch] = noise(gain, c.conv.osr) * float64(gain) / reference
	}
}

// modulate writes the inputs as parts of full scale.
func (c *Chip) modulate(x *row) {
	on := c.regs.enabled()
	for ch := range x {
		x[ch] = 0
		if on>>ch&1 == 0 {
			continue
		}
		switch c.regs.channel(ch, ofsCfg) & 3 {
		case 0:
			x[ch] = float64(c.conv.volts[ch]) * float64(c.regs.gain(ch)) / reference
		case 2:
			x[ch] = testSignal
		case 3:
			x[ch] = -testSignal
		}
	}
}

// convert returns the codes of the conversion that is now complete.
func (c *Chip) convert() sample {
	v := &c.conv
	fast := v.fast > 0
	x := v.filter(fast)
	if fast {
		v.fast--
	}
	var s sample
	on := c.regs.enabled()
	for ch := range s {
		if on>>ch&1 != 0 {
			s[ch] = c.code(ch, x[ch], fast)
		}
	}
	return s
}

// filter returns the weighted sum of the latest units: the decimation filter,
// or the fast path, which is the mean over one conversion period.
func (v *converter) filter(fast bool) row {
	var x row
	if fast {
		for j := range v.perOut {
			u := &v.ring[(v.at-1-j)&(ringRows-1)]
			for ch := range x {
				x[ch] += u[ch] / float64(v.perOut)
			}
		}
		return x
	}
	for j, w := range v.weights {
		u := &v.ring[(v.at-1-j)&(ringRows-1)]
		for ch := range x {
			x[ch] += w * u[ch]
		}
	}
	return x
}

// code turns a part of full scale into the output code of channel ch: noise,
// DC block, calibration, clipping.
func (c *Chip) code(ch int, x float64, fast bool) int32 {
	if !c.opts.Quiet {
		sd := c.conv.sd[ch]
		if fast {
			sd = startNoise / reference
		}
		x += c.rnd.NormFloat64() * sd
	}
	x = c.blockDC(ch, x)
	code := int64(math.RoundToEven(x * (1 << 23)))
	code = (code - int64(c.regs.offset(ch))) * c.regs.gainCal(ch) >> 23
	return int32(min(max(code, codeMin), codeMax))
}

// blockDC is the first-order high pass of table 8-4: the coefficient of code
// n is 2^-(n+1), which gives that table's corner of 1.24 Hz for code 8 at
// 4 kSPS. Code 0 and the channel's own bit switch it off.
func (c *Chip) blockDC(ch int, x float64) float64 {
	n := c.regs[regThLSB] & 0xF
	if n == 0 || c.regs.channel(ch, ofsCfg)&4 != 0 {
		return x
	}
	y := x - c.conv.block[ch]
	c.conv.block[ch] += y * math.Ldexp(1, -int(n)-1)
	return y
}
