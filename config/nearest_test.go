package config

import (
	"testing"

	"pgregory.net/rapid"
)

func TestEdits(t *testing.T) {
	for _, c := range []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"", "abc", 3}, {"abc", "", 3}, {"abc", "abc", 0},
		// The textbook pair of Levenshtein's distance.
		{"kitten", "sitting", 3},
		// A swap of neighbours counts once (Damerau).
		{"rmp", "rpm", 1}, {"ca", "abc", 3},
	} {
		if got := edits(c.a, c.b); got != c.want {
			t.Errorf("%q to %q: %d edits, want %d", c.a, c.b, got, c.want)
		}
	}
}

func TestEditsAreADistance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		word := rapid.StringMatching(`[a-c]{0,6}`)
		a, b := word.Draw(t, "a"), word.Draw(t, "b")
		n := edits(a, b)
		if n != edits(b, a) {
			t.Fatal("not the same both ways")
		}
		if (n == 0) != (a == b) {
			t.Fatalf("%d edits between %q and %q", n, a, b)
		}
		if longest := max(len(a), len(b)); n > longest || n < longest-min(len(a), len(b)) {
			t.Fatalf("%d edits between %q and %q", n, a, b)
		}
	})
}

func TestNearest(t *testing.T) {
	known := []string{"rate_hz", "rated_rpm", "gain"}
	for word, want := range map[string]string{
		"rated_rmp": "rated_rpm", "rate": "", "ratehz": "rate_hz", "Gain": "gain", "gains": "gain", "colour": "", "": "",
	} {
		if got := nearest(word, known); got != want {
			t.Errorf("nearest to %q is %q, want %q", word, got, want)
		}
	}
}
