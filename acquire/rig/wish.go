package rig

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
)

// Wish is what is not left to chance in a machine.
type Wish struct {
	// RPM is the running speed, r/min; zero leaves it open.
	RPM float64
	// MMS is the worst radial 1x by the main cause, mm/s rms; zero leaves it open.
	MMS float64
	// NoiseMMS is the broad-band velocity at the worst radial point, mm/s rms, that
	// the flow causes; zero leaves it open.
	NoiseMMS float64
	// Overhung and CounterClockwise always hold.
	Overhung, CounterClockwise bool
}

// RandomLike draws a machine as Random does but for what is wished. It returns an
// error for a kind that does not go with the rotor, or a wish out of range.
func RandomLike(k Kind, w Wish, r *rand.Rand) (Case, error) {
	if k >= kinds {
		return Case{}, fmt.Errorf("rig: there is no %v", k)
	}
	if w.RPM != 0 && !(w.RPM >= 60 && w.RPM <= 6000) {
		return Case{}, fmt.Errorf("rig: speed is %g r/min, allowed are 60 to 6000", w.RPM)
	}
	if !(w.MMS >= 0 && w.MMS <= 100) || !(w.NoiseMMS >= 0 && w.NoiseMMS <= 100) {
		return Case{}, fmt.Errorf("rig: 1x is %g and noise %g mm/s rms, allowed are 0 to 100", w.MMS, w.NoiseMMS)
	}
	switch k {
	case Static, Couple, Dynamic, BentShaft, Misaligned, Resonant:
		if w.Overhung {
			return Case{}, fmt.Errorf("rig: %v is drawn only for a rotor between bearings", k)
		}
	case OverhungRotor:
		if !w.Overhung {
			return Case{}, fmt.Errorf("rig: %v needs an overhung rotor", k)
		}
	}
	return drawUntil(k, &w, r)
}

// obeyLevels replaces what was drawn by what is wished.
func (d *draw) obeyLevels() {
	if d.wish.RPM > 0 {
		d.c.Drive.RPM = d.wish.RPM
	}
	if d.wish.MMS > 0 {
		d.severity = d.wish.MMS
	}
}

// setFlow gives the flow the force that causes a velocity of level mm/s rms at the worst
// radial sensor: the force's spectrum times the squared response, summed over frequency.
func setFlow(c *Config, level float64) error {
	// Half-power bands are at least 0.04 of their frequency wide; the step resolves them.
	const from, to, ratio = 1.0, 1500.0, 1.01 // Hz
	m := assemble(c)
	corner := 2 * math.Pi * c.Faults.Flow.CornerHz
	square := make([]float64, len(c.Sensors)) // (m/s)^2 for 1 N
	for hz := from; hz < to; hz *= ratio {
		w := 2 * math.Pi * hz
		// One-sided spectrum in Hz of an exponentially correlated force of variance 1.
		density := 4 / corner / (1 + w*w/corner/corner)
		for i := rotorV; i <= rotorA; i++ {
			var f phasor
			f[i] = 1
			q, err := respond(m, f, w, c.Drive.RPM*rpm)
			if err != nil {
				return err
			}
			for s, x := range c.Sensors {
				v := w * cmplx.Abs(q[housing(x.End, x.Direction)])
				square[s] += v * v * density * hz * math.Log(ratio)
			}
		}
	}
	worst := 0.0
	for s, x := range c.Sensors {
		if x.Direction != Axial {
			worst = max(worst, math.Sqrt(square[s])*1000)
		}
	}
	c.Faults.Flow.ForceN = level / worst
	return nil
}
