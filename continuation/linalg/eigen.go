package linalg

import (
	"cmp"
	"errors"
	"slices"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// Eigen computes eigenvalues of general matrices; it keeps its storage.
type Eigen struct {
	a, re, im, work []float64
}

var errEigen = errors.New("the eigenvalues did not converge")

// Values returns the eigenvalues of the n x n matrix a (row by row, not
// changed), by falling real part; of a pair the one with positive imaginary part
// first.
func (e *Eigen) Values(a []float64, n int) ([]complex128, error) {
	e.a = append(e.a[:0], a[:n*n]...)
	if len(e.re) < n {
		e.re, e.im, e.work = make([]float64, n), make([]float64, n), make([]float64, max(8*n, 1))
	}
	g := blas64.General{Rows: n, Cols: n, Stride: n, Data: e.a}
	none := blas64.General{Rows: n, Cols: n, Stride: 1}
	first := lapack64.Geev(lapack.LeftEVNone, lapack.RightEVNone, g, e.re[:n], e.im[:n], none, none, e.work, len(e.work))
	if first > 0 {
		return nil, errEigen
	}
	return sorted(e.re[:n], e.im[:n]), nil
}

// sorted joins real and imaginary parts, by falling real part; of a pair the one
// with positive imaginary part first.
func sorted(re, im []float64) []complex128 {
	values := make([]complex128, len(re))
	for i := range values {
		values[i] = complex(re[i], im[i])
	}
	slices.SortStableFunc(values, func(a, b complex128) int {
		return cmp.Or(cmp.Compare(real(b), real(a)), cmp.Compare(imag(b), imag(a)))
	})
	return values
}
