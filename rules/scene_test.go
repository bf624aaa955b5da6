package rules

import (
	"math"
	"math/rand/v2"

	"heavyspot/dsp"
)

// A scene is a minute of prescribed vectors: no rotor dynamics, only what the
// trade's phase rules say of each cause (the project's table, section 5), with
// amplitudes, unequal supports and scatter drawn at random.
type scene struct {
	cfg Config
	m   dsp.Minute
	// kind is the verdict that is right; suspect goes with NotUnbalance.
	kind    Verdict
	suspect Suspect
}

// causes are what scenes are drawn of.
var causes = []string{
	"static", "couple", "dynamic", "overhung", "bent", "misaligned", "eccentric",
	"resonant", "loose", "rub", "neighbour", "flow",
}

// layout holds the six points in the order of a picture.
func layout() []Point {
	var list []Point
	for b, end := range []string{"de", "nde"} {
		for d, dir := range []string{"v", "h", "a"} {
			list = append(list, Point{Name: end + "-" + dir, NonDriveEnd: b == nonDriveEnd, Direction: Direction(d)})
		}
	}
	return list
}

// draft is a scene in the making: amplitude (mm/s rms) and lag per place.
type draft struct {
	amp, lag [2][3]float64
	// second and third are 2x and 3x against 1x; rest is the rms of what does
	// not turn, against the point's 1x.
	second, third, rest, wander float64
	line                        float64
}

func uniform(r *rand.Rand, lo, hi float64) float64 { return lo + (hi-lo)*r.Float64() }

// sign returns -1 or +1.
func sign(r *rand.Rand) float64 { return float64(2*r.IntN(2) - 1) }

// scatter is the greatest deviation of one point's lag, degrees; differences
// deviate by up to twice as much.
const scatter = 12

// newDraft returns plain static unbalance on unequal supports.
func newDraft(r *rand.Rand, sense float64) *draft {
	d := &draft{second: uniform(r, 0, 0.2), third: uniform(r, 0, 0.12), rest: uniform(r, 0.05, 0.5), wander: uniform(r, 0, 0.9*someWander)}
	size := uniform(r, 4, 25) // above the quiet level with the lower end factor
	base := uniform(r, 0, 360)
	high := uniform(r, 0.6, 1.6)
	for b := range d.amp {
		end := uniform(r, 0.5, 1.5)
		d.amp[b] = [3]float64{size * end, size * end * high * uniform(r, 0.8, 1.25), size * end * uniform(r, 0.02, 0.2)}
		d.lag[b] = [3]float64{base, base + 90*sense, uniform(r, 0, 360)}
	}
	return d
}

// apart turns the drive end's radial vectors by deg.
func (d *draft) apart(deg float64) {
	d.lag[driveEnd][Vertical] += deg
	d.lag[driveEnd][Horizontal] += deg
}

// axial gives both bearings a high axial 1x, deg apart.
func (d *draft) axial(r *rand.Rand, lo, hi, deg float64) {
	base := uniform(r, 0, 360)
	for b := range d.amp {
		mean := math.Sqrt(d.amp[b][Vertical] * d.amp[b][Horizontal])
		d.amp[b][Axial] = mean * uniform(r, lo, hi)
		d.lag[b][Axial] = base + float64(b)*deg
	}
}

// straighten makes horizontal move on one line with vertical.
func (d *draft) straighten(r *rand.Rand) {
	turn := 90 * (1 + sign(r))
	for b := range d.lag {
		d.lag[b][Horizontal] = d.lag[b][Vertical] + turn
	}
}

// newScene draws a scene of a cause.
func newScene(cause string, r *rand.Rand) *scene {
	s := &scene{kind: NotUnbalance}
	s.cfg = Config{CounterClockwise: r.IntN(2) == 1, RatedRPM: 1480, Points: layout()}
	s.cfg.Limits, _ = LimitsISO14694(3, false)
	sense := 1.0
	if s.cfg.CounterClockwise {
		sense = -1
	}
	for {
		d := newDraft(r, sense)
		s.shape(cause, d, r)
		s.draw(d, r)
		if s.kind != DynamicUnbalance || s.alike() {
			return s
		}
	}
}

// alike tells whether the ends' phase differs by at most 28 degrees between
// vertical and horizontal, as it must within 30 for dynamic unbalance (S2).
func (s *scene) alike() bool {
	lag := func(i int) float64 { return s.m.Points[i].Order[0].Lag }
	d := math.Remainder(lag(0)-lag(3)-(lag(1)-lag(4)), 360)
	return math.Abs(d) <= 28
}

// shape makes the draft that of a cause.
func (s *scene) shape(cause string, d *draft, r *rand.Rand) {
	switch cause {
	case "static":
		s.kind = StaticUnbalance
	case "couple":
		s.kind = CoupleUnbalance
		d.apart(180)
		d.amp[driveEnd][Axial] *= uniform(r, 1, 3)
	case "dynamic":
		s.kind = DynamicUnbalance
		d.apart(sign(r) * uniform(r, 60, 120))
	case "overhung":
		s.kind, s.cfg.Overhung = OverhungUnbal, true
		d.apart(uniform(r, -60, 60))
		d.axial(r, 0.35, 1.2, 0)
	case "bent":
		s.suspect = BentShaft
		d.axial(r, 0.45, 1.2, 180)
		d.second = uniform(r, 0, 0.4)
	case "misaligned":
		s.suspect = Misalignment
		d.straighten(r)
		d.axial(r, 0.6, 1.2, uniform(r, 0, 360))
		d.second, d.third = uniform(r, 0.6, 1.5), uniform(r, 0, 0.2)
		d.apart(uniform(r, 0, 360))
	case "eccentric":
		s.suspect = Eccentricity
		d.straighten(r)
	case "resonant":
		s.suspect = Resonance
		d.straighten(r)
		ratio := uniform(r, 5, 10)
		for b := range d.amp {
			d.amp[b][Horizontal] = d.amp[b][Vertical] / ratio
		}
	case "loose":
		s.suspect = Looseness
		d.second, d.third, d.wander = uniform(r, 0.4, 1.2), uniform(r, 0.4, 1), uniform(r, 5, 40)
	case "rub":
		s.suspect = RubOrLooseRotor
		d.wander = uniform(r, 15, 70)
	case "neighbour":
		s.suspect = NeighbourMachine
		d.line = uniform(r, 1.3, 4)
	case "flow":
		s.suspect = NotTurnRelated
		d.rest = uniform(r, 1.3, 4)
	}
}

// draw turns a draft into a minute with scatter of the phases.
func (s *scene) draw(d *draft, r *rand.Rand) {
	s.m = dsp.Minute{Seconds: 60, Coverage: 1, ClockSet: true,
		Speed: dsp.Speed{State: dsp.Steady, Mean: 1480, Min: 1479, Max: 1481, Turns: 1480, Reference: dsp.ReferenceGood}}
	line := dsp.Line{RPM: 1462}
	for b := range d.amp {
		for dir := range d.amp[b] {
			a := d.amp[b][dir]
			p := dsp.PointReading{State: dsp.PointGood, Wander: d.wander}
			p.Name = s.cfg.Points[3*b+dir].Name
			p.Order[0] = dsp.Vector{RMS: a, Lag: turned(d.lag[b][dir] + uniform(r, -scatter, scatter)),
				RMSSD: 0.01, LagSD: uniform(r, 0.05, 0.6)}
			p.Order[1] = dsp.Vector{RMS: a * d.second, Lag: uniform(r, 0, 360)}
			p.Order[2] = dsp.Vector{RMS: a * d.third, Lag: uniform(r, 0, 360)}
			p.Overall = a * math.Sqrt(1+sq(d.second)+sq(d.third)+sq(d.rest)+sq(d.line))
			p.Share = sq(a / p.Overall)
			line.RMS = append(line.RMS, a*d.line)
			s.m.Points = append(s.m.Points, p)
		}
	}
	if d.line > 0 {
		s.m.Lines = []dsp.Line{line}
	}
}

// turned returns the angle from 0 to below 360.
func turned(deg float64) float64 {
	deg = math.Mod(deg, 360)
	if deg < 0 {
		deg += 360
	}
	return deg
}

// finding judges a scene on its own.
func (s *scene) finding() Finding {
	j, err := NewJudge(s.cfg)
	if err != nil {
		panic(err)
	}
	f, _ := j.Judge(s.m)
	return f
}

// right tells whether the finding names the scene's cause, and wrong whether it
// names another one.
func (s *scene) right(f Finding) bool {
	return f.Verdict == s.kind && (s.suspect == "" || f.Suspects[0] == s.suspect)
}

func (s *scene) wrong(f Finding) bool { return f.Verdict != s.kind && f.Verdict != Undetermined }
