package rig

import (
	"math"
	"testing"
)

// TestRunDownFollowsItsLaw: dr/dt = -(a r^2 + b) with r the speed over rated has the
// solution r = sqrt(b/a) tan(atan(sqrt(a/b)) - sqrt(a b) t).
func TestRunDownFollowsItsLaw(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Drive.WindageRPMPerS, c.Drive.FrictionRPMPerS = 148, 37 // a = 0.1/s, b = 0.025/s
	m := start(t, c)
	m.Trip()
	const a, b = 0.1, 0.025
	for s := 5.0; s <= 20; s += 5 {
		skip(m, 5)
		want := max(0, math.Sqrt(b/a)*math.Tan(math.Atan(math.Sqrt(a/b))-math.Sqrt(a*b)*s))
		near(t, "speed over rated", m.RPM()/1480, want, 1e-6)
	}
	skip(m, 10)
	if m.RPM() != 0 {
		t.Errorf("%g r/min long after the stop, want 0", m.RPM())
	}
}

// TestStandstill: nothing moves and the pulse stays as it is.
func TestStandstill(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Unbalances = []Unbalance{{KgM: 0.1, PositionM: 1}}
	c.Drive.Stopped = true
	m := start(t, c)
	dst := make([]float32, m.Channels())
	for range 1000 {
		m.Next(dst)
		for ch, v := range dst {
			if want := float32(0); ch != 6 && v != want {
				t.Fatalf("channel %d carries %g V at standstill", ch, v)
			}
		}
		if dst[6] != 1 {
			t.Fatalf("the mark stands under the pick-up but the pulse is %g V", dst[6])
		}
	}
	m.Start()
	skip(m, 10)
	near(t, "r/min after 10 s of a ramp of 60 r/min per s", m.RPM(), 600, 1e-6)
	skip(m, 40)
	near(t, "running speed", m.RPM(), 1480, 1e-3)
	if err := m.SetSpeed(1000); err != nil {
		t.Fatal(err)
	}
	skip(m, 25)
	near(t, "reduced speed", m.RPM(), 1000, 1e-3)
	for _, bad := range []float64{0, -5, 5000, math.NaN()} {
		if err := m.SetSpeed(bad); err == nil {
			t.Errorf("speed %g: want an error", bad)
		}
	}
}

// TestRunDownPassesTheResonance: a machine above its critical speed
// shows a larger 1x on its way down than running.
func TestRunDownPassesTheResonance(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	for e := range c.Supports {
		c.Supports[e].V.K, c.Supports[e].H.K = 4e6, 4e6
		c.Supports[e].V.C, c.Supports[e].H.C = 6e3, 6e3
	}
	c.Unbalances = []Unbalance{{KgM: 0.1, PositionM: 0.9}}
	c.Drive.WindageRPMPerS = 100
	list, err := c.NaturalRPM(1480)
	if err != nil {
		t.Fatal(err)
	}
	m := start(t, c)
	running := observe(m, 1)[0].rms
	m.Trip()
	peak, at := 0.0, 0.0
	for m.RPM() > 300 {
		now := observe(m, 0.2)[0].rms
		if now > peak {
			peak, at = now, m.RPM()
		}
	}
	if peak < 2*running {
		t.Errorf("peak %.2f mm/s in the run-down, %.2f running: no resonance passed", peak, running)
	}
	if clearOf(list, at) > 0.05 {
		t.Errorf("peak at %.0f r/min, natural frequencies are %.0f", at, list)
	}
}

// TestWander: the speed keeps near its mean with the spread that slip and load give.
func TestWander(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Drive.Slip, c.Drive.LoadWander, c.Drive.WanderS, c.Drive.FollowS = 0.02, 0.2, 1, 0.05
	m := start(t, c)
	sum, square := 0.0, 0.0
	const n = 2000
	for range n {
		skip(m, 0.02)
		d := m.RPM() - 1480
		sum += d
		square += d * d
	}
	// 1480/0.98*0.02*0.2 = 6.04 r/min; 40 s hold about 20 independent values.
	sd := math.Sqrt(square / n)
	if sd < 3.5 || sd > 8.5 || math.Abs(sum/n) > 5 {
		t.Errorf("speed is %.2f r/min off with %.2f, want 0 with 6.0", sum/n, sd)
	}
}
