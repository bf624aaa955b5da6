package ads131m08_test

import (
	"context"
	"fmt"
	"math"
	"testing"
	"time"

	"heavyspot/acquire"
	"heavyspot/acquire/ads131m08"
	"heavyspot/acquire/rig/chip"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// sine is a Signal: channel c carries a sine of Hz(c) with amplitude volts,
// each step its exact mean.
type sine struct {
	step  float64
	hz    [8]float64
	volts float64
	n     int64
}

func (s *sine) Channels() int   { return 8 }
func (s *sine) StepHz() float64 { return s.step }
func (s *sine) Next(dst []float32) {
	a, b := float64(s.n)/s.step, float64(s.n+1)/s.step
	s.n++
	for ch := range dst {
		w := 2 * math.Pi * s.hz[ch]
		dst[ch] = float32(s.volts * (math.Cos(w*a) - math.Cos(w*b)) / (w * (b - a)))
	}
}

// ramp is a Signal whose voltage tells the time: a volt per volts second.
type ramp struct {
	step, slope float64
	n           int64
}

func (r *ramp) Channels() int   { return 8 }
func (r *ramp) StepHz() float64 { return r.step }
func (r *ramp) Next(dst []float32) {
	v := r.slope * (float64(r.n) + 0.5) / r.step
	r.n++
	for ch := range dst {
		dst[ch] = float32(v - 1)
	}
}

func newChip(t testing.TB, o chip.Options) *chip.Chip {
	t.Helper()
	c, err := chip.New(o)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func open(t testing.TB, c *chip.Chip, cfg ads131m08.Config) *ads131m08.Source {
	t.Helper()
	s, err := ads131m08.Open(c, c.DataReady(), cfg)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { s.Close() })
	return s
}

func read(t testing.TB, s *ads131m08.Source, b *acquire.Block) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Second)
	defer cancel()
	if err := s.Read(ctx, b); err != nil {
		t.Fatal(err)
	}
}

// TestAmplitudeAndPhase: a sine comes out as the filter's response says, at
// every rate and gain, with the delay in Block.Time taken off.
func TestAmplitudeAndPhase(t *testing.T) {
	hz := [8]float64{5, 25, 60, 120, 10, 20, 40, 80}
	start := time.Date(2026, 3, 1, 6, 0, 0, 0, time.UTC)
	for _, rate := range []float64{250, 500, 1000, 2000, 4000, 8000, 16000, 32000} {
		t.Run(fmt.Sprintf("%g Hz", rate), func(t *testing.T) {
			c := newChip(t, chip.Options{Signal: &sine{step: 32000, hz: hz, volts: 0.25}, Quiet: true})
			cfg := ads131m08.Default()
			cfg.RateHz, cfg.SPIHz, cfg.Blocks, cfg.BlockSeconds = rate, 25e6, 2, 0.2
			cfg.Gains = []int{1, 2, 4, 1, 2, 4, 1, 2}
			cfg.Now, cfg.ClockSet = c.Wall(start), func() bool { return true }
			s := open(t, c, cfg)
			var re, im [8]float64
			var b acquire.Block
			rows := 0
			for range 5 { // a second: whole periods of all
				read(t, s, &b)
				if !b.ClockSet || b.Gap != (acquire.Gap{}) {
					t.Fatalf("block %+v", b)
				}
				first := b.Time.Sub(start).Seconds()
				for i := range b.Rows(8) {
					at := first + float64(i)/rate
					rows++
					for ch := range 8 {
						sin, cos := math.Sincos(2 * math.Pi * hz[ch] * at)
						re[ch] += float64(b.Volts[8*i+ch]) * sin
						im[ch] += float64(b.Volts[8*i+ch]) * cos
					}
				}
			}
			f := s.Format()
			for ch := range 8 {
				got := math.Hypot(re[ch], im[ch]) * 2 / float64(rows) / 0.25
				if want := f.Gain(hz[ch]); math.Abs(got-want) > 5e-5 {
					t.Errorf("%g Hz: amplitude %.6f, want %.6f", hz[ch], got, want)
				}
				// A microsecond at 120 Hz is 0.04 degrees.
				if got := math.Atan2(im[ch], re[ch]) * 180 / math.Pi; math.Abs(got) > 0.05 {
					t.Errorf("%g Hz: phase %.3f degrees, want 0", hz[ch], got)
				}
			}
		})
	}
}

// TestOddSetUp: other clock, few channels, crystal, odd block length.
func TestOddSetUp(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &sine{step: 8e6 / 1024, hz: [8]float64{25, 50, 75}, volts: 0.1}, ClockHz: 8e6})
	cfg := ads131m08.Default()
	cfg.ClockHz, cfg.RateHz, cfg.Crystal = 8e6, 8e6/2/4096, true
	cfg.Channels, cfg.Gains, cfg.InputCRC = 3, []int{8}, false
	cfg.BlockSeconds = 0.1
	s := open(t, c, cfg)
	var b acquire.Block
	for range 20 {
		read(t, s, &b)
		if b.Rows(3) != 98 || b.Gap.Lost != 0 || !b.Time.Before(time.Now()) || b.ClockSet {
			t.Fatalf("%d rows, %+v, %v, %v", b.Rows(3), b.Gap, b.Time, b.ClockSet)
		}
	}
	if f := s.Format(); f.Channels != 3 || f.RateHz != 976.5625 {
		t.Errorf("format %+v", f)
	}
}

func TestReadAllocatesNothing(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &sine{step: 8000, hz: [8]float64{1, 2, 3, 4, 5, 6, 7, 8}, volts: 0.5}})
	s := open(t, c, ads131m08.Default())
	var b acquire.Block
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	for range 20 {
		read(t, s, &b)
	}
	if n := testing.AllocsPerRun(40, func() {
		if err := s.Read(ctx, &b); err != nil {
			t.Error(err)
		}
	}); n != 0 {
		t.Errorf("%v allocations for each block", n)
	}
}

// TestSlowReader: in the simulation time stands still while blocks wait.
func TestSlowReader(t *testing.T) {
	_, s := setUp(t, 0.2, nil)
	time.Sleep(20 * time.Millisecond)
	if gaps := follow(t, s, 3000, 0.2, 0); len(gaps) != 0 {
		t.Errorf("gaps %+v", gaps)
	}
}

func TestReadEnds(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000}})
	c.Inject(chip.Fault{Kind: chip.CablePulled, From: 200 * ms, To: 1000 * time.Hour, Level: 0xFF})
	s := open(t, c, ads131m08.Default())
	ctx, cancel := context.WithTimeout(context.Background(), 50*ms)
	defer cancel()
	var b acquire.Block
	var err error
	for err == nil {
		err = s.Read(ctx, &b)
	}
	if err != context.DeadlineExceeded {
		t.Errorf("error %v", err)
	}
	if f := s.Faults(); !f.Open || f.Last == nil {
		t.Errorf("%+v", f)
	}
	// Close must end an outage that goes on.
	if err := s.Close(); err != nil {
		t.Error(err)
	}
	if err := s.Close(); err != nil {
		t.Error(err)
	}
	if err := s.Read(context.Background(), &b); err == nil {
		t.Error("read from a closed source")
	}
}

// TestPortClosed: the port goes away under the source, which keeps trying.
func TestPortClosed(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000}, Speed: 50})
	s := open(t, c, ads131m08.Default())
	c.Close()
	for range 1000 {
		if s.Faults().Open {
			break
		}
		time.Sleep(ms)
	}
	if f := s.Faults(); !f.Open || f.Last == nil {
		t.Errorf("%+v", f)
	}
}

func TestThread(t *testing.T) {
	called := make(chan struct{})
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000}})
	cfg := ads131m08.Default()
	cfg.Thread = func() { close(called) }
	open(t, c, cfg)
	<-called
}

func TestStreams(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &sine{step: 8000, hz: [8]float64{5, 25, 60, 120, 1, 2, 3, 4}, volts: 0.5}, Quiet: true})
	s := open(t, c, ads131m08.Default())
	ctx, cancel := context.WithTimeout(context.Background(), 10*time.Second)
	defer cancel()
	var b acquire.Block
	next := int64(0)
	peak := float32(0)
	for range 8 {
		if err := s.Read(ctx, &b); err != nil {
			t.Fatal(err)
		}
		if b.First != next || b.Gap != (acquire.Gap{}) || b.Rows(8) != 250 {
			t.Fatalf("block at %d with %d rows and gap %+v, want %d, 250, none", b.First, b.Rows(8), b.Gap, next)
		}
		next += int64(b.Rows(8))
		for i := 0; i < len(b.Volts); i += 8 {
			peak = max(peak, b.Volts[i])
		}
	}
	if math.Abs(float64(peak)-0.5) > 1e-3 {
		t.Errorf("peak %v V, want 0.5", peak)
	}
}

// BenchmarkStream is one second of eight channels at 1 kSPS, chip and driver.
func BenchmarkStream(b *testing.B) {
	c := newChip(b, chip.Options{Signal: &ramp{step: 8000}})
	cfg := ads131m08.Default()
	cfg.BlockSeconds = 1
	s := open(b, c, cfg)
	var block acquire.Block
	b.ReportAllocs()
	for b.Loop() {
		read(b, s, &block)
	}
	b.ReportMetric(float64(b.N)/b.Elapsed().Seconds(), "x-real-time")
}
