package rig

import (
	"math"
	"sync"
	"testing"

	"pgregory.net/rapid"
)

// TestHeavySpotOnTop ties angles to the real rotor: far below the critical speed the
// housing is highest when the heavy spot is on top. With the pick-up on top too
// and the spot 40 degrees behind the mark, the displacement lags 40 degrees and the
// velocity, 90 degrees ahead, 310; the horizontal one follows a quarter turn later.
func TestHeavySpotOnTop(t *testing.T) {
	c := fan()
	c.Drive.RPM = 60
	c.Unbalances = []Unbalance{{KgM: 0.1, PositionM: 0.9, AngleDeg: 40}}
	for _, ccw := range []bool{false, true} {
		c.Rotor.CounterClockwise = ccw
		p, err := c.Steady(60)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "vertical lag", p[0].Order[0].Lag, 310, 0.3)
		near(t, "horizontal lag", p[1].Order[0].Lag, math.Mod(310+90*c.Rotor.sense(), 360), 0.3)
	}
}

// machines draws random machines of any kind.
func machines(t *rapid.T) Case {
	k := Kind(rapid.IntRange(0, int(kinds)-1).Draw(t, "kind"))
	return Random(k, newRand(rapid.Uint64().Draw(t, "seed")))
}

// steadyOf returns the steady response or fails.
func steadyOf(t *rapid.T, c Config) []Point {
	p, err := c.Steady(c.Drive.RPM)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// equal fails unless all orders of two responses agree after the lags of the second
// were moved by turn degrees of the shaft.
func equal(t *rapid.T, a, b []Point, turn float64, mirror bool) {
	for i := range a {
		for n := range maxOrder {
			x, y := a[i].Order[n], b[i].Order[n]
			lag := y.Lag + turn
			if mirror && a[i].Direction == Horizontal {
				lag += 180
			}
			if math.Abs(x.RMS-y.RMS) > 1e-7*(1+y.RMS) || x.RMS > 1e-6 && apart(x.Lag, lag) > 1e-3 {
				t.Fatalf("%s order %d: %v against %v, turned by %g", a[i].Name, n+1, x, y, turn)
			}
		}
	}
}

// TestTurningTheMassesTurnsTheLags: masses and bow moved on by an angle against the
// rotation, all lags grow by it.
func TestTurningTheMassesTurnsTheLags(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := machines(t).Config
		c.Faults.Misalignment, c.Faults.Pull = Misalignment{}, Pull{} // they do not turn with the shaft
		a := steadyOf(t, c)
		turn := rapid.Float64Range(-360, 360).Draw(t, "turn")
		d := c.clone()
		for i := range d.Unbalances {
			d.Unbalances[i].AngleDeg += turn
		}
		d.Faults.Bow.AngleDeg += turn
		d.Faults.LooseRotor.AngleDeg += turn
		equal(t, steadyOf(t, d), a, turn, false)
		// Moving the pick-up on with the rotation has the opposite effect.
		d.Reference.PickupDeg += turn * d.Rotor.sense()
		equal(t, steadyOf(t, d), a, 0, false)
	})
}

// TestMirror: a machine and its mirror image, turning the other way, move alike with
// horizontal reversed. It fails when a gyroscopic term has the wrong sign.
func TestMirror(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := machines(t).Config
		d := c.clone()
		d.Rotor.CounterClockwise = !d.Rotor.CounterClockwise
		d.Reference.PickupDeg *= -1
		d.Faults.Misalignment.DirectionDeg *= -1
		d.Faults.Pull.DirectionDeg *= -1
		equal(t, steadyOf(t, c), steadyOf(t, d), 0, true)
	})
}

// TestVoltsIntegrateToTheVelocity: whatever the speed does, the sum of the volts is
// the prescribed velocity.
func TestVoltsIntegrateToTheVelocity(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f := func(name string, lo, hi float64) float64 { return rapid.Float64Range(lo, hi).Draw(t, name) }
		c := PhasorConfig{
			Law:     SpeedLaw{RPM: f("rpm", 100, 4000), RPMPerS: f("rise", -40, 40), SwingRPM: f("swing", 0, 20), SwingS: f("period", 1, 60), AngleDeg: f("start", -360, 360)},
			Sensors: []Sensor{{VoltsPerG: f("sensitivity", 0.01, 1), Inverted: rapid.Bool().Draw(t, "inverted")}},
			Orders:  [][maxOrder]Vector{{{f("1x", 0, 20), f("lag1", 0, 360)}, {f("2x", 0, 5), f("lag2", 0, 360)}, {f("3x", 0, 5), f("lag3", 0, 360)}}},
		}
		p, err := NewPhasors(c, 1)
		if err != nil {
			t.Fatal(err)
		}
		velocity := func(s float64) float64 {
			v := 0.0
			for n, o := range c.Orders[0] {
				v += math.Sqrt2 * o.RMS / 1000 * math.Cos(float64(n+1)*c.Law.Angle(s)-radians(o.Lag))
			}
			return v
		}
		scale := standardGravity / c.Sensors[0].VoltsPerG
		if c.Sensors[0].Inverted {
			scale = -scale
		}
		v := velocity(0)
		dst := make([]float32, 8)
		for i := range 4000 {
			p.Next(dst)
			v += float64(dst[0]) * scale / 8000
			if want := velocity(float64(i+1) / 8000); math.Abs(v-want) > 2e-6 {
				t.Fatalf("after %d steps the velocity is %.8f m/s, want %.8f", i+1, v, want)
			}
		}
	})
}

func TestNextDoesNotAllocate(t *testing.T) {
	c := Random(Loose, newRand(3)).Config
	c.Reference.Missing, c.Reference.Extra = 0.1, 0.1
	m := start(t, c)
	dst := make([]float32, m.Channels())
	if n := testing.AllocsPerRun(2000, func() { m.Next(dst) }); n != 0 {
		t.Errorf("%g allocations a step, want none", n)
	}
}

// TestUseFromSeveralGoroutines is for the race detector.
func TestUseFromSeveralGoroutines(t *testing.T) {
	c := fan()
	m := start(t, c)
	var wg sync.WaitGroup
	wg.Go(func() {
		for i := range 50 {
			if err := m.Update(func(f *Faults) { f.Bow = MidspanBow(1e-6*float64(i), 2, 0) }); err != nil {
				t.Error(err)
			}
			if err := m.SetSensor(0, func(s *Sensor) { s.BiasV = 0.1 }); err != nil {
				t.Error(err)
			}
			if err := m.SetReference(func(r *Reference) { r.WidthDeg = 20 }); err != nil {
				t.Error(err)
			}
			m.Trip()
			m.Start()
			_, _, _ = m.RPM(), m.Seconds(), m.Config()
			if _, err := m.Steady(1000); err != nil {
				t.Error(err)
			}
		}
	})
	skip(m, 0.5)
	wg.Wait()
}

// TestStepsOfAnySize: the same machine gives the same motion at any number of steps
// per second, more or fewer than those of the integration.
func TestStepsOfAnySize(t *testing.T) {
	oneGoroutine(t)
	for _, hz := range []float64{500, 1000, 3000, 8000, 16000, 32000} {
		c := fan()
		c.Unbalances = []Unbalance{{KgM: 0.1, PositionM: 0.8}}
		c.StepHz = hz
		m := start(t, c)
		want, err := m.Steady(1480)
		if err != nil {
			t.Fatal(err)
		}
		for i, o := range observe(m, 60.0/1480*50) {
			if want[i].Order[0].RMS > 0.1 {
				same(t, "1x", o.order[1], want[i].Order[0], 0.01, 0.5)
			}
		}
	}
}
