package alarm

import (
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"heavyspot/dsp"
	"heavyspot/rules"
)

var start = time.Date(2026, 3, 1, 6, 0, 0, 0, time.UTC)

func at(n int) time.Time { return start.Add(time.Duration(n) * time.Minute) }

func config() Config {
	return Config{Machine: "kiln-fan-2", AlarmMMS: 7.1, TripMMS: 9, HasReference: true}
}

// steady returns a steady minute whose points de-h and nde-h show 1x and overall.
func steady(first, overall float64) *dsp.Minute {
	return &dsp.Minute{
		Coverage: 1, Seconds: 60,
		Speed: dsp.Speed{State: dsp.Steady, Mean: 990, Min: 989, Max: 991, Reference: dsp.ReferenceGood},
		Points: []dsp.PointReading{
			{Name: "de-h", State: dsp.PointGood, Overall: overall, Order: [dsp.Orders]dsp.Vector{{RMS: first}}},
			{Name: "nde-h", State: dsp.PointGood, Overall: 1, Order: [dsp.Orders]dsp.Vector{{RMS: 0.5}}},
		},
	}
}

func with(m *dsp.Minute, change func(*dsp.Minute)) *dsp.Minute {
	change(m)
	return m
}

func stopped() *dsp.Minute {
	return with(steady(0, 0), func(m *dsp.Minute) {
		m.Speed = dsp.Speed{State: dsp.Stopped, Reference: dsp.ReferenceNone}
	})
}

func changing(low float64) *dsp.Minute {
	return with(steady(20, 20), func(m *dsp.Minute) {
		m.Speed = dsp.Speed{State: dsp.Changing, Mean: (990 + low) / 2, Min: low, Max: 990, Reference: dsp.ReferenceGood}
	})
}

func found(v rules.Verdict, overall float64) *rules.Finding {
	return &rules.Finding{Verdict: v, Severity: rules.Severity{MMS: overall}}
}

type input struct {
	m *dsp.Minute
	f *rules.Finding
}

// play feeds minutes and returns "minute: key state" of each event.
func play(t *testing.T, e *Engine, from int, in ...input) []string {
	t.Helper()
	var out []string
	for i, x := range in {
		x.m.Start = at(from + i)
		for _, ev := range e.Minute(x.m, x.f) {
			sign := "-"
			if ev.State == Unacknowledged {
				sign = "+"
			}
			if (ev.State == Unacknowledged) != ev.Condition || !ev.Time.Equal(at(from+i)) || ev.Since.After(ev.Time) ||
				!strings.HasPrefix(ev.Text, "kiln-fan-2: ") || strings.Contains(ev.Text, "%!") {
				t.Errorf("event %+v", ev)
			}
			out = append(out, fmt.Sprintf("%d%s%s", from+i, sign, ev.Key()))
		}
	}
	return out
}

func repeat(n int, m func() input) []input {
	var out []input
	for range n {
		out = append(out, m())
	}
	return out
}

func row(ms ...*dsp.Minute) []input {
	var out []input
	for _, m := range ms {
		out = append(out, input{m: m})
	}
	return out
}

func TestLife(t *testing.T) {
	ok, high := func() *dsp.Minute { return steady(1, 2) }, func() *dsp.Minute { return steady(1, 8.3) }
	dead := func() *dsp.Minute { return steady(1, 7.0) } // within 5 % below 7.1
	fault := func(s dsp.PointState) *dsp.Minute {
		return with(steady(0, 0), func(m *dsp.Minute) { m.Points[0].State = s })
	}
	unbal := func(v rules.Verdict, n int) []input {
		return repeat(n, func() input { return input{steady(3, 4), found(v, 4)} })
	}
	cat := func(parts ...[]input) []input { return slices.Concat(parts...) }
	for name, c := range map[string]struct {
		in   []input
		want []string
	}{
		"comes at once, clears after three": {row(ok(), high(), ok(), ok(), ok(), ok()), []string{"1+high-overall/de-h", "4-high-overall/de-h"}},
		"deadband keeps it":                 {row(high(), dead(), dead(), dead(), dead()), []string{"0+high-overall/de-h"}},
		"deadband brings none":              {row(dead(), dead(), dead()), nil},
		"no chatter":                        {row(high(), ok(), ok(), high(), ok(), ok(), high()), []string{"0+high-overall/de-h"}},
		"both over":                         {row(steady(8, 8.3)), []string{"0+high-1x/de-h", "0+high-overall/de-h"}},
		"at the limit is not over":          {row(steady(7.1, 7.1)), nil},
		"stop holds and tells":              {row(high(), stopped(), stopped(), stopped(), stopped()), []string{"0+high-overall/de-h", "1+rundown"}},
		"resonance on the way is no alarm":  {row(ok(), changing(600), changing(600)), nil},
		"clears when steady and below again": {row(high(), stopped(), ok(), ok(), ok()),
			[]string{"0+high-overall/de-h", "1+rundown", "2-rundown", "4-high-overall/de-h"}},
		"slows down":                 {row(ok(), changing(480), stopped(), ok()), []string{"1+rundown", "3-rundown"}},
		"standing from the start":    {row(stopped(), stopped(), changing(100), ok()), nil},
		"a lower speed, then steady": {row(ok(), changing(700), ok()), nil},
		"point fault holds its high alarm": {row(high(), fault(dsp.PointOpen), fault(dsp.PointOpen), fault(dsp.PointOpen), ok(), ok(), ok()),
			[]string{"0+high-overall/de-h", "1+point-fault/de-h", "6-point-fault/de-h", "6-high-overall/de-h"}},
		"flat while standing": {row(stopped(), with(stopped(), func(m *dsp.Minute) { m.Points[0].State = dsp.PointFlat })), nil},
		"open while standing": {row(with(stopped(), func(m *dsp.Minute) { m.Points[0].State = dsp.PointOpen })), []string{"0+point-fault/de-h"}},
		"samples lost":        {row(with(ok(), func(m *dsp.Minute) { m.Coverage = 0.98 }), ok(), ok(), ok()), []string{"0+samples-lost", "3-samples-lost"}},
		"few samples lost":    {row(with(ok(), func(m *dsp.Minute) { m.Coverage = 0.991 })), nil},
		"reference": {row(with(ok(), func(m *dsp.Minute) { m.Speed.Reference = dsp.ReferenceNone }),
			stopped(), with(ok(), func(m *dsp.Minute) { m.Speed.Reference = dsp.ReferenceDoubtful }), ok(), ok()),
			[]string{"0+reference-lost", "1+rundown", "2-rundown", "4-reference-lost"}},
		"unbalance after three minutes": {cat(unbal(rules.StaticUnbalance, 1), unbal(rules.DynamicUnbalance, 1), unbal(rules.CoupleUnbalance, 2),
			unbal(rules.Quiet, 3)), []string{"2+unbalance", "6-unbalance"}},
		"two minutes are too few":       {cat(unbal(rules.StaticUnbalance, 2), unbal(rules.NotUnbalance, 1), unbal(rules.StaticUnbalance, 2)), nil},
		"undetermined says nothing":     {cat(unbal(rules.StaticUnbalance, 3), unbal(rules.Undetermined, 9)), []string{"2+unbalance"}},
		"overhung":                      {unbal(rules.OverhungUnbal, 3), []string{"2+overhung-unbalance"}},
		"one kind turns into the other": {cat(unbal(rules.StaticUnbalance, 3), unbal(rules.OverhungUnbal, 3)), []string{"2+unbalance", "5-unbalance", "5+overhung-unbalance"}},
	} {
		t.Run(name, func(t *testing.T) {
			e, err := New(config())
			if err != nil {
				t.Fatal(err)
			}
			if d := cmp.Diff(c.want, play(t, e, 0, c.in...)); d != "" {
				t.Error(d)
			}
		})
	}
}

func TestEventFigures(t *testing.T) {
	e, err := New(config())
	if err != nil {
		t.Fatal(err)
	}
	m := steady(1, 8.3)
	m.Start = at(5)
	want := []Event{{
		Alarm: HighOverall, Point: "de-h", Priority: High, State: Unacknowledged, Condition: true,
		Value: 8.3, Limit: 7.1, Unit: "mm/s rms", Time: at(5), Since: at(5),
		Text: "kiln-fan-2: de-h: vibration 8.3 mm/s rms is over the alarm limit of 7.1",
	}}
	if d := cmp.Diff(want, e.Minute(m, nil)); d != "" {
		t.Error(d)
	}
	for severity, want := range map[float64]Priority{4: Low, 8: Medium, 9.5: High} {
		e, _ := New(config())
		var last []Event
		for i := range 3 {
			m := steady(3, 1)
			m.Start = at(i)
			last = e.Minute(m, found(rules.StaticUnbalance, severity))
		}
		if len(last) != 1 || last[0].Priority != want || last[0].Value != 3 || last[0].Limit != 7.1/4 || !last[0].Since.Equal(at(0)) {
			t.Errorf("severity %v mm/s: %+v, want priority %s", severity, last, want)
		}
	}
}

func TestNoLimitNoAlarm(t *testing.T) {
	e, err := New(Config{Machine: "kiln-fan-2"})
	if err != nil {
		t.Fatal(err)
	}
	m := with(steady(99, 99), func(m *dsp.Minute) { m.Speed.Reference = dsp.ReferenceNone })
	if got := play(t, e, 0, input{m: m}); got != nil {
		t.Errorf("%v", got)
	}
}

func TestStateGoesOn(t *testing.T) {
	before, _ := New(config())
	play(t, before, 0, row(steady(1, 8.3), steady(1, 2), steady(1, 2))...)
	state, err := before.State()
	if err != nil {
		t.Fatal(err)
	}
	after, _ := New(config())
	if err := after.Restore(state); err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff([]string{"high-overall/de-h"}, after.Active()); d != "" {
		t.Error(d)
	}
	// One more quiet minute clears it, and the speed before the stop is known.
	if d := cmp.Diff([]string{"3-high-overall/de-h", "4+rundown"}, play(t, after, 3, row(steady(1, 2), stopped())...)); d != "" {
		t.Error(d)
	}
	for _, bad := range []string{"", "{", `{"version":2}`, `{"version":1,"steady_rpm":-1}`, `{"version":1,"alarms":{"rise":null}}`} {
		if err := after.Restore([]byte(bad)); err == nil {
			t.Errorf("restored %q", bad)
		}
	}
	if d := cmp.Diff([]string{"rundown"}, after.Active()); d != "" {
		t.Errorf("a refused state changed the engine: %s", d)
	}
}

// An alarm of a point that is no longer configured must not stand for ever.
func TestForgottenPointClears(t *testing.T) {
	before, _ := New(config())
	play(t, before, 0, row(steady(1, 8.3))...)
	state, err := before.State()
	if err != nil {
		t.Fatal(err)
	}
	after, _ := New(config())
	if err := after.Restore(state); err != nil {
		t.Fatal(err)
	}
	m := with(steady(1, 8.3), func(m *dsp.Minute) { m.Points = m.Points[1:] })
	if d := cmp.Diff([]string{"1-high-overall/de-h"}, play(t, after, 1, input{m: m}, input{m: m})); d != "" {
		t.Error(d)
	}
}

func TestConfigErrors(t *testing.T) {
	for _, c := range []Config{{AlarmMMS: -1}, {TripMMS: 1e9}, {Deadband: 0.6}, {Coverage: 1.1}, {QuietShare: 2}, {UnbalanceMinutes: -1}, {ClearMinutes: 9999}} {
		if _, err := New(c); err == nil {
			t.Errorf("%+v: no error", c)
		}
	}
}

// TestFold plays random minutes, with restarts between them: no alarm comes
// twice without clearing, and the events added up are the state.
func TestFold(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		e, err := New(config())
		if err != nil {
			t.Fatal(err)
		}
		stands := map[string]bool{}
		for n := range rapid.IntRange(1, 60).Draw(t, "minutes") {
			m, f := anyMinute(t)
			m.Start = at(n)
			for _, ev := range e.Minute(m, f) {
				k := ev.Key()
				if comes := ev.State == Unacknowledged; comes == stands[k] {
					t.Fatalf("minute %d: %s becomes %s, but it was so before", n, k, ev.State)
				}
				stands[k] = !stands[k]
				if !stands[k] {
					delete(stands, k)
				}
			}
			var want []string
			for k := range stands {
				want = append(want, k)
			}
			slices.Sort(want)
			if d := cmp.Diff(want, e.Active()); d != "" {
				t.Fatalf("minute %d: %s", n, d)
			}
			if rapid.IntRange(0, 9).Draw(t, "restart") == 0 {
				e = restart(t, e)
			}
		}
	})
}

func anyMinute(t *rapid.T) (*dsp.Minute, *rules.Finding) {
	v := rapid.SampledFrom([]float64{0, 2, 6.9, 7.0, 7.2, 12})
	m := steady(v.Draw(t, "1x"), v.Draw(t, "overall"))
	m.Speed.State = rapid.SampledFrom([]dsp.SpeedState{dsp.Steady, dsp.Steady, dsp.Steady, dsp.Changing, dsp.Stopped}).Draw(t, "speed")
	m.Speed.Min = rapid.Float64Range(0, 990).Draw(t, "min")
	m.Speed.Reference = rapid.SampledFrom([]dsp.ReferenceState{dsp.ReferenceGood, dsp.ReferenceDoubtful, dsp.ReferenceNone}).Draw(t, "reference")
	m.Points[1].State = rapid.SampledFrom([]dsp.PointState{dsp.PointGood, dsp.PointGood, dsp.PointOpen, dsp.PointFlat}).Draw(t, "state")
	m.Coverage = rapid.SampledFrom([]float64{1, 1, 0.9}).Draw(t, "coverage")
	if m.Speed.State != dsp.Steady {
		return m, nil
	}
	verdict := rapid.SampledFrom([]rules.Verdict{rules.Quiet, rules.StaticUnbalance, rules.StaticUnbalance, rules.OverhungUnbal, rules.NotUnbalance, rules.Undetermined})
	return m, found(verdict.Draw(t, "verdict"), m.Points[0].Overall)
}

func restart(t *rapid.T, e *Engine) *Engine {
	state, err := e.State()
	if err != nil {
		t.Fatal(err)
	}
	next, err := New(config())
	if err != nil {
		t.Fatal(err)
	}
	if err := next.Restore(state); err != nil {
		t.Fatal(err)
	}
	return next
}

func FuzzRestore(f *testing.F) {
	f.Add([]byte(`{"version":1,"steady_rpm":990,"alarms":{"high-1x/de-h":{"active":true,"row":2,"since":"2026-03-01T06:00:00Z"}}}`))
	f.Fuzz(func(t *testing.T, state []byte) {
		e, err := New(config())
		if err != nil {
			t.Fatal(err)
		}
		if e.Restore(state) != nil {
			return
		}
		again, err := e.State()
		if err != nil {
			t.Fatal(err)
		}
		if err := e.Restore(again); err != nil {
			t.Errorf("%s: its own state is refused: %v", state, err)
		}
		e.Minute(steady(8, 9), nil)
	})
}
