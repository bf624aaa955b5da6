package rules_test

import (
	"testing"

	"heavyspot/dsp"
	"heavyspot/rules"
)

// TestLittle1xUnderHighOverall: a machine whose 1x is small but whose overall
// velocity is in alarm is not quiet; something else shakes it.
func TestLittle1xUnderHighOverall(t *testing.T) {
	cfg := rules.Config{}
	cfg.Limits, _ = rules.LimitsISO14694(3, false)
	m := dsp.Minute{Speed: dsp.Speed{State: dsp.Steady, Mean: 990, Min: 989, Max: 991, Reference: dsp.ReferenceGood}, Coverage: 1, Seconds: 60}
	for b, end := range []string{"de", "nde"} {
		for d, dir := range []string{"v", "h", "a"} {
			cfg.Points = append(cfg.Points, rules.Point{Name: end + "-" + dir, NonDriveEnd: b == 1, Direction: rules.Direction(d)})
			v := dsp.Vector{RMS: 0.8, Lag: 90 * float64(d), RMSSD: 0.02, LagSD: 1}
			m.Points = append(m.Points, dsp.PointReading{Name: end + "-" + dir, State: dsp.PointGood, Order: [dsp.Orders]dsp.Vector{v}, Overall: 8, Share: 0.01})
		}
	}
	for _, c := range []struct {
		overall float64
		line    float64
		verdict rules.Verdict
		suspect rules.Suspect
	}{
		{3, 0, rules.Quiet, ""},
		{8, 0, rules.NotUnbalance, rules.NotTurnRelated},
		{8, 7.9, rules.NotUnbalance, rules.NeighbourMachine},
	} {
		m := m
		m.Points = append([]dsp.PointReading(nil), m.Points...)
		for i := range m.Points {
			m.Points[i].Overall = c.overall
			m.Points[i].Share = 0.64 / (c.overall * c.overall)
		}
		if c.line > 0 {
			l := dsp.Line{RPM: 1010}
			for range m.Points {
				l.RMS = append(l.RMS, c.line)
			}
			m.Lines = []dsp.Line{l}
		}
		j, err := rules.NewJudge(cfg)
		if err != nil {
			t.Fatal(err)
		}
		f, ok := j.Judge(m)
		if !ok || f.Verdict != c.verdict || c.suspect != "" && (len(f.Suspects) == 0 || f.Suspects[0] != c.suspect) {
			t.Errorf("overall %v, line %v: %s %v, want %s %s", c.overall, c.line, f.Verdict, f.Suspects, c.verdict, c.suspect)
		}
	}
}
