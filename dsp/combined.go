package dsp

import "math/cmplx"

// combined is the weighted least-squares fit of a sequence of part vectors by a
// constant (the machine's own vector) and lines.
type combined struct {
	s      *series
	hz     float64
	weight []float64 // sums to 1
	column [][]complex128
	// vector[0] is the constant, the others are the lines' amplitudes.
	vector   [1 + mostLine]complex128
	residual []complex128
	gram     [1 + mostLine][1 + mostLine]complex128
}

// newCombined prepares a fit; taper is a weight for each part beside its
// length, nil for none.
func newCombined(s *series, lines []aLine, hz float64, taper []float64) *combined {
	f := &combined{s: s, hz: hz, weight: make([]float64, len(s.centre)), residual: make([]complex128, len(s.centre))}
	sum := 0.0
	for k, l := range s.length {
		f.weight[k] = l
		if taper != nil {
			f.weight[k] *= taper[k]
		}
		sum += f.weight[k]
	}
	for k := range f.weight {
		f.weight[k] /= sum
	}
	one := make([]complex128, len(s.centre))
	for k := range one {
		one[k] = 1
	}
	f.column = append(f.column, one)
	for i, l := range lines {
		f.column = append(f.column, make([]complex128, len(s.centre)))
		f.fill(i+1, l)
	}
	f.normal()
	return f
}

// replace puts another line in place of line i.
func (f *combined) replace(i int, l aLine) {
	f.fill(i+1, l)
	f.normal()
}

func (f *combined) fill(column int, l aLine) {
	for k := range f.column[column] {
		f.column[column][k] = f.s.regressor(l, f.hz, k)
	}
}

// normal fills the lower half of the normal equations and factors it
// (Cholesky).
func (f *combined) normal() {
	for i := range f.column {
		for j := 0; j <= i; j++ {
			f.gram[i][j] = f.dot(f.column[j], f.column[i])
		}
	}
	n := len(f.column)
	for j := range n {
		for k := range j {
			f.gram[j][j] -= f.gram[j][k] * cmplx.Conj(f.gram[j][k])
		}
		// Two lines that have run into each other leave nothing of their own.
		f.gram[j][j] = cmplx.Sqrt(complex(max(real(f.gram[j][j]), 1e-9), 0))
		for i := j + 1; i < n; i++ {
			for k := range j {
				f.gram[i][j] -= f.gram[i][k] * cmplx.Conj(f.gram[j][k])
			}
			f.gram[i][j] /= f.gram[j][j]
		}
	}
}

// dot returns the weighted sum of conj(b)*a.
func (f *combined) dot(a, b []complex128) complex128 {
	var re, im float64
	for k, w := range f.weight {
		ar, ai, br, bi := real(a[k]), imag(a[k]), real(b[k]), imag(b[k])
		re += w * (ar*br + ai*bi)
		im += w * (ai*br - ar*bi)
	}
	return complex(re, im)
}

// solve fits z, which sets vector and residual.
func (f *combined) solve(z []complex128) {
	n := len(f.column)
	x := &f.vector
	for i := range n {
		x[i] = f.dot(z, f.column[i])
		for k := range i {
			x[i] -= f.gram[i][k] * x[k]
		}
		x[i] /= f.gram[i][i]
	}
	for i := n - 1; i >= 0; i-- {
		for k := i + 1; k < n; k++ {
			x[i] -= cmplx.Conj(f.gram[k][i]) * x[k]
		}
		x[i] /= cmplx.Conj(f.gram[i][i])
	}
	for k := range f.residual {
		r := z[k]
		for i := range n {
			r -= x[i] * f.column[i][k]
		}
		f.residual[k] = r
	}
}

// leftOver fits z and returns the share of its power that the fit leaves.
func (f *combined) leftOver(z []complex128) float64 {
	f.solve(z)
	return real(f.dot(f.residual, f.residual)) / real(f.dot(z, z))
}
