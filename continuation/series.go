package continuation

import (
	"errors"
	"fmt"
	"math"

	"brinkline/continuation/linalg"
)

// A Series is the Taylor polynomial of a branch at one of its points,
//
//	z(s) = c_0 + c_1 s + c_2 s² + ... + c_K s^K,  z = (x, λ)
//
// with an error of the order s^(K+1) for |s| below the radius of convergence.
type Series struct {
	// Variables are the states, in the order of the model, and the parameter.
	Variables []Variable
	// By is the variable whose change is s; empty when s is arclength.
	By string
	// Coefficients holds c_k in the user's units: n states, then the parameter.
	Coefficients [][]float64
	// Radius estimates the radius of convergence by the decay of the last
	// coefficients; it is infinite where they vanish. The nearest fold, in the
	// complex plane too, is such a distance away in the parameter.
	Radius float64
}

// Series returns the Taylor polynomial of the branch through the point. by names
// the parameter or the state that is the local parameter; the empty string
// stands for arclength in the variables scaled by their typical sizes, in the
// direction of the point's tangent. It needs exact derivatives: see [WithSource].
//
// The coefficients solve the bordered linear systems that order k of
// f(z(s)) = 0 gives, all with one matrix.
func (p *Point) Series(order int, by string) (*Series, error) {
	b, err := p.seriesBuilder(order, by)
	if err != nil {
		return nil, fmt.Errorf("Series: %w", err)
	}
	for k := 1; k <= order; k++ {
		b.extend(k)
	}
	s := &Series{By: by, Coefficients: b.path, Radius: b.radius()}
	s.Variables = append(p.model.States(), p.model.parameters[b.free].Variable)
	for _, c := range s.Coefficients {
		for i, v := range c {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, fmt.Errorf("Series: the coefficients of %s do not exist here", s.Variables[i].Name)
			}
		}
	}
	return s, nil
}

// At returns z(s): n states, then the parameter.
func (s *Series) At(t float64) []float64 {
	z := make([]float64, len(s.Variables))
	for k := len(s.Coefficients) - 1; k >= 0; k-- {
		for i, c := range s.Coefficients[k] {
			z[i] = z[i]*t + c
		}
	}
	return z
}

// expander gives coefficient k of f along a path.
type expander interface {
	Expand(k int, path [][]float64, p, out []float64)
}

type seriesBuilder struct {
	n, free int
	fixed   int // index of the local parameter in z, -1 for arclength
	weight  []float64
	p       []float64
	path    [][]float64
	f       expander
	lu      linalg.LU
	rhs     []float64
}

func (p *Point) seriesBuilder(order int, by string) (*seriesBuilder, error) {
	if order < 1 {
		return nil, fmt.Errorf("the order is %d; at least 1 is wanted", order)
	}
	b := &seriesBuilder{n: len(p.State), free: p.free, fixed: -1, p: p.Parameters}
	if by != "" {
		if i := find(p.model.states, by); i >= 0 {
			b.fixed = i
		} else {
			j, err := p.model.parameterIndex(by)
			if err != nil {
				return nil, unknown("state or parameter", by, append(p.model.States(), p.model.parameterVariables()...))
			}
			b.fixed, b.free = b.n, j
		}
	}
	if b.free < 0 {
		return nil, errors.New("the point lies on no branch; name a parameter")
	}
	s := newSystem(p.model, p.State, p.Parameters, b.free)
	run, ok := s.diff.(*exactRun)
	if !ok || !run.ready(p.State, p.Parameters) {
		return nil, fmt.Errorf("it needs exact derivatives; the model has %s", p.model.DerivativesNote())
	}
	e, err := run.program.NewTaylor(b.free, order)
	if err != nil {
		return nil, err
	}
	b.f = e
	b.start(p, order)
	return b, b.factor(p, s)
}

// start makes room for the coefficients; the point is the first.
func (b *seriesBuilder) start(p *Point, order int) {
	b.path = make([][]float64, order+1)
	for k := range b.path {
		b.path[k] = make([]float64, b.n+1)
	}
	copy(b.path[0], p.State)
	b.path[0][b.n] = p.Parameters[b.free]
	b.rhs = make([]float64, b.n+1)
	b.f.Expand(0, b.path, b.p, b.rhs[:b.n])
}

// factor factors [f_x f_λ; c], in which c picks the local parameter, or is the
// tangent. Columns are scaled by typical sizes.
func (b *seriesBuilder) factor(p *Point, s *system) error {
	n := b.n
	b.weight = make([]float64, n+1)
	for i := range n {
		b.weight[i] = math.Max(s.sx[i], math.Abs(p.State[i]))
		if p.sizes != nil {
			b.weight[i] = p.sizes.states[i]
		}
	}
	b.weight[n] = s.sp[b.free]
	if p.sizes != nil && b.free == p.free {
		b.weight[n] = p.sizes.parameter
	}
	jac := make([]float64, n*(n+1))
	if err := s.diff.Jacobian(p.State, p.Parameters, b.free, jac); err != nil {
		return err
	}
	border := make([]float64, n+1)
	switch {
	case b.fixed >= 0:
		border[b.fixed] = 1
	case p.Tangent == nil || b.free != p.free:
		return errors.New("the point lies on no branch; name a state or parameter as local parameter")
	default:
		for i, v := range p.Tangent {
			border[i] = v / b.weight[i]
		}
		length := norm(border)
		for i := range border {
			border[i] /= length
		}
	}
	a := b.lu.Matrix(n + 1)
	for i := range n {
		for k := range n + 1 {
			a[i*(n+1)+k] = jac[i*(n+1)+k] * b.weight[k]
		}
	}
	copy(a[n*(n+1):], border)
	if err := b.lu.Factor(); err != nil {
		return fmt.Errorf("%w: the branch does not go on here in that local parameter", err)
	}
	return nil
}

// extend finds coefficient k.
func (b *seriesBuilder) extend(k int) {
	n := b.n
	b.f.Expand(k, b.path, b.p, b.rhs[:n]) // with coefficient k of the path 0
	for i := range n {
		b.rhs[i] = -b.rhs[i]
	}
	b.rhs[n] = b.border(k)
	b.lu.Solve(b.rhs)
	for i := range b.path[k] {
		b.path[k][i] = b.rhs[i] * b.weight[i]
	}
	b.f.Expand(k, b.path, b.p, b.rhs[:n])
}

// border is the right-hand side of the last equation: of the local parameter all
// but the first coefficient vanish. For arclength the unit speed, |z'| = 1, gives
// at order k-1 that 2k z_1·z_k is minus the sum of i (k+1-i) z_i·z_(k+1-i) over
// the orders between.
func (b *seriesBuilder) border(k int) float64 {
	if k == 1 {
		if b.fixed >= 0 {
			return 1 / b.weight[b.fixed]
		}
		return 1
	}
	if b.fixed >= 0 {
		return 0
	}
	sum := 0.0
	for i := 2; i < k; i++ {
		sum += float64(i*(k+1-i)) * b.product(i, k+1-i)
	}
	return -sum / float64(2*k)
}

// product is the inner product of two coefficients in scaled variables.
func (b *seriesBuilder) product(i, j int) float64 {
	sum := 0.0
	for k, w := range b.weight {
		sum += b.path[i][k] / w * (b.path[j][k] / w)
	}
	return sum
}

// radius fits the decay of the coefficients' lengths over the upper half of the
// orders by a straight line in the logarithm (the root test).
func (b *seriesBuilder) radius() float64 {
	var sx, sy, sxx, sxy, count float64
	for k := max(1, len(b.path)/2); k < len(b.path); k++ {
		if v := b.product(k, k); v > 0 {
			x, y := float64(k), 0.5*math.Log(v)
			sx, sy, sxx, sxy, count = sx+x, sy+y, sxx+x*x, sxy+x*y, count+1
		}
	}
	if count < 2 {
		return math.Inf(1)
	}
	return math.Exp(-(count*sxy - sx*sy) / (count*sxx - sx*sx))
}
