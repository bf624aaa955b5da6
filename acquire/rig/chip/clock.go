package chip

import (
	"errors"
	"fmt"
	"math"
	"time"
)

const (
	paceGrain = 10 * time.Millisecond  // how far virtual time may run ahead
	paceLag   = 250 * time.Millisecond // how far behind before it is let go
	paceSlice = 20 * time.Millisecond  // longest sleep, so that a new speed acts soon
)

// clock is virtual time: nanoseconds of the host's monotonic clock, of which
// the chip's own clock is a given number of modulator periods per second.
type clock struct {
	now     time.Duration
	periods int64   // modulator periods done
	rate    float64 // modulator periods per second, its error included

	speed      float64
	anchorWall time.Time
	anchor     time.Duration
}

func (k *clock) set(speed float64) {
	k.speed, k.anchorWall, k.anchor = speed, time.Now(), k.now
}

// end returns the time at which n more modulator periods will be done.
func (k *clock) end(n int) time.Duration {
	return time.Duration(math.Round(float64(k.periods+int64(n)) / k.rate * 1e9))
}

// advance lets time pass until to.
func (c *Chip) advance(to time.Duration) {
	for {
		end := c.clock.end(c.conv.unit)
		if end > to {
			break
		}
		c.tick(end)
	}
	c.clock.now = max(c.clock.now, to)
}

// tick lets one unit of the filter pass, which ends at end.
func (c *Chip) tick(end time.Duration) {
	c.clock.now = max(c.clock.now, end)
	c.clock.periods += int64(c.conv.unit)
	c.upset(end)
	if c.unitStep() {
		c.converted(end)
	}
}

// Now returns the virtual time since power-on.
func (c *Chip) Now() time.Duration {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.clock.now
}

// Wall returns a wall clock which stood at start when the chip was switched
// on and runs with virtual time.
func (c *Chip) Wall(start time.Time) func() time.Time {
	return func() time.Time { return start.Add(c.Now()) }
}

// SetSpeed makes virtual time run at speed times the wall clock from now on:
// 1 is real time, 60 an hour in a minute, 0 as fast as the host asks. A host
// that cannot keep up slows virtual time down; it loses no samples by that.
func (c *Chip) SetSpeed(speed float64) error {
	if !(speed >= 0) || math.IsInf(speed, 1) {
		return fmt.Errorf("chip: cannot run at %g times real time, allowed 0 or more", speed)
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.clock.set(speed)
	return nil
}

// pace sleeps while virtual time is ahead of the wall clock.
func (c *Chip) pace() {
	for {
		d := c.ahead()
		if d < paceGrain {
			return
		}
		time.Sleep(min(d, paceSlice))
	}
}

// ahead returns by how much of wall time virtual time is ahead.
func (c *Chip) ahead() time.Duration {
	c.mu.Lock()
	defer c.mu.Unlock()
	k := &c.clock
	if k.speed == 0 || c.closed {
		return 0
	}
	d := time.Duration(float64(k.now-k.anchor)/k.speed) - time.Since(k.anchorWall)
	if d < -paceLag {
		k.set(k.speed)
	}
	return d
}

// DataReady is the chip's data-ready line as the host sees it.
type DataReady struct{ c *Chip }

// DataReady returns the data-ready line.
func (c *Chip) DataReady() *DataReady { return &DataReady{c} }

// Now returns the virtual time, the clock of the edges' times.
func (d *DataReady) Now() time.Duration { return d.c.Now() }

// Low returns whether the line is low: samples wait to be read.
func (d *DataReady) Low() bool {
	d.c.mu.Lock()
	defer d.c.mu.Unlock()
	return d.c.fifo.n > 0
}

var errClosed = errors.New("chip: cannot wait for data-ready: port closed")

// Wait lets virtual time pass until the line falls, at most for timeout, which
// must be positive. It returns at once when the line fell since the last Wait.
// mono is the virtual time of the edge, the latest one unless QueueEdges is
// set; ready is false when there was
// none. It fails once the port is closed.
func (d *DataReady) Wait(timeout time.Duration) (mono time.Duration, ready bool, err error) {
	if timeout <= 0 {
		return 0, false, fmt.Errorf("chip: cannot wait for data-ready for %v, must be positive", timeout)
	}
	c := d.c
	mono, ready, err = c.wait(timeout)
	c.pace()
	return mono, ready, err
}

func (c *Chip) wait(timeout time.Duration) (time.Duration, bool, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if c.closed {
		return 0, false, errClosed
	}
	deadline := c.clock.now + timeout
	for c.line.n == 0 && c.clock.now < deadline {
		end := min(c.clock.end(c.conv.unit), deadline)
		c.advance(end)
	}
	if c.line.n == 0 {
		return 0, false, nil
	}
	c.beLate()
	return c.line.take(c.opts.QueueEdges), true, nil
}
