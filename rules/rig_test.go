package rules_test

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"heavyspot/acquire/rig"
	"heavyspot/dsp"
	"heavyspot/rules"
)

// truth is the right finding on a kind of machine.
type truth struct {
	kind    rig.Kind
	verdict rules.Verdict
	suspect rules.Suspect
}

// truths is the right verdict on each kind of simulated machine, and the
// suspect that goes with NotUnbalance. Looseness is not here, because a steady
// linear response cannot show it; TestThrough runs it in time.
var truths = []truth{
	{rig.Quiet, rules.Quiet, ""},
	{rig.Static, rules.StaticUnbalance, ""},
	{rig.Couple, rules.CoupleUnbalance, ""},
	{rig.Dynamic, rules.DynamicUnbalance, ""},
	{rig.OverhungRotor, rules.OverhungUnbal, ""},
	{rig.BentShaft, rules.NotUnbalance, rules.BentShaft},
	{rig.Misaligned, rules.NotUnbalance, rules.Misalignment},
	{rig.Eccentric, rules.NotUnbalance, rules.Eccentricity},
	{rig.Resonant, rules.NotUnbalance, rules.Resonance},
	{rig.RubOrLooseRotor, rules.NotUnbalance, rules.RubOrLooseRotor},
	{rig.NeighbourMachine, rules.NotUnbalance, rules.NeighbourMachine},
}

// quiet is a quarter of the alarm limit of BV-3 on rigid supports, mm/s rms.
const quiet = 0.25 * 7.1

// TestRig judges simulated machines with rotor dynamics from their exact steady
// vectors plus noise. No verdict may be wrong and at most 3 % of a kind may stay
// undetermined.
func TestRig(t *testing.T) {
	n := 40
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		n = 3000
	}
	for i, truth := range truths {
		t.Run(truth.kind.String(), func(t *testing.T) {
			t.Parallel()
			r := rand.New(rand.NewPCG(11, uint64(i)))
			var right, other, undetermined, wrong int
			got := map[rules.Verdict]int{}
			for range n {
				c := rig.Random(truth.kind, r)
				f, fewer := judge(t, c, r)
				if fewer.Verdict != truth.verdict && fewer.Verdict != rules.Undetermined && fewer.Verdict != rules.Quiet && truth.kind != rig.RubOrLooseRotor {
					t.Errorf("with points lost: %s", fewer.Verdict)
					report(t, c, fewer)
				}
				got[f.Verdict]++
				switch {
				case f.Verdict == rules.Undetermined:
					undetermined++
				case truth.kind == rig.RubOrLooseRotor && f.Verdict == rules.Quiet && f.Evidence[0].Measured < quiet:
					right++ // a creeping unbalance can cancel out within the minute
				case f.Verdict != truth.verdict:
					wrong++
					report(t, c, f)
				case truth.suspect != "" && f.Suspects[0] != truth.suspect:
					other++
				default:
					right++
				}
			}
			t.Logf("right %d, other suspect first %d, undetermined %d, wrong %d of %d: %v", right, other, undetermined, wrong, n, got)
			if wrong > 0 {
				t.Errorf("%d wrong verdicts", wrong)
			}
			if most := mostUndetermined(n); undetermined > most {
				t.Errorf("%d of %d undetermined, want at most %d", undetermined, n, most)
			}
		})
	}
}

// mostUndetermined is 3 % of n, and for a small sample what chance adds to it:
// three standard deviations of a binomial count.
func mostUndetermined(n int) int {
	most := 0.03 * float64(n)
	if n < 3000 {
		most += 3 * math.Sqrt(most*0.97)
	}
	return int(most)
}

// report prints a machine and the tests that speak against its finding.
func report(t *testing.T, c rig.Case, f rules.Finding) {
	t.Logf("%s %v overhung %v ccw %v", f.Verdict, f.Suspects, c.Overhung, c.Config.Rotor.CounterClockwise)
	for _, p := range c.Points {
		t.Logf("   %s %.2f@%.0f  2x %.2f", p.Name, p.Order[0].RMS, p.Order[0].Lag, p.Order[1].RMS)
	}
	for _, e := range f.Evidence {
		if e.Missing == "" && (!e.Holds || e.Margin < 5 && e.Unit == "deg") {
			t.Logf("   %s %.3g sd %.2g (%s) margin %.3g", e.Test, e.Measured, e.SD, e.Expected, e.Margin)
		}
	}
}

// newJudge returns a judge of the machine.
func newJudge(t *testing.T, c *rig.Case) *rules.Judge {
	t.Helper()
	cfg := rules.Config{Overhung: c.Overhung, CounterClockwise: c.Config.Rotor.CounterClockwise}
	cfg.Limits, _ = rules.LimitsISO14694(3, false)
	if c.Kind == rig.NeighbourMachine {
		cfg.QuietShare = 0.01 // its own 1x is small
	}
	for _, s := range c.Config.Sensors {
		cfg.Points = append(cfg.Points, rules.Point{Name: s.Name, NonDriveEnd: s.End == rig.NonDriveEnd, Direction: rules.Direction(s.Direction)})
	}
	j, err := rules.NewJudge(cfg)
	if err != nil {
		t.Fatal(err)
	}
	return j
}

// judge lets several minutes of a machine pass and returns the last finding,
// and that on the last minute with some of the points lost, judged on its own.
func judge(t *testing.T, c rig.Case, r *rand.Rand) (last, fewer rules.Finding) {
	t.Helper()
	j := newJudge(t, &c)
	var m dsp.Minute
	for range 5 {
		m = minute(t, &c, r)
		var ok bool
		if last, ok = j.Judge(m); !ok {
			t.Fatal("a steady minute was not judged")
		}
	}
	for i := range m.Points {
		if r.IntN(3) == 0 {
			m.Points[i] = dsp.PointReading{Name: m.Points[i].Name, State: dsp.PointNoisy}
		}
	}
	fewer, _ = newJudge(t, &c).Judge(m)
	return last, fewer
}

// stretches is the number of looks at a creeping unbalance in a minute.
const stretches = 6

// minute is the reading of the machine's next minute: the exact vectors with
// noise, the mean over the minute where a part of the unbalance creeps.
func minute(t *testing.T, c *rig.Case, r *rand.Rand) dsp.Minute {
	t.Helper()
	m := dsp.Minute{Seconds: 60, Coverage: 1, Speed: dsp.Speed{State: dsp.Steady, Mean: c.Config.Drive.RPM, Reference: dsp.ReferenceGood}}
	m.Points = make([]dsp.PointReading, len(c.Points))
	sums := make([]complex128, len(c.Points))
	lags := make([]dsp.Directions, len(c.Points))
	creeps := &c.Config.Faults.LooseRotor
	for range stretches {
		points, err := c.Config.Steady(c.Config.Drive.RPM)
		if err != nil {
			t.Fatal(err)
		}
		for i, p := range points {
			sums[i] += phasor(p.Order[0]) / stretches
			lags[i].Add(p.Order[0].Lag, 1)
			m.Points[i] = reading(p, r)
		}
		if creeps.KgM == 0 {
			for i, p := range points {
				sums[i] = phasor(p.Order[0])
			}
			break
		}
		creeps.AngleDeg += creeps.DegPerMinute/stretches + creeps.WalkDeg*r.NormFloat64()/math.Sqrt(stretches)
	}
	for i := range m.Points {
		p := &m.Points[i]
		noise := 0.02 + 0.003*real(sums[i]*conj(sums[i]))/(1+p.Order[0].RMS)
		z := sums[i] + complex(noise*r.NormFloat64(), noise*r.NormFloat64())
		p.Order[0] = vector(z)
		p.Order[0].RMSSD, p.Order[0].LagSD = noise, 57.3*noise/p.Order[0].RMS
		p.Wander = lags[i].Deviation()
	}
	neighbours(c, &m)
	return m
}

// reading takes the orders of a point and an overall velocity with a rest that
// does not turn with the shaft, 10 to 40 % of 1x.
func reading(p rig.Point, r *rand.Rand) dsp.PointReading {
	out := dsp.PointReading{Name: p.Name, State: dsp.PointGood}
	sum := 0.05 * 0.05
	for n, v := range p.Order {
		out.Order[n] = dsp.Vector{RMS: v.RMS, Lag: v.Lag}
		sum += v.RMS * v.RMS
	}
	rest := out.Order[0].RMS * (0.1 + 0.3*r.Float64())
	out.Overall = math.Sqrt(sum + rest*rest)
	out.Share = math.Pow(out.Order[0].RMS/out.Overall, 2)
	return out
}

// neighbours adds the lines of other machines to a minute.
func neighbours(c *rig.Case, m *dsp.Minute) {
	for _, n := range c.Config.Faults.Neighbours {
		line := dsp.Line{RPM: n.RPM}
		for i, v := range n.Velocity {
			line.RMS = append(line.RMS, v.RMS)
			p := &m.Points[i]
			p.Overall = math.Hypot(p.Overall, v.RMS)
			p.Share = math.Pow(p.Order[0].RMS/p.Overall, 2)
		}
		m.Lines = append(m.Lines, line)
	}
}

func phasor(v rig.Vector) complex128 {
	s, c := math.Sincos(-v.Lag * math.Pi / 180)
	return complex(v.RMS*c, v.RMS*s)
}

func conj(z complex128) complex128 { return complex(real(z), -imag(z)) }

func vector(z complex128) dsp.Vector {
	lag := math.Mod(-math.Atan2(imag(z), real(z))*180/math.Pi+360, 360)
	return dsp.Vector{RMS: math.Hypot(real(z), imag(z)), Lag: lag}
}
