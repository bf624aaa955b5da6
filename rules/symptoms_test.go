package rules

import (
	"math"
	"testing"

	"heavyspot/dsp"
)

// Each case changes one symptom of a plain machine and says what must become of
// the verdict. Points are de-v, de-h, de-a, nde-v, nde-h, nde-a; the rules are
// those of the project's table of phase rules, section 5.
func TestSymptoms(t *testing.T) {
	tests := []struct {
		name    string
		ends    float64 // degrees between the ends before the change
		change  func(s *scene)
		verdict Verdict
		suspect Suspect
	}{
		{"static", 0, func(*scene) {}, StaticUnbalance, ""},
		{"one direction past the border", 0, func(s *scene) { s.turn(5, 0); s.turn(42, 1); s.scale(0.5, 1, 4) }, Undetermined, ""},
		{"high axial in phase (no rule of static unbalance)", 0, func(s *scene) { s.axial(0.45, 0) }, Undetermined, ""},
		{"high axial opposed (S4)", 0, func(s *scene) { s.axial(0.45, 180) }, NotUnbalance, BentShaft},
		{"high axial opposed, at its border (S4)", 0, func(s *scene) { s.axial(0.45, 150) }, Undetermined, BentShaft},
		{"axial at its border, opposed (S4)", 0, func(s *scene) { s.axial(0.3, 180) }, Undetermined, BentShaft},
		{"couple with raised axial (S1)", 180, func(s *scene) { s.axial(0.6, 180) }, CoupleUnbalance, ""},
		{"dynamic, ends like a bent shaft's", 40, func(s *scene) { s.axial(0.4, 180) }, Undetermined, ""},
		{"dynamic with raised axial", 90, func(s *scene) { s.axial(0.4, 180) }, DynamicUnbalance, ""},
		{"directions that differ by 38 degrees (S2: 30)", 90, func(s *scene) { s.turn(19, 0); s.turn(-19, 1) }, Undetermined, ""},
		{"directions that differ by 26 degrees (S2: 30)", 90, func(s *scene) { s.turn(13, 0); s.turn(-13, 1) }, DynamicUnbalance, ""},
		{"1x half of the power (S1: 1x dominates)", 0, func(s *scene) { s.share(0.5) }, Undetermined, NotTurnRelated},
		{"1x a third of the power", 0, func(s *scene) { s.share(0.33) }, NotUnbalance, NotTurnRelated},
		{"2x half of 1x (common practice)", 0, func(s *scene) { s.order(2, 0.5, 0, 1, 2, 3, 4, 5) }, Undetermined, Misalignment},
		{"2x above 1x (common practice)", 0, func(s *scene) { s.order(2, 1.2, 0, 1, 2, 3, 4, 5) }, NotUnbalance, Misalignment},
		{"2x vertical alone", 0, func(s *scene) { s.order(2, 0.6, 0, 3); s.order(2, 0.05, 1, 4) }, NotUnbalance, Looseness},
		{"overhung rotor with low axial", 0, func(s *scene) { s.cfg.Overhung = true; s.axial(0.1, 0) }, Undetermined, ""},
		{"overhung rotor with high axial", 0, func(s *scene) { s.cfg.Overhung = true; s.axial(0.5, 0) }, OverhungUnbal, ""},
		{"overhung rotor, axial a quarter turn apart", 0, func(s *scene) { s.cfg.Overhung = true; s.axial(0.5, 90) }, Undetermined, ""},
		{"overhung rotor, axial opposed", 0, func(s *scene) { s.cfg.Overhung = true; s.axial(0.5, 180) }, NotUnbalance, BentShaft},
		{"wandering phase without a reference", 0, func(s *scene) { s.wander(30); s.m.LagFrom = "de-v" }, Undetermined, RubOrLooseRotor},
		{"wandering phase (S2)", 0, func(s *scene) { s.wander(30) }, NotUnbalance, RubOrLooseRotor},
		{"a neighbour as strong as 1x", 0, func(s *scene) { s.neighbour(1) }, Undetermined, NeighbourMachine},
		{"a neighbour of half of 1x", 0, func(s *scene) { s.neighbour(0.5) }, StaticUnbalance, ""},
		{"against the rotor, one direction larger (S2)", 0, func(s *scene) { s.turn(180, 1, 4); s.scale(0.2, 1, 4) }, NotUnbalance, Resonance},
		{"against the rotor, one direction 3.6 times larger", 0, func(s *scene) { s.turn(180, 1, 4); s.level(1, 0.28, 1, 0.28) }, NotUnbalance, Resonance},
		{"one direction 5 times larger, phase unturned", 0, func(s *scene) { s.level(1, 0.2, 1, 0.2) }, StaticUnbalance, ""},
		{"one direction 5 times larger, phase turning", 0, func(s *scene) { s.level(1, 0.2, 1, 0.2); s.turn(25, 1, 4) }, Undetermined, Resonance},
		{"flat orbit, phase 50 degrees off (S2: 40)", 0, func(s *scene) { s.level(1, 0.4, 1, 0.4); s.turn(50, 1, 4) }, Undetermined, ""},
		{"flat orbit, phase 35 degrees off (S2: 40)", 0, func(s *scene) { s.level(1, 0.4, 1, 0.4); s.turn(35, 1, 4) }, StaticUnbalance, ""},
		{"round orbit, phase 48 degrees off (S3)", 0, func(s *scene) { s.turn(48, 1, 4) }, StaticUnbalance, ""},
		{"2x vertical alone, at its border", 0, func(s *scene) { s.order(2, 0.27, 0, 3); s.order(2, 0.05, 1, 4) }, Undetermined, Looseness},
		{"the weaker bearing's pattern broken (S3)", 0, func(s *scene) { s.level(1, 1, 0.4, 0.4); s.turn(25, 4); s.turn(-30, 3) }, StaticUnbalance, ""},
		{"a still bearing's pattern broken (S3)", 0, func(s *scene) {
			s.cfg.Overhung = true
			s.level(1, 1, 0.3, 0.3)
			s.axial(0.5, 0)
			s.turn(90, 4)
		}, OverhungUnbal, ""},
		{"a weaker bearing on a line", 0, func(s *scene) {
			s.cfg.Overhung = true
			s.level(1, 1, 0.7, 0.7)
			s.axial(0.5, 0)
			s.turn(90, 4)
		}, Undetermined, ""},
	}
	for _, tt := range tests {
		s := plainScene(tt.ends, 0.3)
		s.level(1, 1, 1, 1)
		s.axial(0.05, 40)
		tt.change(s)
		f := s.finding()
		first := Suspect("")
		if len(f.Suspects) > 0 {
			first = f.Suspects[0]
		}
		if f.Verdict != tt.verdict || first != tt.suspect {
			t.Errorf("%s: %s %v, want %s %s", tt.name, f.Verdict, f.Suspects, tt.verdict, tt.suspect)
		}
	}
}

// radialSize is the 1x that level makes of 1, mm/s rms.
const radialSize = 8

// level sets the radial 1x of de-v, de-h, nde-v and nde-h, with little else.
func (s *scene) level(dv, dh, nv, nh float64) {
	for i, a := range map[int]float64{0: dv, 1: dh, 3: nv, 4: nh} {
		s.m.Points[i].Order[0].RMS = radialSize * a
		s.m.Points[i].Order[1].RMS, s.m.Points[i].Order[2].RMS = 0.3*a, 0.1*a
	}
	s.share(0.95)
}

// share sets the share of 1x in each point's power.
func (s *scene) share(x float64) {
	for i := range s.m.Points {
		s.m.Points[i].Overall = s.m.Points[i].Order[0].RMS / math.Sqrt(x)
		s.m.Points[i].Share = x
	}
}

// axial sets both axial 1x against the radial rms, deg apart.
func (s *scene) axial(ratio, deg float64) {
	sum := 0.0
	for _, i := range []int{0, 1, 3, 4} {
		sum += sq(s.m.Points[i].Order[0].RMS)
	}
	for i, lag := range map[int]float64{2: deg, 5: 0} {
		s.m.Points[i].Order[0] = dsp.Vector{RMS: ratio * math.Sqrt(sum/4), Lag: lag, LagSD: 0.3}
	}
}

func (s *scene) turn(deg float64, points ...int) {
	for _, i := range points {
		v := &s.m.Points[i].Order[0]
		v.Lag = turned(v.Lag + deg)
	}
}

func (s *scene) scale(by float64, points ...int) {
	for _, i := range points {
		s.m.Points[i].Order[0].RMS *= by
		s.m.Points[i].Overall *= by
	}
}

// order sets a higher order against 1x.
func (s *scene) order(n int, ratio float64, points ...int) {
	for _, i := range points {
		p := &s.m.Points[i]
		p.Order[n-1].RMS = ratio * p.Order[0].RMS
		p.Overall = math.Hypot(p.Overall, p.Order[n-1].RMS)
	}
}

func (s *scene) wander(deg float64) {
	for i := range s.m.Points {
		s.m.Points[i].Wander = deg
	}
}

// neighbour adds another machine's line against 1x.
func (s *scene) neighbour(ratio float64) {
	line := dsp.Line{RPM: 1462}
	for i := range s.m.Points {
		line.RMS = append(line.RMS, ratio*s.m.Points[i].Order[0].RMS)
	}
	s.m.Lines = []dsp.Line{line}
}
