// Package linalg holds the linear algebra of continuation: factored square
// systems with the sign of their determinant, and eigenvalues. LAPACK as
// translated by gonum does the work.
package linalg

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// ErrSingular says that a matrix is singular to working precision.
var ErrSingular = errors.New("the matrix is singular")

// LU holds the factors of an n x n matrix. Its storage is reused by the next
// call to Factor.
type LU struct {
	n     int
	a     []float64
	pivot []int
	norm  float64 // of the matrix, largest column sum
}

// Matrix returns n x n storage, row by row, to be filled before Factor.
func (f *LU) Matrix(n int) []float64 {
	if cap(f.a) < n*n {
		f.a = make([]float64, n*n)
		f.pivot = make([]int, n)
	}
	f.n = n
	f.a = f.a[:n*n]
	f.pivot = f.pivot[:n]
	return f.a
}

// Factor factors what stands in the storage of Matrix.
func (f *LU) Factor() error {
	f.norm = f.columnSum()
	if !lapack64.Getrf(f.general(), f.pivot) {
		return ErrSingular
	}
	return nil
}

func (f *LU) columnSum() float64 {
	worst := 0.0
	for j := range f.n {
		sum := 0.0
		for i := range f.n {
			sum += math.Abs(f.a[i*f.n+j])
		}
		worst = math.Max(worst, sum)
	}
	return worst
}

func (f *LU) general() blas64.General {
	return blas64.General{Rows: f.n, Cols: f.n, Stride: f.n, Data: f.a}
}

// Solve overwrites b by the solution of A x = b.
func (f *LU) Solve(b []float64) { f.solve(blas.NoTrans, b) }

// SolveTransposed overwrites b by the solution of Aᵀ x = b.
func (f *LU) SolveTransposed(b []float64) { f.solve(blas.Trans, b) }

func (f *LU) solve(t blas.Transpose, b []float64) {
	lapack64.Getrs(t, f.general(), blas64.General{Rows: f.n, Cols: 1, Stride: 1, Data: b}, f.pivot)
}

// Sign returns the sign of the determinant, +1 or -1, and 0 when a pivot is 0.
func (f *LU) Sign() int {
	sign := 1
	for i, p := range f.pivot {
		if p != i {
			sign = -sign
		}
		switch d := f.a[i*f.n+i]; {
		case d < 0:
			sign = -sign
		case d == 0:
			return 0
		}
	}
	return sign
}

// Condition estimates the condition number in the norm of column sums.
func (f *LU) Condition() float64 {
	work, iwork := make([]float64, 4*f.n), make([]int, f.n)
	reciprocal := lapack64.Gecon(lapack.MaxColumnSum, f.general(), f.norm, work, iwork)
	if reciprocal == 0 {
		return math.Inf(1)
	}
	return 1 / reciprocal
}
