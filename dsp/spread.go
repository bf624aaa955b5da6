package dsp

import (
	"math"
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/dsp/fourier"
)

// spread judges how far the mean of a sequence of part vectors can be off, from
// the spectrum of what the fit left: the variance of a weighted mean is that
// spectrum weighed by the response of the weights. It serves to state the
// uncertainty and to choose between plain and tapered weights: the plain mean
// is best in white noise, the tapered one when a wandering neighbour or a slow
// change is left over.
type spread struct {
	fft     *fourier.CmplxFFT
	in, out []complex128
	density []float64
	// plain and tapered are the responses of the two sets of weights.
	plain, tapered []float64
}

func newSpread() *spread {
	return &spread{
		fft:     fourier.NewCmplxFFT(slots),
		in:      make([]complex128, slots),
		out:     make([]complex128, slots),
		density: make([]float64, slots),
		plain:   make([]float64, slots),
		tapered: make([]float64, slots),
	}
}

// hann fills w with a Hann taper over the middles of the parts.
func hann(s *series, w []float64) {
	last := len(s.centre) - 1
	start, end := s.centre[0]-s.length[0]/2, s.centre[last]+s.length[last]/2
	for k, t := range s.centre {
		sin := math.Sin(math.Pi * (t - start) / (end - start))
		w[k] = sin * sin
	}
}

// measure sets the density of the residual by a tapered periodogram. Near zero
// frequency, where the fit has taken it away, it takes the level beside.
func (sp *spread) measure(residual []complex128, taper []float64) {
	clear(sp.in)
	power := 0.0
	for k := range min(len(residual), slots) {
		sp.in[k] = residual[k] * complex(taper[k], 0)
		power += taper[k] * taper[k]
	}
	sp.fft.Coefficients(sp.out, sp.in)
	for m, c := range sp.out {
		sp.density[m] = (real(c)*real(c) + imag(c)*imag(c)) / power
	}
	// The taper's main lobe is two bins of 1/duration to each side.
	lobe := int(math.Ceil(2.5 * slots / float64(len(residual))))
	beside := 0.0
	for m := lobe; m < 5*lobe; m++ {
		beside += sp.density[m%slots] + sp.density[(slots-m)%slots]
	}
	beside /= float64(8 * lobe)
	for m := range lobe {
		sp.density[m] = beside
		sp.density[(slots-m)%slots] = beside
	}
}

// respond fills response with the power response of weights (their sum is 1)
// to the slots of the density.
func (sp *spread) respond(weight, response []float64) {
	clear(sp.in)
	for k := range min(len(weight), slots) {
		sp.in[k] = complex(weight[k], 0)
	}
	sp.fft.Coefficients(sp.out, sp.in)
	for m, c := range sp.out {
		response[m] = (real(c)*real(c) + imag(c)*imag(c)) / slots
	}
}

// variance returns the variance of the mean whose weights have the given
// response, for the density measured last.
func (sp *spread) variance(response []float64) float64 {
	v := 0.0
	for m, d := range sp.density {
		v += d * response[m]
	}
	return v
}

// median sorts x and returns its middle value.
func median(x []float64) float64 {
	slices.Sort(x)
	return x[len(x)/2]
}

// split returns the shares of the residual's power along the vector v and
// across it; they sum to 1.
func split(residual []complex128, v complex128) (along, across float64) {
	unit := cmplx.Conj(v) / complex(max(cmplx.Abs(v), 1e-300), 0)
	for _, r := range residual {
		r *= unit
		along += real(r) * real(r)
		across += imag(r) * imag(r)
	}
	if sum := along + across; sum > 0 {
		return along / sum, across / sum
	}
	return 0.5, 0.5
}

// wander returns the angular deviation, degrees, of the vector's lag over
// stretches of a few seconds, with what the noise from part to part explains
// taken off. residual is what the fit left around the vector v.
func wander(residual []complex128, v complex128, perStretch int) float64 {
	if perStretch < 1 || len(residual) < 4*perStretch {
		return 0
	}
	unit := cmplx.Conj(v) / complex(cmplx.Abs(v)*cmplx.Abs(v), 0)
	var lags Directions
	var noise, steps float64
	for k := 0; k+perStretch <= len(residual); k += perStretch {
		var sum complex128
		for i, r := range residual[k : k+perStretch] {
			sum += r
			if i > 0 {
				d := imag((r - residual[k+i-1]) * unit)
				noise += d * d / 2
				steps++
			}
		}
		lags.Add(-cmplx.Phase(1+sum*unit/complex(float64(perStretch), 0))*180/math.Pi, 1)
	}
	deviation := lags.Deviation()
	if steps == 0 {
		return deviation
	}
	noise *= 180 / math.Pi * 180 / math.Pi / steps / float64(perStretch)
	return math.Sqrt(max(0, deviation*deviation-noise))
}
