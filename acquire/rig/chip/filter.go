package chip

import "math"

// sincRate is the over-sampling ratio above which the sinc3 stays as it is and
// a sinc1 follows (section 8.3.7).
const sincRate = 1024

// kernel returns the weights of the decimation filter on a series of means,
// each over unit modulator periods, newest or oldest first alike. osr and
// unit are powers of two, unit <= osr and unit <= 1024.
//
// The filter's response to means cannot be exact, because a mean has already
// lost a little of the higher frequencies. Two ways to weigh the means miss
// the sinc3 in opposite senses: running sums of means read high by
// (pi f T)^2/3, T the length of a unit, the integral of the sinc3's impulse
// response over each unit reads low by the same. Their mean is off by the
// fourth order only: under 2e-6 at 120 Hz with 8 kHz steps, 2e-5 with 4 kHz.
func kernel(osr, unit int) []float64 {
	n := min(osr, sincRate) / unit
	w := make([]float64, 3*n)
	sums := runningSums(n)
	for j := range w {
		lo, hi := float64(j)/float64(n), float64(j+1)/float64(n)
		w[j] = (sums[j] + splineArea(hi) - splineArea(lo)) / 2
	}
	return average(w, max(1, osr/sincRate), n)
}

// runningSums is a mean over n, taken three times, the first of the three
// being the means themselves; 3n weights, the outermost two zero.
func runningSums(n int) []float64 {
	w := make([]float64, 3*n)
	for a := range n {
		for b := range n {
			for c := range n {
				w[1+a+b+c] += 1 / float64(n*n*n)
			}
		}
	}
	return w
}

// splineArea is the integral from 0 to u of the quadratic B-spline on [0, 3],
// the impulse response of the sinc3 with time in units of its first mean.
func splineArea(u float64) float64 {
	sum := 0.0
	for k, c := range [...]float64{1, -3, 3, -1} {
		if d := u - float64(k); d > 0 {
			sum += c * d * d * d
		}
	}
	return sum / 6
}

// average returns the weights of the mean of count outputs of w, each shift
// units after the one before, scaled to a sum of 1.
func average(w []float64, count, shift int) []float64 {
	all := make([]float64, len(w)+(count-1)*shift)
	for k := range count {
		for j, v := range w {
			all[k*shift+j] += v
		}
	}
	sum := 0.0
	for _, v := range all {
		sum += v
	}
	for j := range all {
		all[j] /= sum
	}
	return all
}

// noiseTable is table 7-1: noise with shorted inputs, volts rms, for the gains
// 1, 4 and 8 at 1, 2 and 4 kSPS with a clock of 8.192 MHz.
var noiseTable = [3][3]float64{
	{3.38e-6, 4.25e-6, 5.35e-6},
	{2.88e-6, 3.79e-6, 4.52e-6},
	{1.74e-6, 2.27e-6, 2.70e-6},
}

// startNoise is the noise of the first two samples after a reset, volts rms
// (section 6.5).
const startNoise = 1500e-6

// noise returns the input noise in volts rms. Gain 2 is taken between its
// neighbours, more than 8 as 8; slower than OSR 4096 by the table's own slope
// of a third of a power per octave, faster than 1024 as white noise.
func noise(gain, osr int) float64 {
	row := func(col int) float64 {
		switch gain {
		case 1:
			return noiseTable[0][col]
		case 2:
			return math.Sqrt(noiseTable[0][col] * noiseTable[1][col])
		case 4:
			return noiseTable[1][col]
		}
		return noiseTable[2][col]
	}
	switch {
	case osr < 1024:
		return row(2) * math.Sqrt(1024/float64(osr))
	case osr == 1024:
		return row(2)
	case osr == 2048:
		return row(1)
	}
	return row(0) * math.Cbrt(4096/float64(osr))
}
