package ads131m08

import (
	"errors"
	"fmt"
	"math"
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
	// placeTries is how many rows finding the place may take.
	placeTries = 20
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
		if f = s.resume(try > promptTries); f == nil {
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
		s.gap.Exact = s.gap.Exact && exact
		if worse(s.outset.cause, s.gap.Cause) {
			s.gap.Cause = s.outset.cause
		}
	}
	s.noteOver(first, s.gap)
}

// resume goes on with the chip as it is: not reset. verify has it read every
// register first. When the clock does not hold any more, because of the time
// that has passed or of a reset, it is measured again, and rows are counted on
// as well as can be.
func (s *Source) resume(verify bool) *trouble {
	if verify {
		if err := s.verify(); err != nil {
			return &trouble{causeOf(err), err}
		}
	}
	gone := int64(s.clock.rows(s.ready.Now())) - s.next
	if s.clock.exact(gone) && !s.outset.moved {
		return s.findPlace()
	}
	old := s.clock
	if err := s.start(old.nearestTo); err != nil {
		s.clock = old
		return &trouble{causeOf(err), err}
	}
	s.outset.moved = true
	return nil
}

// findPlace brings host and chip into step. It empties the output, waits for
// the next row, and reads it and a frame more: when that is empty again, the
// row read was the only one, hence the latest by the clock. It is thrown away;
// the next row is the one after it.
func (s *Source) findPlace() *trouble {
	period := time.Duration(s.clock.period)
	for range placeTries {
		s.pause(period / 10) // away from the moment of a conversion
		if _, f := s.drain(8); f != nil {
			s.pause(period / 2)
			return f
		}
		t, ok, err := s.ready.Wait(2 * period)
		switch {
		case err != nil:
			s.pause(period)
			return &trouble{acquire.BusFault, fmt.Errorf("cannot wait for data-ready: %w", err)}
		case !ok:
			return &trouble{acquire.BusFault, errors.New("no data-ready edge: " + adviceEdge)}
		}
		s.pause(period / 5)
		before := s.ready.Now()
		rows, f := s.drain(2)
		if f != nil {
			return f
		}
		row, sure := s.latest(before)
		if rows == 1 && sure && s.clock.fits(t) {
			s.next, s.edge = row+1, row
			s.clock.loosen()
			return nil
		}
	}
	return &trouble{acquire.Late, errors.New("cannot find the place in the stream; " + adviceLoad)}
}

// latest returns the row complete at before and now. It is not sure of it when
// the two differ, or one is near the moment of a conversion.
func (s *Source) latest(before time.Duration) (row int64, sure bool) {
	const margin = 0.1 // periods
	a, b := s.clock.rows(before), s.clock.rows(s.ready.Now())
	whole := math.Floor(a)
	return int64(whole), a-whole > margin && b-whole < 1-margin
}

// drain reads at most limit frames, until one holds no new row, and returns
// how many did.
func (s *Source) drain(limit int) (int, *trouble) {
	for rows := range limit {
		st, f := s.checked()
		if f != nil {
			return rows, f
		}
		if st.Fresh() == 0 {
			return rows, nil
		}
	}
	return limit, nil
}

// setUpAnew resets the chip and brings it up. Rows are counted on by time, but
// the conversions' place in time is a new one.
func (s *Source) setUpAnew() error {
	s.noteRestart()
	old := s.clock
	err := s.bringUp()
	if err == nil {
		err = s.start(old.nearestTo)
	}
	if err != nil {
		s.clock = old
	}
	return err
}

// causeOf tells a restarted chip and a wrong check sum from a bus that does
// not work at all.
func causeOf(err error) acquire.Cause {
	switch {
	case errors.Is(err, errUnset):
		return acquire.ChipReset
	case errors.Is(err, ErrCheck):
		return acquire.BadCheck
	}
	return acquire.BusFault
}
