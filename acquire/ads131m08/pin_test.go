package ads131m08_test

import (
	"errors"
	"testing"
	"time"

	"heavyspot/acquire/ads131m08"

	"periph.io/x/conn/v3/gpio"
)

// fakePin is an input whose edges come from a channel. As in the board's
// driver a time-out of 0 would wait for ever and a negative one not at all.
type fakePin struct {
	gpio.PinIO
	edges chan gpio.Level
	level gpio.Level
	fail  error
	pull  gpio.Pull
	edge  gpio.Edge
	waits []time.Duration
}

func newFakePin() *fakePin {
	return &fakePin{PinIO: gpio.INVALID, edges: make(chan gpio.Level, 16), level: gpio.High}
}

func (p *fakePin) In(pull gpio.Pull, edge gpio.Edge) error {
	p.pull, p.edge = pull, edge
	return p.fail
}
func (p *fakePin) Read() gpio.Level { return p.level }
func (p *fakePin) WaitForEdge(timeout time.Duration) bool {
	p.waits = append(p.waits, timeout)
	select {
	case p.level = <-p.edges:
		return true
	case <-time.After(timeout):
		return false
	}
}

func TestPinReady(t *testing.T) {
	pin := newFakePin()
	ready, err := ads131m08.NewPinReady(pin)
	if err != nil {
		t.Fatal(err)
	}
	if pin.pull != gpio.PullUp || pin.edge != gpio.FallingEdge {
		t.Errorf("pin set to %v, %v", pin.pull, pin.edge)
	}
	if _, ok, err := ready.Wait(time.Millisecond); ok || err != nil {
		t.Errorf("ready without an edge, %v", err)
	}
	pin.edges <- gpio.High // stale: the data have been read meanwhile
	pin.edges <- gpio.Low
	before := ready.Now()
	mono, ok, err := ready.Wait(time.Second)
	if !ok || err != nil || mono < before || mono > ready.Now() {
		t.Errorf("edge at %v, %v, %v; called at %v", mono, ok, err, before)
	}
	pin.edges <- gpio.High
	if _, ok, _ := ready.Wait(time.Millisecond); ok {
		t.Error("a stale edge counted")
	}
	for _, w := range pin.waits {
		if w < 20*time.Microsecond {
			t.Errorf("waited for %v", w)
		}
	}
}

func TestPinReadyRefused(t *testing.T) {
	pin := newFakePin()
	pin.fail = errors.New("busy")
	if _, err := ads131m08.NewPinReady(pin); !errors.Is(err, pin.fail) {
		t.Errorf("error %v", err)
	}
}
