package recording

import (
	"bytes"
	"math/bits"
	"strconv"
)

// number is a decimal number found in a cell.
type number struct {
	value float64
	// mantissa is the number's digits without point and exponent; 0 when there
	// are more than fit.
	mantissa uint64
	// decimals is the place of the last digit written: 3 for 0.120, -2 for 1e2.
	decimals int
}

// pow10 holds the powers of ten that a float64 holds exactly.
var pow10 = [...]float64{
	1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
}

// scanPlain reads the number that starts at b[i] and ends at a comma or the
// end of b; next is where it ends. ok is false when it is not a plain number
// or not one whose value one operation gives exactly rounded; scanCell then
// knows more. With a mantissa up to 2^53 and a power of ten up to 22 both are
// exact, so that one division or product rounds once, as strconv does
// (W. D. Clinger, How to Read Floating Point Numbers Accurately, 1990).
func scanPlain(b []byte, i int) (n number, next int, ok bool) {
	negative := i < len(b) && b[i] == '-'
	if negative {
		i++
	}
	var m uint64
	start := i
	for i < len(b) && b[i]-'0' < 10 {
		m = m*10 + uint64(b[i]-'0')
		i++
	}
	digits, fraction := i-start, 0
	if i < len(b) && b[i] == '.' {
		i++
		start = i
		for i < len(b) && b[i]-'0' < 10 {
			m = m*10 + uint64(b[i]-'0')
			i++
		}
		fraction = i - start
		digits += fraction
	}
	if digits == 0 || digits > 18 || m > 1<<53 {
		return number{}, i, false
	}
	if i < len(b) && b[i] != ',' {
		exponent, end, ok := scanExponent(b, i)
		if !ok {
			return number{}, i, false
		}
		fraction -= exponent
		i = end
	}
	v := float64(m)
	switch {
	case fraction > 22 || fraction < -22:
		return number{}, i, false
	case fraction > 0:
		v /= pow10[fraction]
	case fraction < 0:
		v *= pow10[-fraction]
	}
	if negative {
		v = -v
	}
	return number{value: v, mantissa: m, decimals: fraction}, i, true
}

// scanExponent reads an exponent of one to three digits that starts at b[i]
// and ends at a comma or the end of b.
func scanExponent(b []byte, i int) (exponent, next int, ok bool) {
	if b[i] != 'e' && b[i] != 'E' {
		return 0, i, false
	}
	i++
	negative := i < len(b) && b[i] == '-'
	if i < len(b) && (b[i] == '-' || b[i] == '+') {
		i++
	}
	start := i
	for i < len(b) && i-start < 3 && b[i]-'0' < 10 {
		exponent = exponent*10 + int(b[i]-'0')
		i++
	}
	if i == start || i < len(b) && b[i] != ',' {
		return 0, i, false
	}
	if negative {
		exponent = -exponent
	}
	return exponent, i, true
}

// parseNumber reads a whole cell without blanks and quotes. An empty reason
// means that it is a number; the value may still be infinite by overflow.
func parseNumber(cell []byte) (n number, reason string) {
	if n, end, ok := scanPlain(cell, 0); ok && end == len(cell) {
		return n, ""
	}
	decimals, ok := grammar(cell)
	if !ok {
		return number{}, notNumber(cell)
	}
	// An error can only be one of range here, and then the value says so.
	v, _ := strconv.ParseFloat(string(cell), 64)
	return number{value: v, decimals: decimals}, ""
}

// grammar says whether cell is a decimal number: sign, digits with a point,
// exponent. strconv allows more (hexadecimal, inf, nan). It also returns the
// place of the last digit.
func grammar(cell []byte) (decimals int, ok bool) {
	rest := bytes.TrimLeft(cell, "+-")
	if len(cell)-len(rest) > 1 {
		return 0, false
	}
	mantissa, exponent := rest, []byte(nil)
	if e := bytes.IndexAny(rest, "eE"); e >= 0 {
		mantissa, exponent = rest[:e], rest[e+1:]
		if !digitsAfterSign(exponent) {
			return 0, false
		}
		// Out of range the power is cut to the largest int, far enough.
		power, _ := strconv.Atoi(string(exponent))
		decimals = -power
	}
	whole, fraction, _ := bytes.Cut(mantissa, []byte{'.'})
	decimals += len(fraction)
	return decimals, len(whole)+len(fraction) > 0 && allDigits(whole) && allDigits(fraction)
}

// digitsAfterSign says whether b is at least one digit behind at most one sign.
func digitsAfterSign(b []byte) bool {
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		b = b[1:]
	}
	return len(b) > 0 && allDigits(b)
}

// allDigits says whether b holds nothing but decimal digits.
func allDigits(b []byte) bool {
	for _, c := range b {
		if c-'0' >= 10 {
			return false
		}
	}
	return true
}

// notNumber says why cell is not accepted as a number.
func notNumber(cell []byte) string {
	if len(cell) == 0 {
		return "the cell is empty"
	}
	bare := bytes.ToLower(bytes.TrimLeft(cell, "+-"))
	switch {
	case bytes.HasPrefix(bare, []byte("nan")), bytes.HasPrefix(bare, []byte("inf")):
		return clip(cell) + " is not a finite number"
	case bytes.HasPrefix(bare, []byte("0x")):
		return clip(cell) + " is hexadecimal, allowed are decimal numbers"
	}
	return clip(cell) + " is not a decimal number"
}

// significant returns the number of digits of n from the first that is not 0;
// 17, all that a float64 tells apart, when they are too many to count.
func (n number) significant() int {
	if n.mantissa == 0 {
		if n.value != 0 {
			return 17
		}
		return 0
	}
	// 1233/4096 is log10(2) closely enough for 64 bits.
	d := bits.Len64(n.mantissa) * 1233 >> 12
	if float64(n.mantissa) >= pow10[d] {
		d++
	}
	return d
}
