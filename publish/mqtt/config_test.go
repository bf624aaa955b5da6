package mqtt

import (
	"context"
	"crypto/ecdsa"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/tls"
	"crypto/x509"
	"crypto/x509/pkix"
	"encoding/pem"
	"math/big"
	"net"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

func TestConfigErrors(t *testing.T) {
	secret := filepath.Join(t.TempDir(), "password")
	if err := os.WriteFile(secret, []byte("open sesame\nsecond line\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	for name, c := range map[string]struct {
		change func(*Config)
		want   string // empty: allowed
	}{
		"plain":                 {func(c *Config) {}, ""},
		"no broker":             {func(c *Config) { c.Brokers = nil }, "no broker"},
		"web socket":            {func(c *Config) { c.Brokers = []string{"ws://a:1"} }, "must be tcp"},
		"no port":               {func(c *Config) { c.Brokers = []string{"tcp://a"} }, "must be tcp"},
		"second one wrong":      {func(c *Config) { c.Brokers = append(c.Brokers, "a:1883") }, "a:1883"},
		"password in address":   {func(c *Config) { c.Brokers = []string{"ssl://u:sesame@a:1"} }, "do not belong"},
		"no client id":          {func(c *Config) { c.ClientID = "" }, "client id"},
		"wildcard":              {func(c *Config) { c.Site = "#" }, "may not hold"},
		"window":                {func(c *Config) { c.InFlight = -1 }, "must be from"},
		"keepalive":             {func(c *Config) { c.Keepalive = 1 }, "keepalive"},
		"pause":                 {func(c *Config) { c.MinBackoff = -1 }, "shortest pause"},
		"certificate alone":     {func(c *Config) { c.CertFile = "x" }, "both or none"},
		"password without user": {func(c *Config) { c.PasswordFile = secret }, "without a user"},
		"password in the clear": {func(c *Config) {
			c.User, c.PasswordFile, c.Brokers = "fan", secret, []string{"tcp://broker.example:1883"}
		}, "in the clear"},
		"allowed in the clear": {func(c *Config) {
			c.User, c.PasswordFile, c.Brokers, c.AllowPlainPassword = "fan", secret, []string{"tcp://broker.example:1883"}, true
		}, ""},
		"password on this host": {func(c *Config) {
			c.User, c.PasswordFile, c.Brokers = "fan", secret, []string{"tcp://[::1]:1883", "tcp://localhost:1883"}
		}, ""},
		"password with TLS": {func(c *Config) {
			c.User, c.PasswordFile, c.Brokers = "fan", secret, []string{"ssl://broker.example:8883"}
		}, ""},
	} {
		t.Run(name, func(t *testing.T) {
			cfg := config("tcp://127.0.0.1:1883")
			c.change(&cfg)
			_, err := New(cfg, nil)
			switch {
			case err == nil && c.want != "", err != nil && c.want == "":
				t.Errorf("error %v, want %q", err, c.want)
			case err != nil && (!strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "sesame")):
				t.Errorf("error %v, want %q", err, c.want)
			}
		})
	}
	if got, err := (&Config{PasswordFile: secret}).password(); got != "open sesame" || err != nil {
		t.Errorf("password %q: %v", got, err)
	}
}

func TestBrokerListensOnThisHostOnly(t *testing.T) {
	for _, bad := range []string{"0.0.0.0:0", ":0", "192.0.2.1:1883", "broker.example:1883", "127.0.0.1", "[::]:0"} {
		if b, err := StartBroker(bad, nil); err == nil {
			b.Close()
			t.Errorf("listens on %s", bad)
		}
	}
	b := startBroker(t, "127.0.0.1:0", nil)
	if _, err := StartBroker(b.Addr(), nil); err == nil {
		t.Error("listens twice on one address")
	}
}

// attempt makes one connection attempt and returns what the status says.
func attempt(t *testing.T, cfg Config) string {
	t.Helper()
	cfg.MinBackoff, cfg.MaxBackoff = time.Minute, time.Minute
	p, stop := run(t, cfg, newBox(t))
	until(t, "an attempt", func() bool { s := p.Status(); return s.Connected || s.LastError != "" })
	defer stop()
	if p.Status().Connected {
		return "connected"
	}
	return p.Status().LastError
}

// certificates makes an authority and a certificate of it for 127.0.0.1, and
// returns their files.
func certificates(t *testing.T, notAfter time.Time) (ca, cert, keyFile string) {
	t.Helper()
	dir := t.TempDir()
	write := func(name, kind string, der []byte) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, pem.EncodeToMemory(&pem.Block{Type: kind, Bytes: der}), 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	make := func(serial int64, isCA bool, parent *x509.Certificate, signer *ecdsa.PrivateKey) ([]byte, *x509.Certificate, *ecdsa.PrivateKey) {
		k, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
		if err != nil {
			t.Fatal(err)
		}
		tmpl := &x509.Certificate{
			SerialNumber: big.NewInt(serial), Subject: pkix.Name{CommonName: "test"},
			NotBefore: time.Now().Add(-48 * time.Hour), NotAfter: notAfter,
			IsCA: isCA, BasicConstraintsValid: true, KeyUsage: x509.KeyUsageDigitalSignature | x509.KeyUsageCertSign,
			IPAddresses: []net.IP{net.IPv4(127, 0, 0, 1)},
			ExtKeyUsage: []x509.ExtKeyUsage{x509.ExtKeyUsageServerAuth, x509.ExtKeyUsageClientAuth},
		}
		if parent == nil {
			parent, signer = tmpl, k
		}
		der, err := x509.CreateCertificate(rand.Reader, tmpl, parent, &k.PublicKey, signer)
		if err != nil {
			t.Fatal(err)
		}
		c, err := x509.ParseCertificate(der)
		if err != nil {
			t.Fatal(err)
		}
		return der, c, k
	}
	caDER, caCert, caKey := make(1, true, nil, nil)
	der, _, k := make(2, false, caCert, caKey)
	kder, err := x509.MarshalPKCS8PrivateKey(k)
	if err != nil {
		t.Fatal(err)
	}
	return write("ca.pem", "CERTIFICATE", caDER), write("cert.pem", "CERTIFICATE", der), write("key.pem", "PRIVATE KEY", kder)
}

// secureProxy puts TLS, with a client's certificate asked for, before a broker.
func secureProxy(t *testing.T, ca, cert, key, to string) string {
	t.Helper()
	pair, err := tls.LoadX509KeyPair(cert, key)
	if err != nil {
		t.Fatal(err)
	}
	pool := x509.NewCertPool()
	b, err := os.ReadFile(ca)
	if err != nil || !pool.AppendCertsFromPEM(b) {
		t.Fatal(err)
	}
	px := newProxy(t, tls.NewListener(listen(t), &tls.Config{
		Certificates: []tls.Certificate{pair}, ClientCAs: pool, ClientAuth: tls.RequireAndVerifyClientCert,
	}), to)
	return "ssl://" + px.listener.Addr().String()
}

func TestTLS(t *testing.T) {
	b := startBroker(t, "127.0.0.1:0", nil)
	ca, cert, key := certificates(t, time.Now().Add(time.Hour))
	cfg := config(secureProxy(t, ca, cert, key, b.Addr()))
	cfg.CAFile, cfg.CertFile, cfg.KeyFile = ca, cert, key
	if got := attempt(t, cfg); got != "connected" {
		t.Errorf("with all certificates: %s", got)
	}
	cfg.CertFile, cfg.KeyFile = "", ""
	if got := attempt(t, cfg); got == "connected" {
		t.Error("connected without this client's certificate")
	}
	cfg.CAFile = ""
	if got := attempt(t, cfg); !strings.Contains(got, "signed by nobody known") {
		t.Errorf("unknown authority: %s", got)
	}
	cfg.CAFile = key
	if got := attempt(t, cfg); !strings.Contains(got, "holds no certificate") {
		t.Errorf("wrong file: %s", got)
	}
	cfg.CAFile, cfg.Brokers = ca, []string{"ssl://" + b.Addr()}
	if got := attempt(t, cfg); !strings.Contains(got, "TLS") && !strings.Contains(got, "closed the connection") && !strings.Contains(got, "not answer") {
		t.Errorf("no TLS there: %s", got)
	}
	ca, cert, key = certificates(t, time.Now().Add(-time.Hour))
	cfg.Brokers, cfg.CAFile = []string{secureProxy(t, ca, cert, key, b.Addr())}, ca
	if got := attempt(t, cfg); !strings.Contains(got, "clock") {
		t.Errorf("expired: %s", got)
	}
}

func TestWords(t *testing.T) {
	cfg := config("tcp://" + freeAddr(t))
	if got := attempt(t, cfg); !strings.Contains(got, cfg.Brokers[0]) || !strings.Contains(got, "nothing listens there") {
		t.Errorf("closed port: %s", got)
	}
	silent := listen(t) // takes connections and says nothing
	defer silent.Close()
	cfg.Brokers, cfg.Patience = []string{"tcp://" + silent.Addr().String()}, 200*time.Millisecond
	if got := attempt(t, cfg); !strings.Contains(got, "it does not answer") {
		t.Errorf("silent port: %s", got)
	}
	cfg.PasswordFile, cfg.User = filepath.Join(t.TempDir(), "none"), "fan"
	if got := attempt(t, cfg); !strings.Contains(got, "cannot read the password") {
		t.Errorf("no password file: %s", got)
	}
}

// Run ends at once although nothing can be reached.
func TestRunEndsWithoutBroker(t *testing.T) {
	silent := listen(t)
	defer silent.Close()
	cfg := config("tcp://" + silent.Addr().String())
	cfg.Patience = time.Hour
	p, err := New(cfg, newBox(t))
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(context.Background(), 100*time.Millisecond)
	defer cancel()
	if err := p.Run(ctx); err != nil {
		t.Error(err)
	}
}
