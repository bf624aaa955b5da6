package main

import (
	"context"
	"crypto/tls"
	"crypto/x509"
	"fmt"
	"os"
	"strings"
	"time"

	paho "github.com/eclipse/paho.mqtt.golang"

	"heavyspot/config"
)

// patience is how long a broker may take to answer.
const patience = 10 * time.Second

// tryBroker connects to a broker as the daemon would, under a client name of
// its own so that a running daemon is not pushed out, and leaves again without
// publishing anything.
func tryBroker(ctx context.Context, cfg *config.Config, broker string) error {
	secure, err := clientTLS(cfg)
	if err != nil {
		return err
	}
	m := &cfg.MQTT
	opt := paho.NewClientOptions().AddBroker(broker).SetClientID(m.ClientID + "-check").
		SetCleanSession(true).SetAutoReconnect(false).SetConnectRetry(false).
		SetConnectTimeout(patience).SetTLSConfig(secure).SetUsername(m.User)
	if m.PasswordFile != "" {
		text, err := os.ReadFile(cfg.FilePath(m.PasswordFile))
		if err != nil {
			return err
		}
		line, _, _ := strings.Cut(string(text), "\n")
		opt.SetPassword(strings.TrimSuffix(line, "\r"))
	}
	client := paho.NewClient(opt)
	token := client.Connect()
	defer client.Disconnect(100)
	select {
	case <-token.Done():
		return token.Error()
	case <-time.After(patience + time.Second):
		return fmt.Errorf("no answer in %v", patience)
	case <-ctx.Done():
		return ctx.Err()
	}
}

// clientTLS is the set-up of an encrypted connection.
func clientTLS(cfg *config.Config) (*tls.Config, error) {
	m := &cfg.MQTT
	t := &tls.Config{MinVersion: tls.VersionTLS12}
	if m.CAFile != "" {
		pem, err := os.ReadFile(cfg.FilePath(m.CAFile))
		if err != nil {
			return nil, err
		}
		t.RootCAs = x509.NewCertPool()
		t.RootCAs.AppendCertsFromPEM(pem)
	}
	if m.CertFile != "" {
		cert, err := tls.LoadX509KeyPair(cfg.FilePath(m.CertFile), cfg.FilePath(m.KeyFile))
		if err != nil {
			return nil, err
		}
		t.Certificates = []tls.Certificate{cert}
	}
	return t, nil
}
