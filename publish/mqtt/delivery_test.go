package mqtt

import (
	"testing"
	"time"
)

func TestBrokerLateAndRestarted(t *testing.T) {
	const n = 2000
	box, rec, addr := newBox(t), &recorder{}, freeAddr(t)
	p, stop := run(t, config("tcp://"+addr), box)
	until(t, "a failed attempt", func() bool { return p.Status().LastError != "" })
	store(t, box, n/2)
	for i := 1; i <= 3; i++ {
		b := startBroker(t, addr, rec)
		until(t, "some delivery", func() bool { return rec.has(i * n / 4) })
		b.Close()
		if i == 1 {
			store(t, box, n/2)
		}
	}
	startBroker(t, addr, rec)
	until(t, "an empty outbox", func() bool { return box.Waiting() == 0 })
	stop()
	t.Logf("%d repeats", rec.check(t, n, 16))
}

func TestConnectionCut(t *testing.T) {
	n := fewer(2000)
	box, rec := newBox(t), &recorder{}
	b := startBroker(t, "127.0.0.1:0", rec)
	px := newProxy(t, listen(t), b.Addr())
	_, stop := run(t, config(px.url()), box)
	go store(t, box, n)
	for i := 1; i <= 10; i++ {
		until(t, "some delivery", func() bool { return rec.has(i * n / 11) })
		px.cut()
	}
	until(t, "all delivered", func() bool { return rec.has(n) && box.Waiting() == 0 })
	stop()
	t.Logf("%d repeats", rec.check(t, n, 16))
}

func TestAcknowledgementsWithheld(t *testing.T) {
	const n = 200
	box, rec := newBox(t), &recorder{}
	b := startBroker(t, "127.0.0.1:0", rec)
	px := newProxy(t, listen(t), b.Addr())
	cfg := config(px.url())
	cfg.Patience = 300 * time.Millisecond
	p, stop := run(t, cfg, box)
	until(t, "a connection", func() bool { return p.Status().Connected })
	px.setMute(true)
	store(t, box, n)
	until(t, "a window of messages", func() bool { return rec.has(cfg.InFlight) })
	until(t, "the connection given up", func() bool { return !p.Status().Connected })
	if got := box.Waiting(); got != n {
		t.Errorf("%d messages wait though none was acknowledged, want %d", got, n)
	}
	px.setMute(false)
	until(t, "an empty outbox", func() bool { return box.Waiting() == 0 })
	stop()
	if repeats := rec.check(t, n, 16); repeats < 1 {
		t.Errorf("%d repeats: messages that were not acknowledged must come again", repeats)
	}
}

func TestSecondBrokerTakesOver(t *testing.T) {
	box, rec := newBox(t), &recorder{}
	b := startBroker(t, "127.0.0.1:0", rec)
	p, stop := run(t, config("tcp://"+freeAddr(t), b.URL()), box)
	store(t, box, 10)
	until(t, "all delivered", func() bool { return rec.has(10) && box.Waiting() == 0 })
	if s := p.Status(); !s.Connected || s.Broker != b.URL() || s.LastError != "" || s.Delivered != 10 || s.Connections != 1 {
		t.Errorf("status %+v", s)
	}
	stop()
	if s := p.Status(); s.Connected || s.Backlog != 0 {
		t.Errorf("status after the end %+v", s)
	}
	rec.check(t, 10, 1)
}

// What is stored just before the end still goes out.
func TestFarewellDelivers(t *testing.T) {
	box, rec := newBox(t), &recorder{}
	b := startBroker(t, "127.0.0.1:0", rec)
	p, stop := run(t, config(b.URL()), box)
	until(t, "a connection", func() bool { return p.Status().Connected })
	store(t, box, 100)
	stop()
	rec.check(t, 100, 1)
	if box.Waiting() != 0 {
		t.Errorf("%d messages left", box.Waiting())
	}
}
