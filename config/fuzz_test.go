package config

import (
	"errors"
	"os"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// FuzzParse checks that whatever a file holds, there is either a configuration
// that survives being written and read, or a list of problems, each one line
// with the file's name and a line of the file.
func FuzzParse(f *testing.F) {
	f.Add(good)
	for _, m := range append(contractMistakes, otherMistakes...) {
		f.Add(spoil(m.line, m.text))
	}
	for _, name := range []string{"kiln-fan-2.toml", "minimal.toml"} {
		data, err := os.ReadFile("../testdata/config/" + name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(string(data))
	}
	f.Fuzz(func(t *testing.T, text string) {
		cfg, err := Parse("f.toml", []byte(text))
		if err == nil {
			checkAgain(t, cfg)
			return
		}
		var list *Errors
		if cfg != nil || !errors.As(err, &list) || len(list.Problems) == 0 {
			t.Fatalf("configuration %v, error %v", cfg, err)
		}
		checkProblems(t, list, strings.Count(text, "\n")+1)
	})
}

// checkProblems checks what holds for every list of problems.
func checkProblems(t *testing.T, list *Errors, lines int) {
	last := 1
	for _, p := range list.Problems {
		if p.Line < last || p.Line > lines {
			t.Errorf("line %d after line %d of %d: %s", p.Line, last, lines, p)
		}
		last = p.Line
		if s := p.String(); !strings.HasPrefix(s, "f.toml:") || strings.ContainsAny(s, "\n\r") || len(s) > 1000 {
			t.Errorf("not one short line with the name: %q", s)
		}
	}
}

// checkAgain checks that a configuration survives being written and read.
func checkAgain(t *testing.T, cfg *Config) {
	text := cfg.Effective()
	again, err := Parse("again.toml", []byte(text))
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	if diff := cmp.Diff(cfg, again, same); diff != "" {
		t.Fatal(diff)
	}
	cfg.DSP(1000, 8)
	cfg.Rules()
	_ = cfg.CheckSource()
}
