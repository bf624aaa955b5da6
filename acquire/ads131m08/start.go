package ads131m08

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"time"
)

const (
	unsettled   = 4     // rows to discard after a change (section 8.3.7.1.1)
	measureRows = 16    // least rows to measure the rate over
	measureTime = 0.05  // least seconds of that
	rateOff     = 0.005 // largest relative error of the clock
	startTries  = 4
)

// start empties the output, discards what has not settled and measures the
// rate. Row 0 is then the next one.
func (s *Source) start() error {
	period, mono, n, err := s.measure()
	if err != nil {
		return err
	}
	s.clock = newClock(s.nominal, period, n, -1, mono)
	s.edge, s.edgeAt = -1, mono
	return nil
}

// measure reads settled rows, each after its edge, and returns the mean
// distance of the edges (ns), the time of the last and their number.
func (s *Source) measure() (period float64, last time.Duration, n int, err error) {
	want := max(measureRows, int(measureTime*s.cfg.RateHz))
	for range startTries {
		first, last, err := s.measureRun(want)
		if errors.Is(err, errLate) {
			continue
		}
		if err != nil {
			return 0, 0, 0, err
		}
		period = float64(last-first) / float64(want)
		if r := period/s.nominal - 1; math.Abs(r) > rateOff {
			return 0, 0, 0, fmt.Errorf("cannot use the converter: data-ready comes %.1f times a second, expected %g: %s",
				1e9/period, s.cfg.RateHz, adviceClock)
		}
		return period, last, want, nil
	}
	return 0, 0, 0, fmt.Errorf("cannot measure the rate: host late in each of %d tries; look at the load and the priority of the process", startTries)
}

var errLate = errors.New("host late")

// measureRun returns the times of the first and the last of want+1 edges, one
// period apart each, after unsettled rows and the two that the output may
// hold. It returns errLate when rows were missed.
func (s *Source) measureRun(want int) (first, last time.Duration, err error) {
	for range 2 {
		if _, err := s.readStart(); err != nil {
			return 0, 0, err
		}
	}
	apart := make([]time.Duration, 0, want)
	for i := -unsettled; i <= want; i++ {
		t, err := s.firstEdge()
		if err != nil {
			return 0, 0, err
		}
		fresh, err := s.readStart()
		if err != nil {
			return 0, 0, err
		}
		if i <= 0 {
			first = t
		} else {
			apart = append(apart, t-last)
			if !fresh {
				return 0, 0, errLate
			}
		}
		last = t
	}
	// Compared with the median and not with the nominal period, lateness can
	// be told from a clock that is wrong.
	slices.Sort(apart)
	if median := apart[want/2]; apart[want-1] > median*3/2 {
		return 0, 0, errLate
	}
	return first, last, nil
}

// readStart reads a frame and says whether it held a new row.
func (s *Source) readStart() (bool, error) {
	st, err := s.frame()
	if err != nil {
		return false, fmt.Errorf("cannot read samples: %w", err)
	}
	if !st.Configured() {
		return false, fmt.Errorf("cannot read samples: STATUS %04Xh: converter has restarted: %s", uint16(st), adviceSupply)
	}
	return uint16(st.Fresh()) == s.cfg.mask(), nil
}

// frame reads a frame into s.row.
func (s *Source) frame() (Status, error) {
	if err := s.bus.poll(); err != nil {
		return 0, transferError(err)
	}
	st, err := s.decoder.Decode(&s.bus.r, s.row[:])
	if err != nil {
		return 0, badFrame(err)
	}
	return st, nil
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
