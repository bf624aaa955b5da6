package config

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"

	"github.com/pelletier/go-toml/v2"
)

// mostBytes bounds the size of a configuration file.
const mostBytes = 64 << 10

// Load reads and checks the file at path. The error is an *Errors when the file
// could be read but not accepted; there is no configuration then.
func Load(path string) (*Config, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("cannot open the configuration: %w", err)
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, mostBytes+1))
	if err != nil {
		return nil, fmt.Errorf("cannot read the configuration: %w", err)
	}
	return Parse(path, data)
}

// Parse checks the configuration in data. name is the file's name: it stands in
// front of every problem, and the files that the configuration names are
// relative to its folder. The error is always an *Errors; there is no
// configuration then.
func Parse(name string, data []byte) (*Config, error) {
	if len(data) > mostBytes {
		text := fmt.Sprintf("the file is too long: must be at most %d bytes", mostBytes)
		return nil, sorted([]Problem{{File: name, Line: 1, Text: text}})
	}
	data = bytes.TrimPrefix(data, []byte("\ufeff"))
	var values map[string]any
	if err := toml.Unmarshal(data, &values); err != nil {
		return nil, sorted([]Problem{notTOML(name, err)})
	}
	cfg := defaults()
	cfg.origin = origin{file: name, places: locate(data)}
	c := newChecker(cfg.origin)
	c.read(cfg, values)
	c.validate(cfg)
	c.rest()
	if err := sorted(c.problems); err != nil {
		return nil, err
	}
	complete(cfg)
	return cfg, nil
}

// complete writes out the defaults that depend on other keys.
func complete(cfg *Config) {
	if len(cfg.Source.Gain) == 1 {
		one := cfg.Source.Gain[0]
		cfg.Source.Gain = make([]int, converterChannels)
		for i := range cfg.Source.Gain {
			cfg.Source.Gain[i] = one
		}
	}
	if len(cfg.MQTT.Brokers) > 0 {
		cfg.MQTT.EmbeddedListen = ""
	}
	if cfg.MQTT.ClientID == "" {
		cfg.MQTT.ClientID = "heavyspot-" + cfg.Machine.Site + "-" + cfg.Machine.Name
	}
	if cfg.Source.Driver == DriverRig && cfg.Rig == nil {
		cfg.Rig = defaultRig()
	}
}

// notTOML puts the library's complaint into our form.
func notTOML(name string, err error) Problem {
	p := Problem{File: name, Line: 1, Column: 1}
	text := strings.TrimPrefix(err.Error(), "toml: ")
	var at *toml.DecodeError
	if errors.As(err, &at) {
		p.Line, p.Column = at.Position()
	}
	p.Text = "not valid TOML: " + shorten(text)
	switch {
	case strings.Contains(text, "at start of value"):
		p.Text += " (texts stand in double quotes)"
	case strings.Contains(text, "expected newline but got U+002C"):
		p.Text += " (decimals are written with a point)"
	}
	return p
}
