package dsp_test

import (
	"fmt"
	"math"
	"testing"
	"time"

	"heavyspot/dsp"
)

// base is a plain machine at 25 Hz with a good reference.
func base(seed uint64) signal {
	return signal{rate: 1000, seconds: 60, hz: 24.67, points: 2, filter: 3, width: 0.15, seed: seed, noise: 1e-3,
		mms: [3]float64{4, 0.5, 0.2}, lag: [3]float64{123, 50, 310}}
}

// nearTruth fails unless the first point's 1x is within the bounds.
func nearTruth(t *testing.T, s *signal, m dsp.Minute, percent, degrees float64) {
	t.Helper()
	o := m.Points[0].Order[0]
	da, dl := 100*(o.RMS/s.mms[0]-1), angle(o.Lag, s.lag[0])
	if !(math.Abs(da) <= percent && math.Abs(dl) <= degrees) {
		t.Errorf("1x off by %+.3f %%, %+.3f deg (%s, %+v)", da, dl, m.Points[0].State, m.Speed)
	}
}

// TestPulsesMendedAndRejected: missing and extra pulses are found, counted and
// do not disturb the vector.
func TestPulsesMendedAndRejected(t *testing.T) {
	for _, c := range []struct{ missing, extra, jitter, wander float64 }{
		{0.02, 0, 0, 0}, {0, 0.02, 0, 0}, {0.02, 0.02, 0, 0.003}, {0.1, 0, 0, 0}, {0, 0.1, 0.1, 0.003}, {0, 0, 0.5, 0}, {0.01, 0.01, 0.3, 0},
	} {
		for seed := range uint64(4) {
			t.Run(fmt.Sprintf("%+v/%d", c, seed), func(t *testing.T) {
				s := base(seed)
				s.missing, s.extra, s.jitter, s.wander = c.missing, c.extra, c.jitter, c.wander
				m := s.read(t)
				// Jitter itself scatters the mean phase: 0.5 rows are 4.4 degrees,
				// 0.12 over the turns of a minute.
				nearTruth(t, &s, m, 0.3, 0.3+0.4*c.jitter)
				want := dsp.ReferenceGood
				if c.missing+c.extra > 0 {
					want = dsp.ReferenceDoubtful
				}
				if m.Speed.Reference != want {
					t.Errorf("reference %s, want %s", m.Speed.Reference, want)
				}
				turns := s.hz * s.seconds
				if d := float64(m.Speed.Missing) - c.missing*turns; math.Abs(d) > 5*math.Sqrt(c.missing*turns)+2 {
					t.Errorf("%d missing pulses, about %.0f were", m.Speed.Missing, c.missing*turns)
				}
				if d := float64(m.Speed.Extra) - c.extra*turns; math.Abs(d) > 5*math.Sqrt(c.extra*turns)+2 {
					t.Errorf("%d extra pulses, about %.0f were", m.Speed.Extra, c.extra*turns)
				}
				if d := math.Abs(m.Speed.Mean/60/s.hz - 1); d > 3e-4 {
					t.Errorf("speed off by %.2g", d)
				}
			})
		}
	}
}

// TestGaps: rows lost here and there cost coverage, not accuracy.
func TestGaps(t *testing.T) {
	s := base(9)
	v := s.render()
	e, err := dsp.NewEngine(s.config())
	if err != nil {
		t.Fatal(err)
	}
	stride := s.points + 1
	lost := 0
	for at := 0; at < len(v)/stride; at += 2500 {
		gap := 1 + at/100
		end := min(len(v)/stride, at+2500)
		if end-at <= gap {
			break
		}
		e.Push(int64(at+gap), v[(at+gap)*stride:end*stride])
		if at > 0 { // nothing is known to be missing before the first row
			lost += gap
		}
	}
	m := e.Close(int64(len(v)/stride), time.Time{}, false)
	nearTruth(t, &s, m, 0.3, 0.3)
	n := float64(len(v)/stride - 1)
	if d := m.Coverage - (1 - float64(lost)/n); math.Abs(d) > 1e-9 {
		t.Errorf("coverage %.6f, want %.6f", m.Coverage, 1-float64(lost)/n)
	}
}

// TestWithoutReference: the turn rate and the phases between points come from
// the vibration.
func TestWithoutReference(t *testing.T) {
	for _, c := range []struct {
		hz, wander, noise float64
		dead              bool // the reference is wired but gives no pulses
	}{{24.67, 0, 1e-3, false}, {24.67, 0.003, 1e-3, false}, {7.3, 0, 1e-4, false}, {58.2, 0.001, 1e-2, true}} {
		t.Run(fmt.Sprintf("%+v", c), func(t *testing.T) {
			s := base(3)
			s.hz, s.wander, s.noise = c.hz, c.wander, c.noise
			v := s.render()
			cfg := s.config()
			stride := s.points + 1
			if c.dead {
				for i := s.points; i < len(v); i += stride {
					v[i] = 0.02
				}
			} else {
				cfg.Reference = nil
			}
			cfg.Points[1].Inverted = true
			e, err := dsp.NewEngine(cfg)
			if err != nil {
				t.Fatal(err)
			}
			e.Push(0, v)
			m := e.Close(int64(len(v)/stride), time.Time{}, false)
			if m.Speed.Reference != dsp.ReferenceNone || m.LagFrom != "a" || m.Speed.State != dsp.Steady {
				t.Fatalf("speed %+v, lag from %q", m.Speed, m.LagFrom)
			}
			if d := math.Abs(m.Speed.Mean/60/s.hz - 1); d > 3e-4 {
				t.Errorf("mean %.3f r/min, true %.3f", m.Speed.Mean, 60*s.hz)
			}
			for i, want := range []float64{0, 180} {
				o := m.Points[i].Order[0]
				if math.Abs(o.RMS/4-1) > 0.005 || math.Abs(angle(o.Lag, want)) > 1 {
					t.Errorf("point %d: %.4f mm/s at %.2f deg, want 4 at %v", i, o.RMS, o.Lag, want)
				}
			}
		})
	}
}

// TestStopped: no pulses and no line is a stop, not a fault of the reading.
func TestStopped(t *testing.T) {
	s := base(5)
	s.mms = [3]float64{}
	s.width = 0
	m := s.read(t)
	if m.Speed.State != dsp.Stopped || m.Speed.Mean != 0 || m.Speed.Turns != 0 {
		t.Errorf("speed %+v", m.Speed)
	}
}

// TestChanging: a run-down is no steady minute.
func TestChanging(t *testing.T) {
	s := base(6)
	s.ramp = -0.9
	m := s.read(t)
	if m.Speed.State != dsp.Changing || m.Speed.Reference != dsp.ReferenceGood {
		t.Errorf("speed %+v", m.Speed)
	}
	if math.Abs(m.Speed.Max/60/s.hz-1.45) > 0.03 || math.Abs(m.Speed.Min/60/s.hz-0.55) > 0.03 {
		t.Errorf("speed %+v: want from 0.55 to 1.45 of %.1f r/min", m.Speed, 60*s.hz)
	}
}

// TestNarrowPulses: pulses too narrow for the sampling are doubtful, since their
// edges cannot be located.
func TestNarrowPulses(t *testing.T) {
	for _, c := range []struct {
		rows float64
		want dsp.ReferenceState
	}{{1.2, dsp.ReferenceDoubtful}, {3.2, dsp.ReferenceGood}, {8, dsp.ReferenceGood}} {
		s := base(8)
		s.width = c.rows * s.hz / s.rate
		m := s.read(t)
		if m.Speed.Reference != c.want {
			t.Errorf("pulses of %v rows: reference %s, want %s (%+v)", c.rows, m.Speed.Reference, c.want, m.Speed)
		}
	}
}
