package chip

import (
	"testing"
	"time"

	"periph.io/x/conn/v3/physic"
)

// stairs is a Signal that rises by a code of 256 each conversion at 4 kSPS.
type stairs struct{ n int64 }

func (s *stairs) Channels() int   { return 1 }
func (s *stairs) StepHz() float64 { return 4000 }
func (s *stairs) Next(dst []float32) {
	s.n++
	dst[0] = float32(float64(s.n) * 256 * 1.2 / (1 << 23))
}

// newStairs returns a host in step with a chip at 4 kSPS.
func newStairs(t *testing.T, keep bool) *host {
	h := newHost(t, Options{Signal: &stairs{}, Quiet: true, KeepOldest: keep})
	h.write(regMode, 0x0110)
	for h.frame(0)[1] != 0 {
	}
	for range 4 {
		h.next()
	}
	return h
}

// bits returns the data-ready bits of a frame, stair its number.
func bits(r []byte) byte   { return r[1] }
func stair(r []byte) int   { return int(code(r, 0)+128) / 256 }
func (h *host) skip(n int) { h.let(time.Duration(n) * 250 * time.Microsecond) }

func TestOutputHoldsTwo(t *testing.T) {
	for _, keep := range []bool{false, true} {
		for late := range 6 {
			h := newStairs(t, keep)
			base := stair(h.next())
			before := h.c.Counters()
			h.skip(1 + late) // 1 + late conversions without a read
			want := []int{base + late, base + late + 1}
			switch {
			case late == 0:
				want = want[1:]
			case keep:
				want = []int{base + 1, base + 2}
			}
			for _, w := range want {
				if r := h.frame(0); bits(r) != 0xFF || stair(r) != w {
					t.Errorf("late by %d, keep oldest %v: sample %d bits %02X, want %d, FF", late, keep, stair(r), bits(r), w)
				}
			}
			if r := h.frame(0); bits(r) != 0 || code(r, 0) != 0 {
				t.Errorf("late by %d: an empty output gives bits %02X, code %X", late, bits(r), code(r, 0))
			}
			if got := h.c.Counters().Overwritten - before.Overwritten; got != int64(max(0, late-1)) {
				t.Errorf("late by %d: %d overwritten", late, got)
			}
		}
	}
}

// TestEdges: one for each conversion, at its time; none for a conversion that
// ends while a frame is clocked; level low while samples wait.
func TestEdges(t *testing.T) {
	h := newStairs(t, false)
	d := h.c.DataReady()
	h.next()
	if d.Low() {
		t.Error("low with nothing to read")
	}
	a, _, _ := d.Wait(time.Second)
	h.frame(0)
	b, _, _ := d.Wait(time.Second)
	if b-a != 250*time.Microsecond || b != h.c.Now() || !d.Low() {
		t.Errorf("edges at %v and %v, now %v, low %v", a, b, h.c.Now(), d.Low())
	}
	h.frame(0)
	h.c.LimitSpeed(500 * physic.KiloHertz) // 480 us for a frame
	h.frame(0)
	if _, ok, _ := d.Wait(time.Microsecond); ok {
		t.Error("an edge while a frame was clocked")
	}
	if !d.Low() {
		t.Error("the sample that came meanwhile is gone")
	}
	if _, _, err := d.Wait(0); err == nil {
		t.Error("a timeout of 0 accepted")
	}
}

func TestQueuedEdges(t *testing.T) {
	h := newHost(t, Options{Signal: &stairs{}, Quiet: true, QueueEdges: true})
	h.skip(40)
	d := h.c.DataReady()
	last := h.c.Now().Truncate(250 * time.Microsecond)
	for i := range queueLength {
		at, ok, _ := d.Wait(time.Microsecond)
		if want := last - time.Duration(queueLength-1-i)*250*time.Microsecond; !ok || at != want {
			t.Errorf("edge %d at %v, want %v", i, at, want)
		}
	}
	if _, ok, _ := d.Wait(time.Microsecond); ok {
		t.Error("more edges than the queue holds")
	}
}

// TestPulseFormat: an unread sample costs the next one and its pulse.
func TestPulseFormat(t *testing.T) {
	h := newStairs(t, false)
	h.write(regMode, 0x0111)
	h.next()
	h.next()
	d := h.c.DataReady()
	a, _, _ := d.Wait(time.Second)
	b, _, _ := d.Wait(time.Second)
	if b-a != 500*time.Microsecond {
		t.Errorf("pulses %v apart with an unread sample, want two periods", b-a)
	}
}

// TestClockError: 100 ppm show in the times of the edges.
func TestClockError(t *testing.T) {
	h := newHost(t, Options{Signal: &stairs{}, ClockErrorPPM: -100})
	d := h.c.DataReady()
	first, _, _ := d.Wait(time.Second)
	var last time.Duration
	for range 10000 {
		last, _, _ = d.Wait(time.Second)
	}
	if got, want := (last - first).Seconds(), 2.5/(1-100e-6); got < want-2e-9 || got > want+2e-9 {
		t.Errorf("10000 periods took %.9f s, want %.9f", got, want)
	}
}

func TestSync(t *testing.T) {
	h := newStairs(t, false)
	h.next()
	h.let(100 * time.Microsecond)
	h.c.Sync()
	if got := h.at(h.frame(0), 0); got != 0x4100 {
		t.Errorf("STATUS after a pulse on SYNC %04X, want 4100", got)
	}
	if got := h.at(h.frame(0), 0); got != 0x0100 {
		t.Errorf("STATUS then %04X, want 0100", got)
	}
	h.c.Reset()
	h.let(regAcquire)
	if got := h.at(h.frame(0), 0); got != 0xFF28 {
		t.Errorf("first word after a pulse on RESET %04X, want FF28", got)
	}
}

// TestFastRates: conversions shorter than a step of the signal come at their
// own distance.
func TestFastRates(t *testing.T) {
	h := newHost(t, Options{Signal: &stairs{}})
	for osr, reg := range map[int]uint16{128: 0xFF82, 256: 0xFF86, 512: 0xFF8A} {
		h.write(regClock, reg)
		d := h.c.DataReady()
		d.Wait(time.Second)
		d.Wait(time.Second)
		a, _, _ := d.Wait(time.Second)
		b, _, _ := d.Wait(time.Second)
		if got := (b - a).Seconds() * 4.096e6; got < float64(osr)-0.01 || got > float64(osr)+0.01 {
			t.Errorf("OSR %d: conversions %v apart", osr, b-a)
		}
	}
}

func TestAllocatesNothing(t *testing.T) {
	h := newHost(t, Options{Signal: &tone{step: 8000, hz: 25, volts: 1}})
	h.settled()
	d := h.c.DataReady()
	w, r := make([]byte, 30), make([]byte, 30)
	if n := testing.AllocsPerRun(200, func() {
		d.Wait(time.Second)
		h.conn.Tx(w, r)
	}); n != 0 {
		t.Errorf("%v allocations for each frame", n)
	}
}

// BenchmarkConversion is one row of eight channels at 1 kSPS with steps of
// 8 kHz, noise on: wait, frame.
func BenchmarkConversion(b *testing.B) {
	h := newHost(b, Options{Signal: &steady{step: 8000}})
	h.settled()
	d := h.c.DataReady()
	w, r := make([]byte, 30), make([]byte, 30)
	b.ReportAllocs()
	for b.Loop() {
		d.Wait(time.Second)
		h.conn.Tx(w, r)
	}
	b.ReportMetric(1e6/(float64(b.Elapsed().Nanoseconds())/float64(b.N)), "x-real-time")
}
