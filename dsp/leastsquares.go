package dsp

import "math"

// unknowns is the number of unknowns of a part's fit: a constant, and cosine
// and sine of each order.
const unknowns = 1 + 2*Orders

// normal is the symmetric matrix of the normal equations, then its factor with
// the reciprocals of the diagonal.
type normal [unknowns][unknowns]float64

// build fills the matrix from the sums over the rows of samples of
// cos(n*theta) and sin(n*theta), n = 0 to 2*Orders, by
// cos a cos b = (cos(a-b) + cos(a+b))/2 and its kin. Rows and columns from m on
// are those of the unit matrix: orders that the sample rate does not allow.
func (a *normal) build(m int, c, s *[2*Orders + 1]float64) {
	*a = normal{}
	for i := range unknowns {
		if i >= m {
			a[i][i] = 1
			continue
		}
		for j := 0; j <= i; j++ {
			a[i][j] = product(i, j, c, s)
		}
	}
}

// product returns the sum of the product of the columns i >= j: column 0 is
// the constant, 2n-1 is cos(n*theta), 2n is sin(n*theta).
func product(i, j int, c, s *[2*Orders + 1]float64) float64 {
	n, k := (i+1)/2, (j+1)/2
	iSin, jSin := i > 0 && i%2 == 0, j > 0 && j%2 == 0
	switch {
	case !iSin && !jSin:
		return (c[n-k] + c[n+k]) / 2
	case iSin && jSin:
		return (c[n-k] - c[n+k]) / 2
	case iSin:
		return (s[n+k] + s[n-k]) / 2
	default: // cos(n) sin(k)
		return (s[n+k] - s[n-k]) / 2
	}
}

// factor replaces the matrix by its Cholesky factor; false means that the
// samples do not determine the unknowns.
func (a *normal) factor() bool {
	for j := range unknowns {
		d := a[j][j]
		for k := range j {
			d -= a[j][k] * a[j][k]
		}
		if !(d > leastPivot*a[j][j]) {
			return false
		}
		d = 1 / math.Sqrt(d)
		a[j][j] = d
		for i := j + 1; i < unknowns; i++ {
			v := a[i][j]
			for k := range j {
				v -= a[i][k] * a[j][k]
			}
			a[i][j] = v * d
		}
	}
	return true
}

// leastPivot is the share of a column's power that must be its own. Whole
// turns give nearly 1; samples at the same few angles of every turn give 0.
const leastPivot = 0.01

// solve replaces y by the solution.
func (a *normal) solve(y *[unknowns]float64) {
	for i := range unknowns {
		v := y[i]
		for k := range i {
			v -= a[i][k] * y[k]
		}
		y[i] = v * a[i][i]
	}
	for i := unknowns - 1; i >= 0; i-- {
		v := y[i] * a[i][i]
		y[i] = v
		for k := range i {
			y[k] -= a[i][k] * v
		}
	}
}
