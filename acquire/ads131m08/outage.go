package ads131m08

import (
	"errors"
	"fmt"
	"time"

	"heavyspot/acquire"
)

const (
	promptTries  = 8 // tries one after another, the later ones backing off
	firstBackOff = 10 * time.Millisecond
	maxBackOff   = 200 * time.Millisecond
	// patience is how long the chip is only listened to. A reset would lose
	// the place of its conversions in time, and with it the exact gap.
	patience = 300 * time.Millisecond
)

// trouble is why a row could not be had.
type trouble struct {
	cause acquire.Cause
	err   error
}

// outage goes on from a fault until rows come again, however long that takes,
// and records the gap.
func (s *Source) outage(f *trouble) {
	s.flush()
	first := s.next
	s.outset = outset{cause: f.cause, at: s.ready.Now()}
	s.noteFault(f, first)
	backOff := firstBackOff
	for try := 0; !s.stopping(); try++ {
		if f = s.recover(f, try); f == nil {
			s.closeGap(first)
			return
		}
		if s.blame(f.cause) {
			s.noteFault(f, first)
		}
		if try >= promptTries || f.cause == acquire.ChipReset {
			s.pause(backOff)
			backOff = min(2*backOff, maxBackOff)
		}
	}
}

// outset is what is known of the outage in progress.
type outset struct {
	cause acquire.Cause // the worst so far
	at    time.Duration // when it began
	reset bool          // the chip was sent a reset
	moved bool          // conversions began anew
}

// blame makes c the cause when it is worse and says whether it is. Once the
// chip was sent a reset, that it has restarted proves nothing.
func (s *Source) blame(c acquire.Cause) bool {
	if !worse(c, s.outset.cause) || c == acquire.ChipReset && s.outset.reset {
		return false
	}
	s.outset.cause = c
	return true
}

// worse says whether a explains more than b: a chip that has restarted more
// than a dead bus, that more than wrong check sums, these more than lateness.
func worse(a, b acquire.Cause) bool {
	rank := [...]uint8{acquire.Late: 1, acquire.BadCheck: 2, acquire.BusFault: 3, acquire.ChipReset: 4}
	return rank[a] > rank[b]
}

// recover tries once to get going after f. At first it only looks for the
// place in the stream; a chip that has restarted, or does not come back, is
// set up anew. It returns what is still wrong, nil for nothing.
func (s *Source) recover(f *trouble, try int) *trouble {
	if f.cause != acquire.ChipReset {
		if f = s.findPlace(try > promptTries); f == nil {
			return nil
		}
	}
	if f.cause != acquire.ChipReset && s.ready.Now()-s.outset.at < patience {
		return f
	}
	if s.blame(f.cause) {
		s.noteFault(f, s.next)
	}
	s.outset.reset = true
	if err := s.setUpAnew(); err != nil {
		return &trouble{f.cause, err}
	}
	return nil
}

// closeGap adds the rows lost since first to the gap ahead of the next block.
func (s *Source) closeGap(first int64) {
	exact := !s.outset.moved
	if s.next < first {
		s.next, exact = first, false
	}
	lost := s.next - first
	if lost > 0 {
		if s.gap.Lost == 0 {
			s.gap.Exact = true
		}
		s.gap.Lost += lost
		s.gap.Exact = s.gap.Exact && exact && s.clock.exact(lost)
		if worse(s.outset.cause, s.gap.Cause) {
			s.gap.Cause = s.outset.cause
		}
	}
	s.noteOver(first, s.gap)
}

// findPlace empties the output and waits for the next edge, whose row is then
// the next one. verify has it read every register first.
func (s *Source) findPlace(verify bool) *trouble {
	if verify {
		if err := s.verify(); err != nil {
			if errors.Is(err, errUnset) {
				return &trouble{acquire.ChipReset, err}
			}
			return &trouble{causeOf(err), err}
		}
	}
	period := time.Duration(s.clock.period)
	for range 6 {
		s.pause(period / 10) // away from the moment of a conversion
		empty, f := s.empty()
		if f != nil {
			s.pause(period / 2)
			return f
		}
		t, ok, err := s.edgeAfter(empty, 2*period)
		if err != nil {
			s.pause(period)
			return &trouble{acquire.BusFault, fmt.Errorf("cannot wait for data-ready: %w", err)}
		}
		// Only one conversion may have come since the output was seen empty.
		if ok && t-empty < period*19/20 {
			row := s.clock.nearest(t)
			s.next, s.edge, s.edgeAt = row, row, t
			s.clock.place(row, t)
			return nil
		}
	}
	return &trouble{acquire.Late, errors.New("host too late to find the place in the stream; look at the load and the priority of the process")}
}

// empty reads until a frame holds no new row and returns the time before that
// frame.
func (s *Source) empty() (time.Duration, *trouble) {
	for range 8 {
		before := s.ready.Now()
		st, f := s.checked()
		if f != nil {
			return 0, f
		}
		if st.Fresh() == 0 {
			return before, nil
		}
	}
	return 0, &trouble{acquire.Late, errors.New("output does not run empty; look at the SPI clock")}
}

// edgeAfter waits for an edge later than t.
func (s *Source) edgeAfter(t, limit time.Duration) (time.Duration, bool, error) {
	end := t + limit
	for {
		left := end - s.ready.Now()
		if left <= 0 {
			return 0, false, nil
		}
		edge, ok, err := s.ready.Wait(left)
		if err != nil || ok && edge > t {
			return edge, ok, err
		}
	}
}

// setUpAnew resets the chip and brings it up. Rows are counted on by time, but
// the conversions' place in time is a new one.
func (s *Source) setUpAnew() error {
	s.noteRestart()
	old := s.clock
	err := s.bringUp()
	if err == nil {
		err = s.start()
	}
	if err != nil {
		s.clock = old
		return err
	}
	row := old.nearest(s.edgeAt)
	s.clock.row, s.edge, s.next = row, row, row+1
	return nil
}

// causeOf tells a wrong check sum from a bus that does not work at all.
func causeOf(err error) acquire.Cause {
	if errors.Is(err, ErrCheck) {
		return acquire.BadCheck
	}
	return acquire.BusFault
}
