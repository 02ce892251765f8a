package linalg

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// A Certificate proves how many eigenvalues of a matrix have a positive real part
// without computing them. With a symmetric P for which AᵀP + PA is negative
// definite, A has as many of them as P has negative eigenvalues (Ostrowski &
// Schneider, Some theorems on the inertia of general matrices, Journal of
// Mathematical Analysis and Applications 4 (1962) 72-84).
//
// P = -Σ u_k u_kᴴ / Re μ_k from the eigenvalues μ_k and left eigenvectors u_k of
// one matrix serves for matrices near it. As the condition is convex in A, P proves
// the count on the whole segment between two matrices for which it holds.
type Certificate struct {
	// Unstable is the number of eigenvalues with positive real part that P proves.
	Unstable int

	n                int
	valid            bool
	p, a, m          []float64
	re, im, vl, work []float64
}

// nearAxis is the real part, relative to the largest eigenvalue, below which an
// eigenvalue is too near the imaginary axis to found a proof on.
const nearAxis = 1e-9

// Renew computes the eigenvalues of the n x n matrix a, sorted as by
// [Eigen.Values], and takes the certificate from them. Where an eigenvalue lies on
// the imaginary axis there is none to take.
func (c *Certificate) Renew(a []float64, n int) ([]complex128, error) {
	c.grow(n)
	copy(c.a, a[:n*n])
	left := blas64.General{Rows: n, Cols: n, Stride: n, Data: c.vl}
	none := blas64.General{Rows: n, Cols: n, Stride: n}
	if n == 0 {
		return nil, nil
	}
	g := blas64.General{Rows: n, Cols: n, Stride: n, Data: c.a}
	if lapack64.Geev(lapack.LeftEVCompute, lapack.RightEVNone, g, c.re, c.im, left, none, c.work, len(c.work)) > 0 {
		c.valid = false
		return nil, errEigen
	}
	c.build()
	return sorted(c.re, c.im), nil
}

func (c *Certificate) grow(n int) {
	if c.n == n && c.p != nil {
		return
	}
	c.n = n
	c.p, c.a, c.m, c.vl = make([]float64, n*n), make([]float64, n*n), make([]float64, n*n), make([]float64, n*n)
	c.re, c.im, c.work = make([]float64, n), make([]float64, n), make([]float64, 8*n)
}

// build forms P from the eigenvalues and left eigenvectors at hand. LAPACK stores
// the vector of a complex pair as two columns, its real and imaginary parts.
func (c *Certificate) build() {
	size := 0.0
	for k := range c.re {
		size = math.Max(size, math.Hypot(c.re[k], c.im[k]))
	}
	c.valid, c.Unstable = true, 0
	clear(c.p)
	for k, re := range c.re {
		if math.Abs(re) <= nearAxis*size {
			c.valid = false
		}
		if re > 0 {
			c.Unstable++
		}
		// Both columns of a pair carry the weight of its one real part.
		c.addSquare(k, -1/re)
	}
}

// addSquare adds weight times the square of column k of the left vectors to P.
func (c *Certificate) addSquare(k int, weight float64) {
	n := c.n
	for i := range n {
		v := weight * c.vl[i*n+k]
		if v == 0 {
			continue
		}
		row := c.p[i*n : i*n+n]
		for j := range row {
			row[j] += v * c.vl[j*n+k]
		}
	}
}

// Holds reports whether the certificate proves the count for the n x n matrix a:
// a Cholesky factorisation of -(AᵀP + PA) decides.
func (c *Certificate) Holds(a []float64, n int) bool {
	if !c.valid || n != c.n {
		return false
	}
	c.product(a)
	for i := range n {
		for j := range i + 1 {
			v := -(c.m[i*n+j] + c.m[j*n+i])
			c.m[i*n+j], c.m[j*n+i] = v, v
		}
	}
	return c.cholesky()
}

// product stores (PA)ᵀ in m. Row j of it is the sum of a_kj times row k of the
// symmetric P, so zeros of a, of which large systems have many, cost nothing.
func (c *Certificate) product(a []float64) {
	n := c.n
	if n >= 24 && filled(a[:n*n]) > n*n/4 {
		g := func(d []float64) blas64.General { return blas64.General{Rows: n, Cols: n, Stride: n, Data: d} }
		blas64.Gemm(blas.Trans, blas.NoTrans, 1, g(a[:n*n]), g(c.p), 0, g(c.m))
		return
	}
	clear(c.m)
	for k := range n {
		p := c.p[k*n : k*n+n]
		for j, v := range a[k*n : k*n+n] {
			if v == 0 {
				continue
			}
			row := c.m[j*n : j*n+n]
			for i := range row {
				row[i] += v * p[i]
			}
		}
	}
}

// filled counts what is not zero.
func filled(a []float64) int {
	count := 0
	for _, v := range a {
		if v != 0 {
			count++
		}
	}
	return count
}

// cholesky reports whether m is positive definite by more than rounding.
func (c *Certificate) cholesky() bool {
	n := c.n
	if n >= 24 {
		for i := range n {
			c.m[i*n+i] *= 1 - 1e-12
		}
		_, ok := lapack64.Potrf(blas64.Symmetric{N: n, Stride: n, Data: c.m, Uplo: blas.Lower})
		return ok
	}
	for j := range n {
		pivot := c.m[j*n+j]
		least := 1e-12 * pivot
		for k := range j {
			pivot -= c.m[j*n+k] * c.m[j*n+k]
		}
		if !(pivot > least) || pivot <= 0 {
			return false
		}
		root := math.Sqrt(pivot)
		c.m[j*n+j] = root
		for i := j + 1; i < n; i++ {
			v := c.m[i*n+j]
			for k := range j {
				v -= c.m[i*n+k] * c.m[j*n+k]
			}
			c.m[i*n+j] = v / root
		}
	}
	return true
}
