package dsp_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"heavyspot/dsp"
)

// stateOf reads a signal whose first point has been spoilt and returns that
// point's reading; the second point must stay good and right.
func stateOf(t *testing.T, s *signal, cfg dsp.Config, spoil func(i int, x float32) float32) dsp.PointReading {
	t.Helper()
	v := s.render()
	stride := s.points + 1
	for i := 0; i < len(v)/stride; i++ {
		v[i*stride] = spoil(i, v[i*stride])
	}
	e, err := dsp.NewEngine(cfg)
	if err != nil {
		t.Fatal(err)
	}
	e.Push(0, v)
	m := e.Close(int64(len(v)/stride), time.Time{}, false)
	o := m.Points[1].Order[0]
	if m.Points[1].State != dsp.PointGood || math.Abs(o.RMS/s.mms[0]-1) > 0.01 || math.Abs(angle(o.Lag, s.lag[0])) > 1 {
		t.Errorf("the other point: %+v", m.Points[1])
	}
	if p := m.Points[0]; p.State != dsp.PointGood && (p.Order != [3]dsp.Vector{} || p.Overall != 0) {
		t.Errorf("%s point has figures: %+v", p.State, p)
	}
	return m.Points[0]
}

// TestClipped: flat tops are found at any level, with or without a bias, by
// both rails or one, and not where there are none.
func TestClipped(t *testing.T) {
	for _, hz := range []float64{4.1, 24.67, 49.9} {
		s := base(2)
		s.hz = hz
		peak := math.Sqrt2 * s.mms[0] * 2 * math.Pi * hz / gravityMM * sensitivity
		for _, c := range []struct {
			level, bias float64
			oneSided    bool
			want        dsp.PointState
		}{
			{0.3, 0, false, dsp.PointClipped}, {0.6, 0.1, false, dsp.PointClipped}, {0.8, -0.2, true, dsp.PointClipped},
			{0.5, 0, true, dsp.PointClipped}, {5, 0, false, dsp.PointGood}, {5, 0.3, true, dsp.PointGood},
		} {
			t.Run(fmt.Sprintf("%v Hz/%+v", hz, c), func(t *testing.T) {
				p := stateOf(t, &s, s.config(), func(_ int, x float32) float32 {
					y := min(float64(x), c.level*peak)
					if !c.oneSided {
						y = max(y, -c.level*peak)
					}
					return float32(y + c.bias)
				})
				if p.State != c.want {
					t.Errorf("state %s, want %s", p.State, c.want)
				}
			})
		}
	}
}

// TestKnownFullScale: a few samples at the end of a known range are named; a
// single knock is not.
func TestKnownFullScale(t *testing.T) {
	s := base(2)
	cfg := s.config()
	cfg.Points[0].FullScaleV = 1
	for _, c := range []struct {
		every int
		want  dsp.PointState
	}{{1000, dsp.PointClipped}, {59_000, dsp.PointGood}} {
		p := stateOf(t, &s, cfg, func(i int, x float32) float32 {
			if i%c.every == c.every-1 {
				return 1
			}
			return x
		})
		if p.State != c.want {
			t.Errorf("a sample in %d at full scale: %s, want %s", c.every, p.State, c.want)
		}
	}
	if p := stateOf(t, &s, cfg, func(int, float32) float32 { return 1 }); p.State != dsp.PointOpen {
		t.Errorf("resting at full scale: %s, want open", p.State)
	}
}

// TestFlatAndNoisy: a dead channel, one with only converter noise, a loose plug
// and noise that drowns the 1x.
func TestFlatAndNoisy(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	s := base(2)
	plug := 0.0
	for _, c := range []struct {
		name  string
		spoil func(int, float32) float32
		want  dsp.PointState
	}{
		{"dead", func(int, float32) float32 { return 0.0123 }, dsp.PointFlat},
		{"converter noise", func(int, float32) float32 { return float32(3.4e-6 * r.NormFloat64()) }, dsp.PointFlat},
		{"loose plug", func(_ int, x float32) float32 {
			if r.Float64() < 0.002 {
				plug = 0.6 * r.NormFloat64()
			}
			return x + float32(plug)
		}, dsp.PointNoisy},
		{"quiet sensor", func(_ int, x float32) float32 { return float32(6e-5*r.NormFloat64()) + x*0.002 }, dsp.PointGood},
		{"slow drift", func(i int, x float32) float32 { return x + float32(0.3*math.Sin(float64(i)/20000)) }, dsp.PointGood},
	} {
		t.Run(c.name, func(t *testing.T) {
			if p := stateOf(t, &s, s.config(), c.spoil); p.State != c.want {
				t.Errorf("state %s, want %s (%+v)", p.State, c.want, p)
			}
		})
	}
}
