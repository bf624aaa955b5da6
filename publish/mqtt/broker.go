package mqtt

import (
	"bytes"
	"fmt"
	"log/slog"
	"net"
	"sync"

	server "github.com/mochi-mqtt/server/v2"
	"github.com/mochi-mqtt/server/v2/listeners"
	"github.com/mochi-mqtt/server/v2/packets"
)

// Broker is an MQTT broker within the program, for machines that have none. It
// lets anybody in and therefore listens on this host only. It forgets retained
// messages when it ends; a Publisher sends them again when it connects.
type Broker struct {
	server *server.Server
	tcp    *listeners.TCP
	close  sync.Once
	err    error
}

// DefaultListen is where a broker listens unless told otherwise.
const DefaultListen = "127.0.0.1:1883"

// StartBroker starts a broker on a loopback address, "host:port"; empty means
// DefaultListen, port 0 any free one. log receives what the broker has to say;
// nil means nothing.
func StartBroker(listen string, log *slog.Logger) (*Broker, error) {
	if listen == "" {
		listen = DefaultListen
	}
	host, _, err := net.SplitHostPort(listen)
	if err != nil {
		return nil, fmt.Errorf("mqtt: cannot listen on %q: %v", listen, err)
	}
	if !loopback(host) {
		return nil, fmt.Errorf("mqtt: cannot listen on %q: the embedded broker lets anybody in; its address must be on this host, as 127.0.0.1", listen)
	}
	if log == nil {
		log = slog.New(slog.DiscardHandler)
	}
	b := &Broker{
		server: server.New(&server.Options{Logger: log, Capabilities: capabilities()}),
		tcp:    listeners.NewTCP(listeners.Config{ID: "loopback", Address: listen}),
	}
	if err := b.server.AddHook(new(anybody), nil); err != nil {
		return nil, fmt.Errorf("mqtt: cannot set up the broker: %v", err)
	}
	if err := b.server.AddListener(b.tcp); err != nil {
		return nil, fmt.Errorf("mqtt: cannot listen on %q: %v", listen, err)
	}
	if err := b.server.Serve(); err != nil {
		return nil, fmt.Errorf("mqtt: cannot start the broker: %v", err)
	}
	return b, nil
}

// capabilities bounds what clients can make the broker hold in memory.
func capabilities() *server.Capabilities {
	c := server.NewDefaultServerCapabilities()
	// The library would otherwise throw retained messages away after a day.
	c.MaximumMessageExpiryInterval = 0
	c.MaximumSessionExpiryInterval = 3600
	c.MaximumClients = 100
	c.MaximumInflight = 2048
	c.MaximumClientWritesPending = 2048
	c.MaximumPacketSize = 1 << 20
	return c
}

// Addr is the address that the broker listens on, "host:port".
func (b *Broker) Addr() string { return b.tcp.Address() }

// URL is the address as a Config takes it.
func (b *Broker) URL() string { return "tcp://" + b.Addr() }

// Close ends the broker and the connections to it.
func (b *Broker) Close() error {
	b.close.Do(func() { b.err = b.server.Close() })
	return b.err
}

// anybody is a hook of the broker that lets every client in.
type anybody struct{ server.HookBase }

func (*anybody) ID() string { return "anybody" }

func (*anybody) Provides(b byte) bool {
	return bytes.IndexByte([]byte{server.OnConnectAuthenticate, server.OnACLCheck}, b) >= 0
}

func (*anybody) OnConnectAuthenticate(*server.Client, packets.Packet) bool { return true }

func (*anybody) OnACLCheck(*server.Client, string, bool) bool { return true }
