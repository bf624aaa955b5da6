package ads131m08

import (
	"fmt"
	"math"
	"runtime"
	"time"

	"heavyspot/acquire"
)

const (
	// lateRows is how many periods after its completion a row is lost, or may
	// be: the output holds two rows, so 2, less what the time of the edges may
	// lag behind the conversions.
	lateRows = 1.75
	// edgeWait is how long after its time a row is waited for, in periods. An
	// edge is missing when the conversion came while a frame was read.
	edgeWait = 0.5
	// overdue is when a row is read without waiting, in periods after its
	// time. When there is none by then the count of rows is wrong.
	overdue   = 0.25
	earlyRows = -0.3 // a row this long before its time is not the one expected

	maxBadEdges = 64  // edges out of place before the clock is doubted
	maxUnseen   = 0.5 // seconds without an edge before the line is doubted
	minUnseen   = 50  // rows of that at least
)

// run samples until Close.
func (s *Source) run() {
	defer close(s.ended)
	if s.cfg.Thread != nil {
		runtime.LockOSThread()
		defer runtime.UnlockOSThread()
		s.cfg.Thread()
	}
	for !s.stopping() {
		if f := s.sample(); f != nil {
			s.outage(f)
		}
	}
}

// sample reads the next row. It returns nil also when there is none yet.
func (s *Source) sample() *trouble {
	if err := s.await(); err != nil {
		return &trouble{acquire.BusFault, fmt.Errorf("cannot wait for data-ready: %w", err)}
	}
	before := s.clock.rows(s.ready.Now()) - float64(s.next)
	st, f := s.checked()
	if f != nil {
		return f
	}
	after := s.clock.rows(s.ready.Now()-s.wire) - float64(s.next)
	switch fresh := uint16(st.Fresh()); {
	case after >= lateRows:
		return &trouble{acquire.Late, fmt.Errorf("read %.1f sample periods late; %s", after, adviceLoad)}
	case fresh == 0 && before > overdue:
		return &trouble{acquire.Late, fmt.Errorf("a sample is missing; %s", adviceLoad)}
	case fresh == 0:
		s.pause(time.Duration(0.1 * s.nominal))
		return nil
	case fresh != s.cfg.mask():
		return &trouble{acquire.ChipReset, fmt.Errorf("STATUS %04Xh: some channels have no data: %s", uint16(st), adviceSupply)}
	case after < earlyRows:
		return &trouble{acquire.ChipReset, fmt.Errorf("samples come out of time: %s", adviceSupply)}
	}
	if f := s.learn(); f != nil {
		return f
	}
	s.keep()
	return nil
}

// checked reads a frame into s.row and checks all but its data-ready bits.
func (s *Source) checked() (Status, *trouble) {
	if err := s.bus.poll(); err != nil {
		return 0, &trouble{acquire.BusFault, transferError(err)}
	}
	st, err := s.decoder.Decode(&s.bus.r, s.row[:])
	switch {
	case err != nil:
		return 0, &trouble{causeOf(err), badFrame(err)}
	case !st.Configured():
		return 0, &trouble{acquire.ChipReset, fmt.Errorf("STATUS %04Xh: %w: %s", uint16(st), errUnset, adviceSupply)}
	}
	if st&StatusCRCErr != 0 {
		s.noteInput()
	}
	return st, nil
}

// await returns when the next row should be there.
func (s *Source) await() error {
	due := s.clock.at(s.next)
	for {
		now := float64(s.ready.Now())
		if s.edge >= s.next || now > due+overdue*s.clock.period {
			return nil
		}
		t, ok, err := s.ready.Wait(time.Duration(due + edgeWait*s.clock.period - now))
		if err != nil {
			return err
		}
		if !ok {
			return nil
		}
		s.noteEdge(t)
	}
}

// noteEdge takes down an edge at t, to whichever row it belongs.
func (s *Source) noteEdge(t time.Duration) {
	if row := s.clock.nearest(t); row > s.edge {
		s.edge, s.edgeAt = row, t
	}
}

// learn improves the clock by the edge of the row just read, if it was seen.
func (s *Source) learn() *trouble {
	if s.edge != s.next {
		s.unseen++
		if limit := math.Max(minUnseen, maxUnseen*s.cfg.RateHz); float64(s.unseen) > limit {
			s.unseen = 0
			return &trouble{acquire.BusFault, fmt.Errorf("no data-ready edge for %.0f samples: %s", limit, adviceEdge)}
		}
		return nil
	}
	s.unseen = 0
	if s.clock.update(s.next, s.edgeAt) {
		s.badEdge = 0
		return nil
	}
	if s.badEdge++; s.badEdge > maxBadEdges {
		s.badEdge = 0
		return &trouble{acquire.ChipReset, fmt.Errorf("data-ready comes out of time: %s", adviceClock)}
	}
	return nil
}

// keep appends s.row to the block.
func (s *Source) keep() {
	if s.block == nil && !s.begin() {
		return
	}
	s.block.Volts = append(s.block.Volts, s.row[:s.cfg.Channels]...)
	s.next++
	if len(s.block.Volts) >= s.size {
		s.flush()
	}
}

// begin takes an empty block, and waits for one where the reader is behind.
// It returns false when the source is closed meanwhile.
func (s *Source) begin() bool {
	select {
	case s.block = <-s.free:
	case <-s.done:
		return false
	}
	ago := s.ready.Now() - time.Duration(s.clock.at(s.next)) + s.delay
	*s.block = acquire.Block{
		First: s.next, Volts: s.block.Volts[:0],
		Time: s.cfg.Now().Round(0).Add(-ago), ClockSet: s.cfg.ClockSet(),
		Gap: s.gap,
	}
	s.gap = acquire.Gap{}
	return true
}

// flush hands the block over. There is room for all blocks in the queue.
func (s *Source) flush() {
	if s.block == nil {
		return
	}
	s.full <- s.block
	s.block = nil
}
