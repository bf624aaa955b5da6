package chip

import "time"

const (
	// frameWords is the length of a full frame: command or status, eight
	// channels, check sum (section 8.5.1.7).
	frameWords = channels + 2
	// maxWords is the longest frame with a meaning: a read or a write of
	// all registers.
	maxWords = regCount + 2

	powerOn    = 250 * time.Microsecond // until the interface listens (6.7)
	regAcquire = 5 * time.Microsecond   // t_REGACQ after a reset (6.7)

	timeoutClocks = 32768 // CLKIN periods of a frame (8.5.1.7)
)

// answer is what the next frame has in word 0, and behind it when a read of
// several registers was asked for.
type answer struct {
	status bool // STATUS instead of word
	word   uint16
	first  int // register of a read of several
	n      int // number of registers of that read, 0 for none
}

// exchange handles one chip-select period: w goes in, r comes out, and it
// takes as long as the bits take.
func (c *Chip) exchange(w, r []byte, bits time.Duration) {
	limit := time.Duration(timeoutClocks / c.opts.ClockHz * float64(time.Second))
	if c.regs[regMode]&modeTimeout == 0 || bits <= limit {
		c.frame(w, r, bits)
		return
	}
	// The interface restarts in mid-frame: what follows counts as another.
	n := int(float64(len(w)) * float64(limit) / float64(bits))
	c.frame(w[:n], r[:n], limit)
	c.exchange(w[n:], r[n:], bits-limit)
}

// frame handles one frame.
func (c *Chip) frame(w, r []byte, bits time.Duration) {
	if c.clock.now < c.busyUntil {
		clear(r)
		c.advance(c.clock.now + bits)
		return
	}
	c.count.Frames++
	word := c.regs.wordBytes()
	full := len(w) >= frameWords*word
	n := c.compose(word, full)
	m := copy(r, c.out[:n])
	clear(r[m:])

	c.line.busy = true
	c.advance(c.clock.now + bits)
	c.line.busy = false

	short := !full && c.regs.enabled() != 0 && !c.standby
	if short {
		c.count.Short++
		c.answer = answer{status: true}
		return
	}
	c.answer = c.obey(w, word, full)
}

// compose puts the output frame together in c.out and returns its length.
// full says whether the host clocks the whole of it, which takes the sample
// out of the output.
func (c *Chip) compose(word int, full bool) int {
	a := c.answer
	if a.n > 0 {
		c.put16(0, word, a.word)
		for i := range a.n {
			c.put16(1+i, word, c.read(a.first+i))
		}
		return c.seal(1+a.n, word)
	}
	if a.status {
		a.word = c.readStatus()
	}
	c.put16(0, word, a.word)
	s := c.fifo.front()
	for ch, code := range s {
		c.put24(1+ch, word, code)
	}
	if full {
		c.fifo.pop()
	}
	return c.seal(1+channels, word)
}

// put16 writes a register-sized value as word i, zeros behind it.
func (c *Chip) put16(i, word int, v uint16) {
	b := c.out[i*word : (i+1)*word]
	clear(b)
	b[0], b[1] = byte(v>>8), byte(v)
}

// put24 writes a conversion result as word i.
func (c *Chip) put24(i, word int, code int32) {
	b := c.out[i*word : (i+1)*word]
	if word == 4 && c.regs[regMode]>>8&3 == 3 {
		b[0], b[1], b[2], b[3] = byte(code>>24), byte(code>>16), byte(code>>8), byte(code)
		return
	}
	b[0], b[1] = byte(code>>16), byte(code>>8)
	if word > 2 {
		b[2] = byte(code)
	}
	if word > 3 {
		b[3] = 0
	}
}

// seal appends the check sum as word n and returns the length of the frame.
func (c *Chip) seal(n, word int) int {
	c.put16(n, word, c.regs.crcOf().add(crcSeed, c.out[:n*word]...))
	return (n + 1) * word
}

// readStatus returns STATUS and clears what reading it clears.
func (c *Chip) readStatus() uint16 {
	s := c.statusWord()
	c.status &^= statusResync | statusRegMap | statusCRCErr
	return s
}

// statusWord returns STATUS.
func (c *Chip) statusWord() uint16 {
	s := c.status | c.regs[regMode]&(modeCRCType|modeReset|3<<8)
	if c.locked {
		s |= statusLock
	}
	if c.fifo.n > 0 {
		s |= c.regs.enabled()
	}
	return s
}

// read returns register a.
func (c *Chip) read(a int) uint16 {
	switch {
	case a == regStatus:
		return c.readStatus()
	case a == regMapCRC && c.regs[regMode]&modeRegCRC != 0:
		return c.regs.mapCRC(c.regs.crcOf())
	case a >= regCount:
		return 0
	}
	return c.regs[a]
}
