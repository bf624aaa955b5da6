package recording

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"testing"

	"heavyspot/acquire"
)

// TestRateFromTimeColumn: how programs write times, and what a reader makes of
// it.
func TestRateFromTimeColumn(t *testing.T) {
	fixed := func(decimals int) func(float64) string {
		return func(v float64) string { return strconv.FormatFloat(v, 'f', decimals, 64) }
	}
	cut := func(decimals int) func(float64) string {
		scale := math.Pow10(decimals)
		return func(v float64) string {
			return strconv.FormatFloat(math.Floor(v*scale+1e-6)/scale, 'f', decimals, 64)
		}
	}
	digits := func(n int) func(float64) string {
		return func(v float64) string { return strconv.FormatFloat(v, 'g', n, 64) }
	}
	for _, c := range []struct {
		name   string
		hz     float64
		rows   int
		write  func(float64) string
		expect float64
		want   float64
	}{
		{"1 kHz, 3 decimals", 1000, 5000, fixed(3), 0, 1000},
		{"1 kHz, 3 decimals, few rows", 1000, 5, fixed(3), 0, 1000},
		{"1 kHz, 6 decimals, two rows", 1000, 2, fixed(6), 0, 1000},
		{"50 Hz, 2 decimals", 50, 3000, fixed(2), 0, 50},
		{"50 Hz, 2 decimals, two rows", 50, 2, fixed(2), 0, 50},
		{"1024 Hz, 6 decimals", 1024, 9000, fixed(6), 0, 1024},
		{"1024 Hz, 6 decimals, cut", 1024, 9000, cut(6), 0, 1024},
		{"1024 Hz, 4 decimals", 1024, 9000, fixed(4), 0, 1024},
		{"3 kHz, 4 decimals", 3000, 9000, fixed(4), 0, 3000},
		{"3 kHz, 4 decimals, 500 rows", 3000, 500, fixed(4), 0, 3000},
		{"700 Hz, 3 decimals", 700, 9000, fixed(3), 0, 700},
		{"51.2 kHz, 7 decimals", 51200, 9000, fixed(7), 0, 51200},
		{"60 Hz, 3 decimals", 60, 4000, fixed(3), 0, 60},
		{"976.5625 Hz, 9 decimals", 976.5625, 9000, fixed(9), 0, 976.5625},
		{"976.5625 Hz, 6 decimals, known", 976.5625, 9000, fixed(6), 976.5625, 976.5625},
		{"step 0.03 s", 1 / 0.03, 5000, fixed(2), 0, 100.0 / 3},
		{"a row in 10 s", 0.1, 50, fixed(0), 0, 0.1},
		{"1 kHz, every digit", 1000, 9000, digits(-1), 0, 1000},
		{"1 kHz, 6 digits to 10 s", 1000, 10000, digits(6), 0, 1000},
		{"1024 Hz, 8 digits to 60 s", 1024, 60000, digits(8), 0, 1024},
		{"1 kHz, exponents", 1000, 9000, func(v float64) string { return strconv.FormatFloat(v, 'e', 6, 64) }, 0, 1000},
		{"a clock 80 ppm fast", 1000.08, 100000, fixed(6), 0, 1000.08},
	} {
		var b strings.Builder
		b.WriteString("t_s,ch0\n")
		for i := range c.rows {
			fmt.Fprintf(&b, "%s,%d\n", c.write(float64(i)/c.hz), i)
		}
		s, blocks := mustRead(t, b.String(), Options{ExpectRateHz: c.expect})
		if got := s.Format().RateHz; got != c.want {
			t.Errorf("%s: %v Hz, want %v", c.name, got, c.want)
		}
		if n := len(volts(blocks)); n != c.rows {
			t.Errorf("%s: %d rows, want %d", c.name, n, c.rows)
		}
	}
}

// TestSummedTimes: a program that adds its step up, with the rounding of it.
func TestSummedTimes(t *testing.T) {
	var b strings.Builder
	b.WriteString("t_s,ch0\n")
	at := 0.0
	const rows = 200000
	for range rows {
		fmt.Fprintf(&b, "%v,1\n", at)
		at += 0.001
	}
	s, blocks := mustRead(t, b.String(), Options{})
	if s.Format().RateHz != 1000 || len(volts(blocks)) != rows {
		t.Errorf("%v Hz, %d rows", s.Format().RateHz, len(volts(blocks)))
	}
}

func TestHolesBecomeGaps(t *testing.T) {
	for _, c := range []struct {
		name     string
		hz       float64
		decimals int
	}{
		{"exact", 1000, 3}, {"1024 Hz", 1024, 6}, {"3 kHz", 3000, 4}, {"3 kHz, 9 decimals", 3000, 9}, {"a row a second", 1, 0},
	} {
		var b strings.Builder
		b.WriteString("t_s,ch0\n")
		// Rows 40, 100 to 102, and 5000 to 15000 are missing; the last hole lies
		// behind the rows the rate is taken from.
		holes := map[int]int{40: 1, 100: 3, 5000: 10001}
		for i := 0; i < 16000; i++ {
			i += holes[i]
			fmt.Fprintf(&b, "%.*f,%d\n", c.decimals, float64(i)/c.hz, i)
		}
		s, blocks := mustRead(t, b.String(), Options{BlockSeconds: 1000 / c.hz})
		if s.Format().RateHz != c.hz {
			t.Errorf("%s: %v Hz", c.name, s.Format().RateHz)
		}
		found, next := 0, int64(0)
		for _, b := range blocks {
			next += b.Gap.Lost
			if b.First != next {
				t.Fatalf("%s: block begins with %d, want %d", c.name, b.First, next)
			}
			for i, v := range b.Volts {
				if v != float32(b.First+int64(i)) {
					t.Fatalf("%s: row %d holds %v", c.name, b.First+int64(i), v)
				}
			}
			next += int64(len(b.Volts))
			if b.Gap.Lost > 0 {
				found++
				want := acquire.Gap{Lost: int64(holes[int(b.First-b.Gap.Lost)]), Exact: true, Cause: acquire.Absent}
				if b.Gap != want {
					t.Errorf("%s: %+v ahead of row %d, want %+v", c.name, b.Gap, b.First, want)
				}
			} else if b.Gap != (acquire.Gap{}) {
				t.Errorf("%s: %+v", c.name, b.Gap)
			}
		}
		if found != len(holes) {
			t.Errorf("%s: %d gaps, want %d", c.name, found, len(holes))
		}
	}
}

// TestLongHoleIsNotExact when the step is not known well enough to count it.
func TestLongHoleIsNotExact(t *testing.T) {
	text := "t_s,ch0\n" + rows(3000, 4, 1000) + "900000.0000,1\n"
	s, err := openText(text, Options{})
	if err != nil {
		t.Fatal(err)
	}
	blocks, err := readAll(s)
	last := blocks[len(blocks)-1]
	if err != io.EOF || last.Gap.Lost < 1e9 || last.Gap.Exact {
		t.Errorf("%+v, %v", last.Gap, err)
	}
}

// TestWanderingClock: a clock that warms up and cools down by 3 ppm, written to
// the microsecond, is uniform enough; one that is off by 0.1 % for a while is
// not.
func TestWanderingClock(t *testing.T) {
	for _, c := range []struct {
		wander float64
		sound  bool
	}{{3e-6, true}, {1e-3, false}} {
		var b strings.Builder
		b.WriteString("t_s,ch0\n")
		at := 0.0
		for i := range 100000 {
			fmt.Fprintf(&b, "%.6f,1\n", at)
			at += 0.001 * (1 + c.wander*math.Sin(float64(i)/5000))
		}
		s, err := openText(b.String(), Options{})
		if err != nil {
			t.Fatal(err)
		}
		_, err = readAll(s)
		if sound := err == io.EOF; sound != c.sound {
			t.Errorf("wander %g: %v", c.wander, err)
		}
	}
}
