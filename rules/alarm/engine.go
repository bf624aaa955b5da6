package alarm

import (
	"math"
	"slices"
	"strings"
	"time"

	"heavyspot/dsp"
	"heavyspot/rules"
)

// Engine keeps the state of every alarm of one machine. It is not safe for use
// by several goroutines at once.
type Engine struct {
	cfg       Config
	steadyRPM float64 // mean speed of the last steady minute; 0 = none yet
	lives     map[string]*life
}

// life is the state of one alarm.
type life struct {
	Active bool `json:"active"`
	// Row counts the minutes in a row that speak for a change, and Since is the
	// start of the first of them.
	Row   int       `json:"row,omitempty"`
	Since time.Time `json:"since"`
	// The figures of the event that brought it, for one whose point is gone.
	Priority Priority `json:"priority,omitempty"`
	Unit     string   `json:"unit,omitempty"`
}

// New returns an engine with all alarms normal. An error names the field that
// is out of range.
func New(cfg Config) (*Engine, error) {
	if err := cfg.fill(); err != nil {
		return nil, err
	}
	return &Engine{cfg: cfg, lives: map[string]*life{}}, nil
}

// Minute takes the next minute and its finding (nil when it was not judged) and
// returns the changes of state, at most one an alarm, in a fixed order.
func (e *Engine) Minute(m *dsp.Minute, f *rules.Finding) []Event {
	var events []Event
	watched := map[string]bool{}
	for _, o := range e.observe(m, f) {
		k := key(o.alarm, o.point)
		watched[k] = true
		l := e.lives[k]
		if l == nil {
			l = &life{}
			e.lives[k] = l
		}
		if l.step(&o, m.Start) {
			events = append(events, e.event(l, &o, m.Start))
		}
	}
	events = append(events, e.forget(watched, m.Start)...)
	if m.Speed.State == dsp.Steady && m.Speed.Mean > 0 && !math.IsInf(m.Speed.Mean, 1) {
		e.steadyRPM = m.Speed.Mean
	}
	return events
}

// step counts a minute and reports whether the state has changed.
func (l *life) step(o *observation, at time.Time) bool {
	if o.cause == unknown {
		return false
	}
	speaks := o.cause == present
	need := o.after
	if l.Active {
		speaks = o.cause == away
		need = o.until
	}
	if !speaks {
		l.Row = 0
		return false
	}
	if l.Row == 0 {
		l.Since = at
	}
	l.Row++
	if l.Row < need {
		return false
	}
	l.Active, l.Row = !l.Active, 0
	return true
}

func (e *Engine) event(l *life, o *observation, at time.Time) Event {
	ev := Event{
		Alarm: o.alarm, Point: o.point, Priority: o.priority, State: Normal,
		Value: o.value, Limit: o.limit, Unit: o.unit, Time: at, Since: l.Since,
		Text: e.cfg.Machine + ": " + o.clear,
	}
	if l.Active {
		ev.State, ev.Condition = Unacknowledged, true
		ev.Text = e.cfg.Machine + ": " + o.come
		l.Priority, l.Unit = o.priority, o.unit
	} else {
		// One alarm keeps one priority from coming to clearing.
		ev.Priority = l.Priority
	}
	return ev
}

// forget clears alarms that the configuration no longer has, so that none
// stands for ever.
func (e *Engine) forget(watched map[string]bool, at time.Time) []Event {
	var gone []string
	for k := range e.lives {
		if !watched[k] {
			gone = append(gone, k)
		}
	}
	slices.Sort(gone)
	var events []Event
	for _, k := range gone {
		l := e.lives[k]
		delete(e.lives, k)
		if !l.Active {
			continue
		}
		name, point, _ := strings.Cut(k, "/")
		events = append(events, Event{
			Alarm: Name(name), Point: point, Priority: l.Priority, State: Normal,
			Unit: l.Unit, Time: at, Since: at,
			Text: e.cfg.Machine + ": " + strings.TrimSpace(point+" "+name) + " is no longer watched",
		})
	}
	return events
}

// Active lists the keys (alarm, or alarm/point) of the alarms that stand,
// sorted.
func (e *Engine) Active() []string {
	var keys []string
	for k, l := range e.lives {
		if l.Active {
			keys = append(keys, k)
		}
	}
	slices.Sort(keys)
	return keys
}
