package rig

import (
	"math"
	"testing"
	"time"
)

// quietPhasors is a prescribed 1x of 5 mm/s at 30 degrees seen by one sensor.
func quietPhasors(t *testing.T, s Sensor) *Phasors {
	t.Helper()
	s.Channel = 1
	p, err := NewPhasors(PhasorConfig{
		Law: SpeedLaw{RPM: 600}, Sensors: []Sensor{s}, Orders: [][maxOrder]Vector{{{5, 30}}},
	}, 1)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// TestVoltsOfAKnownVelocity: 5 mm/s rms at 10 Hz is an acceleration of
// 5e-3*2*pi*10 = 0.3142 m/s2 rms, hence 0.003203 V rms at 0.1 V/g.
func TestVoltsOfAKnownVelocity(t *testing.T) {
	for _, inverted := range []bool{false, true} {
		x, src := record(t, quietPhasors(t, Sensor{VoltsPerG: 0.1, Inverted: inverted, BiasV: 0.2}), Sampling{RateHz: 1000, Smooth: 1, Duration: 2 * time.Second}, 1)
		sum, square := 0.0, 0.0
		for _, v := range x {
			sum += v
			square += (v - 0.2) * (v - 0.2)
		}
		near(t, "bias", sum/float64(len(x)), 0.2, 1e-6)
		near(t, "rms", math.Sqrt(square/float64(len(x)))/src.Format().Gain(10), 0.1*5e-3*2*math.Pi*10/9.80665, 2e-8)
		// The velocity peaks at 30 degrees and so the acceleration at -60.
		best, at := 0.0, 0
		for i, v := range x[:100] {
			if s := v - 0.2; !inverted && s > best || inverted && -s > best {
				best, at = math.Abs(s), i
			}
		}
		peak := (src.Delay() + float64(at)/1000) * 3600
		if apart(peak, -60) > 2 {
			t.Errorf("inverted %v: acceleration peaks at %.1f degrees, want -60", inverted, peak)
		}
	}
}

// TestHighPass: a first-order high pass of corner f0 has the gain
// 1/sqrt(1+(f0/f)^2) and leads by atan(f0/f).
func TestHighPass(t *testing.T) {
	for _, corner := range []float64{0.5, 2, 10} {
		p := quietPhasors(t, Sensor{VoltsPerG: 0.1, HighpassHz: corner})
		x, src := record(t, p, Sampling{RateHz: 1000, Smooth: 3, Duration: 12 * time.Second}, 1)
		tail := x[8000:] // the start has died: exp(-2 pi 0.5 8) = 1e-11
		got := fitOrders(t, tail, 20*math.Pi, func(i int) float64 { return 20 * math.Pi * (src.Delay() + 8 + float64(i)/1000) }, src.Format().Gain)
		lead := math.Atan(corner/10) * 180 / math.Pi
		same(t, "high pass", got[0], Vector{5 / math.Hypot(1, corner/10), 30 - lead}, 1e-4, 0.01)
	}
}

// TestNoiseDensity: density d over the band to half the rate is d*sqrt(rate/2).
func TestNoiseDensity(t *testing.T) {
	x, _ := record(t, quietPhasors(t, Sensor{VoltsPerG: 1e-9, NoiseV: 1e-4}), Sampling{RateHz: 1000, Smooth: 1, Duration: 30 * time.Second}, 1)
	square := 0.0
	for _, v := range x {
		square += v * v
	}
	near(t, "noise", math.Sqrt(square/float64(len(x)))/(1e-4*math.Sqrt(500)), 1, 0.02)
}

func TestClippingAndFailures(t *testing.T) {
	for _, c := range []struct {
		s               Sensor
		lowest, highest float64
	}{
		{Sensor{VoltsPerG: 10, ClipV: 0.3}, -0.3, 0.3},
		{Sensor{VoltsPerG: 10, ClipV: 0.3, BiasV: 0.25}, -0.203, 0.3},
		{Sensor{VoltsPerG: 10, Failure: Flat, BiasV: 0.1, NoiseV: 1e-4}, 0.1, 0.1},
		{Sensor{VoltsPerG: 10, Failure: Shorted, BiasV: 0.1}, 0, 0},
		{Sensor{VoltsPerG: 10, Failure: Open, ClipV: 0.9}, 0.9, 0.9},
		{Sensor{VoltsPerG: 10, Failure: Open}, 1.2, 1.2},
	} {
		x, _ := record(t, quietPhasors(t, c.s), Sampling{RateHz: 1000, Duration: time.Second}, 1)
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, v := range x {
			lo, hi = min(lo, v), max(hi, v)
		}
		near(t, "lowest volts", lo, c.lowest, 1e-3)
		near(t, "highest volts", hi, c.highest, 1e-6)
	}
}

func TestSensorsChangeWhileRunning(t *testing.T) {
	c := fan()
	c.Unbalances = []Unbalance{{KgM: 0.1, PositionM: 1}}
	m := start(t, c)
	dst := make([]float32, m.Channels())
	if err := m.SetSensor(1, func(s *Sensor) { s.Failure = Flat; s.BiasV = 0.3; s.Channel = 5 }); err != nil {
		t.Fatal(err)
	}
	for range 100 {
		if m.Next(dst); dst[1] != 0.3 {
			t.Fatalf("flat channel carries %g V, want 0.3", dst[1])
		}
	}
	if err := m.SetSensor(6, func(*Sensor) {}); err == nil {
		t.Error("sensor 6 of six: want an error")
	}
	if err := m.SetSensor(0, func(s *Sensor) { s.VoltsPerG = -1 }); err == nil {
		t.Error("negative sensitivity: want an error")
	}
}

// TestNeighbour: the neighbour's line stands at its own speed with its amplitude at
// each sensor, and a change of it makes no jump.
func TestNeighbour(t *testing.T) {
	c := fan()
	n := Neighbour{RPM: 1440}
	for i := range c.Sensors {
		n.Velocity = append(n.Velocity, Vector{RMS: 1 + float64(i), Lag: 50 * float64(i)})
	}
	c.Faults.Neighbours = []Neighbour{n}
	for ch := range c.Sensors {
		x, src := record(t, start(t, c), Sampling{RateHz: 1000, Smooth: 3, Duration: 2 * time.Second}, ch)
		w := 1440 * rpm
		got := fitOrders(t, x, w, func(i int) float64 { return w * (src.Delay() + float64(i)/1000) }, src.Format().Gain)
		same(t, "neighbour", got[0], n.Velocity[ch], 1e-4, 0.01)
	}
	m := start(t, c)
	dst := make([]float32, m.Channels())
	top := float32(0)
	for i := range 8000 {
		if i == 4037 {
			if err := m.Update(func(f *Faults) { f.Neighbours[0].Velocity[5].RMS = 3 }); err != nil {
				t.Fatal(err)
			}
		}
		m.Next(dst)
		top = max(top, dst[5], -dst[5])
	}
	// 6 mm/s rms at 24 Hz is 1.28 m/s2 peak, 0.01305 V.
	near(t, "greatest volts over a change", float64(top), 0.1*6e-3*math.Sqrt2*1440*rpm/9.80665, 1e-5)
}
