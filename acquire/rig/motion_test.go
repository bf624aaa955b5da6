package rig

import (
	"math"
	"math/cmplx"
	"testing"
)

// observed is what a sensor's housing really did in a stretch of simulation.
type observed struct {
	order [7]Vector // by order, 1 to 6
	// rms is the velocity of all frequencies, mm/s.
	rms float64
	// wander is the greatest change of the 1x lag from one of ten parts to
	// another, degrees.
	wander float64
}

// observe runs a machine and measures housing velocities against the true shaft angle.
func observe(m *Machine, seconds float64) []observed {
	dst := make([]float32, m.Channels())
	n := len(m.dof)
	out := make([]observed, n)
	square := make([]float64, n)
	sum, part := make([][7]complex128, n), make([]complex128, n)
	first := make([]float64, n)
	steps := int(seconds*m.StepHz()) / 10 * 10
	for i := range steps {
		m.Next(dst)
		turn := cmplx.Rect(1, -m.angle())
		for s, v := range m.front.velocity {
			square[s] += v * v
			e := complex(1, 0)
			for k := 1; k <= 6; k++ {
				e *= turn
				sum[s][k] += complex(v, 0) * e
			}
			part[s] += complex(v, 0) * turn
			if (i+1)%(steps/10) == 0 {
				lag := -cmplx.Phase(part[s]) * 180 / math.Pi
				if i < steps/5 && first[s] == 0 {
					first[s] = lag
				}
				out[s].wander = max(out[s].wander, apart(lag, first[s]))
				part[s] = 0
			}
		}
	}
	for s := range out {
		for k := 1; k <= 6; k++ {
			z := sum[s][k] * complex(2000/math.Sqrt2/float64(steps), 0)
			out[s].order[k] = Vector{RMS: cmplx.Abs(z), Lag: lagDegrees(-cmplx.Phase(z))}
		}
		out[s].rms = 1000 * math.Sqrt(square[s]/float64(steps))
	}
	return out
}

// start returns a machine or fails.
func start(t *testing.T, c Config) *Machine {
	t.Helper()
	m, err := New(c, 1)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// oneGoroutine skips a long simulation under the race detector, which slows it
// fiftyfold and has nothing to find in a single goroutine.
func oneGoroutine(t *testing.T) {
	t.Helper()
	if raceDetector {
		t.Skip("one goroutine: nothing to find for the race detector")
	}
}

// skip runs a machine for some seconds without looking.
func skip(m *Machine, seconds float64) {
	dst := make([]float32, m.Channels())
	for range int(seconds * m.StepHz()) {
		m.Next(dst)
	}
}

func TestLoosenessMakesHarmonics(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Unbalances = []Unbalance{{KgM: 0.1, PositionM: 0.9}}
	const wholeTurns = 60.0 / 1480 * 100
	tight := observe(start(t, c), wholeTurns)
	c.Faults.Looseness = Looseness{End: NonDriveEnd, Loss: 0.5, LiftM: 5e-6, Unsteady: 0.5}
	m := start(t, c)
	skip(m, 3)
	loose := observe(m, wholeTurns)
	const nde = 3
	if r := tight[nde].order[2].RMS / tight[nde].order[1].RMS; r > 1e-4 {
		t.Errorf("tight pedestal: 2x is %.2g of 1x, want none", r)
	}
	for n := 2; n <= 5; n++ {
		if r := loose[nde].order[n].RMS / loose[nde].order[1].RMS; r < 0.003 || r > 1 {
			t.Errorf("loose pedestal: order %d is %.2g of 1x, want 0.003 to 1", n, r)
		}
	}
	if loose[nde].order[1].RMS < 1.05*tight[nde].order[1].RMS {
		t.Errorf("loose pedestal: 1x %.3f is not above the tight one's %.3f", loose[nde].order[1].RMS, tight[nde].order[1].RMS)
	}
}

func TestLooseRotorCreeps(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Faults.LooseRotor = LooseRotor{Unbalance: Unbalance{KgM: 0.1, PositionM: 0.9}, DegPerMinute: 120}
	m := start(t, c)
	at, err := m.Steady(c.Drive.RPM)
	if err != nil {
		t.Fatal(err)
	}
	skip(m, 15)
	// A change of something else must not set the loose part back.
	if err := m.Update(func(f *Faults) { f.Flow.CornerHz = 80 }); err != nil {
		t.Fatal(err)
	}
	later, err := m.Steady(c.Drive.RPM)
	if err != nil {
		t.Fatal(err)
	}
	// Creeping against the rotation adds to the lag: 30 degrees in 15 s.
	if d := later[0].Order[0].Lag - at[0].Order[0].Lag; apart(d, 30) > 0.05 {
		t.Errorf("the lag crept by %.3f degrees, want 30", d)
	}
	same(t, "creeping 1x", observe(m, 0.2)[0].order[1], Vector{later[0].Order[0].RMS, later[0].Order[0].Lag + 0.2}, 0.02, 1)
	if w := observe(m, 15)[0].wander; w < 20 || w > 40 {
		t.Errorf("1x lag wandered by %.1f degrees, want about 27", w)
	}
}

func TestHalfOrderKeepsItsPhase(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	c.Faults.LooseRotor.HalfOrderN = 500
	m := start(t, c)
	skip(m, 4)
	dst := make([]float32, m.Channels())
	var half complex128
	var square float64
	const steps = 8000 * 4
	for range steps {
		m.Next(dst)
		v := m.front.velocity[0]
		half += complex(v, 0) * cmplx.Rect(1, -m.angle()/2)
		square += v * v
	}
	if p := 2 * cmplx.Abs(half) * cmplx.Abs(half) / steps / square; p < 0.99 {
		t.Errorf("half order holds %.3f of the power, want nearly all: its phase breaks", p)
	}
}

// TestChangesWhileRunning adds a mass, softens the pedestals and takes both back.
func TestChangesWhileRunning(t *testing.T) {
	oneGoroutine(t)
	c := fan()
	m := start(t, c)
	check := func(what string) {
		t.Helper()
		want, err := m.Steady(c.Drive.RPM)
		if err != nil {
			t.Fatal(err)
		}
		skip(m, 4)
		got := observe(m, 60/c.Drive.RPM*50)
		for i := range got {
			if want[i].Order[0].RMS > 0.01 {
				same(t, what, got[i].order[1], want[i].Order[0], 3e-3, 0.2)
			}
		}
	}
	if err := m.SetUnbalance(Unbalance{KgM: 0.2, PositionM: 1, AngleDeg: 33}); err != nil {
		t.Fatal(err)
	}
	check("mass")
	if err := m.Update(func(f *Faults) { f.Softening.H = 0.4; f.Bow = MidspanBow(30e-6, 2, 10) }); err != nil {
		t.Fatal(err)
	}
	check("mass, bow and softening")
	if err := m.Update(func(f *Faults) { *f = Faults{} }); err != nil {
		t.Fatal(err)
	}
	check("mass alone")
	if err := m.Update(func(f *Faults) { f.Softening.H = 1 }); err == nil {
		t.Error("all stiffness lost: want an error")
	}
	check("after a refused change")
}

// TestFlowIsBroadband: the flow's velocity grows with its force, is no order of the
// shaft, and is a fraction of a percent at 1x.
func TestFlowIsBroadband(t *testing.T) {
	oneGoroutine(t)
	level := func(force float64) observed {
		c := fan()
		c.Faults.Flow.ForceN = force
		return observe(start(t, c), 20)[0]
	}
	a, b := level(1000), level(2000)
	near(t, "velocity at twice the force", b.rms/a.rms, 2, 0.01)
	if share := math.Pow(a.order[1].RMS/a.rms, 2); share > 0.02 || a.rms < 0.05 {
		t.Errorf("flow of 1000 N: %.3f mm/s, %.4f of the power at 1x", a.rms, share)
	}
}
