package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"time"

	"heavyspot/acquire"
	"heavyspot/config"
	"heavyspot/dsp"
	"heavyspot/publish"
	"heavyspot/rules"
	"heavyspot/rules/alarm"
)

const (
	// leastTurns is how many turns a minute that the stream's begin or end cuts
	// short must hold to count.
	leastTurns = 10
	// wholeSeconds is the length from which the first minute is not cut short.
	wholeSeconds = 59.5
)

// tick is what one minute gives.
type tick struct {
	Minute dsp.Minute
	// Finding is nil when the machine did not run steadily.
	Finding *rules.Finding
	// Events are the changes of alarms.
	Events []alarm.Event
}

// sink takes ticks in their order. A tick is the sink's to keep.
type sink interface {
	take(*tick) error
}

// pipeline leads the blocks of a source through the signal path, the rules and
// the alarms to its sinks. Time comes with the blocks alone, so that the same
// code runs live, from a recording and in the demo.
type pipeline struct {
	engine  *dsp.Engine
	judge   *rules.Judge
	alarms  *alarm.Engine
	minutes minutes
	format  acquire.Format
	sinks   []sink
	// onBlock, if not nil, is told each block once it is through.
	onBlock func(*acquire.Block)
	// cut is true while the running minute is the first, which may be short.
	cut bool
	// given counts the ticks given to the sinks and lost the missing rows.
	given int
	lost  int64
}

// newPipeline returns a pipeline for a stream that comes from the configured
// converter or does not (see signalPath). Whatever the configuration cannot do
// with it is an error.
func newPipeline(cfg *config.Config, f acquire.Format, converted bool, alarms *alarm.Engine, sinks ...sink) (*pipeline, error) {
	e, err := dsp.NewEngine(signalPath(cfg, f, converted))
	if err != nil {
		return nil, err
	}
	j, err := rules.NewJudge(cfg.Rules())
	if err != nil {
		return nil, err
	}
	return &pipeline{
		engine: e, judge: j, alarms: alarms, format: f, sinks: sinks, cut: true,
		minutes: minutes{rateHz: f.RateHz},
	}, nil
}

// signalPath is the configuration of the signal path for a stream. Where it
// comes from the configured converter, live or recorded, that saturates at a
// known voltage: 1.2 V over the gain (ADS131M08 data sheet 8.5.1.9).
func signalPath(cfg *config.Config, f acquire.Format, converted bool) dsp.Config {
	dc := cfg.DSP(f.RateHz, f.Channels)
	dc.Gain = f.Response
	for i := range dc.Points {
		if p := &dc.Points[i]; converted && p.Channel < len(cfg.Source.Gain) {
			v := converterV / float64(cfg.Source.Gain[p.Channel])
			if p.FullScaleV == 0 || v < p.FullScaleV {
				p.FullScaleV = v // the converter before the sensor
			}
		}
	}
	return dc
}

// converterV is the converter's full scale at gain 1, volts either way.
const converterV = 1.2

// run reads the source to its end or until ctx ends, and closes the last
// minute in either case. It returns nil at the stream's end and when ctx ended.
func (p *pipeline) run(ctx context.Context, src acquire.Source) error {
	var b acquire.Block
	for {
		err := src.Read(ctx, &b)
		if err == nil {
			if err = p.take(&b); err != nil {
				return err
			}
			continue
		}
		if ferr := p.finish(); ferr != nil {
			return ferr
		}
		if err == io.EOF || ctx.Err() != nil && errors.Is(err, ctx.Err()) {
			return nil
		}
		return err
	}
}

// take leads one block through, split where minutes end.
func (p *pipeline) take(b *acquire.Block) error {
	n := p.format.Channels
	if len(b.Volts)%n != 0 {
		return fmt.Errorf("cannot use block at sample %d: %d values are no whole number of rows of %d channels", b.First, len(b.Volts), n)
	}
	m := &p.minutes
	if m.begun {
		if b.First < m.reached {
			return fmt.Errorf("cannot use block at sample %d: samples up to %d are there already", b.First, m.reached)
		}
		p.lost += b.First - m.reached
	}
	m.observe(b.First, b.Time, b.ClockSet)
	if err := p.bridge(b.First); err != nil {
		return err
	}
	at, volts := b.First, b.Volts
	for {
		rows := int64(len(volts) / n)
		if head := m.end - at; head <= rows {
			p.push(at, volts[:head*int64(n)])
			at, volts = m.end, volts[head*int64(n):]
			if err := p.close(); err != nil {
				return err
			}
			continue
		}
		p.push(at, volts)
		break
	}
	if p.onBlock != nil {
		p.onBlock(b)
	}
	return nil
}

func (p *pipeline) push(at int64, volts []float32) {
	if len(volts) == 0 {
		return
	}
	p.engine.Push(at, volts)
	p.minutes.arrived(at + int64(len(volts)/p.format.Channels))
}

// bridge closes the minute whose end lies in the gap ahead of row, and passes
// over those of which nothing arrived.
func (p *pipeline) bridge(row int64) error {
	m := &p.minutes
	if m.reached == row || m.end > row {
		return nil
	}
	if err := p.close(); err != nil {
		return err
	}
	if !m.skip(row) {
		return nil
	}
	p.engine.Close(m.start, time.Time{}, false)
	return nil
}

// close ends the running minute at its boundary.
func (p *pipeline) close() error {
	end, cut := p.minutes.end, p.cut
	t := p.reading(end)
	p.minutes.advance()
	p.cut = false
	cut = cut && t.Minute.Seconds < wholeSeconds
	if t.Minute.Coverage == 0 || cut && t.Minute.Speed.Turns < leastTurns {
		return nil
	}
	return p.give(t)
}

// finish ends the last minute where the stream ended.
func (p *pipeline) finish() error {
	m := &p.minutes
	if !m.begun || m.reached <= m.start {
		return nil
	}
	t := p.reading(m.reached)
	m.start = m.reached
	if t.Minute.Speed.Turns < leastTurns {
		return nil
	}
	return p.give(t)
}

// reading closes the engine's minute at end.
func (p *pipeline) reading(end int64) *tick {
	m := &p.minutes
	start := m.label
	if start.IsZero() {
		start = publish.Counted(m.start, m.rateHz)
	}
	return &tick{Minute: p.engine.Close(end, start, m.set)}
}

// give judges a minute and hands it to the sinks.
func (p *pipeline) give(t *tick) error {
	if f, ok := p.judge.Judge(t.Minute); ok {
		t.Finding = &f
	}
	t.Events = p.alarms.Minute(&t.Minute, t.Finding)
	p.given++
	for _, s := range p.sinks {
		if err := s.take(t); err != nil {
			return err
		}
	}
	return nil
}
