package ads131m08

import (
	"errors"
	"fmt"
	"math"
	"time"
)

const (
	unsettled   = 4   // rows to discard after a change (section 8.3.7.1.1)
	measureTime = 0.1 // seconds to measure the rate over, within
	leastEdges  = 64  // these numbers of edges
	mostEdges   = 200
	rateOff     = 0.005 // largest relative error of the clock
)

// start measures the rate and finds the place in the stream; the next row gets
// the index that number returns for the time of its completion (ns).
func (s *Source) start(number func(at float64) int64) error {
	if err := s.measure(); err != nil {
		return err
	}
	if f := s.findPlace(); f != nil {
		return fmt.Errorf("cannot find the place in the stream: %w", f.err)
	}
	shift := number(s.clock.at(s.next)) - s.next
	s.next += shift
	s.edge += shift
	s.clock.row += shift
	return nil
}

// measure makes a new sample clock from edges alone. It stands a host that is
// late at times: medians leave out what does not fit.
func (s *Source) measure() error {
	n := s.cfg.measureEdges()
	times, err := s.edges(n)
	if err != nil {
		return err
	}
	k := fit(times, s.nominal)
	if r := k.period/s.nominal - 1; math.Abs(r) > rateOff {
		return fmt.Errorf("cannot use the converter: data-ready comes %.1f times a second, expected %g: %s",
			1e9/k.period, s.cfg.RateHz, adviceClock)
	}
	s.clock, s.unseen, s.badEdge = k, 0, 0
	s.edge, s.edgeAt = k.row, times[n-1]
	return nil
}

// measureEdges is how many edges the rate is measured with.
func (c *Config) measureEdges() int {
	return min(max(leastEdges, int(measureTime*c.RateHz)), mostEdges)
}

// edges returns the times of n edges. Frames are read meanwhile, because the
// line falls only when its data are read; a few may fail their check sum.
func (s *Source) edges(n int) ([]time.Duration, error) {
	var times []time.Duration
	bad := 0
	for i := -unsettled; i < n; i++ {
		t, err := s.firstEdge()
		if err != nil {
			return nil, err
		}
		if i >= 0 {
			times = append(times, t)
		}
		err = s.readStart()
		if errors.Is(err, ErrCheck) && bad < n/4 {
			bad++
			continue
		}
		if err != nil {
			return nil, err
		}
	}
	return times, nil
}

// readStart reads a frame and throws its samples away.
func (s *Source) readStart() error {
	if err := s.bus.poll(); err != nil {
		return fmt.Errorf("cannot read samples: %w", transferError(err))
	}
	st, err := s.decoder.Decode(&s.bus.r, s.row[:])
	if err != nil {
		return fmt.Errorf("cannot read samples: %w", badFrame(err))
	}
	if !st.Configured() {
		return fmt.Errorf("cannot read samples: STATUS %04Xh: %w: %s", uint16(st), errUnset, adviceSupply)
	}
	return nil
}

// firstEdge waits for an edge as long as the slowest converter may take.
func (s *Source) firstEdge() (time.Duration, error) {
	limit := time.Duration(4*s.nominal) + 50*time.Millisecond
	t, ok, err := s.ready.Wait(limit)
	if err != nil {
		return 0, fmt.Errorf("cannot wait for data-ready: %w", err)
	}
	if !ok {
		return 0, fmt.Errorf("no data-ready edge within %v: %s", limit, adviceEdge)
	}
	return t, nil
}

// pause lets time pass on the clock of the data-ready line. Edges that come
// meanwhile are noted.
func (s *Source) pause(d time.Duration) {
	const slice = 50 * time.Millisecond
	end := s.ready.Now() + d
	for !s.stopping() {
		left := end - s.ready.Now()
		if left <= 0 {
			return
		}
		t, ok, err := s.ready.Wait(min(left, slice))
		if err != nil {
			time.Sleep(min(left, slice))
			return
		}
		if ok && s.clock.period > 0 {
			s.noteEdge(t)
		}
	}
}
