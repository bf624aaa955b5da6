package config

import (
	"fmt"
	"net"
	"net/netip"
	"net/url"
	"regexp"
	"strconv"
	"strings"
)

var (
	// rootForm forbids wildcards, $ and empty levels, which brokers treat
	// specially (MQTT 3.1.1, 4.7).
	rootForm = form{
		regexp.MustCompile(`^[^+#$/\x00-\x20\x7f]{1,63}(/[^+#$/\x00-\x20\x7f]{1,63}){0,3}$`),
		"1 to 4 levels of 1 to 63 characters with / between them, without + # $ or spaces",
	}
	clientForm = form{regexp.MustCompile(`^[0-9A-Za-z_.-]{1,128}$`), "letters, digits, _ . and -, from 1 to 128 characters"}
	listenForm = form{regexp.MustCompile(`^.{1,128}$`), "an address"}
	userForm   = form{regexp.MustCompile(`^[^\x00-\x1f\x7f]{1,256}$`), "a name of 1 to 256 characters"}
)

// mostBrokers bounds the list, so that one round of trying them stays short.
const mostBrokers = 8

const brokerWords = `like "tcp://127.0.0.1:1883" or "ssl://broker.example:8883", without a path`

func (c *checker) validateMQTT(cfg *Config) {
	s, m := c.section("mqtt"), &cfg.MQTT
	s.text("embedded_listen", optional, m.EmbeddedListen, listenForm)
	s.text("root", optional, m.Root, rootForm)
	s.text("client_id", optional, m.ClientID, clientForm)
	s.text("user", optional, m.User, userForm)
	s.text("password_file", optional, m.PasswordFile, pathForm)
	s.text("ca_file", optional, m.CAFile, pathForm)
	s.text("cert_file", optional, m.CertFile, pathForm)
	s.text("key_file", optional, m.KeyFile, pathForm)
	s.flag("allow_plain_password")
	s.whole("keepalive_s", optional, m.KeepaliveS, span{5, 3600, "seconds"})
	s.whole("in_flight", optional, m.InFlight, span{1, 64, "messages"})
	s.validateListen(m)
	if s.validateBrokers(m.Brokers) {
		s.validateSignOn(m)
	}
}

// validateListen keeps the embedded broker, which asks for no password, off the
// network.
func (s section) validateListen(m *MQTT) {
	if !s.sound("embedded_listen") {
		return
	}
	if len(m.Brokers) > 0 {
		s.failAt("embedded_listen", "belongs to the embedded broker, leave it out beside brokers")
		return
	}
	host, port, err := net.SplitHostPort(m.EmbeddedListen)
	if err != nil || !isPort(port, 0) || !isLoopback(host) {
		s.failAt("embedded_listen", `must be a loopback address like "127.0.0.1:1883" (the embedded broker asks for no password)`)
	}
}

// validateBrokers checks the addresses and says whether they are right.
func (s section) validateBrokers(brokers []string) bool {
	if kind := s.wrong[s.of("brokers")]; kind != "" {
		s.failAt("brokers", "must be a list of addresses "+brokerWords+", not "+kind)
		return false
	}
	if len(brokers) > mostBrokers {
		s.failAt("brokers", fmt.Sprintf("must be a list of at most %d addresses", mostBrokers))
		return false
	}
	right := true
	for i, b := range brokers {
		key := "brokers" + index(i)
		switch kind := s.wrong[s.of(key)]; {
		case kind != "":
			s.failAt(key, "must be an address "+brokerWords+", not "+kind)
		case strings.Contains(b, "@"):
			s.failAt(key, "must not hold a user or password; use user and password_file")
		case !isBroker(b):
			s.failAt(key, "must be an address "+brokerWords)
		default:
			continue
		}
		right = false
	}
	return right
}

// validateSignOn checks that what is needed to sign on at a broker is complete
// and that a password does not cross the network in the clear.
func (s section) validateSignOn(m *MQTT) {
	signOn := []string{"user", "password_file", "ca_file", "cert_file", "key_file"}
	if len(m.Brokers) == 0 {
		s.foreign("a broker in brokers", signOn...)
		return
	}
	if s.sound("password_file") && !s.has("user") {
		s.failAt("password_file", "must stand beside user")
	}
	if s.has("cert_file") != s.has("key_file") {
		key, other := "cert_file", "key_file"
		if s.has("key_file") {
			key, other = other, key
		}
		s.failAt(key, "must stand beside "+other)
	}
	encrypted := false
	for i, b := range m.Brokers {
		u, _ := url.Parse(b)
		if u.Scheme == "ssl" {
			encrypted = true
		} else if m.PasswordFile != "" && !m.AllowPlainPassword && !isLoopback(u.Hostname()) {
			s.failAt("brokers"+index(i), "must be ssl:// when password_file is set, or set allow_plain_password = true")
		}
	}
	if !encrypted {
		s.foreign("an ssl:// broker", "ca_file", "cert_file", "key_file")
	}
}

// isBroker says whether a text is the address of a broker.
func isBroker(text string) bool {
	u, err := url.Parse(text)
	if err != nil || u.Scheme != "tcp" && u.Scheme != "ssl" || u.Hostname() == "" || !isPort(u.Port(), 1) {
		return false
	}
	return text == fmt.Sprintf("%s://%s", u.Scheme, u.Host)
}

// isPort says whether a text is a port from least to 65535.
func isPort(text string, least int) bool {
	n, err := strconv.ParseUint(text, 10, 16)
	return err == nil && int(n) >= least
}

// isLoopback says whether a host is this one.
func isLoopback(host string) bool {
	if strings.EqualFold(host, "localhost") {
		return true
	}
	a, err := netip.ParseAddr(host)
	return err == nil && a.IsLoopback()
}
