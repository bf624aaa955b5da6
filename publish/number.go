package publish

import "math"

// round rounds to a number of decimals. JSON has no word for what is not a
// finite number; it becomes 0 where a field must be there (see measured for
// those that may be left out).
func round(x float64, decimals int) float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0
	}
	p := math.Pow10(decimals)
	if r := math.Round(x*p) / p; !math.IsInf(r, 0) {
		return r + 0 // no negative zero
	}
	return x
}

// measured is round for a field that may be left out: nil when x is not a
// finite number.
func measured(x float64, decimals int) *float64 {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return nil
	}
	r := round(x, decimals)
	return &r
}

// lag rounds an angle to 0.01 degree in the range 0 <= lag < 360.
func lag(deg float64) float64 {
	r := round(math.Mod(deg, 360), 2)
	if r < 0 {
		r = round(r+360, 2)
	}
	if r >= 360 {
		return 0
	}
	return r
}

// share rounds a share down, so that one lost sample in a minute does not read
// as none.
func share(x float64) float64 {
	if math.IsNaN(x) || x <= 0 {
		return 0
	}
	return math.Floor(min(x, 1)*1e6+1e-6) / 1e6
}

func finite(xs ...float64) bool {
	for _, x := range xs {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return false
		}
	}
	return true
}
