package ads131m08

import "math"

// sincRatio is the over-sampling ratio above which the third-order sinc stays
// as it is and a first-order one follows (section 8.3.7, table 8-2).
const sincRatio = 1024

// Response returns the amplitude response of the decimation filter at hz (Hz)
// for a clock of clockHz (Hz) and an over-sampling ratio of 128, 256 ... 16384;
// 1 at 0 Hz. With f_MOD = clockHz/2 and R = min(osr, 1024) it is
//
//	|sin(pi f R/f_MOD) / (R sin(pi f/f_MOD))|^3
//
// times, for osr > 1024 and N = osr/1024,
//
//	|sin(pi f N R/f_MOD) / (N sin(pi f R/f_MOD))|.
func Response(clockHz float64, osr int, hz float64) float64 {
	x := math.Pi * hz / (clockHz / 2)
	r := min(osr, sincRatio)
	g := math.Abs(dirichlet(x, r))
	return g * g * g * math.Abs(dirichlet(x*float64(r), osr/r))
}

// dirichlet is sin(n x)/(n sin x), +-1 where sin x is 0: the response of a
// mean over n values.
func dirichlet(x float64, n int) float64 {
	s := math.Sin(x)
	if math.Abs(s) < 1e-12 {
		return 1
	}
	return math.Sin(float64(n)*x) / (float64(n) * s)
}

// Delay returns the delay of the decimation filter in seconds, the same at
// every frequency: half the length of its impulse response.
func Delay(clockHz float64, osr int) float64 {
	r := min(osr, sincRatio)
	periods := 3*float64(r-1)/2 + float64(osr-r)/2
	return periods / (clockHz / 2)
}
