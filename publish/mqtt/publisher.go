package mqtt

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"sync"
	"time"

	"heavyspot/publish/buffer"
)

// Outbox is where messages come from; *buffer.Buffer is one.
type Outbox interface {
	// Pending returns the first messages that wait with a sequence number above
	// after, n at most, in order.
	Pending(after uint64, n int) ([]buffer.Record, error)
	// Ack takes messages out for good.
	Ack(sequences ...uint64) error
	// Standing returns the retained messages that a broker should have and that
	// do not wait.
	Standing() ([]buffer.Record, error)
	// Waiting is the number of messages that wait.
	Waiting() int
	// Numbers returns the sequence number of the newest message and the number
	// of this start.
	Numbers() (sequence, boot uint64)
	// Changed receives a value after messages have been added.
	Changed() <-chan struct{}
}

var _ Outbox = (*buffer.Buffer)(nil)

// Publisher delivers an outbox to a broker.
type Publisher struct {
	cfg Config
	box Outbox

	mu     sync.Mutex
	status Status
}

// New returns a publisher; an error names what is wrong in cfg.
func New(cfg Config, box Outbox) (*Publisher, error) {
	if err := cfg.fill(); err != nil {
		return nil, fmt.Errorf("mqtt: cannot publish: %w", err)
	}
	p := &Publisher{cfg: cfg, box: box}
	p.status.Since = time.Now()
	return p, nil
}

// Run delivers until ctx ends; then it goes on for a short while with what
// waits, says that the machine is offline and returns nil. Brokers that do not
// answer and an outbox that cannot be read are no reason to return: Run tries
// again, and Status says what is wrong. It must be called once.
func (p *Publisher) Run(ctx context.Context) error {
	pause := p.cfg.MinBackoff
	for {
		began := time.Now()
		for _, broker := range p.cfg.Brokers {
			connected, err := p.session(ctx, broker)
			p.note(broker, err)
			if ctx.Err() != nil {
				return nil
			}
			if connected {
				break // the first broker has its turn again
			}
		}
		if time.Since(began) > 10*p.cfg.MinBackoff {
			pause = p.cfg.MinBackoff
		}
		if !sleep(ctx, jitter(pause)) {
			return nil
		}
		pause = min(2*pause, p.cfg.MaxBackoff)
	}
}

func (p *Publisher) note(broker string, err error) {
	p.setStatus(func(s *Status) {
		s.Connected, s.Broker = false, broker
		if err != nil {
			s.LastError = broker + ": " + words(err)
		}
	})
}

// jitter spreads the attempts of many machines that lost the same broker.
func jitter(d time.Duration) time.Duration {
	return d/2 + rand.N(d/2+1)
}

func sleep(ctx context.Context, d time.Duration) bool {
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-ctx.Done():
		return false
	case <-t.C:
		return true
	}
}

var (
	errNoAck  = errors.New("the broker is connected but does not acknowledge messages")
	errClosed = errors.New("the other side closed the connection")
)

func broken(err error) error { return fmt.Errorf("the connection broke: %w", err) }
