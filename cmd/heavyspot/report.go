package main

import (
	"context"
	"fmt"
	"log/slog"
	"math"
	"time"

	"heavyspot/acquire"
	"heavyspot/dsp"
	"heavyspot/publish/mqtt"
	"heavyspot/rules"
)

// reporter logs the changes that an operator of the board wants to read, and
// keeps the service manager's status line.
type reporter struct {
	log       *slog.Logger
	publisher *mqtt.Publisher
	service   *service

	verdict rules.Verdict
	level   rules.Level
	speed   dsp.SpeedState
	faulty  map[string]dsp.PointState
	// seen and set say whether the clock was set at the block before.
	seen, set bool
}

// take implements sink.
func (r *reporter) take(t *tick) error {
	m := &t.Minute
	if m.Speed.State != r.speed {
		r.speed = m.Speed.State
		r.log.Info("Machine is "+string(r.speed), keySpeed, hundredths(m.Speed.Mean))
	}
	r.points(m)
	if f := t.Finding; f != nil && (f.Verdict != r.verdict || f.Severity.Level != r.level) {
		r.verdict, r.level = f.Verdict, f.Severity.Level
		r.log.Info("Verdict", keyVerdict, f.Verdict, keyLevel, f.Severity.Level, keyWorst, hundredths(f.Severity.MMS), keyPoint, f.Severity.WorstPoint)
	}
	for i := range t.Events {
		e := &t.Events[i]
		level := slog.LevelInfo
		if e.Condition {
			level = slog.LevelWarn
		}
		r.log.Log(context.Background(), level, e.Text, keyAlarm, e.Key(), keyState, e.State)
	}
	r.service.status(r.line(t))
	return nil
}

// hundredths rounds a figure for the log.
func hundredths(x float64) float64 { return math.Round(100*x) / 100 }

// points logs points whose signal can no longer be believed, or can again.
func (r *reporter) points(m *dsp.Minute) {
	if r.faulty == nil {
		r.faulty = map[string]dsp.PointState{}
	}
	for _, p := range m.Points {
		if before, known := r.faulty[p.Name]; p.State != before && (known || p.State != dsp.PointGood) {
			r.log.Info("Point is "+string(p.State), keyPoint, p.Name)
		}
		r.faulty[p.Name] = p.State
	}
}

// line is the state in a few words.
func (r *reporter) line(t *tick) string {
	s := string(t.Minute.Speed.State)
	if t.Minute.Speed.State != dsp.Stopped {
		s += fmt.Sprintf(" at %.0f r/min", t.Minute.Speed.Mean)
	}
	if f := t.Finding; f != nil {
		s += fmt.Sprintf(", %s, level %s", f.Verdict, f.Severity.Level)
	}
	return fmt.Sprintf("%s, %d messages waiting", s, r.publisher.Status().Backlog)
}

// block logs gaps and a change of what is known of the clock.
func (r *reporter) block(b *acquire.Block) {
	if b.Gap.Lost > 0 {
		r.log.Warn("Samples are missing", keyLost, b.Gap.Lost, keyCause, b.Gap.Cause, keyRow, b.First)
	}
	if !r.seen || b.ClockSet != r.set {
		r.seen, r.set = true, b.ClockSet
		if b.ClockSet {
			r.log.Info("Wall clock is set; minutes are UTC minutes", keySet, true)
		} else {
			r.log.Warn("Wall clock is not set; minutes count from the first sample until it is", keySet, false)
		}
	}
}

// linkPeriod is how often the state of the link is looked at.
const linkPeriod = time.Second

// watchLink logs changes of the link to the broker until the returned function
// is called.
func (r *reporter) watchLink() (stop func()) {
	quit, done := make(chan struct{}), make(chan struct{})
	go func() {
		defer close(done)
		tick := time.NewTicker(linkPeriod)
		defer tick.Stop()
		var before mqtt.Status
		for {
			select {
			case <-quit:
				return
			case <-tick.C:
			}
			now := r.publisher.Status()
			switch {
			case now.Connected && !before.Connected:
				r.log.Info("Connected to the broker", keyBroker, now.Broker, keyWaiting, now.Backlog)
			case !now.Connected && (before.Connected || now.LastError != before.LastError):
				r.log.Warn("Not connected to a broker; messages wait in the buffer", keyError, now.LastError)
			}
			before = now
		}
	}()
	return func() { close(quit); <-done }
}
