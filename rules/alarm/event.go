package alarm

import "time"

// Name is an alarm's name in messages and topics.
type Name string

// The alarms.
const (
	// High1x: the once-per-turn velocity of a point is over the alarm limit.
	High1x Name = "high-1x"
	// HighOverall: the overall velocity of a point is over the alarm limit.
	HighOverall Name = "high-overall"
	// Unbalance: static, couple or dynamic unbalance was found minute after
	// minute.
	Unbalance Name = "unbalance"
	// OverhungUnbalance: the same for an overhung rotor.
	OverhungUnbalance Name = "overhung-unbalance"
	// ReferenceLost: the machine turns and the phase reference gives no usable
	// pulses.
	ReferenceLost Name = "reference-lost"
	// PointFault: a point's signal cannot be believed.
	PointFault Name = "point-fault"
	// SamplesLost: samples of the minute did not arrive.
	SamplesLost Name = "samples-lost"
	// Rundown: the machine slows down or stands after it had run steadily.
	Rundown Name = "rundown"
)

// Priority is how soon an operator has to act.
type Priority string

// The priorities.
const (
	High   Priority = "high"
	Medium Priority = "medium"
	Low    Priority = "low"
)

// State is a state of the alarm life cycle, by the names of IEC 62682.
type State string

// The states that this package gives.
const (
	Normal         State = "normal"
	Unacknowledged State = "unacknowledged"
)

// Event tells that an alarm's state has changed.
type Event struct {
	Alarm Name
	// Point is the point's name; empty for an alarm of the whole machine.
	Point    string
	Priority Priority
	State    State
	// Condition is true while the cause is present.
	Condition bool
	// Value is what was measured and Limit what it is held against, in Unit.
	// An empty Unit with both zero means that the alarm has no figure.
	Value, Limit float64
	Unit         string
	// Time is the start of the minute that changed the state.
	Time time.Time
	// Since is the start of the first minute of the unbroken row with the cause
	// present (or away) that led to the change.
	Since time.Time
	// Text is one sentence for an operator.
	Text string
}

// Key is the alarm and, if it belongs to one, "/" and the point.
func (e *Event) Key() string { return key(e.Alarm, e.Point) }

func key(n Name, point string) string {
	if point == "" {
		return string(n)
	}
	return string(n) + "/" + point
}
