package chip

import (
	"errors"
	"fmt"
	"time"

	"periph.io/x/conn/v3"
	"periph.io/x/conn/v3/physic"
	"periph.io/x/conn/v3/spi"
)

// maxClock is the fastest SCLK at a supply of 2.7 to 3.6 V (section 6.6).
const maxClock = 25 * physic.MegaHertz

// maxTx is the longest transaction, as of a spidev with default settings.
const maxTx = 4096

var (
	_ spi.PortCloser = (*Chip)(nil)
	_ spi.Conn       = (*connection)(nil)
	_ conn.Limits    = (*connection)(nil)
)

// String returns the name of the port.
func (c *Chip) String() string { return "simulated ADS131M08" }

// Close closes the port; every later transaction and wait fails.
func (c *Chip) Close() error {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.closed = true
	return nil
}

// LimitSpeed sets the fastest clock of the port; it must be positive.
func (c *Chip) LimitSpeed(f physic.Frequency) error {
	if f <= 0 {
		return fmt.Errorf("chip: cannot limit the clock to %s, must be positive", f)
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.limit = f
	return nil
}

// Connect implements spi.Port. It can be called once and refuses what the chip
// cannot do: another mode than 1, other words than 8 bits, a clock over
// 25 MHz.
func (c *Chip) Connect(f physic.Frequency, mode spi.Mode, bits int) (spi.Conn, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	switch {
	case c.closed:
		return nil, errors.New("chip: cannot connect: port closed")
	case c.connected:
		return nil, errors.New("chip: Connect() can only be called exactly once")
	case mode != spi.Mode1:
		return nil, fmt.Errorf("chip: cannot connect in %s, the chip knows only Mode1", mode)
	case bits != 8:
		return nil, fmt.Errorf("chip: cannot connect with words of %d bits, allowed 8", bits)
	case f < 100*physic.Hertz || f > maxClock:
		return nil, fmt.Errorf("chip: cannot connect at %s, allowed 100Hz to %s", f, maxClock)
	}
	c.connected = true
	return &connection{c: c, rated: f}, nil
}

// connection is the port once it is configured.
type connection struct {
	c     *Chip
	rated physic.Frequency
	one   [1]spi.Packet
}

// String implements conn.Conn.
func (n *connection) String() string { return n.c.String() }

// Duplex implements conn.Conn.
func (n *connection) Duplex() conn.Duplex { return conn.Full }

// MaxTxSize implements conn.Limits.
func (n *connection) MaxTxSize() int { return maxTx }

// Tx implements conn.Conn: one transaction under one chip select.
func (n *connection) Tx(w, r []byte) error {
	n.one[0] = spi.Packet{W: w, R: r}
	return n.TxPackets(n.one[:])
}

// TxPackets implements spi.Conn. Packets that keep chip select are one
// transaction with those that follow.
func (n *connection) TxPackets(p []spi.Packet) error {
	if err := n.accept(p); err != nil {
		return err
	}
	n.c.mu.Lock()
	defer n.c.mu.Unlock()
	if n.c.closed {
		return errors.New("chip: cannot transfer: port closed")
	}
	for first := 0; first < len(p); {
		last := first
		for p[last].KeepCS && last < len(p)-1 {
			last++
		}
		if err := n.c.transact(p[first:last+1], min(n.rated, n.c.limit)); err != nil {
			return err
		}
		first = last + 1
	}
	return nil
}

// accept checks packets as the bus driver of a real board does.
func (n *connection) accept(p []spi.Packet) error {
	total := 0
	for _, k := range p {
		switch {
		case len(k.W) != 0 && len(k.R) != 0 && len(k.W) != len(k.R):
			return fmt.Errorf("chip: cannot transfer: %d bytes to write, %d to read", len(k.W), len(k.R))
		case k.BitsPerWord != 0 && k.BitsPerWord != 8:
			return fmt.Errorf("chip: cannot transfer words of %d bits, allowed 8", k.BitsPerWord)
		}
		total += max(len(k.W), len(k.R))
	}
	if total == 0 || total > maxTx {
		return fmt.Errorf("chip: cannot transfer %d bytes, allowed 1 to %d", total, maxTx)
	}
	if p[len(p)-1].KeepCS {
		return errors.New("chip: cannot keep chip select after the last packet")
	}
	return nil
}

// transact passes one chip-select period to the chip.
func (c *Chip) transact(p []spi.Packet, f physic.Frequency) error {
	w, r := c.join(p)
	began := c.clock.now
	took := time.Duration(float64(8*len(w)) / (float64(f) / float64(physic.Hertz)) * 1e9)
	if e := c.active(TxError, began); e != nil {
		c.advance(began + took)
		return e.Err
	}
	if e := c.active(CablePulled, began); e != nil {
		fill(r, e.Level)
		c.advance(began + took)
	} else {
		if e := c.active(StuckOutput, began); e != nil {
			fill(w, e.Level)
		}
		c.exchange(w, r, took)
		c.disturb(r, began)
	}
	at := 0
	for _, k := range p {
		copy(k.R, r[at:])
		at += max(len(k.W), len(k.R))
	}
	return nil
}

// join lays the packets end to end and returns room for the answer.
func (c *Chip) join(p []spi.Packet) (w, r []byte) {
	w = c.joined[0][:0]
	for _, k := range p {
		w = append(w, k.W...)
		for range max(0, len(k.R)-len(k.W)) {
			w = append(w, 0)
		}
	}
	r = append(c.joined[1][:0], w...)
	c.joined[0], c.joined[1] = w, r
	return w, r
}
