package publish

import "heavyspot/rules/alarm"

// Alarm tells that an alarm's state has changed.
type Alarm struct {
	Envelope
	Alarm alarm.Name `json:"alarm"`
	// Point is left out for an alarm of the whole machine.
	Point    string         `json:"point,omitempty"`
	Priority alarm.Priority `json:"priority"`
	State    alarm.State    `json:"state"`
	// Condition is true while the cause is present.
	Condition bool `json:"condition"`
	// Value and Limit are in Unit; an empty Unit with both 0 means that the
	// alarm has no figure.
	Value float64 `json:"value"`
	Limit float64 `json:"limit"`
	Unit  string  `json:"unit"`
	// Since is when Condition became what it is.
	Since Time   `json:"since"`
	Text  string `json:"text"`
}

// AlarmMessage makes the message of an alarm event; site, machine, sequence and
// boot are left to the sender.
func AlarmMessage(e *alarm.Event) *Alarm {
	return &Alarm{
		Envelope: Envelope{Schema: Schema, Kind: KindAlarm, Time: At(e.Time)},
		Alarm:    e.Alarm, Point: e.Point, Priority: e.Priority, State: e.State, Condition: e.Condition,
		Value: round(e.Value, 4), Limit: round(e.Limit, 4), Unit: e.Unit, Since: At(e.Since), Text: e.Text,
	}
}

// Levels are the levels of the topic below the machine.
func (a *Alarm) Levels() []string {
	if a.Point == "" {
		return []string{string(KindAlarm), string(a.Alarm)}
	}
	return []string{string(KindAlarm), string(a.Alarm), a.Point}
}

// Retained is true: the newest message of an alarm is its state.
func (a *Alarm) Retained() bool { return true }
