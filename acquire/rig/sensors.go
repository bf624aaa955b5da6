package rig

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// standardGravity in m/s2, by definition.
const standardGravity = 9.80665

// Failure is what a broken sensor chain delivers.
type Failure uint8

// The failures.
const (
	// Sound: the chain works.
	Sound Failure = iota
	// Flat: the bias alone, without signal or noise.
	Flat
	// Shorted: 0 V.
	Shorted
	// Open: the input floats to the rail, ClipV, or 1.2 V when that is zero.
	Open
)

// Sensor is an accelerometer on a bearing housing and its chain.
type Sensor struct {
	// Name is for messages.
	Name      string
	End       End
	Direction Direction
	// Channel is the converter's input, from 0.
	Channel int
	// VoltsPerG is the sensitivity, V per standard gravity.
	VoltsPerG float64
	// Inverted is true when the sensor points against the machine axis.
	Inverted bool
	// HighpassHz is the corner of the chain's first-order high pass; zero means none.
	HighpassHz float64
	// NoiseV is the density of the sensor's white noise, V per root hertz.
	NoiseV float64
	// BiasV is the offset behind the high pass, and DriftV the standard
	// deviation of its slow random change (correlation time 300 s), V.
	BiasV, DriftV float64
	// ClipV is the rail: the signal is cut at +ClipV and -ClipV. Zero means none.
	ClipV float64
	// Failure is what has broken.
	Failure Failure
}

// chain turns the mean acceleration of a step into volts.
type chain struct {
	Sensor
	volts, sigma float64
	// The high pass is y = gain*(x - x1) + keep*y1, the bilinear form.
	gain, keep, x1, y1 float64
	drift              wander
}

// newChain prepares a sensor's chain for steps of 1/stepHz.
func newChain(s Sensor, stepHz float64) (*chain, error) {
	if !(s.VoltsPerG > 0) {
		return nil, fmt.Errorf("rig: sensor %q: volts per g is %g, must be above 0", s.Name, s.VoltsPerG)
	}
	if s.HighpassHz < 0 || s.HighpassHz > stepHz/20 {
		return nil, fmt.Errorf("rig: sensor %q: high pass at %g Hz, allowed are 0 to %g", s.Name, s.HighpassHz, stepHz/20)
	}
	if s.NoiseV < 0 || s.DriftV < 0 || s.ClipV < 0 {
		return nil, fmt.Errorf("rig: sensor %q: noise, drift and rail must not be negative", s.Name)
	}
	c := &chain{Sensor: s, gain: 1, drift: wander{sd: s.DriftV, seconds: 300}}
	c.volts = s.VoltsPerG / standardGravity
	if s.Inverted {
		c.volts = -c.volts
	}
	// White noise of density d averaged over a step has the variance d^2 * stepHz/2.
	c.sigma = s.NoiseV * math.Sqrt(stepHz/2)
	if s.HighpassHz > 0 {
		w := math.Pi * s.HighpassHz / stepHz
		c.gain, c.keep = 1/(1+w), (1-w)/(1+w)
	}
	return c, nil
}

// output returns the volts for a step with the mean acceleration a, m/s2.
func (c *chain) output(a float64, r *rand.Rand) float64 {
	x := a * c.volts
	if c.sigma > 0 {
		x += c.sigma * r.NormFloat64()
	}
	if c.HighpassHz > 0 {
		c.y1 = c.gain*(x-c.x1) + c.keep*c.y1
		c.x1 = x
		x = c.y1
	}
	x += c.BiasV + c.drift.value
	if c.ClipV > 0 {
		x = max(-c.ClipV, min(c.ClipV, x))
	}
	if c.Failure != Sound {
		x = c.broken()
	}
	return x
}

// broken returns what a failed chain delivers.
func (c *chain) broken() float64 {
	switch c.Failure {
	case Flat:
		return c.BiasV
	case Open:
		if c.ClipV > 0 {
			return c.ClipV
		}
		return 1.2
	}
	return 0
}
