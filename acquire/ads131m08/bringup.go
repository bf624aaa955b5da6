package ads131m08

import (
	"errors"
	"fmt"
	"time"
)

const (
	powerOnTime = time.Millisecond       // 250 us until the interface listens (6.7)
	resetTime   = 100 * time.Microsecond // 5 us after a reset (6.7)
)

// setting is a register of the bring-up with its value.
type setting struct {
	name  string
	reg   int
	value uint16
}

// settings returns what is written while the channels are off, in order.
func (c *Config) settings() []setting {
	s := []setting{
		{"CLOCK", regClock, c.clockReg(false)},
		{"GAIN1", regGain1, c.gainReg(0)},
		{"GAIN2", regGain2, c.gainReg(4)},
		{"CFG", regCfg, cfgReset},
		{"THRSHLD_LSB", regThresholdLo, 0},
	}
	for ch := range c.Channels {
		s = append(s, setting{fmt.Sprintf("CH%d_CFG", ch), regChannel + perChannel*ch, 0})
	}
	return append(s, setting{"MODE", regMode, c.modeReg()})
}

// bringUp resets the chip and sets it up, in the order that section 8 of the
// data sheet suggests; conversions run afterwards.
func (s *Source) bringUp() error {
	s.pause(powerOnTime)
	if err := s.resetChip(); err != nil {
		return fmt.Errorf("cannot reset the converter: %w", err)
	}
	s.outset.moved = true
	id, err := s.bus.read(regID)
	if err != nil {
		return fmt.Errorf("cannot read ID: %w", err)
	}
	if id&idMask != idM08 {
		return fmt.Errorf("cannot use the converter: ID %04Xh, expected 28xxh: another part is fitted, or %s", id, adviceIn)
	}
	for _, w := range s.cfg.settings() {
		if err := s.set(w); err != nil {
			return err
		}
	}
	if err := s.set(setting{"CLOCK", regClock, s.cfg.clockReg(true)}); err != nil {
		return err
	}
	return s.checkStatus()
}

// resetChip unlocks and resets, whatever state an earlier program has left.
// The answers to these two frames are not looked at, for the same reason.
func (s *Source) resetChip() error {
	for _, cmd := range [...]uint16{cmdUnlock, cmdReset} {
		s.bus.fill(cmd)
		if err := s.bus.conn.Tx(s.bus.w[:], s.bus.r[:]); err != nil {
			return transferError(err)
		}
	}
	s.pause(resetTime)
	got, err := s.bus.answer()
	if err != nil {
		return err
	}
	if got != ackReset {
		return fmt.Errorf("answer %04Xh, expected %04Xh: %s", got, ackReset, adviceReset)
	}
	return nil
}

// set writes a register and reads it back.
func (s *Source) set(w setting) error {
	if err := s.bus.write(w.reg, w.value); err != nil {
		return fmt.Errorf("cannot write %s = %04Xh: %w", w.name, w.value, err)
	}
	return s.compare(w)
}

// compare reads a register back.
func (s *Source) compare(w setting) error {
	got, err := s.bus.read(w.reg)
	if err != nil {
		return fmt.Errorf("cannot read %s back: %w", w.name, err)
	}
	if got != w.value {
		return fmt.Errorf("cannot set %s: reads %04Xh, written %04Xh: %s", w.name, got, w.value, adviceOut)
	}
	return nil
}

// errUnset means that the chip answers but has not the configuration given.
var errUnset = errors.New("converter has lost its configuration")

// verify reads every register back that the bring-up has written.
func (s *Source) verify() error {
	for _, w := range s.cfg.settings() {
		if w.reg == regClock {
			w.value = s.cfg.clockReg(true)
		}
		got, err := s.bus.read(w.reg)
		if err != nil {
			return err
		}
		if got != w.value {
			return fmt.Errorf("%w: %s reads %04Xh, expected %04Xh: %s", errUnset, w.name, got, w.value, adviceSupply)
		}
	}
	return nil
}

// checkStatus looks at STATUS after the set-up. Reading it clears F_RESYNC,
// which the start of the conversions may have set, so it is read twice.
func (s *Source) checkStatus() error {
	for try := 0; ; try++ {
		got, err := s.bus.answer()
		if err != nil {
			return fmt.Errorf("cannot read STATUS: %w", err)
		}
		st := Status(got)
		if st.Configured() && st&StatusCRCErr == 0 {
			return nil
		}
		if try == 1 {
			return fmt.Errorf("cannot set up the converter: STATUS %04Xh, expected 01xxh: %s", got, adviceSupply)
		}
	}
}
