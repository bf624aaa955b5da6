package main

import (
	"fmt"
	"time"

	"heavyspot/acquire"
	"heavyspot/publish"
	"heavyspot/rules"
)

// demoView shows the demo to a person, or its messages as JSON Lines.
type demoView struct {
	screen *screen
	json   bool
	summary
	verdict rules.Verdict
	level   rules.Level
	// shown is the newest minute, now the story's time.
	shown *tick
	now   time.Time
	// rows counts what has passed of a stream of rateHz, since began.
	rows   int64
	rateHz float64
	began  time.Time
	drawn  time.Time
	err    error
}

// everyMinutes is how often a reading is printed where no status line can be
// rewritten.
const everyMinutes = 4

// line prints a line of the story: when, what kind of thing, and what.
func (v *demoView) line(at time.Time, kind, text string) {
	if !v.json {
		fmt.Fprint(v.screen, wrap(fmt.Sprintf("%s  %-8s", at.UTC().Format("2006-01-02 15:04"), kind), text))
	}
}

// tell tells what happens at the plant.
func (v *demoView) tell(at time.Time, text string) { v.line(at, "story", text) }

// stored is told each tick once it is in the buffer.
func (v *demoView) stored(t *tick, list []publish.Message) {
	v.take(t)
	v.shown = t
	if v.json {
		for _, m := range list {
			if err := printMessage(v.screen, m); err != nil && v.err == nil {
				v.err = err
			}
		}
		return
	}
	if f := t.Finding; f != nil && (f.Verdict != v.verdict || f.Severity.Level != v.level) {
		text := string(f.Verdict)
		if v.verdict != "" && v.verdict != f.Verdict {
			text += " (before: " + string(v.verdict) + ")"
		}
		v.verdict, v.level = f.Verdict, f.Severity.Level
		v.line(t.Minute.Start, "verdict", text+"; "+severityText(&f.Severity))
	}
	for i := range t.Events {
		word, text := eventWords(&t.Events[i])
		v.line(t.Minute.Start, word, text)
	}
	if !v.screen.live && v.minutes%everyMinutes == 0 {
		v.line(t.Minute.Start, "reading", v.reading())
	}
}

// reading is the newest minute in a few words.
func (v *demoView) reading() string {
	if v.shown == nil {
		return "the first minute is being measured"
	}
	m := &v.shown.Minute
	text := string(m.Speed.State)
	if v.shown.Finding != nil {
		text = string(v.shown.Finding.Verdict)
	}
	if p := worst1x(m); p != nil {
		text = fmt.Sprintf("%.0f r/min  %s %.2f mm/s @%.0f  %s", m.Speed.Mean, p.Name, p.Order[0].RMS, wholeLag(p.Order[0].Lag), text)
	}
	return text
}

// block keeps the status line.
func (v *demoView) block(b *acquire.Block, channels int) {
	v.rows += int64(len(b.Volts) / channels)
	v.now = b.Time
	if v.json || time.Since(v.drawn) < 100*time.Millisecond {
		return
	}
	v.drawn = time.Now()
	speed := float64(v.rows) / v.rateHz / v.drawn.Sub(v.began).Seconds()
	v.screen.show(fmt.Sprintf("%s  %.0fx  %s", v.now.UTC().Format(time.DateTime), speed, v.reading()))
}
