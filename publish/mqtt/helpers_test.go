package mqtt

import (
	"cmp"
	"context"
	"fmt"
	"io"
	"net"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	paho "github.com/eclipse/paho.mqtt.golang"
	server "github.com/mochi-mqtt/server/v2"
	"github.com/mochi-mqtt/server/v2/packets"
	"go.uber.org/goleak"

	"heavyspot/dsp"
	"heavyspot/publish"
	"heavyspot/publish/buffer"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func config(brokers ...string) Config {
	return Config{
		Brokers: brokers, ClientID: "heavyspot-test", Root: "heavyspot", Site: "north-works", Machine: "kiln-fan-2",
		Patience: 2 * time.Second, MinBackoff: 5 * time.Millisecond, MaxBackoff: 50 * time.Millisecond,
		Farewell: time.Second,
	}
}

func newBox(t *testing.T) *buffer.Buffer {
	t.Helper()
	b, err := buffer.Open(filepath.Join(t.TempDir(), "box.db"), buffer.Options{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { b.Close() })
	return b
}

// store adds n minutes to the box, ten to a tick.
func store(t *testing.T, box *buffer.Buffer, n int) {
	t.Helper()
	for n > 0 {
		var k buffer.Tick
		for range min(n, 10) {
			k.Messages = append(k.Messages, publish.MinuteMessage(&dsp.Minute{
				Start: time.Date(2026, 3, 1, 6, 0, 0, 0, time.UTC), ClockSet: true, Seconds: 60, Coverage: 1,
				Speed: dsp.Speed{State: dsp.Stopped, Reference: dsp.ReferenceNone},
			}))
			n--
		}
		if err := box.Store(&k); err != nil {
			t.Error(err)
			return
		}
	}
}

// run runs a publisher until the returned function, or the test, ends.
func run(t *testing.T, cfg Config, box Outbox) (*Publisher, func()) {
	t.Helper()
	p, err := New(cfg, box)
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan error, 1)
	go func() { done <- p.Run(ctx) }()
	var once sync.Once
	stop := func() {
		once.Do(func() {
			cancel()
			if err := <-done; err != nil {
				t.Errorf("Run: %v", err)
			}
		})
	}
	t.Cleanup(stop)
	return p, stop
}

// fewer is n in the long run of the tests, and less in the usual one.
func fewer(n int) int {
	if os.Getenv("HEAVYSPOT_LONG") == "1" {
		return n
	}
	return n / 4
}

// until waits for something that must happen.
func until(t *testing.T, what string, ok func() bool) {
	t.Helper()
	for range 6000 {
		if ok() {
			return
		}
		time.Sleep(5 * time.Millisecond)
	}
	t.Fatalf("never happened: %s", what)
}

// recorder notes the sequence numbers of one kind of message in the order they
// arrive.
type recorder struct {
	server.HookBase
	kind    string // what it notes; empty means minutes
	mu      sync.Mutex
	numbers []uint64
}

func (r *recorder) ID() string { return "recorder" }

func (r *recorder) Provides(b byte) bool { return b == server.OnPublished }

func (r *recorder) OnPublished(_ *server.Client, pk packets.Packet) { r.take(pk.TopicName, pk.Payload) }

func (r *recorder) take(topic string, payload []byte) {
	if !strings.HasSuffix(topic, "/"+cmp.Or(r.kind, "minute")) {
		return
	}
	m, err := publish.Decode(payload)
	r.mu.Lock()
	defer r.mu.Unlock()
	if err != nil {
		r.numbers = append(r.numbers, 0)
		return
	}
	r.numbers = append(r.numbers, m.Head().Sequence)
}

func (r *recorder) has(n int) bool {
	r.mu.Lock()
	defer r.mu.Unlock()
	seen := map[uint64]bool{}
	for _, s := range r.numbers {
		seen[s] = true
	}
	return len(seen) >= n
}

// check fails unless 1..n arrived, each first time in order, and no repeat
// reaches back further than the window. It returns the number of repeats.
func (r *recorder) check(t *testing.T, n, window int) int {
	t.Helper()
	r.mu.Lock()
	defer r.mu.Unlock()
	highest, repeats := uint64(0), 0
	for i, s := range r.numbers {
		switch {
		case s == highest+1:
			highest = s
		case s > highest+1 || s == 0:
			t.Fatalf("arrival %d: number %d after %d: lost or out of order", i, s, highest)
		case highest-s >= uint64(window):
			t.Fatalf("arrival %d: number %d again after %d: further back than the window of %d", i, s, highest, window)
		default:
			repeats++
		}
	}
	if highest != uint64(n) {
		t.Fatalf("%d of %d arrived", highest, n)
	}
	return repeats
}

// startBroker starts an embedded broker that tells the recorder.
func startBroker(t *testing.T, listen string, r *recorder) *Broker {
	t.Helper()
	b, err := StartBroker(listen, nil)
	if err != nil {
		t.Fatal(err)
	}
	if r != nil {
		if err := b.server.AddHook(r, nil); err != nil {
			t.Fatal(err)
		}
	}
	t.Cleanup(func() { b.Close() })
	return b
}

// freeAddr returns an address that nothing listens on.
func freeAddr(t *testing.T) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	return l.Addr().String()
}

// proxy stands between a client and a broker. It can cut all connections, and
// swallow what the broker says.
type proxy struct {
	listener net.Listener
	to       string
	mu       sync.Mutex
	conns    []net.Conn
	mute     bool
	wg       sync.WaitGroup
}

func newProxy(t *testing.T, l net.Listener, to string) *proxy {
	t.Helper()
	p := &proxy{listener: l, to: to}
	p.wg.Go(p.accept)
	t.Cleanup(func() {
		l.Close()
		p.cut()
		p.wg.Wait()
	})
	return p
}

func listen(t *testing.T) net.Listener {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func (p *proxy) url() string { return "tcp://" + p.listener.Addr().String() }

func (p *proxy) accept() {
	for {
		a, err := p.listener.Accept()
		if err != nil {
			return
		}
		b, err := net.Dial("tcp", p.to)
		if err != nil {
			a.Close()
			continue
		}
		p.mu.Lock()
		p.conns = append(p.conns, a, b)
		p.mu.Unlock()
		p.wg.Go(func() { io.Copy(b, a); a.Close(); b.Close() })
		p.wg.Go(func() { io.Copy(quiet{p, a}, b); a.Close(); b.Close() })
	}
}

// quiet writes unless the proxy is mute.
type quiet struct {
	p *proxy
	w io.Writer
}

func (q quiet) Write(b []byte) (int, error) {
	q.p.mu.Lock()
	mute := q.p.mute
	q.p.mu.Unlock()
	if mute {
		return len(b), nil
	}
	return q.w.Write(b)
}

func (p *proxy) cut() {
	p.mu.Lock()
	defer p.mu.Unlock()
	for _, c := range p.conns {
		c.Close()
	}
	p.conns = nil
}

func (p *proxy) setMute(on bool) {
	p.mu.Lock()
	p.mute = on
	p.mu.Unlock()
}

// subscriber keeps the newest payload of each topic, and its retain flag.
type subscriber struct {
	mu     sync.Mutex
	newest map[string]string
}

func subscribe(t *testing.T, broker string) *subscriber {
	t.Helper()
	s := &subscriber{newest: map[string]string{}}
	c := paho.NewClient(paho.NewClientOptions().AddBroker(broker).
		SetClientID(fmt.Sprintf("screen-%d", time.Now().UnixNano())).SetAutoReconnect(false))
	if token := c.Connect(); !token.WaitTimeout(5*time.Second) || token.Error() != nil {
		t.Fatalf("subscriber: %v", token.Error())
	}
	t.Cleanup(func() { c.Disconnect(250) })
	token := c.Subscribe("heavyspot/#", 1, func(_ paho.Client, m paho.Message) {
		s.mu.Lock()
		defer s.mu.Unlock()
		s.newest[m.Topic()] = string(m.Payload())
	})
	if !token.WaitTimeout(5*time.Second) || token.Error() != nil {
		t.Fatalf("subscriber: %v", token.Error())
	}
	return s
}

func (s *subscriber) get(topic string) string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.newest[topic]
}
