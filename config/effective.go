package config

import (
	"fmt"

	"github.com/pelletier/go-toml/v2"
)

// Effective returns the configuration as TOML with every default written out.
// Parsing it gives the same configuration. Passwords and keys are never part of
// it, only the names of their files. It panics when the fields were changed to
// what no file can hold.
func (c *Config) Effective() string {
	text, err := toml.Marshal(c)
	if err != nil {
		panic(fmt.Sprintf("config: cannot write the configuration: %v", err))
	}
	return string(text)
}
