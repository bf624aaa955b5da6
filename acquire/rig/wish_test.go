package rig

import (
	"math"
	"testing"
)

func TestWishesAreGranted(t *testing.T) {
	for _, k := range Kinds() {
		for _, ccw := range []bool{false, true} {
			w := Wish{RPM: 987, MMS: 6, NoiseMMS: 0.5, Overhung: k == OverhungRotor, CounterClockwise: ccw}
			c, err := RandomLike(k, w, newRand(3))
			if err != nil {
				t.Fatal(err)
			}
			if c.Kind != k || c.Config.Drive.RPM != 987 || c.Config.Rotor.CounterClockwise != ccw || c.Overhung != w.Overhung {
				t.Errorf("%v: got %v at %g r/min, counter-clockwise %v, overhung %v", k, c.Kind, c.Config.Drive.RPM, c.Config.Rotor.CounterClockwise, c.Overhung)
			}
			// A fifth of other unbalance may add to or take from the main cause.
			near(t, k.String()+": worst 1x", worst(c.Points, 1, false), 6, 1.5)
		}
	}
}

// TestNoiseIsAsWished measures the flow's velocity in time against its prediction from
// the spectrum.
func TestNoiseIsAsWished(t *testing.T) {
	oneGoroutine(t)
	for _, k := range []Kind{Static, OverhungRotor} {
		c, err := RandomLike(k, Wish{RPM: 1500, MMS: 5, NoiseMMS: 0.8, Overhung: k == OverhungRotor}, newRand(8))
		if err != nil {
			t.Fatal(err)
		}
		c.Config.Unbalances, c.Config.Faults.Misalignment = nil, Misalignment{}
		level := 0.0
		for i, o := range observe(start(t, c.Config), 20) {
			if c.Points[i].Direction != Axial {
				level = math.Max(level, o.rms)
			}
		}
		near(t, k.String()+": noise, mm/s", level, 0.8, 0.08)
	}
}

func TestImpossibleWishes(t *testing.T) {
	for name, w := range map[string]struct {
		k Kind
		w Wish
	}{
		"no kind":          {kinds, Wish{}},
		"overhung static":  {Static, Wish{Overhung: true}},
		"overhung between": {OverhungRotor, Wish{}},
		"speed":            {Quiet, Wish{RPM: 10}},
		"no number":        {Quiet, Wish{RPM: math.NaN()}},
		"level":            {Quiet, Wish{MMS: -1}},
		"noise":            {Quiet, Wish{NoiseMMS: math.Inf(1)}},
	} {
		if _, err := RandomLike(w.k, w.w, newRand(1)); err == nil {
			t.Errorf("%s: want an error", name)
		}
	}
}
