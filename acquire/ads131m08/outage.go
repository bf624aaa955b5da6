package ads131m08

import (
	"errors"
	"fmt"
	"time"

	"heavyspot/acquire"
)

const (
	patience     = 8 // tries to find the place again before the chip is set up anew
	firstBackOff = 10 * time.Millisecond
	maxBackOff   = time.Second
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
	first, cause := s.next, f.cause
	exact := true
	backOff := firstBackOff
	s.noteFault(f, first)
	for try := 0; !s.stopping(); try++ {
		next := s.findPlace(try > patience)
		if next != nil && (next.cause == acquire.ChipReset || try >= patience) {
			exact = false
			next = s.setUpAnew(next)
		}
		if next == nil {
			s.closeGap(first, cause, exact)
			return
		}
		if next.cause > cause {
			cause = next.cause
			s.noteFault(next, first)
		}
		if try < patience {
			continue
		}
		s.pause(backOff)
		backOff = min(2*backOff, maxBackOff)
	}
}

// closeGap adds the rows lost since first to the gap ahead of the next block.
func (s *Source) closeGap(first int64, cause acquire.Cause, exact bool) {
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
		s.gap.Cause = max(s.gap.Cause, cause)
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
			return &trouble{acquire.BusFault, err}
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
// the conversions' place in time is a new one. why is the fault that made it
// necessary and decides what is told when this fails.
func (s *Source) setUpAnew(why *trouble) *trouble {
	s.noteRestart()
	old := s.clock
	err := s.bringUp()
	if err == nil {
		err = s.start()
	}
	if err != nil {
		s.clock = old
		return &trouble{why.cause, err}
	}
	row := old.nearest(s.edgeAt)
	s.clock.row, s.edge, s.next = row, row, row+1
	return nil
}
