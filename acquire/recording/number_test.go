package recording

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// sameAsStrconv says how the number in cell differs from strconv, with the
// grammar of decimal numbers in front of it; "" if it does not.
func sameAsStrconv(cell string) string {
	n, reason := parseNumber([]byte(cell))
	want, err := strconv.ParseFloat(cell, 64)
	decimal := strings.Trim(cell, "+-.0123456789eE") == ""
	if e, ok := err.(*strconv.NumError); ok && e.Err == strconv.ErrRange {
		err = nil
	}
	switch {
	case (reason == "") != (err == nil && decimal):
		return "accepted: " + strconv.FormatBool(reason == "") + ", strconv: " + strconv.FormatBool(err == nil)
	case reason == "" && math.Float64bits(n.value) != math.Float64bits(want):
		return "got " + strconv.FormatFloat(n.value, 'g', -1, 64) + ", strconv " + strconv.FormatFloat(want, 'g', -1, 64)
	}
	return ""
}

// numberCells are cells at the edges of the fast path and of the grammar.
var numberCells = []string{
	"0", "-0", "0.0", "-0.000", "+1", "+-1", "--1", "1.", ".5", ".", "-.", "", "e5", "1e", "1e+", "1e5", "1E-5", "1e+05",
	"9.91859e-05", "9007199254740992", "9007199254740993", "9007199254740993e0", "1e22", "1e23", "1e-22", "1e-23",
	"123456789012345678", "1234567890123456789", "0.1234567890123456789012345", "1e308", "1e309", "-1e309", "5e-324", "1e-400",
	"1e0000000000000000001", "1e999999999999999999999", "1e-999999999999999999999", "inf", "nan", "Infinity", "0x1p4", "0x10", "1_000", "1__0",
	"1 2", "1,5", "0b1", "0o7", "\x00", "١", "1e5.5", "1-", "3.4028235e38", "8.5e37", "179769313486231580793e289",
	// In and just above the middle between two float64.
	"9007199254740992.5", "9007199254740993.0000000000000000000001",
}

func TestNumberIsThatOfStrconv(t *testing.T) {
	for _, c := range numberCells {
		if diff := sameAsStrconv(c); diff != "" {
			t.Errorf("%q: %s", c, diff)
		}
	}
}

func TestNumberIsThatOfStrconvAnyFloat(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := math.Float64frombits(rapid.Uint64().Draw(t, "bits"))
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return
		}
		format := rapid.SampledFrom([]byte("eEfgG")).Draw(t, "format")
		precision := rapid.IntRange(-1, 25).Draw(t, "precision")
		size := rapid.SampledFrom([]int{32, 64}).Draw(t, "size")
		cell := strconv.FormatFloat(v, format, precision, size)
		if diff := sameAsStrconv(cell); diff != "" && !strings.Contains(cell, "Inf") {
			t.Fatalf("%q: %s", cell, diff)
		}
	})
}

func TestNumberIsThatOfStrconvAnyText(t *testing.T) {
	digits := rapid.StringMatching(`[+-]?[0-9]{0,20}(\.[0-9]{0,20})?([eE][+-]?[0-9]{0,4})?`)
	rapid.Check(t, func(t *rapid.T) {
		cell := digits.Draw(t, "cell")
		if diff := sameAsStrconv(cell); diff != "" {
			t.Fatalf("%q: %s", cell, diff)
		}
	})
}

func TestSignificantDigits(t *testing.T) {
	for _, c := range []struct {
		cell                  string
		significant, decimals int
	}{
		{"0", 0, 0}, {"0.000", 0, 3}, {"0.001000", 4, 6}, {"9.999", 4, 3}, {"10.000", 5, 3},
		{"1e-3", 1, 3}, {"1.5e2", 2, -1}, {"100", 3, 0}, {"0.00000000000000000001234", 17, 23},
	} {
		n, reason := parseNumber([]byte(c.cell))
		if reason != "" || n.significant() != c.significant || n.decimals != c.decimals {
			t.Errorf("%s: %d digits, %d decimals, %q", c.cell, n.significant(), n.decimals, reason)
		}
	}
	for m := uint64(1); m < 1e15; m *= 10 {
		if got, want := (number{mantissa: m}).significant(), len(strconv.FormatUint(m, 10)); got != want {
			t.Errorf("%d: %d digits", m, got)
		}
		if got, want := (number{mantissa: m*10 - 1}).significant(), len(strconv.FormatUint(m, 10)); got != want {
			t.Errorf("%d: %d digits", m*10-1, got)
		}
	}
}

func FuzzNumber(f *testing.F) {
	for _, c := range numberCells {
		f.Add(c)
	}
	f.Fuzz(func(t *testing.T, cell string) {
		if diff := sameAsStrconv(cell); diff != "" {
			t.Errorf("%q: %s", cell, diff)
		}
	})
}
