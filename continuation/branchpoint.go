package continuation

import (
	"errors"
	"fmt"
	"math"

	"brinkline/continuation/linalg"
)

// refineBranchPoint finds the simple stationary bifurcation on an arc on which the
// bordered determinant changes sign. There F_z = [f_x f_λ] has rank n-1: two null
// vectors on the right, one on the left that kills f_λ too. With G = F_z scaled,
//
//	F(z) + β b = 0,  g1(z) = g2(z) = 0,   [G b; Cᵀ 0] [φi; gi] = [0; ei],
//
// in the unknowns z and β, with gradients -ψᵀ F_zz[φi, ·], is regular where two
// branches cross with different tangents (Govaerts 2000, chapter 4); β vanishes at
// the solution.
func (t *tracer) refineBranchPoint(c *arc) (*node, error) {
	z, _ := c.at(0.5)
	a := t.fresh()
	t.place(a, z)
	if err := t.evaluate(a); err != nil {
		return nil, err
	}
	t.naturalRows()
	sys := &crossing{t: t, a: a, rows: append([]float64(nil), t.rows...)}
	if err := sys.frame(); err != nil {
		return nil, err
	}
	r, err := t.iterate(a, sys.step)
	if err != nil {
		return nil, err
	}
	if math.Abs(sys.beta) > crossingGap {
		return nil, &refusal{reason: fmt.Sprintf("the branches near %s pass each other without crossing", t.where(a))}
	}
	if err := t.within(c, a); err != nil {
		return nil, err
	}
	if err := sys.bordered(); err != nil {
		return nil, err
	}
	point, err := t.branchPoint(c, a, sys, r)
	if err != nil {
		return nil, err
	}
	a.iterations = r.iterations
	a.special = point
	return a, nil
}

// crossingGap is the largest |β|, relative to the terms of the equations, at which
// two branches are taken to cross and not to pass each other.
const crossingGap = 1e-12

// A crossing is the augmented system of two branches that cross.
type crossing struct {
	t    *tracer
	a    *node
	rows []float64    // sizes of the equations, held so that g is a smooth function
	b    []float64    // left border
	c    [2][]float64 // right borders
	phi  [2][]float64
	g    [2]float64
	psi  []float64
	beta float64
	lu   linalg.LU
	full linalg.LU
}

func (s *crossing) frame() error {
	left, right, err := extremes(s.t.scaledJacobian(), 2)
	if err != nil {
		return err
	}
	s.b, s.c = left, [2][]float64{right[0], right[1]}
	return nil
}

// bordered solves for both right vectors and the left one.
func (s *crossing) bordered() error {
	n, m := s.t.n, s.t.n+2
	a := s.lu.Matrix(m)
	clear(a)
	for i := range n {
		for k, size := range s.t.S {
			a[i*m+k] = s.t.jac[i*(n+1)+k] * size / s.t.rows[i]
		}
		a[i*m+n+1] = s.b[i]
	}
	copy(a[n*m:], s.c[0])
	copy(a[(n+1)*m:], s.c[1])
	if s.lu.Factor() != nil {
		return &refusal{reason: "more than two branches meet"}
	}
	for k := range s.phi {
		phi := make([]float64, m)
		phi[n+k] = 1
		s.lu.Solve(phi)
		s.phi[k], s.g[k] = phi[:n+1], phi[n+1]
	}
	psi := make([]float64, m)
	psi[n+1] = 1
	s.lu.SolveTransposed(psi)
	s.psi = psi[:n]
	return nil
}

// step returns Newton's correction of z and β, and applies that of β.
func (s *crossing) step() ([]float64, error) {
	t, n, m := s.t, s.t.n, s.t.n+2
	if err := t.evaluate(s.a); err != nil {
		return nil, err
	}
	copy(t.rows, s.rows)
	if err := s.bordered(); err != nil {
		return nil, err
	}
	j := s.full.Matrix(m)
	clear(j)
	d := make([]float64, m)
	for i := range n {
		for k, size := range t.S {
			j[i*m+k] = t.jac[i*(n+1)+k] * size / t.rows[i]
		}
		j[i*m+n+1] = s.b[i]
		d[i] = -t.f[i]/t.rows[i] - s.beta*s.b[i]
	}
	for k := range s.phi {
		gradient, err := t.adjoint(s.a, s.psi, s.phi[k])
		if err != nil {
			return nil, err
		}
		for l, v := range gradient {
			j[(n+k)*m+l] = -v
		}
		d[n+k] = -s.g[k]
	}
	if s.full.Factor() != nil {
		return nil, &refusal{reason: "the two branches touch instead of crossing"}
	}
	s.full.Solve(d)
	s.beta += d[n+1]
	return d, nil
}

// branchPoint makes the point of a refined node.
func (t *tracer) branchPoint(c *arc, a *node, s *crossing, r refined) (*BranchPoint, error) {
	n := t.n
	v := make([]float64, n)
	for i := range v { // the combination of both null vectors without λ
		v[i] = s.phi[0][i]*s.phi[1][n] - s.phi[1][i]*s.phi[0][n]
	}
	b := &BranchPoint{}
	b.Right, b.Left, _ = t.nullVectors(v, s.psi)
	scaled := 0.0
	for i := range n {
		b.RangeTest += b.Left[i] * t.jac[i*(n+1)+n]
		scaled += s.psi[i] * t.jac[i*(n+1)+n] * t.S[n] / t.rows[i]
	}
	b.RangeRelative = math.Abs(scaled) / norm(s.psi)
	if b.RangeRelative > 1e-6 {
		return nil, &refusal{reason: fmt.Sprintf("f_λ lies outside the range of f_x (%.2g)", b.RangeRelative)}
	}
	if err := t.settleSpectrum(a, 1); err != nil {
		return nil, err
	}
	b.scales, b.plan = t.S, t.plan
	if err := t.reduce(a, s, b); err != nil {
		if errors.Is(err, ErrInterrupted) {
			return nil, err
		}
		b.Reduced, b.Tangents = Reduced{}, [2][]float64{}
		t.notes = append(t.notes, fmt.Sprintf("the branches that cross at %s are not resolved: %v", t.where(a), err))
	}
	t.certify(c, a, &b.found, r)
	// Unlike a fold's, the error of the parameter is of first order in that of
	// the derivatives: the last correction shows it.
	b.Uncertainty = 4*math.Max(r.size, accuracy(t.s.diff))*t.S[n] + t.roundingOf(a.lambda)
	b.digits = reliableDigits(a.lambda, b.Uncertainty)
	return b, nil
}
