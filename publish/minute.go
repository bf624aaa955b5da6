package publish

import "heavyspot/dsp"

// Minute is the reading of one minute.
type Minute struct {
	Envelope
	// Seconds is the length covered.
	Seconds float64 `json:"seconds"`
	// Coverage is the share of the samples that arrived, 0 to 1.
	Coverage float64 `json:"coverage"`
	// Clock is "set" when Time can be believed, else "unset".
	Clock string `json:"clock"`
	// LagFrom names the point that lags are relative to when there is no usable
	// reference; left out otherwise.
	LagFrom string  `json:"lag_from,omitempty"`
	Speed   Speed   `json:"speed"`
	Points  []Point `json:"points"`
	// Neighbours are other machines heard close to 1x, strongest first.
	Neighbours []Neighbour `json:"neighbours,omitempty"`
}

// Values of Minute.Clock.
const (
	ClockSet   = "set"
	ClockUnset = "unset"
)

// Speed is what was learnt of the speed.
type Speed struct {
	State     dsp.SpeedState     `json:"state"`
	MeanRPM   float64            `json:"mean_rpm"`
	MinRPM    float64            `json:"min_rpm"`
	MaxRPM    float64            `json:"max_rpm"`
	Turns     int                `json:"turns"`
	Reference dsp.ReferenceState `json:"reference"`
	// MissingPulses and ExtraPulses count those mended and rejected.
	MissingPulses int `json:"missing_pulses,omitempty"`
	ExtraPulses   int `json:"extra_pulses,omitempty"`
}

// Point is what one point showed. The figures of a point that is not good are
// left out, and so are the orders of a machine that stands.
type Point struct {
	Point  string         `json:"point"`
	State  dsp.PointState `json:"state"`
	Order1 *Order1        `json:"order1,omitempty"`
	// Order2 and Order3 are left out when the sampling rate is too low for them.
	Order2  *Order   `json:"order2,omitempty"`
	Order3  *Order   `json:"order3,omitempty"`
	Overall *float64 `json:"overall_mm_s_rms,omitempty"`
	// Share is (order1 / overall) squared.
	Share *float64 `json:"order1_share,omitempty"`
	// Wander is the angular deviation of the 1x lag within the minute, degrees.
	Wander *float64 `json:"wander_deg,omitempty"`
}

// Order is the vector of one order of the turn rate.
type Order struct {
	MMS float64 `json:"mm_s_rms"`
	// Lag is 0 <= Lag < 360 degrees.
	Lag float64 `json:"lag_deg"`
}

// Order1 is the 1x vector with one standard deviation of its figures.
type Order1 struct {
	Order
	MMSSD float64 `json:"mm_s_rms_sd"`
	LagSD float64 `json:"lag_deg_sd"`
}

// Neighbour is a line close to 1x that does not turn with the shaft.
type Neighbour struct {
	RPM    float64          `json:"rpm"`
	Points []NeighbourPoint `json:"points"`
}

// NeighbourPoint is a neighbour's velocity at one point.
type NeighbourPoint struct {
	Point string  `json:"point"`
	MMS   float64 `json:"mm_s_rms"`
}

// MinuteMessage makes the message of a minute; site, machine, sequence and boot
// are left to the sender.
func MinuteMessage(m *dsp.Minute) *Minute {
	out := &Minute{
		Envelope: Envelope{Schema: Schema, Kind: KindMinute, Time: At(m.Start)},
		Seconds:  round(m.Seconds, 3), Coverage: share(m.Coverage),
		Clock: ClockUnset, LagFrom: m.LagFrom,
		Speed: Speed{
			State: m.Speed.State, MeanRPM: round(m.Speed.Mean, 3),
			MinRPM: round(m.Speed.Min, 3), MaxRPM: round(m.Speed.Max, 3),
			Turns: m.Speed.Turns, Reference: m.Speed.Reference,
			MissingPulses: m.Speed.Missing, ExtraPulses: m.Speed.Extra,
		},
		Points: make([]Point, len(m.Points)),
	}
	if m.ClockSet {
		out.Clock = ClockSet
	}
	turning := m.Speed.State != dsp.Stopped
	for i := range m.Points {
		out.Points[i] = point(&m.Points[i], turning)
	}
	for _, l := range m.Lines {
		out.Neighbours = append(out.Neighbours, neighbour(&l, m.Points))
	}
	return out
}

func point(p *dsp.PointReading, turning bool) Point {
	out := Point{Point: p.Name, State: p.State}
	if p.State != dsp.PointGood {
		return out
	}
	out.Overall = measured(p.Overall, 4)
	v := p.Order[0]
	if !turning || !finite(v.RMS, v.Lag) {
		return out
	}
	out.Order1 = &Order1{Order: *order(v), MMSSD: round(v.RMSSD, 4), LagSD: round(v.LagSD, 2)}
	out.Order2, out.Order3 = order(p.Order[1]), order(p.Order[2])
	out.Share = measured(p.Share, 4)
	out.Wander = measured(p.Wander, 2)
	return out
}

// order returns nil for an order that was not fitted.
func order(v dsp.Vector) *Order {
	if v == (dsp.Vector{}) || !finite(v.RMS, v.Lag) {
		return nil
	}
	return &Order{MMS: round(v.RMS, 4), Lag: lag(v.Lag)}
}

func neighbour(l *dsp.Line, points []dsp.PointReading) Neighbour {
	n := Neighbour{RPM: round(l.RPM, 3), Points: []NeighbourPoint{}}
	for i := range points {
		if i < len(l.RMS) && points[i].State == dsp.PointGood {
			n.Points = append(n.Points, NeighbourPoint{points[i].Name, round(l.RMS[i], 4)})
		}
	}
	return n
}

// Levels are the levels of the topic below the machine.
func (m *Minute) Levels() []string { return []string{string(KindMinute)} }

// Retained is false: a reading is no state.
func (m *Minute) Retained() bool { return false }
