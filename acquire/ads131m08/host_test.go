package ads131m08_test

import (
	"fmt"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/ads131m08"
	"heavyspot/acquire/rig/chip"
)

// busyHost is a data-ready line on a board that has other things to do: the
// process wakes up late, and the time of the edge is either that of the
// interrupt or that of waking.
type busyHost struct {
	*chip.DataReady
	rnd    *rand.Rand
	kernel bool // times of the interrupt
}

func (h *busyHost) Wait(timeout time.Duration) (time.Duration, bool, error) {
	mono, ok, err := h.DataReady.Wait(timeout)
	if !ok || err != nil {
		return mono, ok, err
	}
	end := h.Now() + h.latency()
	for h.Now() < end {
		// The edges of the time between are merged into the latest.
		t, ok, err := h.DataReady.Wait(end - h.Now())
		if err != nil {
			return 0, false, err
		}
		if ok {
			mono = t
		}
	}
	if h.kernel {
		return mono + time.Duration(h.rnd.ExpFloat64()*10e3), true, nil
	}
	return h.Now(), true, nil
}

// latency is 50 us as a rule, up to 3 ms once in 200 times and up to 30 ms
// once in 5000.
func (h *busyHost) latency() time.Duration {
	d := time.Duration(h.rnd.ExpFloat64() * 50e3)
	if h.rnd.IntN(200) == 0 {
		d += time.Duration(h.rnd.IntN(3000)) * time.Microsecond
	}
	if h.rnd.IntN(5000) == 0 {
		d += time.Duration(h.rnd.IntN(30)) * ms
	}
	return d
}

// TestBusyHost proves every row's place on a loaded board with bad wires, a
// chip that resets and a loose cable, by the ramp's own voltage.
func TestBusyHost(t *testing.T) {
	seeds, rows := 6, int64(20_000)
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		seeds, rows = 40, 200_000
	}
	for seed := range uint64(seeds) {
		for _, rate := range []float64{1000, 2000} {
			o := chip.Options{Seed: seed, KeepOldest: seed&1 != 0, ClockErrorPPM: 100 * (float64(seed%5) - 2), Quiet: true}
			slope := 1.9 * rate / float64(rows)
			o.Signal = &ramp{step: 8000, slope: slope}
			c := newChip(t, o)
			rnd := rand.New(rand.NewPCG(seed, 1))
			length := time.Duration(float64(rows) / rate * 1e9)
			some := func() time.Duration { return 400*ms + time.Duration(rnd.Int64N(int64(length))) }
			c.Inject(chip.Fault{Kind: chip.Corrupt, From: 400 * ms, To: length, Probability: 0.002})
			for range 3 {
				at := some()
				c.Inject(chip.Fault{Kind: chip.CablePulled, From: at, To: at + time.Duration(rnd.IntN(100_000))*time.Microsecond})
				at = some()
				c.Inject(chip.Fault{Kind: chip.TxError, From: at, To: at + time.Duration(rnd.IntN(3000))*time.Microsecond, Err: errBoom})
				c.Inject(chip.Fault{Kind: chip.SelfReset, From: some()})
			}
			cfg := ads131m08.Default()
			cfg.RateHz, cfg.Blocks = rate, 2
			s, err := ads131m08.Open(c, &busyHost{DataReady: c.DataReady(), rnd: rnd, kernel: seed%3 != 0}, cfg)
			if err != nil {
				t.Fatalf("seed %d: %v", seed, err)
			}
			gaps := follow(t, s, rows, slope, 3)
			s.Close()
			var by [acquire.Absent]int
			inexact := 0
			lost := int64(0)
			for _, g := range gaps {
				by[g.Cause]++
				lost += g.Lost
				if !g.Exact {
					inexact++
				}
			}
			t.Logf("seed %d, %g Hz: %d gaps, by cause %v, %d not exact, %.2f %% of rows lost",
				seed, rate, len(gaps), by, inexact, 100*float64(lost)/float64(rows))
			if len(gaps) == 0 || inexact > 12 {
				t.Errorf("seed %d: %d gaps, %d not exact", seed, len(gaps), inexact)
			}
		}
	}
}

// TestQueuedEdges: a queue tells old edges first.
func TestQueuedEdges(t *testing.T) {
	var faults []chip.Fault
	for n := 1; n <= 40; n++ {
		faults = append(faults, chip.Fault{Kind: chip.HostLate, From: 100*ms + time.Duration(n)*100*ms, Periods: float64(n)})
	}
	_, s := setUp(t, 0.3, func(o *chip.Options, _ *ads131m08.Config) { o.QueueEdges = true }, faults...)
	gaps := follow(t, s, 4500, 0.3, 0)
	if len(gaps) != 39 {
		t.Errorf("%d gaps, want 39", len(gaps))
	}
	for i, g := range gaps {
		if n := int64(i + 2); !g.Exact || g.Cause != acquire.Late || g.Lost < n-1 || g.Lost > n+3 {
			t.Errorf("late by %d: %+v", n, g)
		}
	}
}

// TestDeadLine: the line breaks while the bus works. Without the times of the
// edges a row has no place, so there are none until the line is mended.
func TestDeadLine(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000, slope: 0.2}, Quiet: true})
	line := &breaking{DataReady: c.DataReady(), from: 500 * ms, to: 2500 * ms}
	cfg := ads131m08.Default()
	cfg.Blocks = 2
	s, err := ads131m08.Open(c, line, cfg)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	gaps := follow(t, s, 4000, 0.2, 1.5)
	if len(gaps) != 1 || gaps[0].Cause != acquire.BusFault {
		t.Errorf("gaps %+v", gaps)
	}
}

// breaking is a line without edges from from to to.
type breaking struct {
	ads131m08.DataReady
	from, to time.Duration
}

func (b *breaking) Wait(timeout time.Duration) (time.Duration, bool, error) {
	if now := b.Now(); now >= b.from && now < b.to {
		return deadLine{b.DataReady}.Wait(timeout)
	}
	return b.DataReady.Wait(timeout)
}

// TestBrokenWait: the line's own driver fails for a while.
func TestBrokenWait(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000, slope: 0.2}, Quiet: true})
	line := &failing{DataReady: c.DataReady(), at: 500 * ms, n: 20}
	cfg := ads131m08.Default()
	cfg.Blocks = 2
	s, err := ads131m08.Open(c, line, cfg)
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	gaps := follow(t, s, 2000, 0.2, 1.5)
	if len(gaps) != 1 || gaps[0].Cause != acquire.BusFault {
		t.Errorf("gaps %+v", gaps)
	}
}

// failing fails n waits from at on.
type failing struct {
	ads131m08.DataReady
	at time.Duration
	n  int
}

func (f *failing) Wait(timeout time.Duration) (time.Duration, bool, error) {
	if f.n > 0 && f.Now() >= f.at {
		f.n--
		if _, _, err := (deadLine{f.DataReady}).Wait(timeout); err != nil {
			return 0, false, err
		}
		return 0, false, fmt.Errorf("line: %w", errBoom)
	}
	return f.DataReady.Wait(timeout)
}
