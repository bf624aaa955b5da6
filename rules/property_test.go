package rules

import (
	"math/rand/v2"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"heavyspot/dsp"
)

// drawScene draws a scene of any cause.
func drawScene(t *rapid.T) (*scene, *rand.Rand) {
	r := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
	return newScene(rapid.SampledFrom(causes).Draw(t, "cause"), r), r
}

// changed returns the scene with each reading passed through f.
func (s *scene) changed(f func(p *Point, r *dsp.PointReading)) *scene {
	out := *s
	out.cfg.Points = slices.Clone(s.cfg.Points)
	out.m.Points = slices.Clone(s.m.Points)
	for i := range out.m.Points {
		f(&out.cfg.Points[i], &out.m.Points[i])
	}
	return &out
}

// same fails when two findings differ in verdict, suspects or severity.
func same(t *rapid.T, what string, a, b Finding) {
	if a.Verdict != b.Verdict || !slices.Equal(a.Suspects, b.Suspects) || a.Severity != b.Severity {
		t.Fatalf("%s: %s %v %+v, was %s %v %+v", what, b.Verdict, b.Suspects, b.Severity, a.Verdict, a.Suspects, a.Severity)
	}
}

// Where the reference mark sits on the shaft means nothing: turning all lags
// by any angle, order n by n times as much, changes no verdict.
func TestTurnedMark(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, r := drawScene(t)
		by := uniform(r, 0, 360)
		turnedScene := s.changed(func(_ *Point, p *dsp.PointReading) {
			for n := range p.Order {
				p.Order[n].Lag = turned(p.Order[n].Lag + float64(n+1)*by)
			}
		})
		same(t, "lags turned", s.finding(), turnedScene.finding())
	})
}

// A machine seen in a mirror turns the other way and its horizontal is reversed.
func TestMirrored(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, _ := drawScene(t)
		m := s.changed(func(c *Point, p *dsp.PointReading) {
			if c.Direction == Horizontal {
				for n := range p.Order {
					p.Order[n].Lag = turned(p.Order[n].Lag + 180)
				}
			}
		})
		m.cfg.CounterClockwise = !s.cfg.CounterClockwise
		same(t, "mirrored", s.finding(), m.finding())
	})
}

// Seen from the other end a machine turns the other way, horizontal and axial
// are reversed, and the ends change places.
func TestSeenFromTheOtherEnd(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, _ := drawScene(t)
		m := s.changed(func(c *Point, p *dsp.PointReading) {
			c.NonDriveEnd = !c.NonDriveEnd
			if c.Direction != Vertical {
				for n := range p.Order {
					p.Order[n].Lag = turned(p.Order[n].Lag + 180)
				}
			}
		})
		m.cfg.CounterClockwise = !s.cfg.CounterClockwise
		same(t, "seen from the other end", s.finding(), m.finding())
	})
}

// Only the severity and whether it is quiet depend on the size.
func TestScaled(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, r := drawScene(t)
		by := uniform(r, 0.02, 3)
		m := s.changed(func(_ *Point, p *dsp.PointReading) {
			for n := range p.Order {
				p.Order[n].RMS *= by
				p.Order[n].RMSSD *= by
			}
			p.Overall *= by
		})
		m.m.Lines = slices.Clone(s.m.Lines)
		for i := range m.m.Lines {
			m.m.Lines[i].RMS = slices.Clone(s.m.Lines[i].RMS)
			for k := range m.m.Lines[i].RMS {
				m.m.Lines[i].RMS[k] *= by
			}
		}
		a, b := s.finding(), m.finding()
		worst := 0.0
		for _, p := range m.m.Points {
			worst = max(worst, p.Order[0].RMS)
		}
		if quiet := worst < 0.25*s.cfg.Limits.Alarm; quiet != (b.Verdict == Quiet) {
			t.Fatalf("worst 1x %.2f mm/s: verdict %s", worst, b.Verdict)
		}
		if b.Verdict != Quiet && a.Verdict != Quiet && (a.Verdict != b.Verdict || !slices.Equal(a.Suspects, b.Suspects)) {
			t.Fatalf("scaled by %.3f: %s %v, was %s %v", by, b.Verdict, b.Suspects, a.Verdict, a.Suspects)
		}
	})
}

// Losing points never turns a verdict into another: it stays, becomes
// undetermined, or quiet when what is left is quiet.
func TestLostPoints(t *testing.T) {
	states := []dsp.PointState{dsp.PointClipped, dsp.PointFlat, dsp.PointOpen, dsp.PointShort, dsp.PointNoisy}
	rapid.Check(t, func(t *rapid.T) {
		s, _ := drawScene(t)
		mask := rapid.IntRange(1, 63).Draw(t, "lost")
		i := 0
		m := s.changed(func(_ *Point, p *dsp.PointReading) {
			if mask>>i&1 == 1 {
				*p = dsp.PointReading{Name: p.Name, State: states[i%len(states)]}
			}
			i++
		})
		f := m.finding()
		if m.wrong(f) && f.Verdict != Quiet {
			t.Fatalf("without points %06b: verdict %s %v, is %s %s", mask, f.Verdict, f.Suspects, s.kind, s.suspect)
		}
		lostWords(t, m, f)
	})
}

// lostWords checks that a kind of unbalance is not named without what its
// definition needs, and that what was not tested is said.
func lostWords(t *rapid.T, s *scene, f Finding) {
	good := map[string]bool{}
	for _, p := range s.m.Points {
		good[p.Name] = p.State == dsp.PointGood
	}
	radial := good["de-v"] && good["de-h"] && good["nde-v"] && good["nde-h"]
	switch f.Verdict {
	case StaticUnbalance, CoupleUnbalance, DynamicUnbalance, OverhungUnbal:
		if !radial || !good["de-a"] || !good["nde-a"] {
			t.Fatalf("verdict %s with points %v", f.Verdict, good)
		}
	case NotUnbalance:
		if !radial {
			t.Fatalf("verdict %s with points %v", f.Verdict, good)
		}
	case Undetermined:
		missing := slices.ContainsFunc(f.Evidence, func(e Evidence) bool { return e.Missing != "" && e.Test != "phase-creep" })
		if !radial && !missing {
			t.Fatalf("points %v: nothing is said to be missing: %+v", good, f.Evidence)
		}
	}
}

// Without a phase reference lags are relative to a point; their differences
// are the same, and so is every verdict, but for a phase that wanders: that
// cannot be sure then.
func TestRelativeLags(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, _ := drawScene(t)
		zero := s.m.Points[0].Order[0].Lag
		m := s.changed(func(_ *Point, p *dsp.PointReading) {
			for n := range p.Order {
				p.Order[n].Lag = turned(p.Order[n].Lag - float64(n+1)*zero)
			}
		})
		m.m.LagFrom = "de-v"
		m.m.Speed.Reference = dsp.ReferenceNone
		f := m.finding()
		if wanders := s.m.Points[0].Wander > mostWander-steadyGuard; wanders && f.Verdict == Undetermined {
			if !slices.Contains(f.Suspects, RubOrLooseRotor) && !slices.Contains(f.Suspects, Looseness) {
				t.Fatalf("wandering phase: suspects %v", f.Suspects)
			}
			return
		}
		same(t, "relative lags", s.finding(), f)
	})
}
