package ads131m08_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/ads131m08"
	"heavyspot/acquire/rig/chip"
)

// found is a gap as a reader sees it.
type found struct {
	at int64 // first row after it
	acquire.Gap
}

// follow reads rows rows of a ramp and fails unless every one of them sits at
// the index which its own voltage proves, after exact gaps, and the index
// agrees with the gaps. After a gap that is not exact the offset may change by
// up to slack rows.
func follow(t *testing.T, s *ads131m08.Source, rows int64, slope float64, slack float64) []found {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Second)
	defer cancel()
	f := s.Format()
	perRow := slope / f.RateHz
	var b acquire.Block
	var gaps []found
	next, zero := int64(0), math.NaN()
	for next < rows {
		if err := s.Read(ctx, &b); err != nil {
			t.Fatalf("at row %d: %v; %+v", next, err, s.Faults())
		}
		if b.First != next+b.Gap.Lost {
			t.Fatalf("block at %d after %d with a gap of %d rows", b.First, next, b.Gap.Lost)
		}
		if (b.Gap.Lost == 0) != (b.Gap == acquire.Gap{}) || len(b.Volts) == 0 {
			t.Fatalf("block of %d values with gap %+v", len(b.Volts), b.Gap)
		}
		if b.Gap.Lost > 0 {
			gaps = append(gaps, found{b.First, b.Gap})
		}
		for i := range b.Rows(f.Channels) {
			row := float64(b.First) + float64(i)
			is := float64(b.Volts[i*f.Channels])/perRow - row
			if math.IsNaN(zero) || i == 0 && b.Gap.Lost > 0 && !b.Gap.Exact && math.Abs(is-zero) < slack {
				zero = is
			}
			if math.Abs(is-zero) > 0.1 {
				t.Fatalf("row %.0f is off by %.2f rows; gaps %+v", row, is-zero, gaps)
			}
		}
		next = b.First + int64(b.Rows(f.Channels))
	}
	return gaps
}

// setUp returns a source on a chip with a quiet ramp of slope V/s and faults
// to come, at virtual times, since the source samples ahead of its reader.
// Rows come from about 70 ms on at 1 kHz, 90 ms at 250 Hz.
func setUp(t *testing.T, slope float64, change func(*chip.Options, *ads131m08.Config), faults ...chip.Fault) (*chip.Chip, *ads131m08.Source) {
	t.Helper()
	o := chip.Options{Quiet: true, Seed: 7}
	cfg := ads131m08.Default()
	cfg.Blocks = 2 // so that the source does not run far ahead of the test
	if change != nil {
		change(&o, &cfg)
	}
	o.Signal = &ramp{step: 8000, slope: slope}
	c := newChip(t, o)
	for _, f := range faults {
		c.Inject(f)
	}
	return c, open(t, c, cfg)
}

const ms = time.Millisecond

func TestLateHost(t *testing.T) {
	for _, rate := range []float64{250, 1000, 4000} {
		for _, keep := range []bool{false, true} {
			t.Run(fmt.Sprintf("%v Hz, keep oldest %v", rate, keep), func(t *testing.T) {
				period := time.Duration(1e9 / rate)
				slope := 0.1 * rate / 1000
				const apart = 120
				var faults []chip.Fault
				for n := 1; n <= 50; n++ {
					at := 100*ms + time.Duration(20+apart*n)*period
					faults = append(faults, chip.Fault{Kind: chip.HostLate, From: at, Periods: float64(n)})
				}
				_, s := setUp(t, slope, func(o *chip.Options, cfg *ads131m08.Config) {
					o.KeepOldest = keep
					o.ClockErrorPPM = 40
					cfg.RateHz = rate
				}, faults...)
				gaps := follow(t, s, 20+52*apart, slope, 0)
				if len(gaps) != 49 {
					t.Fatalf("%d gaps, want 49: %+v", len(gaps), gaps)
				}
				for i, g := range gaps {
					n := int64(i + 2)
					if g.Cause != acquire.Late || !g.Exact || g.Lost < n-1 || g.Lost > n+3 {
						t.Errorf("late by %d periods: %+v", n, g)
					}
				}
			})
		}
	}
}

func TestLateByFractions(t *testing.T) {
	for late := 0.0; late <= 4; late += 0.125 {
		for _, keep := range []bool{false, true} {
			change := func(o *chip.Options, _ *ads131m08.Config) { o.KeepOldest = keep }
			c, s := setUp(t, 0.5, change, chip.Fault{Kind: chip.HostLate, From: 300 * ms, Periods: late})
			gaps := follow(t, s, 600, 0.5, 0)
			want := 0
			if late >= 1.75 {
				want = 1
			}
			if len(gaps) != want || want == 1 && (!gaps[0].Exact || gaps[0].Cause != acquire.Late) {
				t.Errorf("late by %v periods, keep oldest %v: gaps %+v", late, keep, gaps)
			}
			// Before the channels are set up the output overflows once or so.
			if lost := c.Counters().Overwritten; want == 0 && lost > 4 {
				t.Errorf("late by %v periods: chip has overwritten %d samples, no gap told", late, lost)
			}
		}
	}
}

// TestChipRestarts scans the time of a restart over a sample period.
func TestChipRestarts(t *testing.T) {
	for _, kind := range []chip.FaultKind{chip.SelfReset, chip.SelfSync} {
		for at := 300 * ms; at < 301*ms; at += 97 * time.Microsecond {
			gains := func(_ *chip.Options, cfg *ads131m08.Config) { cfg.Gains = []int{1, 2} }
			_, s := setUp(t, 0.5, gains, chip.Fault{Kind: kind, From: at})
			gaps := follow(t, s, 1000, 0.5, 1.5)
			if len(gaps) != 1 || gaps[0].Cause != acquire.ChipReset || gaps[0].Exact {
				t.Errorf("restart at %v: gaps %+v", at, gaps)
			}
			if f := s.Faults(); f.Restarts != 1 || f.Outages[acquire.ChipReset] != 1 || f.Open {
				t.Errorf("restart at %v: %+v", at, f)
			}
		}
	}
}

func TestBadChecks(t *testing.T) {
	_, s := setUp(t, 0.2, nil, chip.Fault{Kind: chip.Corrupt, From: 200 * ms, To: 5200 * ms, Probability: 0.05})
	gaps := follow(t, s, 6000, 0.2, 1.5)
	if len(gaps) < 100 || s.Faults().Restarts > 2 {
		t.Fatalf("%d gaps, %+v", len(gaps), s.Faults())
	}
	for _, g := range gaps {
		if g.Cause != acquire.BadCheck || !g.Exact || g.Lost > 8 {
			t.Errorf("gap %+v", g)
		}
	}
}

func TestAllChecksBad(t *testing.T) {
	_, s := setUp(t, 0.2, nil, chip.Fault{Kind: chip.Corrupt, From: 200 * ms, To: 900 * ms, Probability: 1})
	gaps := follow(t, s, 4000, 0.2, 1.5)
	if len(gaps) != 1 || gaps[0].Cause != acquire.BadCheck || gaps[0].Lost < 700 || gaps[0].Lost > 1200 {
		t.Errorf("gaps %+v", gaps)
	}
}

// TestBus scans the time of a bus fault over a sample period. A short one may
// fall between two frames.
func TestBus(t *testing.T) {
	for _, kind := range []chip.FaultKind{chip.CablePulled, chip.StuckInput, chip.TxError} {
		for _, long := range []time.Duration{50 * time.Microsecond, ms, 5 * ms, 50 * ms, 2 * time.Second} {
			for i := range 4 {
				from := 250*ms + time.Duration(i)*263*time.Microsecond
				fault := chip.Fault{Kind: kind, From: from, To: from + long, Level: byte(-(i & 1)), Err: errBoom}
				testBus(t, fault, long)
			}
		}
	}
}

var errBoom = errors.New("boom")

func testBus(t *testing.T, fault chip.Fault, long time.Duration) {
	t.Helper()
	var told []ads131m08.Fault
	note := func(_ *chip.Options, cfg *ads131m08.Config) {
		cfg.OnFault = func(f ads131m08.Fault) { told = append(told, f) }
	}
	_, s := setUp(t, 0.2, note, fault)
	gaps := follow(t, s, 1000+int64(3*long/2/ms), 0.2, 1.5)
	s.Close()
	name := fmt.Sprintf("kind %d level %02x for %v at %v", fault.Kind, fault.Level, long, fault.From)
	if len(gaps) == 0 && long < 2*ms {
		return
	}
	if len(gaps) != 1 || gaps[0].Cause != acquire.BusFault {
		t.Fatalf("%s: gaps %+v", name, gaps)
	}
	g := gaps[0]
	if !g.Exact && (fault.Kind != chip.StuckInput || long < time.Second) {
		t.Errorf("%s: gap not exact: %+v", name, g)
	}
	if lost := time.Duration(g.Lost) * ms; lost < long-ms || lost > long+400*ms {
		t.Errorf("%s: lost %v", name, lost)
	}
	if len(told) != 2 || told[0].Over || told[0].Err == nil || !told[1].Over || told[1].Gap != g.Gap {
		t.Errorf("%s: told %+v", name, told)
	}
	f := s.Faults()
	if f.LostRows != g.Lost || f.Outages[acquire.BusFault] != 1 || f.Last == nil {
		t.Errorf("%s: %+v", name, f)
	}
	if fault.Kind == chip.TxError && !errors.Is(f.Last, errBoom) {
		t.Errorf("%s: told %v", name, f.Last)
	}
}

// TestCommandsSpoilt: the chip tells of commands that come with a wrong check
// sum; the samples are not touched by that.
func TestCommandsSpoilt(t *testing.T) {
	for _, level := range []byte{0, 0xFF} {
		_, s := setUp(t, 0.2, nil, chip.Fault{Kind: chip.StuckOutput, From: 500 * ms, To: 1500 * ms, Level: level})
		if gaps := follow(t, s, 3000, 0.2, 0); len(gaps) != 0 {
			t.Errorf("gaps %+v", gaps)
		}
		if n := s.Faults().InputChecks; n < 990 || n > 1010 {
			t.Errorf("%d bad commands told, want about 1000", n)
		}
	}
}

// TestCableAndPower: the chip loses its supply together with the cable. When
// that takes long it has been sent a reset, and why it restarted is unknown.
func TestCableAndPower(t *testing.T) {
	for _, long := range []time.Duration{10 * ms, 100 * ms, time.Second} {
		_, s := setUp(t, 0.2, nil,
			chip.Fault{Kind: chip.CablePulled, From: 250 * ms, To: 250*ms + long, Level: 0xFF},
			chip.Fault{Kind: chip.SelfReset, From: 255 * ms})
		want := acquire.ChipReset
		if long > 500*ms {
			want = acquire.BusFault
		}
		gaps := follow(t, s, 3000, 0.2, 1.5)
		if len(gaps) != 1 || gaps[0].Cause != want || gaps[0].Exact {
			t.Errorf("pulled for %v: gaps %+v", long, gaps)
		}
	}
}
