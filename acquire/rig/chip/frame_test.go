package chip

import (
	"bytes"
	"testing"
	"time"

	"periph.io/x/conn/v3/physic"
	"periph.io/x/conn/v3/spi"
	"pgregory.net/rapid"
)

// Vectors of 24-bit words. The first is a frame of a real part, published on
// the maker's forum (thread 1011774); the rest were computed independently.
func TestCheckSums(t *testing.T) {
	real := append([]byte{0x81}, make([]byte, 14)...)
	if got := ccitt.add(crcSeed, real...); got != 0xB42D {
		t.Errorf("CCITT of the real frame %04X, want B42D", got)
	}
	if got := ansi.add(crcSeed, real...); got != 0x80FB {
		t.Errorf("ANSI of the real frame %04X, want 80FB", got)
	}
	for _, v := range []struct {
		words []uint16
		want  uint16
	}{
		{[]uint16{cmdNull}, 0xCC9C}, {[]uint16{cmdReset}, 0xFCDE}, {[]uint16{cmdStandby}, 0xAC18},
		{[]uint16{cmdWakeup}, 0x9C5A}, {[]uint16{cmdLock}, 0xD626}, {[]uint16{cmdUnlock}, 0x8F76},
		{[]uint16{0xA000}, 0x7100}, {[]uint16{0xA080}, 0x6A98}, {[]uint16{0xA100}, 0x4630}, {[]uint16{0xA180}, 0x5DA8},
		{[]uint16{0x6100, 0x0110}, 0x20EB}, {[]uint16{0x6100, 0x1110}, 0x6388}, {[]uint16{0x6180, 0xFF96}, 0x4B56},
		{[]uint16{0x6180, 0xFF92}, 0x8792}, {[]uint16{0x6180, 0xFF8E}, 0xC18C}, {[]uint16{0x6180, 0x008E}, 0x0EEF},
	} {
		var p []byte
		for _, w := range v.words {
			p = append(p, byte(w>>8), byte(w), 0)
		}
		if got := ccitt.add(crcSeed, p...); got != v.want {
			t.Errorf("check sum of %04X: %04X, want %04X", v.words, got, v.want)
		}
	}
}

func TestAnswersOneFrameLater(t *testing.T) {
	h := newHost(t, Options{})
	if got := h.at(h.frame(0), 0); got != 0xFF28 {
		t.Errorf("first word after power-on %04X, want FF28", got)
	}
	// STATUS out of reset: 0500h and no channel flag, or all.
	if got := h.at(h.frame(0), 0); got&0xFF00 != 0x0500 {
		t.Errorf("STATUS %04X, want 05xx", got)
	}
	for _, v := range []struct{ cmd, want uint16 }{
		{cmdReset, 0xFF28}, {cmdStandby, cmdStandby}, {cmdWakeup, cmdWakeup},
		{cmdLock, cmdLock}, {cmdUnlock, cmdUnlock}, {0xA000, 0x2800}, {0xA100, 0x0510},
	} {
		h.frame(v.cmd)
		h.let(regAcquire)
		if got := h.at(h.frame(0), 0); got != v.want {
			t.Errorf("%04X answered %04X, want %04X", v.cmd, got, v.want)
		}
	}
	if got := h.ask(0x1234); got&0xFF00 != 0x0500 {
		t.Errorf("an unknown command answered %04X, want STATUS", got)
	}
}

func TestDeafAfterPowerOnAndReset(t *testing.T) {
	c, err := New(Options{Signal: &steady{step: 8000}})
	if err != nil {
		t.Fatal(err)
	}
	conn, _ := c.Connect(8*physic.MegaHertz, spi.Mode1, 8)
	r := []byte{1, 2, 3}
	if err := conn.Tx([]byte{0, 0, 0}, r); err != nil || !bytes.Equal(r, []byte{0, 0, 0}) {
		t.Errorf("answer % X, %v right after power-on", r, err)
	}
	h := newHost(t, Options{})
	h.frame(cmdReset)
	if r := h.send(frameWords, 0); !bytes.Equal(r, make([]byte, 30)) {
		t.Errorf("answer % X within 5 us of a reset", r)
	}
}

func TestShortFrames(t *testing.T) {
	h := newHost(t, Options{})
	h.send(2, cmdLock)
	if got := h.at(h.frame(0), 0); got&0xFF00 != 0x0500 {
		t.Errorf("short LOCK with channels on answered %04X, want STATUS, not locked", got)
	}
	if h.c.Counters().Short != 1 {
		t.Errorf("%d short frames counted, want 1", h.c.Counters().Short)
	}
	h.write(regClock, 0x000E)
	h.write(regGain1, 0x0001)
	h.send(2, cmdReset)
	if got := h.at(h.frame(0), 0); got != 0x0011 {
		t.Errorf("short RESET answered %04X, want 0011", got)
	}
	if got := h.read(regGain1); got != 1 {
		t.Errorf("short RESET has reset: GAIN1 %04X", got)
	}
	h.send(2, cmdLock)
	if got := h.at(h.frame(0), 0); got != cmdLock {
		t.Errorf("short LOCK with channels off answered %04X", got)
	}
}

func TestLock(t *testing.T) {
	h := newHost(t, Options{})
	h.frame(cmdLock)
	if got := h.ask(0); got&statusLock == 0 {
		t.Errorf("STATUS %04X, want locked", got)
	}
	for _, words := range [][]uint16{{cmdReset}, {cmdStandby}, {0x6000 | regGain1<<7, 0x7777}} {
		if got := h.ask(words...); got&0xFF00 != 0x8500 {
			t.Errorf("%04X on a locked chip answered %04X, want STATUS", words, got)
		}
	}
	if got := h.read(regGain1); got != 0 {
		t.Errorf("locked register was written: %04X", got)
	}
	if got := h.ask(cmdUnlock); got != cmdUnlock {
		t.Errorf("UNLOCK answered %04X", got)
	}
	h.write(regGain1, 0x7777)
}

func TestStandby(t *testing.T) {
	h := newHost(t, Options{})
	h.frame(cmdStandby)
	if _, ok, _ := h.c.DataReady().Wait(20 * time.Millisecond); ok {
		// One edge may have come before.
		if _, ok, _ = h.c.DataReady().Wait(20 * time.Millisecond); ok {
			t.Error("converts in standby")
		}
	}
	h.frame(cmdWakeup)
	if _, ok, _ := h.c.DataReady().Wait(20 * time.Millisecond); !ok {
		t.Error("does not convert after wake-up")
	}
}

func TestResetValues(t *testing.T) {
	h := newHost(t, Options{})
	want := map[int]uint16{0: 0x2800, 2: 0x0510, 3: 0xFF0E, 6: 0x0600}
	for ch := range 8 {
		want[0x0C+5*ch] = 0x8000
	}
	for a := range regCount {
		if a == regStatus {
			continue
		}
		if got := h.read(a); got != want[a] {
			t.Errorf("register %02X resets to %04X, want %04X", a, got, want[a])
		}
	}
}

// TestWriteMasks: a register keeps of what is written only its own bits, and
// read-only ones keep all of theirs. MODE.WLENGTH is left at 24 bits here.
func TestWriteMasks(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		h := newHost(t, Options{})
		a := rapid.IntRange(0, regCount-1).Draw(rt, "address")
		v := rapid.Uint16().Draw(rt, "value")
		old := h.read(a)
		if a == regMode {
			v = v&^0x0F00 | 0x0100
		}
		if a == regStatus {
			return
		}
		h.write(a, v)
		mask := map[int]uint16{2: 0x3F1F, 3: 0xFFDF, 4: 0x7777, 5: 0x7777, 6: 0x1FFF, 7: 0xFFFF, 8: 0xFF0F}[a]
		if a >= 9 && a <= 0x30 {
			mask = [5]uint16{0xFFC7, 0xFFFF, 0xFF00, 0xFFFF, 0xFF00}[(a-9)%5]
		}
		if got, want := h.read(a), old&^mask|v&mask; got != want {
			rt.Errorf("register %02X reads %04X after writing %04X, want %04X", a, got, v, want)
		}
	})
}

func TestSeveralRegisters(t *testing.T) {
	h := newHost(t, Options{})
	// WREG of GAIN1, GAIN2, CFG.
	h.frame(0x6000|regGain1<<7|2, 0x1111, 0x2222, 0x0601)
	if got, want := h.at(h.frame(0xA000|regGain1<<7|2), 0), uint16(0x4000|regGain1<<7|2); got != want {
		t.Fatalf("write of three answered %04X, want %04X", got, want)
	}
	r := h.send(frameWords, 0)
	h.sealed(r, 4)
	for i, want := range []uint16{0xE000 | regGain1<<7 | 2, 0x1111, 0x2222, 0x0601} {
		if got := h.at(r, i); got != want {
			t.Errorf("word %d of the answer %04X, want %04X", i, got, want)
		}
	}
	if !bytes.Equal(r[5*3:], make([]byte, 15)) {
		t.Errorf("answer to a read of three carries more: % X", r)
	}
	// The whole map in one frame of 2+64 words.
	h.frame(0xA000 | 63)
	r = h.send(66, 0)
	h.sealed(r, 65)
	if h.at(r, 1) != 0x2800 || h.at(r, 1+regGain2) != 0x2222 {
		t.Errorf("read of all: % X", r)
	}
	// A write cut short by the end of the frame.
	h.frame(0x6000|regGain1<<7|40, 0, 0, 0, 0, 0, 0, 0, 0)
	if got, want := h.at(h.frame(0), 0), uint16(0x4000|regGain1<<7|8); got != want {
		t.Errorf("cut write answered %04X, want %04X", got, want)
	}
}

func TestInputCheck(t *testing.T) {
	h := newHost(t, Options{})
	h.write(regMode, 0x1110)
	if got := h.ask(0); got&0xFF00 != 0x0100 {
		t.Fatalf("STATUS %04X, want 01xx", got)
	}
	good := h.poly
	h.poly = 0x8005 // wrong for the chip
	h.send(frameWords, cmdLock)
	h.poly = good
	if got := h.at(h.frame(0), 0); got&0xFF00 != 0x1100 {
		t.Errorf("STATUS after a bad check sum %04X, want 11xx and not locked", got)
	}
	if got := h.ask(0); got&statusCRCErr != 0 {
		t.Errorf("CRC_ERR not cleared: %04X", got)
	}
	h.poly = 0x8005
	h.send(frameWords, 0x6000|regGain1<<7, 0x0003)
	h.poly = good
	if got := h.at(h.frame(0), 0); got&statusCRCErr == 0 {
		t.Errorf("no CRC_ERR after a bad write: %04X", got)
	}
	if got := h.read(regGain1); got != 3 {
		t.Errorf("GAIN1 %04X: the write must happen in spite of the check sum", got)
	}
	if n := h.c.Counters().InputChecks; n != 2 {
		t.Errorf("%d bad check sums counted, want 2", n)
	}
}

func TestOtherCheckSum(t *testing.T) {
	h := newHost(t, Options{})
	h.frame(0x6000|regMode<<7, 0x1910)
	h.poly = 0x8005
	if got, want := h.at(h.frame(0), 0), uint16(0x4000|regMode<<7); got != want {
		t.Errorf("answer %04X, want %04X", got, want)
	}
	if got := h.ask(0); got&0xFF00 != 0x0900 {
		t.Errorf("STATUS %04X, want 09xx", got)
	}
}

func TestWordLengths(t *testing.T) {
	volts := [8]float32{0.3, -0.3, 1.2, -1.2}
	for _, v := range []struct {
		mode  uint16
		bytes int
		want  func(code int32) []byte
	}{
		{0x0010, 2, func(c int32) []byte { return []byte{byte(c >> 16), byte(c >> 8)} }},
		{0x0110, 3, func(c int32) []byte { return []byte{byte(c >> 16), byte(c >> 8), byte(c)} }},
		{0x0210, 4, func(c int32) []byte { return []byte{byte(c >> 16), byte(c >> 8), byte(c), 0} }},
		{0x0310, 4, func(c int32) []byte { return []byte{byte(c >> 24), byte(c >> 16), byte(c >> 8), byte(c)} }},
	} {
		h := newHost(t, Options{Signal: &steady{step: 8000, volts: volts}, Quiet: true})
		h.settled()
		h.frame(0x6000|regMode<<7, v.mode)
		h.word = v.bytes
		h.frame(0)
		h.next()
		r := h.next()
		for ch, code := range []int32{0x200000, -0x200000, 0x7FFFFF, -0x800000} {
			if got, want := r[(1+ch)*v.bytes:(2+ch)*v.bytes], v.want(code); !bytes.Equal(got, want) {
				t.Errorf("MODE %04X: %v V read as % X, want % X", v.mode, volts[ch], got, want)
			}
		}
	}
}

func TestFrameTimeout(t *testing.T) {
	h := newHost(t, Options{})
	h.frame(0)
	h.c.LimitSpeed(50 * physic.KiloHertz) // 4.8 ms for a frame, 4 ms allowed
	h.send(frameWords, cmdLock)
	h.c.LimitSpeed(8 * physic.MegaHertz)
	h.frame(0)
	if got := h.ask(0); got&statusLock != 0 {
		t.Errorf("a frame over the limit was obeyed: STATUS %04X", got)
	}
	h.write(regMode, 0x0100) // no time limit
	h.c.LimitSpeed(50 * physic.KiloHertz)
	h.send(frameWords, cmdLock)
	h.c.LimitSpeed(8 * physic.MegaHertz)
	if got := h.at(h.frame(0), 0); got != cmdLock {
		t.Errorf("slow LOCK without a limit answered %04X", got)
	}
}

func TestRegisterMapCheck(t *testing.T) {
	h := newHost(t, Options{})
	if got := h.read(regMapCRC); got != 0 {
		t.Errorf("REGMAP_CRC %04X while off, want 0", got)
	}
	h.write(regMode, 0x2110)
	var p []byte
	for a := regMode; a <= regLast; a++ {
		v := h.c.regs[a]
		p = append(p, byte(v>>8), byte(v))
	}
	if got, want := h.read(regMapCRC), bitCRC(0x1021, p); got != want {
		t.Errorf("REGMAP_CRC %04X, want %04X", got, want)
	}
	h.ask(0)
	h.write(regGain1, 1)
	if got := h.at(h.frame(0), 0); got&statusRegMap == 0 {
		t.Errorf("STATUS %04X after a change, want REG_MAP", got)
	}
	if got := h.at(h.frame(0), 0); got&statusRegMap != 0 {
		t.Errorf("REG_MAP not cleared: %04X", got)
	}
}

// FuzzFrame: whatever is sent, the chip answers with a valid check sum, keeps
// to its write masks, and takes a good reset afterwards.
func FuzzFrame(f *testing.F) {
	f.Add([]byte{0x00, 0x11, 0x00})
	f.Add(append([]byte{0x61, 0x00, 0x00, 0x03, 0x10}, make([]byte, 40)...))
	f.Add([]byte{0xA0, 0x3F, 0, 0, 0, 0})
	f.Fuzz(func(t *testing.T, p []byte) {
		p = p[:min(len(p), 2048)]
		h := newHost(t, Options{})
		for len(p) > 0 {
			n := min(len(p), 1+int(p[0]))
			r := make([]byte, n)
			if err := h.conn.Tx(p[:n], r); err != nil {
				t.Fatal(err)
			}
			p = p[n:]
		}
		h.let(time.Millisecond)
		if c := h.c; c.regs[regID] != 0x2800 || c.regs[regClock]&0x20 != 0 || c.regs[regMode]&0xC0E0 != 0 {
			t.Fatalf("registers %04X", h.c.regs)
		}
		h.word, h.poly = h.c.regs.wordBytes(), 0x1021
		if h.c.regs[regMode]&modeCRCType != 0 {
			h.poly = 0x8005
		}
		if h.c.answer.n == 0 {
			h.frame(cmdUnlock)
		} else {
			h.send(frameWords, cmdUnlock)
		}
		if h.c.answer.n == 0 {
			h.frame(cmdReset)
		} else {
			h.send(frameWords, cmdReset)
		}
		h.let(time.Millisecond)
		h.word, h.poly = 3, 0x1021
		if got := h.at(h.frame(0), 0); got != 0xFF28 {
			t.Fatalf("reset answered %04X", got)
		}
	})
}
