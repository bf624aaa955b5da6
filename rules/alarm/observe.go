package alarm

import (
	"fmt"

	"heavyspot/dsp"
	"heavyspot/rules"
)

// cause says whether an alarm's cause is there in a minute.
type cause uint8

const (
	away    cause = iota
	present       // over the limit
	between       // inside the deadband: keeps an alarm, brings none
	unknown       // cannot be told now: the alarm holds its state
)

// observation is one alarm's cause in one minute.
type observation struct {
	alarm        Name
	point        string
	cause        cause
	priority     Priority
	value, limit float64
	unit         string
	// come and clear are sentences without the machine's name; the one that
	// matches the change is used.
	come, clear string
	// after and until are the minutes in a row before it comes and clears.
	after, until int
}

const mms = "mm/s rms"

// observe lists the causes of every alarm in a minute; f is nil when the minute
// was not judged.
func (e *Engine) observe(m *dsp.Minute, f *rules.Finding) []observation {
	obs := make([]observation, 0, 3*len(m.Points)+5)
	for i := range m.Points {
		obs = append(obs, e.point(m, &m.Points[i])...)
	}
	obs = append(obs, e.unbalance(m, f, Unbalance), e.unbalance(m, f, OverhungUnbalance))
	if e.cfg.HasReference {
		obs = append(obs, e.reference(m))
	}
	return append(obs, e.samples(m), e.rundown(m))
}

func (e *Engine) point(m *dsp.Minute, p *dsp.PointReading) []observation {
	fault := observation{
		alarm: PointFault, point: p.Name, priority: Low, after: 1, until: e.cfg.ClearMinutes,
		come:  p.Name + ": " + faultText(p.State),
		clear: p.Name + ": signal is good again",
	}
	switch {
	case p.State == dsp.PointGood:
	case m.Speed.State == dsp.Stopped && p.State == dsp.PointFlat:
		fault.cause = unknown // a standing machine may well give a flat signal
	default:
		fault.cause = present
	}
	obs := []observation{fault}
	if e.cfg.AlarmMMS > 0 {
		known := p.State == dsp.PointGood && m.Speed.State == dsp.Steady
		obs = append(obs,
			e.high(High1x, p.Name, "1x vibration", p.Order[0].RMS, known),
			e.high(HighOverall, p.Name, "vibration", p.Overall, known))
	}
	return obs
}

func (e *Engine) high(n Name, point, what string, value float64, known bool) observation {
	limit := e.cfg.AlarmMMS
	o := observation{
		alarm: n, point: point, priority: Medium, value: value, limit: limit, unit: mms,
		after: 1, until: e.cfg.ClearMinutes,
		come:  fmt.Sprintf("%s: %s %.1f mm/s rms is over the alarm limit of %.4g", point, what, value, limit),
		clear: fmt.Sprintf("%s: %s is back to %.1f mm/s rms, under the alarm limit of %.4g", point, what, value, limit),
	}
	if n == HighOverall {
		o.priority = High
	}
	switch {
	case !known || value != value:
		o.cause = unknown
	case value > limit:
		o.cause = present
	case value > limit*(1-e.cfg.Deadband):
		o.cause = between
	}
	return o
}

func faultText(s dsp.PointState) string {
	switch s {
	case dsp.PointOpen:
		return "sensor signal is interrupted; look at cable and plugs"
	case dsp.PointShort:
		return "sensor signal is short-circuited; look at cable and plugs"
	case dsp.PointFlat:
		return "sensor gives no signal; look at its supply and cable"
	case dsp.PointClipped:
		return "sensor signal is cut off at the end of its range; its readings are not used"
	case dsp.PointNoisy:
		return "sensor signal is too noisy to be used; look at mounting, cable and shield"
	}
	return fmt.Sprintf("sensor signal is %s and is not used", s)
}

var kinds = map[rules.Verdict]string{
	rules.StaticUnbalance:  "static unbalance",
	rules.CoupleUnbalance:  "couple unbalance",
	rules.DynamicUnbalance: "dynamic unbalance",
	rules.OverhungUnbal:    "unbalance of the overhung rotor",
}

// countedSeconds is the length from which a minute counts in a row of minutes;
// the first and the last of a run may be much shorter.
const countedSeconds = 50.0

// unbalance observes one of the two unbalance alarms. A verdict that is
// undetermined, or comes from a part of a minute, neither brings nor clears it.
func (e *Engine) unbalance(m *dsp.Minute, f *rules.Finding, n Name) observation {
	o := observation{alarm: n, priority: Low, unit: mms, after: e.cfg.UnbalanceMinutes, until: e.cfg.ClearMinutes}
	worst := ""
	for i := range m.Points {
		if p := &m.Points[i]; p.State == dsp.PointGood && p.Order[0].RMS > o.value {
			o.value, worst = p.Order[0].RMS, p.Name
		}
	}
	o.limit = e.cfg.QuietShare * e.cfg.AlarmMMS
	if f == nil || m.Speed.State != dsp.Steady || f.Verdict == rules.Undetermined || m.Seconds < countedSeconds {
		o.cause = unknown
		return o
	}
	switch {
	case e.cfg.TripMMS > 0 && f.Severity.MMS > e.cfg.TripMMS:
		o.priority = High
	case e.cfg.AlarmMMS > 0 && f.Severity.MMS > e.cfg.AlarmMMS:
		o.priority = Medium
	}
	kind, unbalanced := kinds[f.Verdict]
	if unbalanced && (f.Verdict == rules.OverhungUnbal) == (n == OverhungUnbalance) {
		o.cause = present
	}
	o.come = fmt.Sprintf("%s found for %d minutes; worst 1x vibration %.1f mm/s rms at %s", kind, o.after, o.value, worst)
	o.clear = "unbalance is no longer found"
	return o
}

func (e *Engine) reference(m *dsp.Minute) observation {
	o := observation{
		alarm: ReferenceLost, priority: Low, after: 1, until: e.cfg.ClearMinutes,
		come:  "phase reference gives no usable pulses; phase cannot be compared with earlier readings",
		clear: "phase reference gives pulses again",
	}
	switch {
	case m.Speed.State == dsp.Stopped:
		o.cause = unknown
	case m.Speed.Reference == dsp.ReferenceNone:
		o.cause = present
	}
	return o
}

func (e *Engine) samples(m *dsp.Minute) observation {
	o := observation{
		alarm: SamplesLost, priority: Low, value: m.Coverage, limit: e.cfg.Coverage, unit: "share",
		after: 1, until: e.cfg.ClearMinutes,
		come:  fmt.Sprintf("%.1f %% of the samples of a minute were lost", 100*(1-m.Coverage)),
		clear: "all samples arrive again",
	}
	if !(m.Coverage >= e.cfg.Coverage) {
		o.cause = present
	}
	return o
}

// rundown compares with the speed of the last steady minute, which a stop does
// not change.
func (e *Engine) rundown(m *dsp.Minute) observation {
	o := observation{
		alarm: Rundown, priority: Medium, value: m.Speed.Min, limit: slowShare * e.steadyRPM, unit: "r/min",
		after: 1, until: 1, cause: unknown,
		clear: fmt.Sprintf("machine runs steadily again at %.0f r/min", m.Speed.Mean),
	}
	switch {
	case m.Speed.State == dsp.Steady:
		o.cause = away
	case e.steadyRPM == 0:
	case m.Speed.State == dsp.Stopped:
		o.cause, o.value = present, 0
		o.come = fmt.Sprintf("machine has stopped; it had run at %.0f r/min", e.steadyRPM)
	case m.Speed.Min < o.limit:
		o.cause = present
		o.come = fmt.Sprintf("machine slows down from %.0f to %.0f r/min", e.steadyRPM, m.Speed.Min)
	}
	return o
}
