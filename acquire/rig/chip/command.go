package chip

// Command words and answers (table 8-11).
const (
	cmdNull    = 0x0000
	cmdReset   = 0x0011
	cmdStandby = 0x0022
	cmdWakeup  = 0x0033
	cmdLock    = 0x0555
	cmdUnlock  = 0x0655
	opWrite    = 0b011 << 13
	opRead     = 0b101 << 13
	opMask     = 0b111 << 13

	resetDone = 0xFF28
	wrote     = 0b010 << 13
	readMany  = 0b111 << 13
)

// obey carries out the command in the frame w and returns what the next frame
// answers.
func (c *Chip) obey(w []byte, word int, full bool) answer {
	if len(w) < word {
		return answer{status: true}
	}
	cmd := uint16(w[0])<<8 | uint16(w[1])
	checked := c.check(w, cmd, word)
	if cmd&opMask == opWrite {
		// Registers change while the bits arrive, whatever the check sum says
		// (section 8.5.1.10.8).
		a := c.write(w, cmd, word)
		if !checked {
			return answer{status: true}
		}
		return a
	}
	if !checked {
		return answer{status: true}
	}
	if cmd&opMask == opRead {
		return c.readAnswer(cmd)
	}
	return c.simple(cmd, full)
}

// simple carries out a command without an address.
func (c *Chip) simple(cmd uint16, full bool) answer {
	if c.locked && cmd != cmdUnlock {
		return answer{status: true}
	}
	switch cmd {
	case cmdReset:
		if full {
			c.reset()
			return answer{word: resetDone}
		}
	case cmdStandby:
		c.standby = true
		c.fifo.n = 0
	case cmdWakeup:
		if c.standby {
			c.standby = false
			c.restart()
		}
	case cmdLock:
		c.locked = true
	case cmdUnlock:
		c.locked = false
	default:
		return answer{status: true}
	}
	return answer{word: cmd}
}

// check compares the input's check sum where the chip has to.
func (c *Chip) check(w []byte, cmd uint16, word int) bool {
	if c.regs[regMode]&modeRxCRC == 0 {
		return true
	}
	n := 1 // words that the check sum covers
	if cmd&opMask == opWrite {
		n += int(cmd&0x7F) + 1
	}
	end := n * word
	if len(w) >= end+2 {
		if c.regs.crcOf().add(crcSeed, w[:end]...) == uint16(w[end])<<8|uint16(w[end+1]) {
			return true
		}
	}
	c.count.InputChecks++
	c.status |= statusCRCErr
	return false
}

// write stores the registers of a WREG as far as the frame holds data.
func (c *Chip) write(w []byte, cmd uint16, word int) answer {
	if c.locked {
		return answer{status: true}
	}
	first, n := int(cmd>>7&0x3F), int(cmd&0x7F)+1
	old := c.regs
	done := 0
	for i := range n {
		at := (1 + i) * word
		if first+i >= regCount || at+2 > len(w) {
			break
		}
		c.regs.write(first+i, uint16(w[at])<<8|uint16(w[at+1]))
		done++
	}
	c.changed(&old)
	if done == 0 {
		return answer{status: true}
	}
	return answer{word: wrote | uint16(first)<<7 | uint16(done-1)}
}

// changed does what new register values bring about.
func (c *Chip) changed(old *registers) {
	if c.regs.osr() != old.osr() {
		c.restart()
	}
	c.setNoise()
	if c.regs.enabled() == 0 {
		c.fifo.n = 0
	}
	if c.regs[regMode]&modeRegCRC != 0 {
		crc := c.regs.mapCRC(c.regs.crcOf())
		if crc != c.mapCRC {
			c.status |= statusRegMap
		}
		c.mapCRC = crc
	}
}

// readAnswer prepares the answer to RREG.
func (c *Chip) readAnswer(cmd uint16) answer {
	first, n := int(cmd>>7&0x3F), int(cmd&0x7F)+1
	n = min(n, regCount-first)
	if n == 1 {
		return answer{word: c.read(first)}
	}
	return answer{word: readMany | cmd&0x1FFF, first: first, n: n}
}
