package main

import (
	"context"
	"fmt"
	"io"
	"math"
	"sync"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/rig"
)

// settleSeconds is the simulated time between two visits, in which the machine
// comes to rest in its new state and which is not shown.
const settleSeconds = 3

// plan is where the visits of a story lie on the sample clock of the source.
type plan struct {
	visits []visit
	rateHz float64
	// first holds the first row of each visit.
	first []int64
}

func newPlan(visits []visit, rateHz float64) *plan {
	p := &plan{visits: visits, rateHz: rateHz}
	at := 0.0
	for _, v := range visits {
		p.first = append(p.first, int64(math.Round(at*rateHz)))
		at += float64(60*v.minutes) + settleSeconds
	}
	return p
}

// end returns the row after a visit's last.
func (p *plan) end(i int) int64 {
	return p.first[i] + int64(math.Round(float64(60*p.visits[i].minutes)*p.rateHz))
}

// leap returns by how many rows the story's clock is ahead of the source's
// during a visit.
func (p *plan) leap(i int) int64 {
	return int64(math.Round(float64(p.visits[i].day)*86400*p.rateHz)) - p.first[i]
}

// scene is the machine with the acts that change it, by its own steps, so that
// the same story gives the same samples however fast it runs.
type scene struct {
	*rig.Machine
	acts  []act
	steps int64

	mu  sync.Mutex
	err error
}

// act changes the machine before a step.
type act struct {
	step int64
	do   func(*rig.Machine) error
}

// newScene puts a machine on the stage of a plan.
func newScene(m *rig.Machine, p *plan) *scene {
	s := &scene{Machine: m}
	at := func(row int64, seconds float64) int64 {
		return int64((float64(row)/p.rateHz + seconds) * m.StepHz())
	}
	for i, v := range p.visits {
		// Early in the time between the visits; the machine's steps are a little
		// ahead of the source's rows, by what the converter takes to start.
		s.acts = append(s.acts, act{at(p.first[i], 0.5-settleSeconds), func(m *rig.Machine) error {
			return m.SetUnbalance(unbalances(v.deposits...)...)
		}})
		for _, t := range v.turns {
			s.acts = append(s.acts, act{at(p.first[i], t.second), t.do})
		}
	}
	return s
}

// Next implements rig.Signal.
func (s *scene) Next(dst []float32) {
	for len(s.acts) > 0 && s.steps >= s.acts[0].step {
		if err := s.acts[0].do(s.Machine); err != nil {
			s.mu.Lock()
			s.err = err
			s.mu.Unlock()
		}
		s.acts = s.acts[1:]
	}
	s.steps++
	s.Machine.Next(dst)
}

// failure is what went wrong on the stage.
func (s *scene) failure() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.err
}

// storySource shows the visits of a story and leaves out what lies between: the
// sample index and the time leap with it, as in a recording with holes.
type storySource struct {
	acquire.Source
	plan  *plan
	scene *scene
	// tell is told what happens, with the story's time.
	tell func(at time.Time, text string)
	// visit is the running visit, told how many of its turns were told.
	visit, told int
	begun       bool
}

// Read implements acquire.Source.
func (s *storySource) Read(ctx context.Context, b *acquire.Block) error {
	for {
		if s.visit == len(s.plan.visits) {
			return io.EOF
		}
		if err := s.Source.Read(ctx, b); err != nil {
			return err
		}
		if err := s.scene.failure(); err != nil {
			return fmt.Errorf("cannot play the demo's story: %w", err)
		}
		if s.show(b) {
			return nil
		}
	}
}

// show cuts a block to the running visit and puts it on the story's clock. It
// reports false when nothing is left.
func (s *storySource) show(b *acquire.Block) bool {
	n, p := int64(s.Format().Channels), s.plan
	from, to := p.first[s.visit], p.end(s.visit)
	last := b.First + int64(len(b.Volts))/n
	if last > to {
		b.Volts = b.Volts[:max(0, to-b.First)*n]
	}
	if cut := from - b.First; cut > 0 {
		b.Volts = b.Volts[min(cut*n, int64(len(b.Volts))):]
		b.First = from
	}
	leap := p.leap(s.visit)
	first := b.First
	b.First += leap
	b.Time, b.ClockSet = s.timeOf(b.First), true
	if len(b.Volts) > 0 {
		s.narrate(b, first-from)
	}
	if last >= to {
		s.visit, s.told, s.begun = s.visit+1, 0, false
	}
	return len(b.Volts) > 0
}

// narrate tells what happens in a block that begins at a row of the visit, and
// marks the leap ahead of a visit's first.
func (s *storySource) narrate(b *acquire.Block, row int64) {
	v := &s.plan.visits[s.visit]
	if !s.begun {
		s.begun = true
		text := v.text
		if s.visit > 0 {
			before := s.visit - 1
			b.Gap = acquire.Gap{Lost: b.First - s.plan.end(before) - s.plan.leap(before), Exact: true, Cause: acquire.Absent}
			text = fmt.Sprintf("the story leaps %s: %s", several(v.day-s.plan.visits[before].day, "day"), text)
		}
		s.tell(b.Time, text)
	}
	rows := int64(len(b.Volts) / s.Format().Channels)
	for s.told < len(v.turns) && float64(row+rows) > v.turns[s.told].second*s.plan.rateHz {
		s.tell(b.Time, v.turns[s.told].text)
		s.told++
	}
}

// timeOf is the story's time of a row on the story's clock.
func (s *storySource) timeOf(row int64) time.Time {
	seconds, rest := row/int64(s.plan.rateHz), row%int64(s.plan.rateHz)
	return storyBegins.Add(time.Duration(seconds)*time.Second + time.Duration(float64(rest)/s.plan.rateHz*1e9))
}
