package rules

import (
	"math/rand/v2"
	"testing"
	"time"

	"heavyspot/dsp"
)

// run judges minutes made from a scene, each turned by the next of the angles
// and at the next of the speeds, and returns the last finding.
func run(t *testing.T, s *scene, turns, rpm []float64) Finding {
	t.Helper()
	return runEvery(t, time.Minute, s, turns, rpm)
}

// runEvery does so with the minutes a time apart.
func runEvery(t *testing.T, every time.Duration, s *scene, turns, rpm []float64) Finding {
	t.Helper()
	j, err := NewJudge(s.cfg)
	if err != nil {
		t.Fatal(err)
	}
	var f Finding
	for k, by := range turns {
		m := s.changed(func(_ *Point, p *dsp.PointReading) { p.Order[0].Lag = turned(p.Order[0].Lag + by) }).m
		m.Start = time.Date(2026, 3, 1, 6, 0, 0, 0, time.UTC).Add(time.Duration(k) * every)
		if rpm != nil {
			m.Speed.Mean = rpm[k]
		}
		f, _ = j.Judge(m)
	}
	return f
}

func steadyStatic() *scene {
	s := plainScene(0, 0.3)
	for i := range s.m.Points {
		s.m.Points[i].Wander = 1
	}
	return s
}

// An impeller that creeps on its shaft turns the phase from minute to minute,
// also when it is steady within each.
func TestCreepingPhase(t *testing.T) {
	f := run(t, steadyStatic(), []float64{0, 20, 40, 60, 80, 100}, nil)
	if f.Verdict != NotUnbalance || f.Suspects[0] != RubOrLooseRotor {
		t.Errorf("20 degrees a minute: %s %v", f.Verdict, f.Suspects)
	}
	f = run(t, steadyStatic(), []float64{0, 340, 320, 300, 280}, nil)
	if f.Verdict != NotUnbalance {
		t.Errorf("-20 degrees a minute, through zero: %s %v", f.Verdict, f.Suspects)
	}
	if f = run(t, steadyStatic(), []float64{0, 2, 4, 6, 8, 10}, nil); f.Verdict != StaticUnbalance {
		t.Errorf("2 degrees a minute, warming up: %s %v", f.Verdict, f.Suspects)
	}
	if f = run(t, steadyStatic(), []float64{0, 10, 20, 30, 40}, nil); f.Verdict != Undetermined {
		t.Errorf("10 degrees a minute, on the border: %s %v", f.Verdict, f.Suspects)
	}
}

// Days between the minutes: dust has moved the heavy spot, and nothing creeps.
func TestHolesAreNoCreep(t *testing.T) {
	if f := runEvery(t, 24*time.Hour, steadyStatic(), []float64{0, 20, 40, 60, 80, 100}, nil); f.Verdict != StaticUnbalance {
		t.Errorf("20 degrees a day: %s %v", f.Verdict, f.Suspects)
	}
}

// A lump that lets go turns the phase once; before and after it is steady.
func TestLumpLetsGo(t *testing.T) {
	f := run(t, steadyStatic(), []float64{0, 0, 0, 130, 130, 130, 130}, nil)
	if f.Verdict != StaticUnbalance {
		t.Errorf("one step of 130 degrees: %s %v", f.Verdict, f.Suspects)
	}
}

// Near a resonance the phase follows the speed; minutes at different speeds are
// not compared.
func TestCreepNeedsOneSpeed(t *testing.T) {
	f := run(t, steadyStatic(), []float64{0, 20, 40, 60, 80}, []float64{900, 950, 1000, 1050, 1100})
	if f.Verdict != StaticUnbalance {
		t.Errorf("another speed each minute: %s %v", f.Verdict, f.Suspects)
	}
}

// Without a reference the phase from minute to minute means nothing.
func TestCreepNeedsReference(t *testing.T) {
	s := steadyStatic()
	s.m.LagFrom = "de-v"
	f := run(t, s, []float64{0, 50, 100, 150, 200}, nil)
	if f.Verdict != StaticUnbalance {
		t.Errorf("relative lags: %s %v", f.Verdict, f.Suspects)
	}
	for _, e := range f.Evidence {
		if e.Test == "phase-creep" && e.Missing != "no phase reference" {
			t.Errorf("creep without reference: %+v", e)
		}
	}
}

// The memory is bounded, and what is forgotten has no say.
func TestMemoryBounded(t *testing.T) {
	s := steadyStatic()
	j, err := NewJudge(s.cfg)
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(5, 5))
	for range 50 {
		m := s.changed(func(_ *Point, p *dsp.PointReading) { p.Order[0].Lag = turned(p.Order[0].Lag + uniform(r, 0, 360)) }).m
		j.Judge(m)
		// What a loose rotor does to all points alike is not in this loop; the
		// scatter here is per point, so the sum's steps are random.
	}
	if len(j.memory.rpm) != remembered || len(j.memory.pictures) != remembered {
		t.Errorf("%d minutes remembered, want %d", len(j.memory.rpm), remembered)
	}
	var f Finding
	for range remembered {
		f, _ = j.Judge(s.m)
	}
	if f.Verdict != StaticUnbalance {
		t.Errorf("after %d steady minutes: %s %v", remembered, f.Verdict, f.Suspects)
	}
}

// A lag that wanders a little is left open until it has been seen to stay where
// it is from minute to minute.
func TestLittleWander(t *testing.T) {
	s := steadyStatic()
	s.wander(3)
	if f := run(t, s, []float64{0}, nil); f.Verdict != Undetermined || len(f.Suspects) != 1 || f.Suspects[0] != RubOrLooseRotor {
		t.Errorf("first minute: %s %v", f.Verdict, f.Suspects)
	}
	if f := run(t, s, []float64{0, 1, 0, 1, 0}, nil); f.Verdict != StaticUnbalance {
		t.Errorf("fifth minute: %s %v", f.Verdict, f.Suspects)
	}
	if f := run(t, s, []float64{0, 20, 40, 60, 80}, nil); f.Verdict != NotUnbalance {
		t.Errorf("creeping: %s %v", f.Verdict, f.Suspects)
	}
}
