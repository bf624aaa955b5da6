package rig

import (
	"errors"
	"math"
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// eigenvalues returns those of the machine turning at omega, rad/s, as the
// eigenvalues of [0 I; -K/M -(C+wG)/M], rad/s.
func eigenvalues(m *matrices, omega float64, undamped bool) ([]complex128, error) {
	var free []int
	for i := range dofs {
		if !m.held[i] {
			free = append(free, i)
		}
	}
	n := len(free)
	a := mat.NewDense(2*n, 2*n, nil)
	for r, i := range free {
		a.Set(r, n+r, 1)
		for s, j := range free {
			damping := omega * m.gyroscopic(i, j)
			if !undamped {
				damping += m.c[i][j]
			}
			a.Set(n+r, s, -m.k[i][j]/m.mass[i])
			a.Set(n+r, n+s, -damping/m.mass[i])
		}
	}
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		return nil, errors.New("rig: the eigenvalues of the machine could not be found")
	}
	return e.Values(nil), nil
}

// spectralRadius returns the greatest magnitude of an eigenvalue, rad/s.
func spectralRadius(m *matrices, omega float64) (float64, error) {
	values, err := eigenvalues(m, omega, false)
	r := 0.0
	for _, v := range values {
		r = max(r, cmplx.Abs(v))
	}
	return r, err
}

// NaturalRPM returns the natural frequencies of the machine while it turns at a
// speed (both r/min), undamped, rising; motions without a spring are left out.
func (c Config) NaturalRPM(rpmNow float64) ([]float64, error) {
	values, err := eigenvalues(assemble(&c), rpmNow*rpm, true)
	if err != nil {
		return nil, err
	}
	var list []float64
	for _, v := range values {
		if f := imag(v); f > 1e-3 {
			list = append(list, f/rpm)
		}
	}
	slices.Sort(list)
	return list, nil
}

// clearOf returns the smallest relative distance of a frequency in list to f.
func clearOf(list []float64, f float64) float64 {
	d := math.Inf(1)
	for _, x := range list {
		d = min(d, math.Abs(x-f)/f)
	}
	return d
}
