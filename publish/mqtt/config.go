package mqtt

import (
	"crypto/tls"
	"crypto/x509"
	"errors"
	"fmt"
	"net"
	"net/url"
	"os"
	"strings"
	"time"

	"heavyspot/publish"
)

// Config says where messages go.
type Config struct {
	// Brokers are tried in turn: "tcp://host:port" or, with TLS, "ssl://host:port".
	Brokers []string
	// ClientID is the name given to the broker; no other client may have it.
	ClientID string
	// Root is the first level of every topic, Site and Machine the next two.
	Root, Site, Machine string
	// User signs on, with the first line of PasswordFile. Empty means none.
	User, PasswordFile string
	// CAFile holds the certificates (PEM) that the broker's is checked against;
	// empty means those of the system.
	CAFile string
	// CertFile and KeyFile are this client's certificate and key (PEM), both or
	// none.
	CertFile, KeyFile string
	// AllowPlainPassword permits a password over an unencrypted connection to
	// another host, where anybody on the network can read it.
	AllowPlainPassword bool
	// Keepalive is the time between signs of life; 0 means 30 s.
	Keepalive time.Duration
	// InFlight is how many messages may wait for the acknowledgement; 0 means 16.
	InFlight int
	// Patience is how long to wait for a connection, a write, an answer to a sign
	// of life or an acknowledgement before the connection is given up; 0 means
	// 15 s.
	Patience time.Duration
	// MinBackoff and MaxBackoff bound the pause before the next attempt, which
	// doubles from one failure to the next; 0 means 1 s and 1 min.
	MinBackoff, MaxBackoff time.Duration
	// Farewell is how long Run goes on delivering after its context has ended; 0
	// means 2 s.
	Farewell time.Duration
}

func (c *Config) fill() error {
	for _, d := range []struct {
		name         string
		value        *time.Duration
		unset, least time.Duration
	}{
		{"keepalive", &c.Keepalive, 30 * time.Second, time.Second},
		{"patience", &c.Patience, 15 * time.Second, time.Millisecond},
		{"shortest pause", &c.MinBackoff, time.Second, time.Millisecond},
		{"longest pause", &c.MaxBackoff, time.Minute, time.Millisecond},
		{"farewell", &c.Farewell, 2 * time.Second, time.Millisecond},
	} {
		if *d.value == 0 {
			*d.value = d.unset
		}
		if *d.value < d.least {
			return fmt.Errorf("%s %v: must be %v or more", d.name, *d.value, d.least)
		}
	}
	if c.InFlight == 0 {
		c.InFlight = 16
	}
	if c.InFlight < 1 || c.InFlight > 1000 {
		return fmt.Errorf("%d messages in flight: must be from 1 to 1000", c.InFlight)
	}
	if c.ClientID == "" {
		return errors.New("client id is empty")
	}
	if err := publish.CheckTopic(publish.Topic(c.Root, c.Site, c.Machine)); err != nil {
		return err
	}
	return c.checkBrokers()
}

func (c *Config) checkBrokers() error {
	if len(c.Brokers) == 0 {
		return errors.New("no broker")
	}
	if (c.CertFile == "") != (c.KeyFile == "") {
		return errors.New("certificate and key: both or none must be given")
	}
	if c.PasswordFile != "" && c.User == "" {
		return errors.New("a password without a user")
	}
	for _, b := range c.Brokers {
		u, err := url.Parse(b)
		if err != nil {
			return fmt.Errorf("broker %q: %v", b, err)
		}
		if u.Scheme != "tcp" && u.Scheme != "ssl" || u.Hostname() == "" || u.Port() == "" {
			return fmt.Errorf("broker %q: must be tcp://host:port or ssl://host:port", b)
		}
		if u.User != nil {
			return fmt.Errorf("broker at %s: user and password do not belong into the address", u.Host)
		}
		if c.PasswordFile != "" && u.Scheme == "tcp" && !c.AllowPlainPassword && !loopback(u.Hostname()) {
			return fmt.Errorf("broker %q: the password would cross the network in the clear: use ssl:// or allow it", b)
		}
	}
	return nil
}

// loopback reports whether a host is this one, whatever the name service says.
func loopback(host string) bool {
	ip := net.ParseIP(host)
	return host == "localhost" || ip != nil && ip.IsLoopback()
}

// password reads the first line of the password file.
func (c *Config) password() (string, error) {
	if c.PasswordFile == "" {
		return "", nil
	}
	b, err := os.ReadFile(c.PasswordFile)
	if err != nil {
		return "", fmt.Errorf("cannot read the password: %v", err)
	}
	line, _, _ := strings.Cut(string(b), "\n")
	return strings.TrimSuffix(line, "\r"), nil
}

// tls makes the settings of an encrypted connection; the files are read at each
// connection, so that renewed ones are taken up.
func (c *Config) tls() (*tls.Config, error) {
	t := &tls.Config{MinVersion: tls.VersionTLS12}
	if c.CAFile != "" {
		pem, err := os.ReadFile(c.CAFile)
		if err != nil {
			return nil, fmt.Errorf("cannot read the certificates to check the broker's against: %v", err)
		}
		t.RootCAs = x509.NewCertPool()
		if !t.RootCAs.AppendCertsFromPEM(pem) {
			return nil, fmt.Errorf("%s holds no certificate", c.CAFile)
		}
	}
	if c.CertFile != "" {
		cert, err := tls.LoadX509KeyPair(c.CertFile, c.KeyFile)
		if err != nil {
			return nil, fmt.Errorf("cannot read this client's certificate: %v", err)
		}
		t.Certificates = []tls.Certificate{cert}
	}
	return t, nil
}
