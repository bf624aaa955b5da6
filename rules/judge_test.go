package rules

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"heavyspot/dsp"
)

func TestNewJudgeRefuses(t *testing.T) {
	good := Limits{Standard: "own", Alarm: 7.1}
	tests := []struct {
		cfg  Config
		want string
	}{
		{Config{}, "alarm limit is 0 mm/s"},
		{Config{Limits: Limits{Alarm: math.NaN()}}, "alarm limit is NaN"},
		{Config{Limits: Limits{Alarm: math.Inf(1)}}, "alarm limit is +Inf"},
		{Config{Limits: Limits{Alarm: 7, Acceptable: 8}}, "acceptable limit is 8"},
		{Config{Limits: Limits{Alarm: 7, Trip: 6}}, "trip limit is 6"},
		{Config{Limits: good, QuietShare: 1.5}, "quiet share is 1.5"},
		{Config{Limits: good, QuietShare: math.NaN()}, "quiet share is NaN"},
		{Config{Limits: good, Points: []Point{{Name: "x", Direction: 3}}}, `point "x" has direction 3`},
	}
	for _, tt := range tests {
		if _, err := NewJudge(tt.cfg); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%+v: error %v, want %q", tt.cfg, err, tt.want)
		}
	}
	if _, err := NewJudge(Config{Limits: good}); err != nil {
		t.Error(err)
	}
}

func TestOnlySteadyMinutes(t *testing.T) {
	s := steadyStatic()
	j, _ := NewJudge(s.cfg)
	for _, state := range []dsp.SpeedState{dsp.Changing, dsp.Stopped, ""} {
		m := s.m
		m.Speed.State = state
		if _, ok := j.Judge(m); ok {
			t.Errorf("a minute with state %q was judged", state)
		}
	}
	if f, ok := j.Judge(s.m); !ok || !f.Start.Equal(s.m.Start) {
		t.Error("a steady minute was not judged")
	}
}

// A value equal to a limit has reached it; the limits are those of BV-3 on
// rigid supports (ISO 14694:2003 table 5: 4.5, 7.1, 9.0).
func TestSeverity(t *testing.T) {
	bv3, _ := LimitsISO14694(3, false)
	bv1, _ := LimitsISO14694(1, false)
	own := Limits{Standard: "own", Alarm: 7.1, Trip: 9}
	tests := []struct {
		limits Limits
		mms    float64
		level  Level
		limit  float64
	}{
		{bv3, 0, Good, 4.5}, {bv3, 4.49, Good, 4.5}, {bv3, 4.5, Acceptable, 7.1}, {bv3, 7.09, Acceptable, 7.1},
		{bv3, 7.1, Alarm, 7.1}, {bv3, 7.9, Alarm, 7.1}, {bv3, 9, Trip, 9}, {bv3, 50, Trip, 9},
		{bv1, 50, Alarm, 10.6}, // the standard leaves BV-1's shut-down to the machine's history
		{own, 7, Good, 7.1}, {own, 8, Alarm, 7.1}, {own, 9.5, Trip, 9},
	}
	for _, tt := range tests {
		m := dsp.Minute{Points: []dsp.PointReading{
			{Name: "a", State: dsp.PointGood, Overall: tt.mms / 2},
			{Name: "b", State: dsp.PointGood, Overall: tt.mms},
			{Name: "c", State: dsp.PointClipped, Overall: 99},
		}}
		s := severity(tt.limits, &m)
		want := Severity{Standard: tt.limits.Standard, Level: tt.level, WorstPoint: "b", MMS: tt.mms, Limit: tt.limit}
		if tt.mms == 0 {
			want.WorstPoint = "a"
		}
		if s != want {
			t.Errorf("%g mm/s: %+v, want %+v", tt.mms, s, want)
		}
	}
	if s := severity(bv3, &dsp.Minute{}); s.Level != "" || s.WorstPoint != "" {
		t.Errorf("without points: %+v", s)
	}
}

// Three axes at one place, as a loose accelerometer gives them: whatever they
// show, nothing is concluded.
func TestOneBearing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, _ := drawScene(t)
		s.cfg.Points, s.m.Points = s.cfg.Points[:3], s.m.Points[:3]
		s.m.Lines = nil
		if f := s.finding(); f.Verdict != Undetermined && f.Verdict != Quiet {
			t.Fatalf("one bearing: %s %v", f.Verdict, f.Suspects)
		}
	})
}

// Advice on work at the machine carries the safety words; a balance is advised
// for unbalance only.
func TestAdvice(t *testing.T) {
	for i, cause := range causes {
		s := newScene(cause, rand.New(rand.NewPCG(8, uint64(i))))
		f := s.finding()
		balance := s.kind != NotUnbalance
		if strings.HasPrefix(f.Advice, "do not balance") == balance || !strings.Contains(f.Advice, "lock out") ||
			!strings.Contains(f.Advice, "qualified person") || strings.Contains(f.Advice, "\n") {
			t.Errorf("%s (%s): %s", cause, f.Verdict, f.Advice)
		}
		if balance != strings.Contains(f.Advice, "plane of rotation") {
			t.Errorf("%s: words on trial masses: %s", cause, f.Advice)
		}
	}
	s := plainScene(0, 0.3)
	for i := range 3 {
		s.m.Points[i].Order[0].RMS *= 4
		s.m.Points[i].Overall *= 4
	}
	if f := s.finding(); f.Verdict != StaticUnbalance || !strings.Contains(f.Advice, "nearer to the drive-end") {
		t.Errorf("unequal ends in phase: %s: %s", f.Verdict, f.Advice)
	}
}

// A rotation configured the wrong way round shows as circling against the rotor.
func TestWrongRotation(t *testing.T) {
	s := plainScene(0, 0.3)
	s.cfg.CounterClockwise = true
	if f := s.finding(); f.Verdict != Undetermined || !strings.Contains(f.Advice, "check the configured rotation") {
		t.Errorf("%s: %s", f.Verdict, f.Advice)
	}
}

// Whatever stands in a minute, judging it does not panic, and the finding is
// consistent in itself.
func TestAnything(t *testing.T) {
	number := rapid.OneOf(rapid.Float64(), rapid.SampledFrom([]float64{0, math.NaN(), math.Inf(1), math.Inf(-1), -1, 1e300, 1e6, 1e-6, 5e-324, 3}))
	rapid.Check(t, func(t *rapid.T) {
		s, _ := drawScene(t)
		n := rapid.IntRange(0, 8).Draw(t, "points")
		s.cfg.Overhung = rapid.Bool().Draw(t, "overhung")
		for i := range min(n, len(s.m.Points)) {
			p := &s.m.Points[i]
			p.Overall, p.Wander = number.Draw(t, "overall"), number.Draw(t, "wander")
			p.Order[0] = dsp.Vector{RMS: number.Draw(t, "rms"), Lag: number.Draw(t, "lag"), RMSSD: number.Draw(t, "sd"), LagSD: number.Draw(t, "lag sd")}
		}
		s.m.Points = s.m.Points[:min(len(s.m.Points), rapid.IntRange(0, 6).Draw(t, "kept"))]
		consistent(t, s.finding())
	})
}

// consistent checks what holds for every finding.
func consistent(t *rapid.T, f Finding) {
	if f.Verdict == "" || f.Advice == "" || len(f.Evidence) == 0 {
		t.Fatalf("empty verdict, advice or evidence: %+v", f)
	}
	named := f.Verdict != NotUnbalance && f.Verdict != Undetermined
	if f.Verdict == NotUnbalance && len(f.Suspects) == 0 || named && len(f.Suspects) > 0 {
		t.Fatalf("%s with suspects %v", f.Verdict, f.Suspects)
	}
	for _, e := range f.Evidence {
		if e.Holds != (e.Missing == "" && e.Margin >= 0) || e.Expected == "" {
			t.Fatalf("evidence %+v", e)
		}
		if sum := e.Measured + e.SD + e.Margin; math.IsNaN(sum) || math.IsInf(sum, 0) {
			t.Fatalf("evidence %+v holds what JSON cannot carry", e)
		}
	}
}
