package main

import (
	"fmt"
	"strings"

	"heavyspot/rules"
)

// evidenceTable is the evidence of a finding as a table for people.
func evidenceTable(list []rules.Evidence) string {
	const head = "  %-6s %-40s %8s  "
	width := screenWidth - (2 + 6 + 1 + 40 + 1 + 8 + 2)
	var b strings.Builder
	row := func(holds, test, measured, expected string) {
		lines := fold(expected, width)
		fmt.Fprintf(&b, head+"%s\n", holds, test, measured, lines[0])
		if rest := strings.Join(lines[1:], " "); rest != "" {
			b.WriteString(wrap(strings.Repeat(" ", 2+6+1), rest))
		}
	}
	row("holds", "test", "measured", "unit, expected")
	for _, e := range list {
		if e.Missing != "" {
			row("-", e.Test, "-", "not tested: "+e.Missing)
			continue
		}
		holds := "yes"
		if !e.Holds {
			holds = "NO"
		}
		expected := e.Expected
		if e.Unit != "" {
			expected = e.Unit + ", " + expected
		}
		row(holds, e.Test, measured(&e), expected)
	}
	return b.String()
}

// measured is the measured value with the decimals that mean something.
func measured(e *rules.Evidence) string {
	switch {
	case e.Unit == "":
		return fmt.Sprintf("%.3f", e.Measured)
	case strings.HasPrefix(e.Unit, "deg"):
		return fmt.Sprintf("%.1f", e.Measured)
	}
	return fmt.Sprintf("%.2f", e.Measured)
}
