package mqtt

import (
	"context"
	"errors"
	"time"

	paho "github.com/eclipse/paho.mqtt.golang"

	"heavyspot/publish"
	"heavyspot/publish/buffer"
)

// flight is a message that waits for its acknowledgement.
type flight struct {
	sequence uint64 // 0: not from the outbox
	token    paho.Token
	sent     time.Time
}

// session is the delivery over one connection.
type session struct {
	p      *Publisher
	c      *connection
	window []flight // in the order sent
	last   uint64   // sequence number of the last message sent from the outbox
	// dark is closed when delivery must end; nil until ctx has ended.
	dark <-chan time.Time
}

// linger is how long to wait for more acknowledgements before those that came
// are written down in one commit.
const linger = 50 * time.Millisecond

// session connects to a broker and delivers until the connection breaks or ctx
// ends. It reports whether it was connected.
func (p *Publisher) session(ctx context.Context, broker string) (bool, error) {
	c, err := p.connect(ctx, broker)
	if err != nil {
		return false, err
	}
	s := &session{p: p, c: c}
	if err := s.greet(ctx); err != nil {
		c.drop()
		return true, err
	}
	p.setStatus(func(s *Status) {
		s.Connected, s.Broker, s.LastError = true, broker, ""
		s.Connections++
	})
	if err := s.deliver(ctx); err != nil {
		c.drop()
		return true, err
	}
	s.leave()
	return true, nil
}

// greet tells that the machine is online and what stands.
func (s *session) greet(ctx context.Context) error {
	online, err := s.p.link(publish.Online)
	if err != nil {
		return err
	}
	if err := s.c.confirmed(s.p.topic(string(publish.KindLink)), online, s.p.cfg.Patience); err != nil {
		return err
	}
	standing, err := s.p.box.Standing()
	if err != nil {
		return err
	}
	// What already waits must not be overtaken by anything newer: a receiver
	// that drops lower numbers would miss it.
	first, err := s.p.box.Pending(0, 1)
	if err != nil {
		return err
	}
	for _, r := range standing {
		if len(first) > 0 && r.Sequence > first[0].Sequence {
			break
		}
		for len(s.window) >= s.p.cfg.InFlight {
			if err := s.wait(ctx); err != nil {
				return err
			}
		}
		s.send(r, 0)
	}
	return nil
}

func (s *session) send(r buffer.Record, sequence uint64) {
	s.window = append(s.window, flight{
		sequence: sequence,
		token:    s.c.publish(s.p.topic(r.Levels...), r.Retained, r.JSON),
		sent:     time.Now(),
	})
}

// deliver returns nil when ctx has ended and nothing waits, or the time for the
// farewell is over.
func (s *session) deliver(ctx context.Context) error {
	for {
		if err := s.fill(); err != nil {
			return err
		}
		if ctx.Err() != nil && len(s.window) == 0 {
			return nil
		}
		if err := s.wait(ctx); err != nil {
			if errors.Is(err, errDark) {
				return nil
			}
			return err
		}
	}
}

// errDark says that the time for the farewell is over.
var errDark = errors.New("time is over")

// fill sends as much as the window has room for.
func (s *session) fill() error {
	room := s.p.cfg.InFlight - len(s.window)
	if room <= 0 {
		return nil
	}
	records, err := s.p.box.Pending(s.last, room)
	if err != nil {
		return err
	}
	for _, r := range records {
		s.send(r, r.Sequence)
		s.last = r.Sequence
	}
	return nil
}

// wait waits for the oldest acknowledgement, for something new to send, or for
// the end.
func (s *session) wait(ctx context.Context) error {
	var acknowledged <-chan struct{}
	var late <-chan time.Time
	if len(s.window) > 0 {
		acknowledged = s.window[0].token.Done()
		timer := time.NewTimer(time.Until(s.window[0].sent.Add(s.p.cfg.Patience)))
		defer timer.Stop()
		late = timer.C
	}
	done := ctx.Done()
	if ctx.Err() != nil {
		done = nil
		if s.dark == nil {
			s.dark = time.After(s.p.cfg.Farewell)
		}
	}
	select {
	case <-acknowledged:
		return s.settle()
	case <-s.p.box.Changed():
		return nil
	case err := <-s.c.lost:
		return broken(err)
	case <-late:
		return errNoAck
	case <-done:
		return nil
	case <-s.dark:
		return errDark
	}
}

// settle takes the messages at the head of the window that are acknowledged out
// of the outbox, in one commit.
func (s *session) settle() error {
	timer := time.NewTimer(linger)
	defer timer.Stop()
	n := 0
	var failed error
	for over := false; n < len(s.window) && !over; {
		select {
		case <-s.window[n].token.Done():
			if failed = s.window[n].token.Error(); failed != nil {
				over = true
				break
			}
			n++
		case <-timer.C:
			over = true
		}
	}
	var gone []uint64
	for _, f := range s.window[:n] {
		if f.sequence != 0 {
			gone = append(gone, f.sequence)
		}
	}
	if err := s.p.box.Ack(gone...); err != nil {
		return err
	}
	s.p.setStatus(func(st *Status) { st.Delivered += uint64(len(gone)) })
	s.window = append(s.window[:0], s.window[n:]...)
	return failed
}

// leave tells that the machine is offline and ends the connection.
func (s *session) leave() {
	offline, err := s.p.link(publish.Offline)
	if err == nil {
		err = s.c.confirmed(s.p.topic(string(publish.KindLink)), offline, s.p.cfg.Farewell)
	}
	if err != nil {
		s.c.drop() // the last will says it
		return
	}
	s.c.client.Disconnect(250)
}
