package chip

import (
	"testing"
	"time"

	"go.uber.org/goleak"
	"periph.io/x/conn/v3/physic"
	"periph.io/x/conn/v3/spi"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// steady is a Signal of constant voltages.
type steady struct {
	step  float64
	volts [8]float32
}

func (s *steady) Channels() int      { return 8 }
func (s *steady) StepHz() float64    { return s.step }
func (s *steady) Next(dst []float32) { copy(dst, s.volts[:]) }

// host is a bare bus master for tests, with words of 24 bits unless told
// otherwise. Its check sums are computed bit by bit.
type host struct {
	t    testing.TB
	c    *Chip
	conn spi.Conn
	word int
	poly uint16
}

func newHost(t testing.TB, o Options) *host {
	t.Helper()
	if o.Signal == nil {
		o.Signal = &steady{step: 8000}
	}
	c, err := New(o)
	if err != nil {
		t.Fatal(err)
	}
	conn, err := c.Connect(8*physic.MegaHertz, spi.Mode1, 8)
	if err != nil {
		t.Fatal(err)
	}
	h := &host{t: t, c: c, conn: conn, word: 3, poly: 0x1021}
	h.let(powerOn)
	return h
}

// let lets time pass.
func (h *host) let(d time.Duration) {
	h.c.mu.Lock()
	defer h.c.mu.Unlock()
	h.c.advance(h.c.clock.now + d)
}

// bitCRC is the check sum by its definition.
func bitCRC(poly uint16, p []byte) uint16 {
	crc := uint16(0xFFFF)
	for _, b := range p {
		for bit := 7; bit >= 0; bit-- {
			top := crc>>15 ^ uint16(b)>>bit&1
			crc <<= 1
			if top != 0 {
				crc ^= poly
			}
		}
	}
	return crc
}

// send clocks a frame of words (16-bit values, with the check sum behind
// them) as long as n words, and returns the answer.
func (h *host) send(n int, words ...uint16) []byte {
	h.t.Helper()
	w := make([]byte, n*h.word)
	for i, v := range words {
		w[i*h.word], w[i*h.word+1] = byte(v>>8), byte(v)
	}
	if end := len(words) * h.word; end+2 <= len(w) {
		crc := bitCRC(h.poly, w[:end])
		w[end], w[end+1] = byte(crc>>8), byte(crc)
	}
	r := make([]byte, len(w))
	if err := h.conn.Tx(w, r); err != nil {
		h.t.Fatal(err)
	}
	return r
}

// frame sends a full frame and returns the answer, whose check sum must hold.
func (h *host) frame(words ...uint16) []byte {
	h.t.Helper()
	r := h.send(frameWords, words...)
	h.sealed(r, frameWords-1)
	return r
}

// sealed checks the check sum that is word n of r.
func (h *host) sealed(r []byte, n int) {
	h.t.Helper()
	if got, want := h.at(r, n), bitCRC(h.poly, r[:n*h.word]); got != want {
		h.t.Fatalf("check sum %04X, want %04X of % X", got, want, r)
	}
}

// at returns the upper 16 bits of word i.
func (h *host) at(r []byte, i int) uint16 {
	return uint16(r[i*h.word])<<8 | uint16(r[i*h.word+1])
}

// ask sends a command and returns its answer, one frame later.
func (h *host) ask(words ...uint16) uint16 {
	h.t.Helper()
	h.frame(words...)
	return h.at(h.frame(0), 0)
}

func (h *host) read(a int) uint16 {
	h.t.Helper()
	return h.ask(0xA000 | uint16(a)<<7)
}

func (h *host) write(a int, v uint16) {
	h.t.Helper()
	if got, want := h.ask(0x6000|uint16(a)<<7, v), 0x4000|uint16(a)<<7; got != want {
		h.t.Fatalf("write of %02Xh answered %04X, want %04X", a, got, want)
	}
}

// code returns channel ch of a frame of 24-bit words.
func code(r []byte, ch int) int32 {
	b := r[3+3*ch:]
	return int32(uint32(b[0])<<24|uint32(b[1])<<16|uint32(b[2])<<8) >> 8
}

// next waits for data-ready and returns the frame read then.
func (h *host) next() []byte {
	h.t.Helper()
	if _, ok, err := h.c.DataReady().Wait(time.Second); !ok || err != nil {
		h.t.Fatalf("no data-ready: %v", err)
	}
	return h.frame(0)
}

// settled sets OSR 4096 and returns a frame after the filter has settled.
func (h *host) settled() []byte {
	h.t.Helper()
	h.write(regClock, 0xFF96)
	h.frame(0)
	h.frame(0)
	for range 5 {
		h.next()
	}
	return h.next()
}
