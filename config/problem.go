package config

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
)

// Problem is one thing wrong in a configuration file.
type Problem struct {
	// File is the file's name as it was given.
	File string
	// Line and Column count from 1. Column is 0 unless the text is not TOML.
	Line, Column int
	// Key is the key's path, for instance "point[2].volts_per_g"; empty when
	// the text is not TOML.
	Key string
	// Value is the value as written, shortened; empty when the key is missing
	// or unknown, and never a password.
	Value string
	// Text says what is wrong and what is allowed.
	Text string
}

// String returns the problem in one line.
func (p Problem) String() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s:%d", p.File, p.Line)
	if p.Column > 0 {
		fmt.Fprintf(&b, ":%d", p.Column)
	}
	b.WriteString(": ")
	b.WriteString(p.Key)
	if p.Value != "" {
		b.WriteString(" = ")
		b.WriteString(p.Value)
	}
	if p.Key != "" {
		b.WriteString(": ")
	}
	b.WriteString(p.Text)
	return b.String()
}

// Errors is everything wrong in a configuration file, by line; never empty when
// it is returned.
type Errors struct {
	Problems []Problem
}

// Error returns the problems one a line.
func (e *Errors) Error() string {
	lines := make([]string, len(e.Problems))
	for i, p := range e.Problems {
		lines[i] = p.String()
	}
	return strings.Join(lines, "\n")
}

// sorted returns an error holding the problems by line, nil when there are none.
func sorted(problems []Problem) error {
	if len(problems) == 0 {
		return nil
	}
	slices.SortStableFunc(problems, func(a, b Problem) int {
		return cmp.Or(cmp.Compare(a.Line, b.Line), cmp.Compare(a.Column, b.Column))
	})
	return &Errors{Problems: problems}
}
