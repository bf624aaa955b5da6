package config

import (
	"fmt"
	"maps"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// checker collects what is wrong with a file.
type checker struct {
	origin   origin
	problems []Problem
	// wrong holds the kind of the values that are not of their key's type.
	wrong map[string]string
	// told holds the keys that a problem names.
	told map[string]bool
}

func newChecker(o origin) *checker {
	return &checker{origin: o, wrong: map[string]string{}, told: map[string]bool{}}
}

// fail tells that the value of a path is not what text says it must be.
func (c *checker) fail(path, text string) {
	c.told[path] = true
	value := c.origin.places[path].value
	if strings.HasPrefix(path, "mqtt.") && strings.Contains(value, "@") {
		value = "" // an address with a password in it
	}
	c.problems = append(c.problems, Problem{
		File: c.origin.file, Line: c.origin.line(path), Key: path, Value: value, Text: text,
	})
}

// rest tells of the values of a wrong type that no check has told of, nor of the
// list they are in.
func (c *checker) rest() {
	for _, path := range slices.Sorted(maps.Keys(c.wrong)) {
		list := path[:max(0, strings.LastIndexByte(path, '['))]
		if !c.told[path] && !c.told[list] {
			c.fail(path, "must not be "+c.wrong[path])
		}
	}
}

// section is the checker at work on one table.
type section struct {
	*checker
	path string
}

func (c *checker) section(path string) section { return section{c, path} }

// of returns the path of one of the program's own keys in the table.
func (s section) of(key string) string { return s.path + "." + key }

// presence says whether a key may be left out.
type presence bool

const (
	required presence = true
	optional presence = false
)

// has says whether a key stands in the file.
func (s section) has(key string) bool {
	_, ok := s.origin.places[s.of(key)]
	return ok
}

// sound says whether a key stands in the file and nothing is wrong with it.
func (s section) sound(key string) bool { return s.has(key) && !s.told[s.of(key)] }

// failAt tells that the value of a key is not what text says it must be.
func (s section) failAt(key, text string) { s.fail(s.of(key), text) }

// check tells what is wrong with a key: missing, of a wrong type, or, when ok is
// false, outside of what is allowed. typ names the type and allowed the range in
// words; either may be empty.
func (s section) check(key string, p presence, ok bool, typ, allowed string) {
	path := s.of(key)
	full := strings.TrimSpace(typ + " " + allowed)
	switch {
	case s.wrong[path] != "":
		s.fail(path, fmt.Sprintf("must be %s, not %s", full, s.wrong[path]))
	case !s.has(key):
		if p == required {
			s.fail(path, "missing; must be "+full)
		}
	case !ok && allowed == "":
		s.fail(path, "must be "+full)
	case !ok:
		s.fail(path, "must be "+allowed)
	}
}

// span is an allowed range, both ends included.
type span struct {
	lo, hi float64
	unit   string
}

func (r span) String() string {
	text := "from " + plain(r.lo) + " to " + plain(r.hi)
	if r.unit != "" {
		text += " (" + r.unit + ")"
	}
	return text
}

// plain returns a number without an exponent.
func plain(x float64) string { return strconv.FormatFloat(x, 'f', -1, 64) }

// number checks a number against its range.
func (s section) number(key string, p presence, v float64, r span) {
	s.check(key, p, v >= r.lo && v <= r.hi, "a number", r.String())
}

// whole checks a whole number against its range.
func (s section) whole(key string, p presence, v int, r span) {
	x := float64(v)
	s.check(key, p, x >= r.lo && x <= r.hi, "a whole number", r.String())
}

// choice checks that a word is one of a list.
func (s section) choice(key string, p presence, v string, words []string) {
	quoted := make([]string, len(words))
	for i, w := range words {
		quoted[i] = strconv.Quote(w)
	}
	s.check(key, p, slices.Contains(words, v), "", oneOf(quoted))
}

// oneOf returns words as "a, b or c".
func oneOf(words []string) string {
	last := len(words) - 1
	if last <= 0 {
		return strings.Join(words, "")
	}
	return strings.Join(words[:last], ", ") + " or " + words[last]
}

// form is what a text must look like.
type form struct {
	pattern *regexp.Regexp
	words   string
}

// text checks what a text looks like.
func (s section) text(key string, p presence, v string, f form) {
	s.check(key, p, f.pattern.MatchString(v), "text:", f.words)
}

// flag checks the type of a key that is true or false.
func (s section) flag(key string) { s.check(key, optional, true, "true or false", "") }

// foreign tells of keys that have no meaning beside the value of another.
func (s section) foreign(owner string, keys ...string) {
	for _, key := range keys {
		if s.has(key) {
			s.failAt(key, "belongs to "+owner+", leave it out")
		}
	}
}
