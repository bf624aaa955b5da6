package chip

import (
	"bytes"
	"errors"
	"math"
	"testing"
	"time"

	"periph.io/x/conn/v3/physic"
	"periph.io/x/conn/v3/spi"
)

func TestConnectRefuses(t *testing.T) {
	for _, v := range []struct {
		f    physic.Frequency
		mode spi.Mode
		bits int
	}{
		{8 * physic.MegaHertz, spi.Mode0, 8},
		{8 * physic.MegaHertz, spi.Mode2, 8},
		{8 * physic.MegaHertz, spi.Mode3, 8},
		{8 * physic.MegaHertz, spi.Mode1 | spi.LSBFirst, 8},
		{8 * physic.MegaHertz, spi.Mode1 | spi.HalfDuplex, 8},
		{8 * physic.MegaHertz, spi.Mode1, 16},
		{25*physic.MegaHertz + 1, spi.Mode1, 8},
		{0, spi.Mode1, 8},
	} {
		c, _ := New(Options{Signal: &steady{step: 8000}})
		if _, err := c.Connect(v.f, v.mode, v.bits); err == nil {
			t.Errorf("connected at %s in %s with %d bits", v.f, v.mode, v.bits)
		}
		if _, err := c.Connect(25*physic.MegaHertz, spi.Mode1, 8); err != nil {
			t.Errorf("after a refusal: %v", err)
		}
		if _, err := c.Connect(physic.MegaHertz, spi.Mode1, 8); err == nil {
			t.Error("connected twice")
		}
	}
}

func TestNewRefuses(t *testing.T) {
	for _, o := range []Options{
		{},
		{Signal: &steady{step: 1000}},
		{Signal: &steady{step: 64000}},
		{Signal: &steady{step: 8000}, ClockHz: 8e6},
		{Signal: &steady{step: 8000}, ClockHz: 9e6},
		{Signal: &steady{step: 8000}, ClockHz: -1},
		{Signal: &steady{step: 8000}, Speed: -1},
	} {
		if _, err := New(o); err == nil {
			t.Errorf("built with %+v", o)
		}
	}
	for step := 4000.0; step <= 32000; step *= 2 {
		if _, err := New(Options{Signal: &steady{step: step}}); err != nil {
			t.Error(err)
		}
	}
}

func TestTransfersRefused(t *testing.T) {
	h := newHost(t, Options{})
	for _, p := range [][]spi.Packet{
		{},
		{{W: make([]byte, 3), R: make([]byte, 4)}},
		{{W: make([]byte, maxTx+1)}},
		{{W: make([]byte, maxTx)}, {W: make([]byte, 1)}},
		{{W: make([]byte, 30), BitsPerWord: 16}},
		{{W: make([]byte, 30), KeepCS: true}},
	} {
		if err := h.conn.TxPackets(p); err == nil {
			t.Errorf("accepted %d packets", len(p))
		}
	}
	h.c.Close()
	if err := h.conn.Tx(make([]byte, 30), nil); err == nil {
		t.Error("transfer on a closed port")
	}
	if _, _, err := h.c.DataReady().Wait(time.Second); err == nil {
		t.Error("wait on a closed port")
	}
}

// TestPackets: packets that keep chip select are one frame, others are not.
func TestPackets(t *testing.T) {
	h := newHost(t, Options{})
	h.frame(0)
	var one, two [30]byte
	err := h.conn.TxPackets([]spi.Packet{
		{W: []byte{0xA0, 0x00, 0}, R: one[:3], KeepCS: true}, {R: one[3:]},
		{W: make([]byte, 30), R: two[:]},
	})
	if err != nil {
		t.Fatal(err)
	}
	h.sealed(one[:], 9)
	h.sealed(two[:], 9)
	if got := h.at(two[:], 0); got != 0x2800 {
		t.Errorf("ID read over two packets %04X, want 2800", got)
	}
}

func TestFaultsOnTheBus(t *testing.T) {
	boom := errors.New("boom")
	h := newHost(t, Options{Seed: 3})
	h.frame(0)
	at := func(ms time.Duration) time.Duration { return ms * time.Millisecond }
	h.c.Inject(Fault{Kind: TxError, From: at(10), To: at(20), Err: boom})
	h.c.Inject(Fault{Kind: StuckInput, From: at(20), To: at(30), Level: 0})
	h.c.Inject(Fault{Kind: CablePulled, From: at(30), To: at(40), Level: 0xFF})
	h.c.Inject(Fault{Kind: Corrupt, From: at(40), To: at(50), Probability: 1})
	h.let(at(10) - h.c.Now())
	if err := h.conn.Tx(make([]byte, 30), nil); err != boom {
		t.Errorf("error %v, want %v", err, boom)
	}
	h.let(at(20) - h.c.Now())
	if r := h.send(frameWords, cmdLock); !bytes.Equal(r, make([]byte, 30)) {
		t.Errorf("stuck input reads % X", r)
	}
	h.let(at(30) - h.c.Now())
	if r := h.send(frameWords, cmdUnlock); !bytes.Equal(r, bytes.Repeat([]byte{0xFF}, 30)) {
		t.Errorf("pulled cable reads % X", r)
	}
	if !h.c.locked {
		t.Error("the chip must see what is sent through a stuck input, and nothing through a pulled cable")
	}
	h.let(at(40) - h.c.Now())
	if r := h.send(frameWords, 0); h.at(r, 9) == bitCRC(0x1021, r[:27]) {
		t.Errorf("corrupted frame % X has a good check sum", r)
	}
	h.let(at(50) - h.c.Now())
	h.frame(0)
	h.c.Inject(Fault{Kind: StuckOutput, From: at(60), To: at(70), Level: 0xFF})
	h.let(at(60) - h.c.Now())
	h.frame(cmdUnlock)
	h.let(at(70) - h.c.Now())
	h.frame(0)
	if !h.c.locked {
		t.Error("a command came through a stuck output")
	}
}

func TestSpeed(t *testing.T) {
	h := newHost(t, Options{})
	for _, bad := range []float64{-1, math.NaN(), math.Inf(1)} {
		if err := h.c.SetSpeed(bad); err == nil {
			t.Errorf("speed %v accepted", bad)
		}
	}
	const speed = 20
	if err := h.c.SetSpeed(speed); err != nil {
		t.Fatal(err)
	}
	began, virtual := time.Now(), h.c.Now()
	for h.c.Now() < virtual+time.Second {
		h.next()
	}
	// Sleeping takes at least its time, so this bound holds on any machine.
	if took := time.Since(began); took < time.Second/speed-2*paceGrain {
		t.Errorf("a second at %d times real time took %v", speed, took)
	}
	h.c.SetSpeed(0)
	wall := h.c.Wall(time.Unix(1000, 0))
	if got := wall().Sub(time.Unix(1000, 0)); got != h.c.Now() {
		t.Errorf("wall clock advanced by %v, virtual time by %v", got, h.c.Now())
	}
}
