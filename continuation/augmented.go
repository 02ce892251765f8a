package continuation

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// refined is the outcome of Newton's method on an augmented system.
type refined struct {
	iterations int
	last       []float64 // the last correction, scaled
	size       float64   // its length
}

const refineSteps = 30

// iterate runs Newton's method: step stores the correction of the n+1 scaled
// variables z (and of any further unknowns of its own) and returns it. It goes on
// until the corrections are down to rounding: below 1e-14, or no longer falling
// while small.
func (t *tracer) iterate(a *node, step func() ([]float64, error)) (refined, error) {
	z := t.scaled(a)
	previous := math.Inf(1)
	for k := 1; k <= refineSteps; k++ {
		d, err := step()
		if err != nil {
			return refined{}, err
		}
		d = d[:t.n+1]
		size := norm(d)
		if math.IsNaN(size) || size > 1 {
			return refined{}, &refusal{reason: "the refinement diverges"}
		}
		if size > 0.5*previous && size < 1e-11 {
			// Rounding moves the point about now; it is as good as it gets.
			return refined{k, d, size}, nil
		}
		for i := range z {
			z[i] += d[i]
		}
		t.place(a, z)
		if size < 1e-14*(1+norm(z)) {
			return refined{k, d, size}, nil
		}
		if size > 2*previous && size > 1e-9 {
			return refined{}, &refusal{reason: "the refinement diverges"}
		}
		previous = size
	}
	if previous < 1e-9 {
		return refined{refineSteps, make([]float64, t.n+1), previous}, nil
	}
	return refined{}, &refusal{reason: "the refinement does not converge"}
}

// scaledJacobian returns [F_z], n x (n+1), in scaled variables and equations.
func (t *tracer) scaledJacobian() *mat.Dense {
	g := mat.NewDense(t.n, t.n+1, nil)
	for i := range t.n {
		for k, s := range t.S {
			g.Set(i, k, t.jac[i*(t.n+1)+k]*s/t.rows[i])
		}
	}
	return g
}

// extremes returns the left and right singular vectors of g that belong to its
// smallest singular values: those of the last column of U, and of the last
// columns of V.
func extremes(g mat.Matrix, columns int) (left []float64, right [][]float64, err error) {
	var svd mat.SVD
	if !svd.Factorize(g, mat.SVDFull) {
		return nil, nil, &refusal{reason: "the singular values did not converge"}
	}
	var u, v mat.Dense
	svd.UTo(&u)
	svd.VTo(&v)
	left = mat.Col(nil, u.RawMatrix().Cols-1, &u)
	for k := range columns {
		right = append(right, mat.Col(nil, v.RawMatrix().Cols-1-k, &v))
	}
	return left, right, nil
}

// adjoint returns wᵀ F_zz[a, ·] in scaled variables, n+1 components, for scaled w
// and a.
func (t *tracer) adjoint(at *node, w, a []float64) ([]float64, error) {
	left, along, out := make([]float64, t.n), make([]float64, t.n+1), make([]float64, t.n+1)
	for i := range left {
		left[i] = w[i] / t.rows[i]
	}
	for k := range a {
		along[k] = a[k] * t.S[k]
	}
	t.s.p[t.s.free] = at.lambda
	if err := t.s.diff.Adjoint(at.x, t.s.p, t.s.free, left, along, out); err != nil {
		return nil, t.refuse(err)
	}
	for k := range out {
		out[k] *= t.S[k]
	}
	return out, nil
}

// evaluate takes F and F_z at a node.
func (t *tracer) evaluate(a *node) error {
	if err := t.s.F(a.x, a.lambda, t.f); err != nil {
		return t.refuse(err)
	}
	if err := t.jacobian(a); err != nil {
		return t.refuse(err)
	}
	return nil
}

// within checks that a refined point lies on the arc that it was looked for on,
// and places it there.
func (t *tracer) within(c *arc, a *node) error {
	u, off := c.project(t.scaled(a))
	if u < -1e-6 || u > 1+1e-6 || off > 0.1 || math.IsNaN(off) {
		return &refusal{reason: fmt.Sprintf("the refinement led away, to %s", t.where(a))}
	}
	u = math.Max(0, math.Min(1, u))
	a.arc = c.a.arc + u*(c.b.arc-c.a.arc)
	a.step = u * (c.b.arc - c.a.arc)
	_, d := c.at(u)
	length := norm(d)
	for i := range d {
		d[i] /= length
	}
	a.t, a.scales = d, t.S
	return nil
}

// nullVectors turns scaled null vectors into the user's units: |v| = 1, largest
// component positive, wᵀ v = 1; weak says that the last is out of reach, and w
// has length 1 then.
func (t *tracer) nullVectors(v, w []float64) (right, left []float64, weak bool) {
	right, left = make([]float64, t.n), make([]float64, t.n)
	for i := range right {
		right[i] = v[i] * t.S[i]
		left[i] = w[i] / t.rows[i]
	}
	length := norm(right)
	if right[leading(right)] < 0 {
		length = -length
	}
	for i := range right {
		right[i] /= length
	}
	product, size := dot(left, right), 0.0
	for i := range left {
		size += math.Abs(left[i] * right[i])
	}
	if weak = math.Abs(product) < 1e-7*size || product == 0; weak {
		product = norm(left)
	}
	for i := range left {
		left[i] /= product
	}
	return right, left, weak
}

// leading returns the first of the components that are largest, up to the error
// of a null vector.
func leading(v []float64) int {
	size := math.Abs(v[largest(v)])
	for i, x := range v {
		if math.Abs(x) > (1-1e-6)*size {
			return i
		}
	}
	return 0
}

// rounding returns the error of wᵀ f that the rounding of the terms of f makes,
// for w in the user's units.
func (t *tracer) rounding(a *node, w []float64) float64 {
	m, sum := t.n+1, 0.0
	for i := range w {
		terms := math.Abs(t.jac[i*m+t.n] * a.lambda)
		for k, x := range a.x {
			terms += math.Abs(t.jac[i*m+k] * x)
		}
		sum += math.Abs(w[i]) * terms
	}
	return 2 * epsilon * sum
}

// roundingOf is the rounding of a value of the parameter in the scaled variables
// that the refinements work in.
func (t *tracer) roundingOf(lambda float64) float64 {
	return 2 * epsilon * (math.Abs(lambda) + t.S[t.n])
}

// settleSpectrum sets the eigenvalues at a special point and the count without
// the critical ones, which are those nearest the imaginary axis.
func (t *tracer) settleSpectrum(a *node, critical int) error {
	defer func(usual bool) { t.stable.want = usual }(t.stable.want)
	t.stable.want = true
	if err := t.spectrum(a); err != nil {
		return err
	}
	if a.eigenvalues == nil {
		return nil
	}
	a.unstable = countBeyond(a.eigenvalues, critical)
	return nil
}
