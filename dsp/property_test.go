package dsp_test

import (
	"math"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"heavyspot/dsp"
)

// drawSignal draws a short machine: any speed, noise, pulse and fault of the
// reference.
func drawSignal(t *rapid.T) signal {
	s := signal{
		rate: rapid.SampledFrom([]float64{500, 1000, 2000}).Draw(t, "rate"), seconds: 12, points: 2, filter: 3,
		hz:      rapid.Float64Range(2, 60).Draw(t, "hz"),
		ramp:    rapid.Float64Range(-0.05, 0.05).Draw(t, "ramp"),
		falling: rapid.Bool().Draw(t, "falling"),
		missing: rapid.SampledFrom([]float64{0, 0, 0.02}).Draw(t, "missing"),
		extra:   rapid.SampledFrom([]float64{0, 0, 0.02}).Draw(t, "extra"),
		seed:    rapid.Uint64Range(0, 1000).Draw(t, "seed"),
		noise:   1e-5,
	}
	s.width = max(0.1, 4*s.hz/s.rate)
	for n := range dsp.Orders {
		s.mms[n] = rapid.Float64Range(0.5, 10).Draw(t, "mm/s") / float64(n*n*4+1)
		s.lag[n] = rapid.Float64Range(0, 359.99).Draw(t, "lag")
	}
	return s
}

// pushAll pushes the rows in pieces whose sizes next gives.
func pushAll(t rapid.TB, cfg dsp.Config, v []float32, next func() int) dsp.Minute {
	e, err := dsp.NewEngine(cfg)
	if err != nil {
		t.Fatal(err)
	}
	rows := len(v) / cfg.Channels
	for at := 0; at < rows; {
		n := min(next(), rows-at)
		e.Push(int64(at), v[at*cfg.Channels:(at+n)*cfg.Channels])
		at += n
	}
	return e.Close(int64(rows), time.Time{}, false)
}

// TestPiecesDoNotMatter: however the samples are cut into blocks, the reading
// is the same to the last bit.
func TestPiecesDoNotMatter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := drawSignal(t)
		v := s.render()
		whole := pushAll(t, s.config(), v, func() int { return len(v) })
		pieces := pushAll(t, s.config(), v, func() int { return rapid.IntRange(1, 3000).Draw(t, "rows") })
		if d := cmp.Diff(whole, pieces); d != "" {
			t.Error(d)
		}
	})
}

// TestVectorIsTrue: at any speed within range, ramp, edge and state of the
// reference the vector is the prescribed one.
func TestVectorIsTrue(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := drawSignal(t)
		v := s.render()
		m := pushAll(t, s.config(), v, func() int { return len(v) })
		for _, p := range m.Points {
			if p.State != dsp.PointGood {
				t.Fatalf("point is %s", p.State)
			}
			o := p.Order[0]
			if math.Abs(o.RMS/s.mms[0]-1) > 0.005+5*o.RMSSD/s.mms[0] || math.Abs(angle(o.Lag, s.lag[0])) > 0.7+5*o.LagSD {
				t.Errorf("1x %.4f at %.2f (sd %.4f, %.2f), prescribed %.4f at %.2f: %+v", o.RMS, o.Lag, o.RMSSD, o.LagSD, s.mms[0], s.lag[0], m.Speed)
			}
		}
	})
}

// TestPolarityAndSensitivity: an inverted sensor, or another sensitivity, gives
// the same reading once the configuration says so.
func TestPolarityAndSensitivity(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := drawSignal(t)
		factor := rapid.SampledFrom([]float32{-4, -1, 0.25, 8}).Draw(t, "factor")
		v := s.render()
		m := pushAll(t, s.config(), v, func() int { return len(v) })
		stride := s.points + 1
		for i := 0; i < len(v); i += stride {
			v[i] *= factor
		}
		cfg := s.config()
		cfg.Points[0].Inverted = factor < 0
		cfg.Points[0].VoltsPerG *= math.Abs(float64(factor))
		again := pushAll(t, cfg, v, func() int { return len(v) })
		for n := range dsp.Orders {
			a, b := m.Points[0].Order[n], again.Points[0].Order[n]
			if math.Abs(a.RMS-b.RMS) > 1e-6*a.RMS+1e-9 || math.Abs(angle(a.Lag, b.Lag)) > 1e-4 {
				t.Errorf("order %d: %+v became %+v", n+1, a, b)
			}
		}
	})
}

// TestHighpassAndConverterTakenOff: what a chain's high pass and the converter
// do to the signal is taken off in amplitude and phase.
func TestHighpassAndConverterTakenOff(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := drawSignal(t)
		corner := rapid.Float64Range(0.05, 3).Draw(t, "corner")
		v := s.render()
		plain := pushAll(t, s.config(), v, func() int { return len(v) })
		cfg := s.config()
		cfg.Points[0].HighpassHz = corner
		cfg.Gain = func(hz float64) float64 { return 1 / (1 + hz/1000) }
		m := pushAll(t, cfg, v, func() int { return len(v) })
		hz := m.Speed.Mean / 60
		a, b := plain.Points[0].Order[0], m.Points[0].Order[0]
		// The signal has not been through them, so it comes out enlarged by
		// their inverse, and turned by the lead that was assumed.
		gain := math.Hypot(1, corner/hz) * (1 + hz/1000)
		lead := math.Atan(corner/hz) * 180 / math.Pi
		tol := 0.02 * math.Abs(s.ramp) * 10
		if math.Abs(b.RMS/a.RMS/gain-1) > 1e-4+tol || math.Abs(angle(b.Lag, a.Lag+lead)) > 0.02+30*tol {
			t.Errorf("%v Hz, corner %v: %+v became %+v, want times %.5f and %+.3f deg", hz, corner, a, b, gain, lead)
		}
	})
}
