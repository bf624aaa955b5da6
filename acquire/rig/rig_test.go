package rig

import (
	"context"
	"errors"
	"io"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"gonum.org/v1/gonum/mat"

	"heavyspot/acquire"
)

// sixSensors are V, H, A at both bearings on channels 0 to 5, noiseless.
func sixSensors() []Sensor {
	var list []Sensor
	for i, name := range []string{"de-v", "de-h", "de-a", "nde-v", "nde-h", "nde-a"} {
		list = append(list, Sensor{Name: name, End: End(i / 3), Direction: Direction(i % 3), Channel: i, VoltsPerG: 0.1})
	}
	return list
}

// fan is a quiet machine between bearings, without random changes.
func fan() Config {
	s := Support{
		BearingV: Spring{8e8, 2e4}, BearingH: Spring{8e8, 2e4}, BearingA: Spring{1e8, 5e3}, BearingTilt: Spring{2e6, 200},
		HousingKg: 60, V: Spring{3e8, 6e4}, H: Spring{2e8, 5e4}, A: Spring{1e8, 2e4}, PedestalM: 0.4,
	}
	c := Config{
		Rotor:     Rotor{MassKg: 900, PolarKgM2: 180, TransverseKgM2: 220, CentreM: 0.9},
		Supports:  [2]Support{s, s},
		Drive:     Drive{RPM: 1480, Slip: 0.01},
		Sensors:   sixSensors(),
		Reference: &Reference{Channel: 6, HighV: 1},
	}
	c.Supports[1].PositionM = 2
	c.Supports[1].V.K = 2.5e8
	return c
}

// collect reads a source to its end.
func collect(t *testing.T, s acquire.Source) []acquire.Block {
	t.Helper()
	var list []acquire.Block
	for {
		var b acquire.Block
		err := s.Read(context.Background(), &b)
		if errors.Is(err, io.EOF) {
			return list
		}
		if err != nil {
			t.Fatal(err)
		}
		list = append(list, b)
	}
}

// record returns the samples of one channel and the rate, volts.
func record(t *testing.T, sig Signal, smp Sampling, channel int) ([]float64, *Source) {
	t.Helper()
	src, err := NewSource(sig, smp)
	if err != nil {
		t.Fatal(err)
	}
	var x []float64
	for _, b := range collect(t, src) {
		for i := range b.Rows(sig.Channels()) {
			x = append(x, float64(b.Volts[i*sig.Channels()+channel]))
		}
	}
	return x, src
}

// fitOrders fits orders 1 to 3 and a constant to samples at the shaft angles
// angle(i), by least squares, and turns volts of acceleration into velocity
// vectors for a sensor of 0.1 V/g at the constant speed w, rad/s.
func fitOrders(t *testing.T, x []float64, w float64, angle func(i int) float64, gain func(hz float64) float64) [maxOrder]Vector {
	t.Helper()
	a := mat.NewDense(len(x), 2*maxOrder+1, nil)
	for i := range x {
		a.Set(i, 0, 1)
		for n := 1; n <= maxOrder; n++ {
			s, c := math.Sincos(float64(n) * angle(i))
			a.Set(i, 2*n-1, c)
			a.Set(i, 2*n, s)
		}
	}
	var z mat.VecDense
	if err := z.SolveVec(a, mat.NewVecDense(len(x), x)); err != nil {
		t.Fatal(err)
	}
	var out [maxOrder]Vector
	for n := 1; n <= maxOrder; n++ {
		nw := float64(n) * w
		scale := standardGravity / 0.1 / nw / gain(nw/(2*math.Pi)) * 1000 / math.Sqrt2
		// v = V cos(n theta - lag), dv/dt = V n w cos(n theta - lag + 90 degrees).
		re, im := z.AtVec(2*n-1)*scale, z.AtVec(2*n)*scale
		out[n-1] = Vector{RMS: math.Hypot(re, im), Lag: lagDegrees(math.Atan2(im, re) + math.Pi/2)}
	}
	return out
}

// apart returns the angle between two lags, degrees, 0 to 180.
func apart(a, b float64) float64 { return math.Abs(math.Remainder(a-b, 360)) }

// same fails unless two vectors agree: relative to the amplitude, and in degrees.
func same(t *testing.T, what string, got, want Vector, rel, deg float64) {
	t.Helper()
	if math.Abs(got.RMS-want.RMS) > rel*want.RMS || apart(got.Lag, want.Lag) > deg {
		t.Errorf("%s: got %.6f mm/s @ %.4f, want %.6f @ %.4f", what, got.RMS, got.Lag, want.RMS, want.Lag)
	}
}

func TestTimeDomainEqualsSteadyResponse(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Unbalances = []Unbalance{{KgM: 0.08, PositionM: 0.7, AngleDeg: 40}, {KgM: 0.05, PositionM: 1.3, AngleDeg: 200}}
	c.Faults.Bow = MidspanBow(40e-6, 2, 100)
	c.Faults.Misalignment = Misalignment{RadialN: [3]float64{300, 900, 200}, AxialN: [3]float64{100, 400, 50}, MomentNM: [3]float64{0, 100, 0}, LagDeg: [3]float64{10, 100, 200}, DirectionDeg: 30, PositionM: -0.3}
	c.Faults.Pull = Pull{ForceN: 500, DirectionDeg: 40, LagDeg: 70, PositionM: 1}
	for _, ccw := range []bool{false, true} {
		c.Rotor.CounterClockwise = ccw
		m, err := New(c, 1)
		if err != nil {
			t.Fatal(err)
		}
		truth, err := m.Steady(c.Drive.RPM)
		if err != nil {
			t.Fatal(err)
		}
		w := c.Drive.RPM * rpm
		for ch, p := range truth {
			m, _ := New(c, 1)
			x, src := record(t, m, Sampling{RateHz: 1000, Smooth: 3, Duration: 3 * time.Second}, ch)
			got := fitOrders(t, x, w, func(i int) float64 { return w * (src.Delay() + float64(i)/1000) }, src.Format().Gain)
			for n, v := range got {
				same(t, p.Name, v, p.Order[n], 2e-4, 0.02)
			}
		}
	}
}

func TestPhasorsAreWhatTheySay(t *testing.T) {
	c := PhasorConfig{Law: SpeedLaw{RPM: 1500, AngleDeg: 77}, Sensors: sixSensors(), Reference: &Reference{Channel: 6, HighV: 3}}
	for i := range c.Sensors {
		f := float64(i)
		c.Orders = append(c.Orders, [maxOrder]Vector{{2 + f, 40 * f}, {0.5 + f, 300 - 20*f}, {0.2, 10 * f}})
	}
	for ch := range c.Sensors {
		p, err := NewPhasors(c, 1)
		if err != nil {
			t.Fatal(err)
		}
		x, src := record(t, p, Sampling{RateHz: 1000, Smooth: 3, Duration: 2 * time.Second}, ch)
		got := fitOrders(t, x, 1500*rpm, func(i int) float64 { return c.Law.Angle(src.Delay() + float64(i)/1000) }, src.Format().Gain)
		for n, v := range got {
			same(t, c.Sensors[ch].Name, v, c.Orders[ch][n], 1e-5, 1e-3)
		}
	}
}

// newRand returns the generator of a seed.
func newRand(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 7)) }
