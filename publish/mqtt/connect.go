package mqtt

import (
	"context"
	"crypto/tls"
	"net"
	"net/url"
	"sync"
	"time"

	paho "github.com/eclipse/paho.mqtt.golang"

	"heavyspot/publish"
)

// connection is one connection to a broker.
type connection struct {
	client paho.Client
	lost   chan error

	mu   sync.Mutex
	conn net.Conn
}

// connect makes a connection; it ends early when ctx does.
func (p *Publisher) connect(ctx context.Context, broker string) (*connection, error) {
	c := &connection{lost: make(chan error, 1)}
	opt, err := p.options(ctx, broker, c)
	if err != nil {
		return nil, err
	}
	c.client = paho.NewClient(opt)
	token := c.client.Connect()
	select {
	case <-token.Done():
		if err := token.Error(); err != nil {
			c.drop()
			return nil, err
		}
	case <-ctx.Done():
		c.drop()
		<-token.Done()
		return nil, ctx.Err()
	}
	if !c.client.IsConnectionOpen() {
		c.drop()
		return nil, errClosed
	}
	return c, nil
}

func (p *Publisher) options(ctx context.Context, broker string, c *connection) (*paho.ClientOptions, error) {
	password, err := p.cfg.password()
	if err != nil {
		return nil, err
	}
	secure, err := p.cfg.tls()
	if err != nil {
		return nil, err
	}
	will, err := p.link(publish.Offline)
	if err != nil {
		return nil, err
	}
	opt := paho.NewClientOptions().
		AddBroker(broker).
		SetClientID(p.cfg.ClientID).
		SetProtocolVersion(4). // MQTT 3.1.1
		SetCleanSession(true).
		SetAutoReconnect(false).
		SetConnectRetry(false).
		SetOrderMatters(false).
		SetKeepAlive(p.cfg.Keepalive).
		SetPingTimeout(p.cfg.Patience).
		SetConnectTimeout(p.cfg.Patience).
		SetWriteTimeout(p.cfg.Patience).
		SetBinaryWill(p.topic(string(publish.KindLink)), will, 1, true).
		SetDefaultPublishHandler(func(paho.Client, paho.Message) {}).
		SetConnectionLostHandler(func(_ paho.Client, err error) {
			select {
			case c.lost <- err:
			default:
			}
		}).
		SetCustomOpenConnectionFn(func(u *url.URL, _ paho.ClientOptions) (net.Conn, error) {
			return c.dial(ctx, u, secure, p.cfg.Patience)
		})
	if p.cfg.User != "" {
		opt.SetUsername(p.cfg.User).SetPassword(password)
	}
	return opt, nil
}

// dial opens the connection itself, so that it can be cut and that no proxy of
// the environment gets between.
func (c *connection) dial(ctx context.Context, u *url.URL, secure *tls.Config, patience time.Duration) (net.Conn, error) {
	d := &net.Dialer{Timeout: patience, Control: userTimeout(patience)}
	var conn net.Conn
	var err error
	if u.Scheme == "ssl" {
		conn, err = (&tls.Dialer{NetDialer: d, Config: secure}).DialContext(ctx, "tcp", u.Host)
	} else {
		conn, err = d.DialContext(ctx, "tcp", u.Host)
	}
	if err != nil {
		return nil, err
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.conn = conn
	return conn, nil
}

// drop cuts the connection without a goodbye, so that the broker sends the last
// will.
func (c *connection) drop() {
	c.mu.Lock()
	if c.conn != nil {
		c.conn.Close()
	}
	c.mu.Unlock()
	c.client.Disconnect(250)
}

// publish hands a message to the client.
func (c *connection) publish(topic string, retained bool, payload []byte) paho.Token {
	return c.client.Publish(topic, 1, retained, payload)
}

// confirmed publishes and waits for the acknowledgement.
func (c *connection) confirmed(topic string, payload []byte, patience time.Duration) error {
	token := c.publish(topic, true, payload)
	timer := time.NewTimer(patience)
	defer timer.Stop()
	select {
	case <-token.Done():
		return token.Error()
	case err := <-c.lost:
		return broken(err)
	case <-timer.C:
		return errNoAck
	}
}

func (p *Publisher) topic(levels ...string) string {
	return publish.Topic(p.cfg.Root, p.cfg.Site, p.cfg.Machine, levels...)
}

// link makes a link message of this moment.
func (p *Publisher) link(s publish.LinkState) ([]byte, error) {
	m := publish.LinkMessage(s, time.Now())
	m.Site, m.Machine = p.cfg.Site, p.cfg.Machine
	m.Sequence, m.Boot = p.box.Numbers()
	return publish.Encode(m)
}
