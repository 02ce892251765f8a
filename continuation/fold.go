package continuation

import (
	"errors"
	"fmt"
	"math"

	"brinkline/continuation/linalg"
)

// refineFold finds the fold on an arc on which dλ/ds changes sign, by Newton's
// method on the minimally augmented system (Griewank & Reddien, SIAM Journal on
// Numerical Analysis 21 (1984) 176-185; Govaerts, Numerical Methods for
// Bifurcations of Dynamical Equilibria, 2000, chapter 4):
//
//	F(z) = 0,  g(z) = 0,   [A b; cᵀ 0] [v; g] = [0; 1],  A = f_x scaled,
//
// with gradient g_z = -wᵀ A_z v, where wᵀ is the last row of the inverse of the
// bordered matrix. It is regular at a fold.
func (t *tracer) refineFold(c *arc) (*node, error) {
	z, _ := c.at(c.turn(t.n))
	a := t.fresh()
	t.place(a, z)
	if err := t.evaluate(a); err != nil {
		return nil, err
	}
	t.naturalRows()
	sys := &foldSystem{t: t, a: a, rows: append([]float64(nil), t.rows...)}
	if err := sys.frame(); err != nil {
		return nil, err
	}
	r, err := t.iterate(a, sys.step)
	if err != nil {
		return nil, err
	}
	if err := t.within(c, a); err != nil {
		return nil, err
	}
	if err := sys.bordered(); err != nil {
		return nil, err
	}
	a.iterations = r.iterations
	fold, err := t.fold(c, a, sys, r)
	if err != nil {
		return nil, err
	}
	a.special = fold
	return a, nil
}

// turn returns the fraction of the arc at which component i of the tangent is
// zero: the root of the derivative of the cubic.
func (c *arc) turn(i int) float64 {
	low, high := 0.0, 1.0
	below := c.a.t[i] < 0
	for range 50 {
		mid := (low + high) / 2
		if _, d := c.at(mid); (d[i] < 0) == below {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2
}

// A foldSystem is the minimally augmented system at a node.
type foldSystem struct {
	t    *tracer
	a    *node
	rows []float64 // sizes of the equations, held so that g is a smooth function
	b, c []float64 // border of the scaled f_x
	v, w []float64 // scaled null vectors of the bordered matrix
	g    float64
	lu   linalg.LU // of the bordered matrix
	full linalg.LU // of Newton's matrix
}

// frame chooses the borders: the singular vectors of the smallest singular value
// make the bordered matrix as regular as can be.
func (s *foldSystem) frame() error {
	g := s.t.scaledJacobian()
	left, right, err := extremes(g.Slice(0, s.t.n, 0, s.t.n), 1)
	if err != nil {
		return err
	}
	s.b, s.c = left, right[0]
	return nil
}

// bordered solves for v, g and w at the node, whose Jacobian is at hand.
func (s *foldSystem) bordered() error {
	n, m := s.t.n, s.t.n+1
	a := s.lu.Matrix(m)
	for i := range n {
		for k := range n {
			a[i*m+k] = s.t.jac[i*m+k] * s.t.S[k] / s.t.rows[i]
		}
		a[i*m+n] = s.b[i]
	}
	copy(a[n*m:], s.c)
	a[n*m+n] = 0
	if s.lu.Factor() != nil {
		return &refusal{reason: "two eigenvalues vanish together"}
	}
	s.v, s.w = make([]float64, m), make([]float64, m)
	s.v[n], s.w[n] = 1, 1
	s.lu.Solve(s.v)
	s.lu.SolveTransposed(s.w)
	s.g = s.v[n]
	return nil
}

// step returns Newton's correction of z.
func (s *foldSystem) step() ([]float64, error) {
	t, n, m := s.t, s.t.n, s.t.n+1
	if err := t.evaluate(s.a); err != nil {
		return nil, err
	}
	copy(t.rows, s.rows)
	if err := s.bordered(); err != nil {
		return nil, err
	}
	v := append(append([]float64(nil), s.v[:n]...), 0)
	gradient, err := t.adjoint(s.a, s.w[:n], v)
	if err != nil {
		return nil, err
	}
	j := s.full.Matrix(m)
	d := make([]float64, m)
	for i := range n {
		for k, size := range t.S {
			j[i*m+k] = t.jac[i*m+k] * size / t.rows[i]
		}
		d[i] = -t.f[i] / t.rows[i]
	}
	for k := range m {
		j[n*m+k] = -gradient[k]
	}
	d[n] = -s.g
	if s.full.Factor() != nil {
		return nil, &refusal{reason: "the fold is degenerate (a cusp is near)"}
	}
	s.full.Solve(d)
	return d, nil
}

// insideRange is the size below which wᵀ f_λ, relative to its natural size, counts
// as zero: f_λ in the range of f_x.
const insideRange = 1e-7

// fold makes the fold of a refined node.
func (t *tracer) fold(c *arc, a *node, s *foldSystem, r refined) (*Fold, error) {
	n, m := t.n, t.n+1
	f := &Fold{}
	f.Right, f.Left, f.WeakLeft = t.nullVectors(s.v[:n], s.w[:n])
	scaled, size := 0.0, norm(s.w[:n])
	for i := range n {
		f.RangeTest += f.Left[i] * t.jac[i*m+n]
		scaled += s.w[i] * t.jac[i*m+n] * t.S[n] / t.rows[i]
	}
	// The equations are scaled to terms of size 1, and λ to its range.
	f.RangeRelative = math.Abs(scaled) / size
	if f.RangeRelative < insideRange {
		return nil, &refusal{reason: fmt.Sprintf("f_λ lies in the range of f_x (%.2g)", f.RangeRelative)}
	}
	var err error
	if f.Quadratic, err = t.quadratic(a, f.Left, f.Right); err != nil {
		return nil, err
	}
	f.Curvature = -f.Quadratic / f.RangeTest
	if f.Cubic, err = t.cubic(a, f, s); err != nil {
		return nil, err
	}
	if f.sensitivities, err = t.sensitivities(a, f); err != nil {
		return nil, err
	}
	if err := t.settleSpectrum(a, 1); err != nil {
		return nil, err
	}
	t.certify(c, a, &f.found, r)
	f.Uncertainty = t.foldUncertainty(a, f, r)
	f.digits = reliableDigits(a.lambda, f.Uncertainty)
	return f, nil
}

// certify fills in what all special points have in common.
func (t *tracer) certify(c *arc, a *node, f *found, r refined) {
	f.point = t.point(a)
	f.UnstableBefore, f.UnstableAfter = c.a.unstable, c.b.unstable
	f.Iterations = r.iterations
}

// quadratic returns 1/2 wᵀ f_xx[v, v].
func (t *tracer) quadratic(a *node, w, v []float64) (float64, error) {
	out := make([]float64, t.n)
	along := append(append([]float64(nil), v...), 0)
	t.s.p[t.s.free] = a.lambda
	if err := t.s.diff.Second(a.x, t.s.p, t.s.free, along, out); err != nil {
		return 0, t.refuse(err)
	}
	return dot(w, out) / 2, nil
}

// cubic returns the cubic coefficient of a fold, with the factors of the bordered
// matrix at hand.
func (t *tracer) cubic(a *node, f *Fold, s *foldSystem) (float64, error) {
	forms := t.forms(a)
	v := state(f.Right)
	vv, err := forms.square(v)
	if err != nil {
		return 0, err
	}
	h := make([]float64, t.n+1)
	for i, x := range vv {
		h[i] = -x / s.rows[i]
	}
	s.lu.Solve(h)
	h = h[:t.n]
	for i := range h {
		h[i] *= t.S[i]
	}
	along := dot(f.Right, h)
	for i := range h {
		h[i] -= along * f.Right[i]
	}
	vvv, err := forms.cube(v)
	var domain *refusal
	if errors.As(err, &domain) {
		return math.NaN(), nil
	}
	if err != nil {
		return 0, err
	}
	vh, err := forms.product(v, state(h))
	if err != nil {
		return 0, err
	}
	return (dot(f.Left, vvv) + 3*dot(f.Left, vh)) / 6, nil
}

// sensitivities returns dλ*/dp_j = -(wᵀ f_{p_j}) / (wᵀ f_λ) for every parameter,
// -1 standing for λ itself. It is 0 where the whole of p_j moves wᵀ f by no more
// than the rounding of f: a heat capacity that only slows the model down.
func (t *tracer) sensitivities(a *node, f *Fold) ([]float64, error) {
	list, col := make([]float64, len(t.s.p)), make([]float64, t.n)
	t.s.p[t.s.free] = a.lambda
	noise := t.rounding(a, f.Left)
	for j := range list {
		if err := t.s.diff.Parameter(a.x, t.s.p, j, col); err != nil {
			return nil, t.refuse(err)
		}
		if slope := dot(f.Left, col); math.Abs(slope*t.s.p[j]) > noise || t.s.p[j] == 0 {
			list[j] = -slope / f.RangeTest
		}
	}
	return list, nil
}

// foldUncertainty estimates the error of λ*: what the rounding of f makes of it,
// the last correction, and the square of what is left in the state along v.
func (t *tracer) foldUncertainty(a *node, f *Fold, r refined) float64 {
	along := 0.0
	for i := range t.n {
		along += math.Abs(r.last[i]) * t.S[i] * math.Abs(f.Right[i])
	}
	e := t.rounding(a, f.Left)/math.Abs(f.RangeTest) + math.Abs(f.Curvature)*along*along
	return e + math.Min(math.Abs(r.last[t.n]), r.size*r.size)*t.S[t.n] + t.roundingOf(a.lambda)
}
