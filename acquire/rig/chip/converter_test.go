package chip

import (
	"fmt"
	"math"
	"testing"
	"time"
)

// TestKernelSum: the weights are a partition of unity. Summed at the distance
// of the outputs of the sinc3 they are 1 for every phase, so that a steady
// input gives a steady output whatever its place.
func TestKernelSum(t *testing.T) {
	for osr := 128; osr <= 16384; osr *= 2 {
		for unit := 128; unit <= min(osr, 1024); unit *= 2 {
			w := kernel(osr, unit)
			sum := 0.0
			phase := make([]float64, osr/unit)
			for j, v := range w {
				sum += v
				phase[j%len(phase)] += v
				if math.Abs(v-w[len(w)-1-j]) > 1e-15 || v < 0 {
					t.Fatalf("OSR %d, unit %d: weights %v not symmetrical and positive", osr, unit, w)
				}
			}
			if math.Abs(sum-1) > 1e-15 {
				t.Errorf("OSR %d, unit %d: sum of weights off by %g", osr, unit, sum-1)
			}
			for _, p := range phase {
				if d := math.Abs(p*float64(len(phase)) - 1); d > 1e-12 {
					t.Errorf("OSR %d, unit %d: a phase sums to 1%+.2g", osr, unit, d)
				}
			}
		}
	}
}

// The gains at 5, 25, 60 and 120 Hz by oversampling ratio, computed beforehand
// from the structure of the filter (ADS131M08 data sheet SBAS950B, section 8.3.7
// and table 8-2, clock 8.192 MHz).
var droop = map[int][4]float64{
	128:   {1.00000, 1.00000, 0.99998, 0.99993},
	256:   {1.00000, 0.99999, 0.99993, 0.99972},
	512:   {1.00000, 0.99995, 0.99972, 0.99889},
	1024:  {0.99999, 0.99981, 0.99889, 0.99557},
	2048:  {0.99998, 0.99961, 0.99778, 0.99115},
	4096:  {0.99995, 0.99884, 0.99335, 0.97359},
	8192:  {0.99983, 0.99576, 0.97576, 0.90522},
	16384: {0.99934, 0.98351, 0.90724, 0.65988},
}

// TestDroop computes the response of the weights, the mean over a unit
// included, and holds it against the table, for every step there is.
func TestDroop(t *testing.T) {
	worst := map[int]float64{}
	for osr, want := range droop {
		for step := 128; step <= 1024; step *= 2 {
			unit := min(step, osr)
			w := kernel(osr, unit)
			for i, hz := range []float64{5, 25, 60, 120} {
				x := math.Pi * hz * float64(unit) / 4.096e6
				sum := 0.0
				for j, v := range w {
					sum += v * math.Cos(2*x*(float64(j)-float64(len(w)-1)/2))
				}
				// The signal's mean is over a step, the unit where shorter.
				y := math.Pi * hz * float64(step) / 4.096e6
				d := math.Abs(sum*math.Sin(y)/y - want[i])
				worst[step] = max(worst[step], d)
			}
		}
	}
	for step, d := range worst {
		// 5e-6 is the rounding of the table; a step longer than OSR shows the
		// mean over the step, which the filter has not.
		limit := map[int]float64{128: 8e-6, 256: 8e-5, 512: 4e-4, 1024: 2e-3}[step]
		if d > limit {
			t.Errorf("step %d: gain off by %.2g, want under %.2g", step, d, limit)
		}
		t.Logf("step of %d modulator periods: gain off by at most %.2g", step, d)
	}
}

// tone is a Signal, the same sine on all channels, each step its exact mean.
type tone struct {
	step, hz, volts float64
	n               int64
}

func (s *tone) Channels() int   { return 8 }
func (s *tone) StepHz() float64 { return s.step }
func (s *tone) Next(dst []float32) {
	w := 2 * math.Pi * s.hz
	a, b := float64(s.n)/s.step, float64(s.n+1)/s.step
	s.n++
	for ch := range dst {
		dst[ch] = float32(s.volts * (math.Cos(w*a) - math.Cos(w*b)) / (w * (b - a)))
	}
}

// TestSine takes amplitude and delay of a whole conversion, register to frame.
func TestSine(t *testing.T) {
	delays := map[int]float64{1024: 374.6, 2048: 499.6, 4096: 749.6, 8192: 1249.6} // us, table 1.6
	for osr, delay := range delays {
		for i, hz := range []float64{5, 25, 60, 120} {
			h := newHost(t, Options{Signal: &tone{step: 8000, hz: hz, volts: 1}, Quiet: true})
			reg := uint16(0xFF82)
			for o := osr; o > 128; o /= 2 {
				reg += 4
			}
			h.write(regClock, reg)
			h.frame(0)
			h.frame(0)
			for range 5 {
				h.next()
			}
			n := 4 * 4096 * 1000 / osr // four seconds, whole periods of all tones
			var re, im float64
			for range n {
				at, ok, err := h.c.DataReady().Wait(time.Second)
				if !ok || err != nil {
					t.Fatal("no data-ready")
				}
				v := float64(code(h.frame(0), 0)) * reference / (1 << 23)
				s, c := math.Sincos(2 * math.Pi * hz * at.Seconds())
				re, im = re+2*v*s/float64(n), im+2*v*c/float64(n)
			}
			if got, want := math.Hypot(re, im), droop[osr][i]; math.Abs(got-want) > 2e-5 {
				t.Errorf("OSR %d, %g Hz: amplitude %.5f, want %.5f", osr, hz, got, want)
			}
			got := -math.Atan2(im, re) / (2 * math.Pi * hz) * 1e6
			if math.Abs(got-delay) > 1 {
				t.Errorf("OSR %d, %g Hz: delay %.2f us, want %.2f", osr, hz, got, delay)
			}
		}
	}
}

func TestGainAndClipping(t *testing.T) {
	volts := [8]float32{0.01, -0.01, 0.6, -0.6, 1.3, -1.3, 0, 1.2}
	for gain := uint16(0); gain < 8; gain++ {
		h := newHost(t, Options{Signal: &steady{step: 16000, volts: volts}, Quiet: true})
		h.write(regGain1, 0x1111*gain)
		h.write(regGain2, 0x1111*gain)
		r := h.settled()
		for ch, v := range volts {
			want := math.RoundToEven(float64(v) * float64(int(1)<<gain) / 1.2 * (1 << 23))
			want = min(max(want, codeMin), codeMax)
			if got := float64(code(r, ch)); math.Abs(got-want) > 1 {
				t.Errorf("gain %d: %v V gives %v, want %v", 1<<gain, v, got, want)
			}
		}
	}
}

func TestMultiplexer(t *testing.T) {
	for mux, want := range []float64{0.25, 0, 2.0 / 15 * 1.2, -2.0 / 15 * 1.2} {
		var volts [8]float32
		volts[2] = 0.25
		h := newHost(t, Options{Signal: &steady{step: 8000, volts: volts}, Quiet: true})
		h.write(regCh+2*perChannel, uint16(mux))
		if got := float64(code(h.settled(), 2)) * 1.2 / (1 << 23); math.Abs(got-want) > 2e-7 {
			t.Errorf("MUX %d reads %v V, want %v", mux, got, want)
		}
	}
}

func TestCalibration(t *testing.T) {
	var volts [8]float32
	volts[1] = 0.3 // code 200000h
	for _, v := range []struct {
		offset int32
		gain   uint32
		want   int32
	}{
		{0, 0x800000, 0x200000},
		{0x1000, 0x800000, 0x1FF000},
		{-0x1000, 0x800000, 0x201000},
		{0, 0x400000, 0x100000},
		{0, 0xC00000, 0x300000},
		{0x100000, 0xFFFFFF, 0x1FFFFF},
		{-0x400000, 0xFFFFFF, 0x7FFFFF},
	} {
		h := newHost(t, Options{Signal: &steady{step: 8000, volts: volts}, Quiet: true})
		a := regCh + perChannel
		h.write(a+ofsOcalMSB, uint16(v.offset>>8))
		h.write(a+ofsOcalLSB, uint16(v.offset<<8))
		h.write(a+ofsGcalMSB, uint16(v.gain>>8))
		h.write(a+ofsGcalLSB, uint16(v.gain<<8))
		if got := code(h.settled(), 1); got < v.want-1 || got > v.want+1 {
			t.Errorf("offset %X, gain %X: code %X, want %X", v.offset, v.gain, got, v.want)
		}
	}
}

func TestChannelsOff(t *testing.T) {
	h := newHost(t, Options{Signal: &steady{step: 8000, volts: [8]float32{1, 1, 1, 1, 1, 1, 1, 1}}, Quiet: true})
	h.settled()
	h.write(regClock, 0x0596)
	for range 6 {
		h.next()
	}
	r := h.next()
	if got := h.at(r, 0) & 0xFF; got != 0x05 {
		t.Errorf("data-ready bits %02X, want 05", got)
	}
	for ch := range 8 {
		if got := code(r, ch) != 0; got != (ch == 0 || ch == 2) {
			t.Errorf("channel %d reads %X", ch, code(r, ch))
		}
	}
	h.write(regClock, 0x0096)
	if _, ok, _ := h.c.DataReady().Wait(20 * time.Millisecond); ok {
		t.Error("converts with all channels off")
	}
}

// TestNoise holds the spread of 4000 samples on eight shorted channels against
// table 7-1: the standard error is 0.4 %.
func TestNoise(t *testing.T) {
	for _, v := range []struct {
		clock, gain uint16
		uV          float64
	}{
		{0xFF96, 0, 3.38}, {0xFF92, 0, 4.25}, {0xFF8E, 0, 5.35},
		{0xFF96, 0x2222, 2.88}, {0xFF92, 0x2222, 3.79}, {0xFF8E, 0x2222, 4.52},
		{0xFF96, 0x3333, 1.74}, {0xFF92, 0x3333, 2.27}, {0xFF8E, 0x3333, 2.70},
	} {
		h := newHost(t, Options{Seed: 5})
		h.write(regGain1, v.gain)
		h.write(regGain2, v.gain)
		h.write(regClock, v.clock)
		sum, n := 0.0, 0
		for i := range 4000 {
			r := h.next()
			if i < 10 {
				continue
			}
			for ch := range 8 {
				x := float64(code(r, ch)) * 1.2e6 / (1 << 23) / float64(int(1)<<(v.gain&7))
				sum, n = sum+x*x, n+1
			}
		}
		if got := math.Sqrt(sum / float64(n)); math.Abs(got/v.uV-1) > 0.02 {
			t.Errorf("CLOCK %04X, gain code %X: noise %.3f uV, want %.2f", v.clock, v.gain&7, got, v.uV)
		}
	}
}

// TestStart: the first two samples after a reset come over the fast path and
// are noisy; those after a change of the rate run in.
func TestStart(t *testing.T) {
	var first, third float64
	for seed := range uint64(200) {
		h := newHost(t, Options{Seed: seed})
		for i := range 3 {
			r := h.next()
			for ch := range 8 {
				x := float64(code(r, ch)) * 1.2 / (1 << 23)
				if i < 2 {
					first += x * x / (2 * 8 * 200)
				} else {
					third += x * x / (8 * 200)
				}
			}
		}
	}
	if got := math.Sqrt(first); math.Abs(got/1500e-6-1) > 0.05 {
		t.Errorf("first two samples: noise %.3g V, want 1500 uV", got)
	}
	if got := math.Sqrt(third); math.Abs(got/5.35e-6-1) > 0.1 {
		t.Errorf("third sample: noise %.3g V, want 5.35 uV", got)
	}

	h := newHost(t, Options{Signal: &steady{step: 8000, volts: [8]float32{0.6}}, Quiet: true})
	h.settled()
	h.write(regClock, 0xFF92) // 2 kSPS
	var got []string
	for range 4 {
		got = append(got, fmt.Sprintf("%.3f", float64(code(h.next(), 0))/(1<<22)))
	}
	// sinc3(1024) then a mean of 2: (1/6 + 5/6)/2, then settled.
	if want := "[0.500 1.000 1.000 1.000]"; fmt.Sprint(got) != want {
		t.Errorf("after a change of rate %v, want %s", got, want)
	}
}

// TestBlockDC: corner and settling of table 8-4 for code 8 at 4 kSPS.
func TestBlockDC(t *testing.T) {
	h := newHost(t, Options{Signal: &steady{step: 8000, volts: [8]float32{0.6, 0.6}}, Quiet: true})
	h.write(regThLSB, 8)
	h.write(regCh+perChannel, 4) // off on channel 1
	h.write(regClock, 0xFF8E)
	h.frame(0)
	h.frame(0)
	var r []byte
	for range 2357 {
		r = h.next()
	}
	if got := float64(code(r, 0)) / (1 << 22); got > 0.0101 || got < 0.0095 {
		t.Errorf("after 2357 samples %.4f of the step is left, want 0.01", got)
	}
	if got := float64(code(r, 1)) / (1 << 22); math.Abs(got-1) > 1e-6 {
		t.Errorf("channel with the DC block off reads %v", got)
	}
}
