package ads131m08_test

import (
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	"heavyspot/acquire/ads131m08"
	"heavyspot/acquire/rig/chip"

	"periph.io/x/conn/v3/physic"
	"periph.io/x/conn/v3/spi"
)

// tapped is a port whose transactions can be counted and spoilt.
type tapped struct {
	spi.Port
	spi.Conn
	n     int
	spoil func(n int, w, r []byte) error // after the transfer
}

func (p *tapped) String() string { return p.Port.String() }

func (p *tapped) Connect(f physic.Frequency, mode spi.Mode, bits int) (spi.Conn, error) {
	c, err := p.Port.Connect(f, mode, bits)
	p.Conn = c
	return p, err
}

func (p *tapped) Tx(w, r []byte) error {
	p.n++
	if err := p.Conn.Tx(w, r); err != nil {
		return err
	}
	return p.spoil(p.n, w, r)
}

// openSpoilt opens a chip through a port that spoils transactions.
func openSpoilt(t *testing.T, spoil func(n int, w, r []byte) error) error {
	t.Helper()
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000}})
	s, err := ads131m08.Open(&tapped{Port: c, spoil: spoil}, c.DataReady(), ads131m08.Default())
	if err == nil {
		s.Close()
	}
	return err
}

// transactions are those of the bring-up with what fails when one does. Each
// register takes a write, its answer, a read and its answer.
func transactions() []string {
	names := []string{"reset the converter", "reset the converter", "reset the converter", "read ID", "read ID"}
	regs := []string{"CLOCK", "GAIN1", "GAIN2", "CFG", "THRSHLD_LSB"}
	for ch := range 8 {
		regs = append(regs, fmt.Sprintf("CH%d_CFG", ch))
	}
	for _, r := range append(regs, "MODE", "CLOCK") {
		names = append(names, "write "+r, "write "+r, "read "+r+" back", "read "+r+" back")
	}
	return append(names, "read STATUS", "read samples", "read samples", "read samples", "read samples")
}

// TestEachTransactionFails fails the transactions of the bring-up one by one.
func TestEachTransactionFails(t *testing.T) {
	boom := errors.New("boom")
	for i, name := range transactions() {
		t.Run(fmt.Sprintf("%d %s", i+1, name), func(t *testing.T) {
			err := openSpoilt(t, func(n int, _, _ []byte) error {
				if n == i+1 {
					return boom
				}
				return nil
			})
			if !errors.Is(err, boom) {
				t.Fatalf("error %v does not wrap the port's", err)
			}
			for _, part := range []string{"ads131m08: cannot " + name, "look at the SPI port"} {
				if !strings.Contains(err.Error(), part) {
					t.Errorf("error %q without %q", err, part)
				}
			}
		})
	}
}

// TestEachAnswerSpoilt flips a bit of one answer after another. The answers
// to the first two frames are not looked at, those to the first frame of a
// command neither: the command's own answer comes later.
func TestEachAnswerSpoilt(t *testing.T) {
	for i, name := range transactions() {
		looked := false
		err := openSpoilt(t, func(n int, w, r []byte) error {
			if n == i+1 {
				r[4] ^= 1
				looked = w[0] == 0 && w[1] == 0
			}
			return nil
		})
		// A few bad samples are put up with while the rate is measured.
		if !looked || name == "read samples" {
			if err != nil {
				t.Errorf("transaction %d, %s: %v", i+1, name, err)
			}
			continue
		}
		if err == nil || !strings.Contains(err.Error(), "cannot "+name+": ") && !strings.Contains(err.Error(), "cannot "+name+" = ") ||
			!errors.Is(err, ads131m08.ErrCheck) || !strings.Contains(err.Error(), "SPI mode (1)") {
			t.Errorf("transaction %d, %s: error %v", i+1, name, err)
		}
	}
}

// answerWith replaces word 0 of answer n and mends the check sum.
func answerWith(n int, word uint16) func(int, []byte, []byte) error {
	return func(k int, _, r []byte) error {
		if k == n {
			r[0], r[1] = byte(word>>8), byte(word)
			crc := uint16(0xFFFF)
			for _, b := range r[:27] {
				for bit := 7; bit >= 0; bit-- {
					top := crc>>15 ^ uint16(b)>>bit&1
					crc <<= 1
					if top != 0 {
						crc ^= 0x1021
					}
				}
			}
			r[27], r[28] = byte(crc>>8), byte(crc)
		}
		return nil
	}
}

func TestWrongAnswers(t *testing.T) {
	for _, v := range []struct {
		n     int
		word  uint16
		parts string
	}{
		{3, 0x0011, "cannot reset the converter: answer 0011h, expected FF28h; MOSI"},
		{3, 0x0500, "answer 0500h; switch its power off"},
		{5, 0x2400, "ID 2400h, expected 28xxh; another part"},
		{7, 0x0500, "cannot write CLOCK = 0096h: answer 0500h, expected 4180h; MOSI"},
		{9, 0xFF0E, "cannot set CLOCK: reads FF0Eh, written 0096h"},
		{66, 0x0500, "STATUS"},
		{67, 0x0500, "converter has lost its configuration; supply"},
	} {
		err := openSpoilt(t, answerWith(v.n, v.word))
		if v.n == 66 {
			// The first STATUS after the start may still carry old flags.
			if err != nil {
				t.Errorf("answer %d: %v", v.n, err)
			}
			continue
		}
		if err == nil {
			t.Errorf("answer %d = %04X accepted", v.n, v.word)
			continue
		}
		for part := range strings.SplitSeq(v.parts, "; ") {
			if !strings.Contains(err.Error(), part) {
				t.Errorf("answer %d = %04X: error %q without %q", v.n, v.word, err, part)
			}
		}
	}
	twice := func(n int, w, r []byte) error {
		answerWith(66, 0x0500)(n, w, r)
		return answerWith(67, 0x1100)(n, w, r)
	}
	if err := openSpoilt(t, twice); err == nil || !strings.Contains(err.Error(), "cannot set up the converter: STATUS 1100h") {
		t.Errorf("STATUS wrong twice: %v", err)
	}
}

// TestOpenFails: what is wired wrongly is told.
func TestOpenFails(t *testing.T) {
	hour := time.Hour
	for _, v := range []struct {
		name   string
		change func(*chip.Options, *ads131m08.Config)
		faults []chip.Fault
		parts  []string
	}{
		{"MISO at ground", nil, []chip.Fault{{Kind: chip.StuckInput, To: hour, Level: 0}},
			[]string{"all bits read 0", "MISO", "supply"}},
		{"MISO open", nil, []chip.Fault{{Kind: chip.StuckInput, To: hour, Level: 0xFF}},
			[]string{"all bits read 1", "MISO", "power"}},
		{"bad wires", nil, []chip.Fault{{Kind: chip.Corrupt, To: hour, Probability: 1}},
			[]string{"check sum wrong", "SPI clock", "ground"}},
		{"MOSI at ground", nil, []chip.Fault{{Kind: chip.StuckOutput, To: hour, Level: 0}},
			[]string{"cannot reset", "MOSI"}},
		{"MOSI open", nil, []chip.Fault{{Kind: chip.StuckOutput, To: hour, Level: 0xFF}},
			[]string{"cannot reset", "MOSI"}},
		{"data-ready open", nil, nil, []string{"no data-ready edge within", "data-ready wire", "clock"}},
		{"wrong clock", func(o *chip.Options, _ *ads131m08.Config) { o.ClockErrorPPM = -20_000 }, nil,
			[]string{"data-ready comes 980.0 times a second, expected 1000", "clock_hz"}},
		{"resets again and again", nil, []chip.Fault{{Kind: chip.SelfReset, From: 10 * ms}},
			[]string{"converter has lost its configuration", "supply"}},
		{"bad config", func(_ *chip.Options, c *ads131m08.Config) { c.Channels = 0 }, nil, []string{"channels = 0"}},
	} {
		t.Run(v.name, func(t *testing.T) {
			o := chip.Options{Signal: &ramp{step: 8000}}
			cfg := ads131m08.Default()
			if v.change != nil {
				v.change(&o, &cfg)
			}
			c := newChip(t, o)
			for _, f := range v.faults {
				c.Inject(f)
			}
			var ready ads131m08.DataReady = c.DataReady()
			if v.name == "data-ready open" {
				ready = deadLine{ready}
			}
			s, err := ads131m08.Open(c, ready, cfg)
			if err == nil {
				s.Close()
				t.Fatal("opened")
			}
			for _, part := range append(v.parts, "ads131m08: ") {
				if !strings.Contains(err.Error(), part) {
					t.Errorf("error %q without %q", err, part)
				}
			}
		})
	}
}

// deadLine is a data-ready line without edges.
type deadLine struct{ ads131m08.DataReady }

func (d deadLine) Wait(timeout time.Duration) (time.Duration, bool, error) {
	end := d.Now() + timeout
	for d.Now() < end {
		if _, _, err := d.DataReady.Wait(end - d.Now()); err != nil {
			return 0, false, err
		}
	}
	return 0, false, nil
}

func TestOpenTwice(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000}})
	open(t, c, ads131m08.Default())
	if _, err := ads131m08.Open(c, c.DataReady(), ads131m08.Default()); err == nil || !strings.Contains(err.Error(), "cannot connect") {
		t.Errorf("second Open: %v", err)
	}
}

// TestOpenAfterAnotherProgram: whatever state an earlier run has left, locked
// and checking its input, the bring-up gets through.
func TestOpenAfterAnotherProgram(t *testing.T) {
	c := newChip(t, chip.Options{Signal: &ramp{step: 8000}})
	p := &tapped{Port: c, spoil: func(int, []byte, []byte) error { return nil }}
	if _, err := p.Connect(8*physic.MegaHertz, spi.Mode1, 8); err != nil {
		t.Fatal(err)
	}
	c.DataReady().Wait(5 * ms)
	mode := make([]byte, 30)
	copy(mode, []byte{0x61, 0, 0, 0x11, 0x10, 0, 0x63, 0x88}) // input check on
	lock := make([]byte, 30)
	copy(lock, []byte{0x05, 0x55, 0, 0xD6, 0x26})
	for _, w := range [][]byte{mode, lock} {
		if err := p.Tx(w, make([]byte, 30)); err != nil {
			t.Fatal(err)
		}
	}
	s, err := ads131m08.Open(connected{p}, c.DataReady(), ads131m08.Default())
	if err != nil {
		t.Fatal(err)
	}
	s.Close()
}

// connected hands out a connection made before.
type connected struct{ *tapped }

func (c connected) Connect(physic.Frequency, spi.Mode, int) (spi.Conn, error) { return c.tapped, nil }
