package chip

import "time"

// sample holds the codes of one conversion of all channels.
type sample [channels]int32

// fifo is the two samples deep output (section 8.5.1.9.1).
type fifo struct {
	s [2]sample
	n int
}

// front returns the sample that goes out next, zeros when there is none.
func (f *fifo) front() sample {
	if f.n == 0 {
		return sample{}
	}
	return f.s[0]
}

// pop takes the sample that went out.
func (f *fifo) pop() {
	if f.n > 0 {
		f.s[0] = f.s[1]
		f.n--
	}
}

// push adds a sample and says whether one was lost for want of room.
func (f *fifo) push(s sample, keepOldest bool) bool {
	if f.n < 2 {
		f.s[f.n] = s
		f.n++
		return false
	}
	if !keepOldest {
		f.s[0], f.s[1] = f.s[1], s
	}
	return true
}

// line is the data-ready pin.
type line struct {
	busy    bool // a frame is being clocked: no edge is given (8.5.1.5)
	pending bool // an edge the host has not yet seen
	at      time.Duration
	skipped bool // pulse format: the last pulse was left out
}

// converted puts a finished conversion into the output and moves the line.
func (c *Chip) converted(at time.Duration) {
	c.count.Conversions++
	unread := c.fifo.n > 0
	if c.regs[regMode]&modePulse != 0 {
		// Pulse format: an unread conversion makes the chip skip one result
		// and its pulse (section 8.5.1.5).
		if unread && !c.line.skipped {
			c.line.skipped = true
			c.count.Overwritten++
			return
		}
		c.line.skipped = false
	}
	if c.fifo.push(c.convert(), c.opts.KeepOldest) {
		c.count.Overwritten++
	}
	if c.line.busy || c.active(CablePulled, at) != nil {
		return
	}
	c.line.pending, c.line.at = true, at
}
