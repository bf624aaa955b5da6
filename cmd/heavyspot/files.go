package main

import (
	"crypto/tls"
	"crypto/x509"
	"fmt"
	"os"

	"heavyspot/config"
)

// checkFiles reads the files that [mqtt] names, so that a wrong one is found
// before anything starts.
func checkFiles(cfg *config.Config) error {
	m := &cfg.MQTT
	if m.PasswordFile != "" {
		if _, err := os.ReadFile(cfg.FilePath(m.PasswordFile)); err != nil {
			return fmt.Errorf("cannot read mqtt.password_file: %w", err)
		}
	}
	if m.CAFile != "" {
		pem, err := os.ReadFile(cfg.FilePath(m.CAFile))
		if err != nil {
			return fmt.Errorf("cannot read mqtt.ca_file: %w", err)
		}
		if !x509.NewCertPool().AppendCertsFromPEM(pem) {
			return fmt.Errorf("mqtt.ca_file %s holds no certificate", cfg.FilePath(m.CAFile))
		}
	}
	if m.CertFile != "" {
		if _, err := tls.LoadX509KeyPair(cfg.FilePath(m.CertFile), cfg.FilePath(m.KeyFile)); err != nil {
			return fmt.Errorf("cannot use mqtt.cert_file and mqtt.key_file: %w", err)
		}
	}
	return nil
}
