package ads131m08

import (
	"fmt"
	"time"

	"periph.io/x/conn/v3/gpio"
)

// PinReady is a DataReady on a GPIO pin. A pin tells that an edge came, not
// when: the time is when the process woke up. Where the system gives time
// stamps with line events, a DataReady that uses them is better.
type PinReady struct {
	pin   gpio.PinIn
	start time.Time
}

var _ DataReady = (*PinReady)(nil)

// shortestWait is the least time-out handed to a pin: some drivers take 0 for
// ever and miss queued edges below some tens of microseconds.
const shortestWait = 50 * time.Microsecond

// NewPinReady makes pin an input for falling edges, with a pull-up so that a
// line left open does not read as data-ready.
func NewPinReady(pin gpio.PinIn) (*PinReady, error) {
	if err := pin.In(gpio.PullUp, gpio.FallingEdge); err != nil {
		return nil, fmt.Errorf("ads131m08: cannot use pin %s for data-ready: %w; look whether another program holds it", pin, err)
	}
	return &PinReady{pin: pin, start: time.Now()}, nil
}

// Now implements DataReady: the time since NewPinReady.
func (p *PinReady) Now() time.Duration { return time.Since(p.start) }

// Wait implements DataReady. An edge that is still queued although its data
// have been read leaves the line high; it does not count.
func (p *PinReady) Wait(timeout time.Duration) (mono time.Duration, ready bool, err error) {
	end := p.Now() + timeout
	for left := timeout; left > 0; left = end - p.Now() {
		if !p.pin.WaitForEdge(max(left, shortestWait)) {
			// A pin that fails returns at once: it must not make its caller spin.
			time.Sleep(end - p.Now())
			return 0, false, nil
		}
		if p.pin.Read() == gpio.Low {
			return p.Now(), true, nil
		}
	}
	return 0, false, nil
}
