package mqtt

import (
	"net"
	"testing"
	"time"

	"github.com/eclipse/paho.mqtt.golang/packets"
)

// sparing is a broker that acknowledges the online message and the first
// messages after it, and then only takes.
func sparing(t *testing.T, l net.Listener, acknowledged int) {
	conn, err := l.Accept()
	if err != nil {
		return
	}
	defer conn.Close()
	left := acknowledged + 1
	for {
		p, err := packets.ReadPacket(conn)
		if err != nil {
			return
		}
		switch p := p.(type) {
		case *packets.ConnectPacket:
			err = packets.NewControlPacket(packets.Connack).Write(conn)
		case *packets.PublishPacket:
			if p.Qos != 1 {
				t.Errorf("QoS %d", p.Qos)
			}
			if left--; left >= 0 {
				ack := packets.NewControlPacket(packets.Puback).(*packets.PubackPacket)
				ack.MessageID = p.MessageID
				err = ack.Write(conn)
			}
		}
		if err != nil {
			t.Error(err)
			return
		}
	}
}

// Only what was acknowledged leaves the outbox, although more was sent.
func TestSomeAcknowledged(t *testing.T) {
	const n, acknowledged = 100, 5
	box := newBox(t)
	store(t, box, n)
	l := listen(t)
	done := make(chan struct{})
	go func() { defer close(done); sparing(t, l, acknowledged) }()
	cfg := config("tcp://" + l.Addr().String())
	cfg.Patience, cfg.MinBackoff, cfg.MaxBackoff = 300*time.Millisecond, time.Minute, time.Minute
	p, stop := run(t, cfg, box)
	until(t, "the connection given up", func() bool { return p.Status().LastError != "" })
	stop()
	l.Close()
	<-done
	pending, err := box.Pending(0, n)
	if err != nil || len(pending) != n-acknowledged || pending[0].Sequence != acknowledged+1 || box.Waiting() != n-acknowledged {
		t.Errorf("%d pending, %d waiting, want %d: %v", len(pending), box.Waiting(), n-acknowledged, err)
	}
	if s := p.Status(); s.Delivered != acknowledged {
		t.Errorf("status %+v", s)
	}
}
