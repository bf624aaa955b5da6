package config

import "fmt"

// validate tells everything that is wrong with the values of cfg.
func (c *checker) validate(cfg *Config) {
	if c.table("machine", required) {
		c.validateMachine(&cfg.Machine)
	}
	if c.table("limits", required) {
		c.validateLimits(&cfg.Limits)
	}
	if c.table("source", required) {
		c.validateSource(&cfg.Source)
	}
	if c.table("rig", optional) {
		c.validateRig(cfg)
	}
	c.validatePoints(cfg)
	if c.table("reference", optional) {
		c.validateReference(cfg)
	}
	if c.table("buffer", optional) {
		c.validateBuffer(&cfg.Buffer)
	}
	if c.table("mqtt", optional) {
		c.validateMQTT(cfg)
	}
	if c.table("alarm", optional) {
		c.validateAlarm(&cfg.Alarm)
	}
}

// table says whether a table stands in the file; a required one that does not
// is a problem, and so is a value in its place.
func (c *checker) table(name string, p presence) bool {
	_, stands := c.origin.places[name]
	header := "[" + name + "]"
	switch {
	case c.wrong[name] != "":
		c.fail(name, fmt.Sprintf("must be one table, %s, not %s", header, c.wrong[name]))
		return false
	case !stands && p == required:
		c.fail(name, "missing table "+header)
		return false
	}
	return stands
}

// taken remembers which path holds a value first, to tell of the second.
type taken map[string]string

// claim returns where the value is held already, "" when it was free.
func (t taken) claim(value, path string) string {
	if first, ok := t[value]; ok {
		return first
	}
	t[value] = path
	return ""
}
