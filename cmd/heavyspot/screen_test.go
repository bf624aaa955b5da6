package main

import (
	"bytes"
	"strings"
	"testing"

	"heavyspot/rules"
)

// TestScreen checks that a status line is wiped before anything is written, and
// that without a terminal nothing but the text is.
func TestScreen(t *testing.T) {
	for _, live := range []bool{true, false} {
		var all bytes.Buffer
		s := newScreen(&all, &all)
		if s.live {
			t.Fatal("a buffer is taken for a terminal")
		}
		s.live = live
		s.show("50 %")
		s.Write([]byte("data\n"))
		s.say("talk")
		s.show("60 %")
		s.show("")
		want := "data\ntalk\n"
		if live {
			const wipe = "\r\x1b[K"
			want = "50 %" + wipe + "data\n50 %" + wipe + "talk\n50 %" + wipe + "60 %" + wipe
		}
		if got := all.String(); got != want {
			t.Errorf("live %v: %q, want %q", live, got, want)
		}
	}
}

func TestWrap(t *testing.T) {
	long := strings.Repeat("word ", 40)
	for _, text := range []string{long, "", strings.Repeat("x", 200), "é " + long} {
		got := wrap("  label  ", text)
		if !strings.HasPrefix(got, "  label  ") || !strings.HasSuffix(got, "\n") {
			t.Errorf("%q", got)
		}
		if strings.Join(strings.Fields(got), " ") != strings.Join(strings.Fields("label "+text), " ") {
			t.Errorf("words were lost: %q", got)
		}
		if text == long {
			plainOutput(t, got)
		}
	}
}

// TestEvidenceTable checks that each test shows in the table whatever its
// length, and that a failed one is told by a word.
func TestEvidenceTable(t *testing.T) {
	got := evidenceTable([]rules.Evidence{
		{Test: "larger-to-smaller-non-drive-end", Measured: 12.3456, Expected: "at least 1 while horizontal is a quarter turn behind", Holds: true},
		{Test: "horizontal-behind-vertical-non-drive-end", Measured: -123.45, Unit: "deg", Expected: "30 to 150 in the sense of rotation"},
		{Test: "axial-ends-phase", Missing: "no point at drive-end axial, no point at non-drive-end axial"},
	})
	plainOutput(t, got)
	for _, text := range []string{
		"  yes    larger-to-smaller-non-drive-end            12.346  at least 1 while",
		"  NO     horizontal-behind-vertical-non-drive-end   -123.5  deg, 30 to 150 in",
		"  -      axial-ends-phase                                -  not tested: no point",
	} {
		if !strings.Contains(got, text) {
			t.Errorf("%q is not in the table:\n%s", text, got)
		}
	}
}
