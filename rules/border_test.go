package rules

import (
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"
)

// plainScene returns static unbalance without scatter: the ends deg apart, both
// directions alike, every lag known to sd degrees.
func plainScene(deg, sd float64) *scene {
	s := newScene("static", rand.New(rand.NewPCG(3, 3)))
	s.cfg.CounterClockwise = false
	lags := [2][3]float64{{20 + deg, 110 + deg, 300}, {20, 110, 80}}
	for i := range s.m.Points {
		v := &s.m.Points[i].Order[0]
		v.Lag, v.LagSD = turned(lags[i/3][i%3]), sd
	}
	return s
}

// The ends' phase through all its values: static up to 30 degrees, couple from
// 150 (S1: +-30), dynamic between (S2), and at each border a stretch as wide as
// the guard and the uncertainty in which nothing is named.
func TestEndsBorders(t *testing.T) {
	for _, sd := range []float64{0, 1, 3} {
		// Both directions together are known better than each alone.
		open := phaseGuard + 2*sd
		for deg := -180.0; deg < 180; deg += 0.5 {
			size := max(deg, -deg)
			f := plainScene(deg, sd).finding()
			var want Verdict
			switch {
			case size < 30-open-1:
				want = StaticUnbalance
			case size > 30+open+1 && size < 150-open-1:
				want = DynamicUnbalance
			case size > 150+open+1:
				want = CoupleUnbalance
			case size > 27.5 && size < 32.5, size > 147.5 && size < 152.5:
				want = Undetermined
			default:
				continue // how far the uncertainty reaches depends on the amplitudes
			}
			if f.Verdict != want {
				t.Errorf("ends %g degrees apart, sd %g: %s, want %s", deg, sd, f.Verdict, want)
			}
		}
	}
}

// The lag of horizontal behind vertical through all its values: unbalance is
// named only near a quarter turn in the sense of rotation, a line never is, and
// circling against the rotor is left open.
func TestTurningBorders(t *testing.T) {
	for deg := 0.0; deg < 360; deg++ {
		s := plainScene(0, 0.3)
		for _, i := range []int{1, 4} {
			s.m.Points[i].Order[0].Lag = turned(20 + deg)
		}
		f := s.finding()
		switch {
		case deg > 55 && deg < 125:
			if f.Verdict != StaticUnbalance {
				t.Errorf("horizontal %g behind vertical: %s, want static", deg, f.Verdict)
			}
		case deg > 153 || deg < 27:
			if f.Verdict != NotUnbalance && (deg < 207 || deg > 333) {
				t.Errorf("horizontal %g behind vertical: %s, want not unbalance", deg, f.Verdict)
			}
			if deg > 215 && deg < 325 && f.Verdict != Undetermined {
				t.Errorf("horizontal %g behind vertical: %s, want undetermined", deg, f.Verdict)
			}
		}
	}
}

// A value of one standard deviation from a border never decides.
func TestOpenNearLimit(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		limit := rapid.Float64Range(-100, 100).Draw(t, "limit")
		guard := rapid.Float64Range(0.01, 10).Draw(t, "guard")
		sd := rapid.Float64Range(0, 10).Draw(t, "sd")
		off := rapid.Float64Range(-3, 3).Draw(t, "off") * (guard + 2*sd)
		got := value{limit + off, sd, true}.atLeast(limit, guard)
		want := open
		if off > (guard+2*sd)*1.001 {
			want = yes
		} else if off < -(guard+2*sd)*1.001 {
			want = no
		}
		near := off/(guard+2*sd) > 0.999 || off/(guard+2*sd) < -0.999
		if got != want && !near {
			t.Fatalf("%g off, guard %g, sd %g: %d, want %d", off, guard, sd, got, want)
		}
		if (value{x: limit + off}).atLeast(limit, guard) != open {
			t.Fatal("what was not measured decides")
		}
	})
}

// Kleene's strong connectives (Introduction to Metamathematics, 1952, section 64).
func TestConnectives(t *testing.T) {
	tests := []struct{ a, b, and, or truth }{
		{yes, yes, yes, yes}, {yes, open, open, yes}, {yes, no, no, yes},
		{open, open, open, open}, {open, no, no, open}, {no, no, no, no},
	}
	for _, tt := range tests {
		if all(tt.a, tt.b) != tt.and || all(tt.b, tt.a) != tt.and || either(tt.a, tt.b) != tt.or || either(tt.b, tt.a) != tt.or {
			t.Errorf("%d, %d: and %d, or %d", tt.a, tt.b, all(tt.a, tt.b), either(tt.a, tt.b))
		}
	}
	if not(yes) != no || not(open) != open || not(no) != yes {
		t.Error("not")
	}
}
