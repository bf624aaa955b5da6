package rules

import "heavyspot/dsp"

// severity returns the level of the worst point's overall velocity. A value
// equal to a limit has reached it.
func severity(l Limits, m *dsp.Minute) Severity {
	s := Severity{Standard: l.Standard}
	for i := range m.Points {
		p := &m.Points[i]
		if usable(p) && (s.WorstPoint == "" || p.Overall > s.MMS) {
			s.WorstPoint, s.MMS = p.Name, p.Overall
		}
	}
	if s.WorstPoint == "" {
		return s
	}
	switch {
	case l.Trip > 0 && s.MMS >= l.Trip:
		s.Level, s.Limit = Trip, l.Trip
	case s.MMS >= l.Alarm:
		s.Level, s.Limit = Alarm, l.Alarm
	case l.Acceptable > 0 && s.MMS < l.Acceptable:
		s.Level, s.Limit = Good, l.Acceptable
	case l.Acceptable > 0:
		s.Level, s.Limit = Acceptable, l.Alarm
	default:
		s.Level, s.Limit = Good, l.Alarm
	}
	return s
}
