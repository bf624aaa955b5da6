package mqtt

import (
	"crypto/tls"
	"crypto/x509"
	"errors"
	"fmt"
	"net"
	"os"
	"strings"
	"syscall"
	"time"
)

// Status is a snapshot of the link.
type Status struct {
	Connected bool
	// Broker is the address connected to, or tried last.
	Broker string
	// Since is when Connected became what it is.
	Since time.Time
	// LastError says in words why the last attempt failed or the connection
	// broke; empty once connected.
	LastError string
	// Backlog is the number of messages that wait for the broker.
	Backlog int
	// Delivered counts the messages acknowledged since the start.
	Delivered uint64
	// Connections counts the connections made since the start.
	Connections uint64
}

// Status returns a snapshot; it may be called at any time.
func (p *Publisher) Status() Status {
	p.mu.Lock()
	s := p.status
	p.mu.Unlock()
	s.Backlog = p.box.Waiting()
	return s
}

func (p *Publisher) setStatus(f func(*Status)) {
	p.mu.Lock()
	defer p.mu.Unlock()
	was := p.status.Connected
	f(&p.status)
	if p.status.Connected != was {
		p.status.Since = time.Now()
	}
}

// words says what an error of a connection means to the person who has to mend
// it.
func words(err error) string {
	var dns *net.DNSError
	var verify *tls.CertificateVerificationError
	var unknown x509.UnknownAuthorityError
	var name x509.HostnameError
	var invalid x509.CertificateInvalidError
	var record tls.RecordHeaderError
	switch {
	case err == nil:
		return ""
	case errors.As(err, &dns):
		return fmt.Sprintf("the name %q is not known to the name service", dns.Name)
	case errors.As(err, &unknown):
		return "the broker's certificate is signed by nobody known; give its authority's certificate as ca_file"
	case errors.As(err, &name):
		return "the broker's certificate is for another name: " + name.Error()
	case errors.As(err, &invalid) && invalid.Reason == x509.Expired:
		return "the broker's certificate is not valid at this time; has it expired, or is the clock of this machine wrong?"
	case errors.As(err, &verify):
		return "the broker's certificate is not accepted: " + verify.Err.Error()
	case errors.As(err, &record):
		return "the broker does not speak TLS on this port"
	case errors.Is(err, syscall.ECONNREFUSED):
		return "nothing listens there (connection refused)"
	case errors.Is(err, syscall.EHOSTUNREACH), errors.Is(err, syscall.ENETUNREACH):
		return "there is no way to it (network or host unreachable)"
	case errors.Is(err, os.ErrDeadlineExceeded), isTimeout(err):
		return "it does not answer"
	}
	return plainWords(err.Error())
}

// plainWords treats errors that the client library gives as text only.
func plainWords(s string) string {
	lower := strings.ToLower(s)
	for _, w := range []struct{ part, words string }{
		{"not authorized", "the broker refuses this user (not authorized)"},
		{"bad user name or password", "the broker refuses the user name or the password"},
		{"identifier rejected", "the broker refuses the client id"},
		{"server unavailable", "the broker says that it is not available"},
		{"connection refused", "nothing listens there (connection refused)"},
		{"i/o timeout", "it does not answer"},
		{"pingresp not received", "it no longer answers"},
		{"connection reset", "the other side closed the connection"},
		{"eof", "the other side closed the connection"},
	} {
		if strings.Contains(lower, w.part) {
			return w.words
		}
	}
	return s
}

func isTimeout(err error) bool {
	var n net.Error
	return errors.As(err, &n) && n.Timeout()
}
