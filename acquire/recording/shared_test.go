package recording

import (
	"context"
	"io"
	"math"
	"os"
	"path/filepath"
	"testing"

	"heavyspot/acquire"
)

// sharedFiles returns the example recordings that match pattern, which lie
// beside the repository.
func sharedFiles(t testing.TB, pattern string) []string {
	t.Helper()
	files, err := filepath.Glob(filepath.Join("..", "..", "..", "shared", "data", pattern))
	if err != nil {
		t.Fatal(err)
	}
	if len(files) == 0 {
		if os.Getenv("HEAVYSPOT_REQUIRE") == "1" {
			t.Fatalf("no example recordings %s beside the repository", pattern)
		}
		t.Skipf("no example recordings %s beside the repository", pattern)
	}
	return files
}

// readAll returns all blocks of s and the error that ended it.
func readAll(s acquire.Source) ([]acquire.Block, error) {
	var all []acquire.Block
	for {
		var b acquire.Block
		if err := s.Read(context.Background(), &b); err != nil {
			return all, err
		}
		all = append(all, b)
	}
}

func TestExampleRecordings(t *testing.T) {
	for _, c := range []struct {
		pattern  string
		rate     float64
		channels int
		rows     int
	}{
		{"known/*.csv", 1000, 7, 30000},
		{"fan-weights/*.csv", 50, 3, 3000},
	} {
		for _, path := range sharedFiles(t, c.pattern) {
			s, err := Open(path, Options{ExpectRateHz: c.rate})
			if err != nil {
				t.Fatal(err)
			}
			if f := s.Format(); f.RateHz != c.rate || f.Channels != c.channels {
				t.Errorf("%s: format %v, want %v Hz, %d channels", path, f, c.rate, c.channels)
			}
			blocks, err := readAll(s)
			if err != io.EOF {
				t.Errorf("%s: %v", path, err)
			}
			rows := 0
			for _, b := range blocks {
				if b.First != int64(rows) || b.Gap != (acquire.Gap{}) || !b.Time.IsZero() || b.ClockSet {
					t.Fatalf("%s: block %d after %d rows, gap %v, time %v", path, b.First, rows, b.Gap, b.Time)
				}
				rows += b.Rows(c.channels)
			}
			if rows != c.rows || len(blocks) != rows/int(c.rate) {
				t.Errorf("%s: %d rows in %d blocks, want %d in blocks of a second", path, rows, len(blocks), c.rows)
			}
			if done, total := s.Progress(); done != total {
				t.Errorf("%s: %d of %d bytes at the end", path, done, total)
			}
			if err := s.Close(); err != nil {
				t.Error(err)
			}
		}
	}
}

// TestExampleTurnRate checks content, not only counts: the phase reference of
// clean.csv crosses its threshold as often as the true rate of its README says.
func TestExampleTurnRate(t *testing.T) {
	path := sharedFiles(t, "known/clean.csv")[0]
	s, err := Open(path, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	blocks, _ := readAll(s)
	edges, high := 0, true
	for _, b := range blocks {
		for i := 6; i < len(b.Volts); i += 7 {
			now := b.Volts[i] > 0.51
			if now && !high {
				edges++
			}
			high = now
		}
	}
	const rpm, seconds = 924.742, 30.0
	if want := rpm / 60 * seconds; math.Abs(float64(edges)-want) > 1 {
		t.Errorf("%d turns, want %.1f", edges, want)
	}
}
