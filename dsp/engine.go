package dsp

import (
	"errors"
	"fmt"
	"time"
)

// Engine is the signal path of one machine. It is fed rows of samples and
// gives a reading whenever a minute is closed. It is not safe for use by
// several goroutines at once.
type Engine struct {
	cfg     Config
	buf     *rows
	pulses  *pulses // nil without a reference
	turns   turns
	fitter  *fitter
	tracker *tracker
	band    *band
	health  health
	series  *series
	nb      *neighbours
	spread  *spread
	taper   []float64

	origin   int64 // first row of the minute
	expected int64 // index of the next row
	arrived  int64 // rows of the minute that arrived
	started  bool
	// lastTurn is the end of the newest turn by the reference.
	lastTurn float64
	// tracked is true while the turn rate comes from the vibration.
	tracked bool
}

const (
	// keepSeconds of samples stay in memory: several turns at 60 r/min.
	keepSeconds = 10
	// slowestTurn is the longest turn, s; slower is stopped.
	slowestTurn = 2.5
)

// NewEngine returns an engine; cfg must be consistent (channels in range,
// sensitivities over zero), else an error names the field.
func NewEngine(cfg Config) (*Engine, error) {
	if err := cfg.check(); err != nil {
		return nil, err
	}
	e := &Engine{cfg: cfg, nb: newNeighbours(), spread: newSpread()}
	e.buf = newRows(cfg.Channels, int(keepSeconds*cfg.RateHz))
	e.band = newBand(&e.cfg)
	e.series = newSeries(len(cfg.Points))
	e.health.flat = make([]flatTops, len(cfg.Points))
	e.fitter = newFitter(&e.cfg, e.buf, e.part)
	e.turns = turns{emit: e.pulseTurn, lost: e.fitter.broken}
	e.tracker = newTracker(&e.cfg, e.buf)
	if cfg.Reference != nil {
		e.pulses = newPulses(*cfg.Reference)
	} else {
		e.tracked = true
	}
	return e, nil
}

func (c *Config) check() error {
	if !(c.RateHz > 0) || c.Channels < 1 {
		return fmt.Errorf("dsp: rate %v Hz and %d channels: both must be over 0", c.RateHz, c.Channels)
	}
	if len(c.Points) == 0 {
		return errors.New("dsp: no measuring points")
	}
	for _, p := range c.Points {
		if p.Channel < 0 || p.Channel >= c.Channels {
			return fmt.Errorf("dsp: point %s: channel %d: must be from 0 to %d", p.Name, p.Channel, c.Channels-1)
		}
		if !(p.VoltsPerG > 0) {
			return fmt.Errorf("dsp: point %s: %v volts per g: must be over 0", p.Name, p.VoltsPerG)
		}
	}
	if r := c.Reference; r != nil && (r.Channel < 0 || r.Channel >= c.Channels) {
		return fmt.Errorf("dsp: phase reference: channel %d: must be from 0 to %d", r.Channel, c.Channels-1)
	}
	return nil
}

// Push takes rows of samples; first is the sample index of the first of them.
// Rows between the last pushed and first count as lost; first may not be less.
// volts is not kept.
func (e *Engine) Push(first int64, volts []float32) {
	if !e.started {
		e.started = true
		e.origin, e.expected = first, first
		e.restart(first)
	}
	if first != e.expected {
		e.restart(first)
	}
	// Long stretches are fed by the second, so that turns are taken while
	// their samples are still in memory.
	step := int(e.cfg.RateHz) * e.cfg.Channels
	for len(volts) > 0 {
		n := min(step, len(volts))
		e.push(volts[:n])
		volts = volts[n:]
	}
}

func (e *Engine) push(volts []float32) {
	n := int64(len(volts) / e.cfg.Channels)
	e.expected += n
	e.arrived += n
	e.buf.push(volts)
	e.band.push(volts)
	if e.pulses != nil {
		e.pulses.scan(e.buf, e.turns.edge)
		e.choose()
	}
	if e.tracked {
		e.tracker.scan(e.turn, e.fitter.broken)
	}
}

// choose goes over to the vibration when pulses stay away, and back when they
// have returned.
func (e *Engine) choose() {
	silent := float64(e.expected) - e.lastTurn
	switch {
	case !e.tracked && silent > 2*slowestTurn*e.cfg.RateHz:
		e.tracked = true
		e.fitter.broken()
		e.tracker.restart()
	case e.tracked && e.turns.locked && silent < slowestTurn*e.cfg.RateHz:
		e.tracked = false
		e.fitter.broken()
	}
}

// restart begins anew after a gap, with the row at.
func (e *Engine) restart(at int64) {
	e.turns.restart()
	e.fitter.broken()
	e.buf.restart(at)
	e.band.restart()
	e.tracker.restart()
	if e.pulses != nil {
		e.pulses.restart(at)
	}
	e.expected = at
	e.lastTurn = float64(at)
}

// pulseTurn takes a turn from the reference.
func (e *Engine) pulseTurn(t turn) {
	e.lastTurn = t.end
	if !e.tracked {
		e.turn(t)
	}
}

// turn passes on a turn that is not too slow and still in memory.
func (e *Engine) turn(t turn) {
	if t.end-t.start > slowestTurn*e.cfg.RateHz || t.start < float64(e.buf.base) {
		e.fitter.broken()
		return
	}
	e.fitter.turn(t)
}

// part takes a fitted part.
func (e *Engine) part(p *part) {
	e.series.add(&e.cfg, e.origin, p, e.tracked)
	e.band.follow(60 * float64(p.turns) / p.length * e.cfg.RateHz)
	e.health.look(e.fitter, p)
}

// Close ends the minute at the sample index end, which must not be before the
// last row pushed, and returns its reading. start is the wall time of the
// minute's first row (zero: unknown). Rows missing up to end count as lost.
func (e *Engine) Close(end int64, start time.Time, clockSet bool) Minute {
	m := Minute{
		First: e.origin, Start: start, ClockSet: clockSet,
		Seconds: float64(end-e.origin) / e.cfg.RateHz,
	}
	if end > e.origin {
		m.Coverage = float64(e.arrived) / float64(end-e.origin)
	}
	e.read(&m)
	e.origin, e.arrived = end, 0
	e.turns.missing, e.turns.extra = 0, 0
	e.series.clear()
	e.band.clear()
	e.health.clear()
	return m
}
