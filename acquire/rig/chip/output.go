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

// queueLength is how many edges the host's queue holds; it drops the oldest.
const queueLength = 16

// line is the data-ready pin with the host's queue of edges.
type line struct {
	busy    bool // a frame is being clocked: no edge is given (8.5.1.5)
	skipped bool // pulse format: the last pulse was left out
	at      [queueLength]time.Duration
	n       int // edges in the queue, the oldest first
}

// fall adds an edge to the queue.
func (l *line) fall(at time.Duration) {
	if l.n == queueLength {
		copy(l.at[:], l.at[1:])
		l.n--
	}
	l.at[l.n] = at
	l.n++
}

// take returns the latest edge and empties the queue, or takes the oldest.
func (l *line) take(oldest bool) time.Duration {
	if !oldest {
		at := l.at[l.n-1]
		l.n = 0
		return at
	}
	at := l.at[0]
	copy(l.at[:], l.at[1:l.n])
	l.n--
	return at
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
	c.line.fall(at)
}
