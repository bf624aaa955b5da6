package chip

import "time"

// FaultKind is a kind of fault that can be brought about.
type FaultKind uint8

// The kinds of fault.
const (
	// HostLate makes the first wait that ends at or after From return
	// Periods conversion periods late, once.
	HostLate FaultKind = iota
	// SelfReset resets the chip at From, once, as a dip of the supply does.
	SelfReset
	// SelfSync starts the conversions anew at From, once, as a pulse on the
	// SYNC/RESET pin does.
	SelfSync
	// Corrupt flips one random bit of an answer with the probability
	// Probability, for frames in [From, To).
	Corrupt
	// StuckInput holds the host's input at Level in [From, To); the chip
	// still sees and obeys what is sent.
	StuckInput
	// StuckOutput holds the host's output at Level in [From, To): the chip
	// sees frames of that level and answers them.
	StuckOutput
	// CablePulled holds the host's input at Level in [From, To); the chip
	// sees nothing and no edge of data-ready reaches the host.
	CablePulled
	// TxError makes transactions in [From, To) fail with Err; nothing
	// reaches the chip.
	TxError
)

// Fault is a fault to bring about; times are virtual.
type Fault struct {
	Kind     FaultKind
	From, To time.Duration
	// Periods is how late the host is, in conversion periods.
	Periods float64
	// Probability is that of a corrupted frame, 0 to 1.
	Probability float64
	// Level is what each byte on a stuck line reads, 00h or FFh.
	Level byte
	// Err is what a failing transaction returns.
	Err error
}

// Inject adds a fault to those that will come about.
func (c *Chip) Inject(f Fault) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.faults = append(c.faults, f)
}

// active returns the fault of a kind that is present at time t, or nil.
func (c *Chip) active(kind FaultKind, t time.Duration) *Fault {
	for i := range c.faults {
		f := &c.faults[i]
		if f.Kind == kind && t >= f.From && t < f.To {
			return f
		}
	}
	return nil
}

// once takes a fault out of the list that happens one time, at From or after.
func (c *Chip) once(kind FaultKind, t time.Duration) (Fault, bool) {
	for i, f := range c.faults {
		if f.Kind == kind && t >= f.From {
			c.faults = append(c.faults[:i], c.faults[i+1:]...)
			return f, true
		}
	}
	return Fault{}, false
}

// upset does what the chip suffers at time t.
func (c *Chip) upset(t time.Duration) {
	if len(c.faults) == 0 {
		return
	}
	if _, due := c.once(SelfReset, t); due {
		c.reset()
	}
	if _, due := c.once(SelfSync, t); due {
		c.resync()
	}
}

// beLate lets the time of a late host pass.
func (c *Chip) beLate() {
	f, due := c.once(HostLate, c.clock.now)
	if !due {
		return
	}
	period := float64(c.conv.osr) / c.clock.rate * 1e9
	c.advance(c.clock.now + time.Duration(f.Periods*period+0.5))
}

// disturb changes the answer r of a frame that began at t.
func (c *Chip) disturb(r []byte, t time.Duration) {
	if f := c.active(Corrupt, t); f != nil && c.rnd.Float64() < f.Probability && len(r) > 0 {
		bit := c.rnd.IntN(8 * len(r))
		r[bit/8] ^= 1 << (bit % 8)
	}
	if f := c.active(StuckInput, t); f != nil {
		fill(r, f.Level)
	}
}

func fill(r []byte, level byte) {
	for i := range r {
		r[i] = level
	}
}
