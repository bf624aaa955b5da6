package main

import (
	"fmt"
	"io"
	"strings"
	"time"

	"heavyspot/config"
	"heavyspot/dsp"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

// textSink prints ticks for people: a row for each minute, and what changed
// below it.
type textSink struct {
	out io.Writer
	// name is the width of the column of the points' names.
	name int
	// headed says that the column heads are printed; day is the date below
	// which the rows stand, notes what was noted last.
	headed     bool
	day, notes string
	verdict    rules.Verdict
}

func newTextSink(cfg *config.Config, out io.Writer) *textSink {
	s := &textSink{out: out, name: len("point")}
	for _, p := range cfg.Points {
		s.name = max(s.name, len(p.Name))
	}
	return s
}

func (s *textSink) take(t *tick) error {
	var b strings.Builder
	if !s.headed {
		s.headed = true
		fmt.Fprintf(&b, "%9s  %7s  %-*s %6s %4s  %7s  %-10s  %s\n",
			"time", "r/min", s.name, "point", "1x", "@lag", "overall", "level", "verdict")
	}
	if day := dayOf(&t.Minute); day != s.day && day != "" {
		s.day = day
		fmt.Fprintf(&b, "%s UTC\n", day)
	}
	b.WriteString(s.row(t))
	if n := strings.Join(notes(&t.Minute), "; "); n != s.notes {
		s.notes = n
		if n != "" {
			b.WriteString(wrap("           note: ", n))
		}
	}
	if t.Finding != nil && t.Finding.Verdict != s.verdict {
		b.WriteString(verdictText(t.Finding, s.verdict))
		s.verdict = t.Finding.Verdict
	}
	for i := range t.Events {
		b.WriteString(eventText(&t.Events[i]))
	}
	_, err := io.WriteString(s.out, b.String())
	return err
}

// row is one minute in one line.
func (s *textSink) row(t *tick) string {
	m := &t.Minute
	speed, level, verdict := fmt.Sprintf("%7.1f", m.Speed.Mean), "-", "("+string(m.Speed.State)+")"
	if m.Speed.State == dsp.Stopped {
		speed = "-"
	}
	if t.Finding != nil {
		level, verdict = string(t.Finding.Severity.Level), string(t.Finding.Verdict)
	}
	point, first, lag, overall := "-", "-", "", "-"
	if p := worst1x(m); p != nil {
		point, first, lag = p.Name, fmt.Sprintf("%.2f", p.Order[0].RMS), fmt.Sprintf("@%.0f", wholeLag(p.Order[0].Lag))
	}
	if v, ok := highestOverall(m); ok {
		overall = fmt.Sprintf("%.2f", v)
	}
	if level == "" {
		level = "-"
	}
	return fmt.Sprintf("%9s  %7s  %-*s %6s %4s  %7s  %-10s  %s\n", clockOf(m), speed, s.name, point, first, lag, overall, level, verdict)
}

// dayOf is the date of a minute, empty when its time is counted.
func dayOf(m *dsp.Minute) string {
	if counted(m) {
		return ""
	}
	return m.Start.UTC().Format(time.DateOnly)
}

// counted says whether a minute's time is counted from the first sample, as
// publish.Counted does.
func counted(m *dsp.Minute) bool { return !m.ClockSet && m.Start.Before(time.Unix(86400*365, 0)) }

// clockOf is the time of day of a minute, or its distance from the first sample
// after a plus sign; a question mark says that the clock was not set.
func clockOf(m *dsp.Minute) string {
	if counted(m) {
		n := int64(m.Start.Sub(time.Unix(0, 0)).Seconds())
		return fmt.Sprintf("+%d:%02d:%02d", n/3600, n/60%60, n%60)
	}
	s := m.Start.UTC().Format(time.TimeOnly)
	if !m.ClockSet {
		s += "?"
	}
	return s
}

// stampOf is date and time of a minute.
func stampOf(m *dsp.Minute) string { return strings.TrimSpace(dayOf(m) + " " + clockOf(m)) }

// wholeLag rounds a lag for people; 359.7 becomes 0.
func wholeLag(deg float64) float64 { return float64(int(deg+0.5) % 360) }

// worst1x returns the good point with the largest 1x, nil when there is none.
func worst1x(m *dsp.Minute) *dsp.PointReading {
	var worst *dsp.PointReading
	if m.Speed.State == dsp.Stopped {
		return nil
	}
	for i := range m.Points {
		p := &m.Points[i]
		if p.State == dsp.PointGood && (worst == nil || p.Order[0].RMS > worst.Order[0].RMS) {
			worst = p
		}
	}
	return worst
}

// highestOverall returns the highest overall velocity of the good points, mm/s
// rms; false when there is none.
func highestOverall(m *dsp.Minute) (v float64, ok bool) {
	for i := range m.Points {
		if p := &m.Points[i]; p.State == dsp.PointGood {
			v, ok = max(v, p.Overall), true
		}
	}
	return v, ok
}

// notes lists what a reader of a minute's figures must know.
func notes(m *dsp.Minute) []string {
	var list []string
	if m.Coverage < 1 {
		list = append(list, fmt.Sprintf("%.2f %% of the samples are missing", 100*(1-m.Coverage)))
	}
	for i := range m.Points {
		if p := &m.Points[i]; p.State != dsp.PointGood {
			list = append(list, fmt.Sprintf("%s is %s", p.Name, p.State))
		}
	}
	switch s := &m.Speed; {
	case s.Reference != dsp.ReferenceDoubtful:
	case s.Missing+s.Extra == 0:
		list = append(list, "phase reference is doubtful: its pulses are too narrow for the sampling")
	default:
		list = append(list, fmt.Sprintf("phase reference is doubtful: %d pulses missing, %d extra", s.Missing, s.Extra))
	}
	if m.LagFrom != "" {
		list = append(list, "no usable phase reference, lags are relative to "+m.LagFrom)
	}
	for _, l := range m.Lines {
		if m.Speed.State != dsp.Steady {
			break // while the speed changes a line is hardly another machine
		}
		list = append(list, fmt.Sprintf("a neighbour turns at %.1f r/min", l.RPM))
	}
	return list
}

// verdictText tells of a verdict that differs from the one before.
func verdictText(f *rules.Finding, before rules.Verdict) string {
	text := string(f.Verdict)
	if before != "" {
		text += " (before: " + string(before) + ")"
	}
	if len(f.Suspects) > 0 {
		words := make([]string, len(f.Suspects))
		for i, s := range f.Suspects {
			words[i] = string(s)
		}
		text += ", suspected: " + strings.Join(words, ", ")
	}
	return wrap("  verdict  ", text+"; "+severityText(&f.Severity))
}

// severityText is the severity in words.
func severityText(s *rules.Severity) string {
	if s.WorstPoint == "" {
		return "no point to judge the severity by"
	}
	than := "is below"
	if s.Level == rules.Alarm || s.Level == rules.Trip {
		than = "has reached"
	}
	return fmt.Sprintf("level %s: %s with %.2f mm/s rms overall %s %.4g (%s)", s.Level, s.WorstPoint, s.MMS, than, s.Limit, s.Standard)
}

// eventText tells of an alarm that changed.
func eventText(e *alarm.Event) string {
	word, text := eventWords(e)
	return wrap(fmt.Sprintf("  %-9s", word), text)
}

// eventWords is what happened to an alarm, in a word and in a sentence.
func eventWords(e *alarm.Event) (word, text string) {
	word = "cleared"
	if e.Condition {
		word = "ALARM"
	}
	text = fmt.Sprintf("%s, priority %s: ", e.Key(), e.Priority)
	if e.Alarm == alarm.High1x || e.Alarm == alarm.HighOverall {
		return word, text + fmt.Sprintf("%.2f %s, limit %.4g", e.Value, e.Unit, e.Limit)
	}
	return word, text + e.Text
}
