package ads131m08_test

import (
	"context"
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
