package continuation

import (
	"brinkline/continuation/linalg"

	"gonum.org/v1/gonum/mat"
)

// nullPair returns the null vectors of the f_x at hand in the user's units: |q| = 1,
// largest component positive; |p| = 1.
func (c *core) nullPair() (q, p []float64, err error) {
	left, right, err := extremes(mat.NewDense(c.n, c.n, append([]float64(nil), c.scaled...)), 1)
	if err != nil {
		return nil, nil, err
	}
	q, p = make([]float64, c.n), make([]float64, c.n)
	for i := range c.n {
		q[i], p[i] = right[0][i]*c.s.sx[i], left[i]/c.rows[i]
	}
	q, p = unit(q), unit(p)
	if q[leading(q)] < 0 {
		q = negated(q)
	}
	return q, p, nil
}

// bordered solves [A p; qᵀ 0] [x; ·] = [b; 0] (or with Aᵀ, [Aᵀ q; pᵀ 0]) in the user's
// units, through scaled variables.
func (c *core) bordered(q, p, b []float64, transposed bool) ([]float64, error) {
	n, m := c.n, c.n+1
	var lu linalg.LU
	a := lu.Matrix(m)
	clear(a)
	for i := range n {
		for k := range n {
			a[i*m+k] = c.scaled[i*n+k]
		}
		a[i*m+n] = p[i] / norm(p) // borders need only not be orthogonal to the null vectors
		a[n*m+i] = q[i] / c.s.sx[i]
	}
	if err := lu.Factor(); err != nil {
		return nil, &refusal{reason: "the null vectors are not alone"}
	}
	x := make([]float64, m)
	for i, v := range b {
		if transposed {
			x[i] = v * c.s.sx[i]
		} else {
			x[i] = v / c.rows[i]
		}
	}
	if transposed {
		lu.SolveTransposed(x)
	} else {
		lu.Solve(x)
	}
	x = x[:n]
	for i := range x {
		if transposed {
			x[i] /= c.rows[i]
		} else {
			x[i] *= c.s.sx[i]
		}
	}
	return x, nil
}

// cubicAt returns the cubic coefficient 1/6 wᵀ (f_xxx[v,v,v] + 3 f_xx[v,h]), f_x h =
// -f_xx[v,v], at a cusp: |v| = 1, wᵀ v = 1.
func (c *core) cubicAt(y []float64) (float64, error) {
	v, w, err := c.nullPair()
	if err != nil {
		return 0, err
	}
	product := dot(w, v)
	for i := range w {
		w[i] /= product
	}
	f := c.forms(y)
	vv, err := f.square(state(v))
	if err != nil {
		return 0, err
	}
	h, err := c.bordered(v, w, negated(vv), false)
	if err != nil {
		return 0, err
	}
	vvv, err := f.cube(state(v))
	if err != nil {
		return 0, err
	}
	vh, err := f.product(state(v), state(h))
	if err != nil {
		return 0, err
	}
	return (dot(w, vvv) + 3*dot(w, vh)) / 6, nil
}

// doubleZero returns the coefficients of the normal form at a Bogdanov-Takens point:
// A q0 = 0, A q1 = q0, |q0| = 1, q0ᵀ q1 = 0, Aᵀ p1 = 0, Aᵀ p0 = p1, p1ᵀ q1 = 1,
// p0ᵀ q1 = 0,
//
//	a2 = 1/2 p1ᵀ B(q0, q0),  b2 = p0ᵀ B(q0, q0) + p1ᵀ B(q0, q1)
//
// (Kuznetsov 2004, section 8.4).
func (c *core) doubleZero(y []float64) (a2, b2 float64, err error) {
	q0, p1, err := c.nullPair()
	if err != nil {
		return 0, 0, err
	}
	q1, err := c.bordered(q0, p1, q0, false)
	if err != nil {
		return 0, 0, err
	}
	addMultiple(q1, -dot(q0, q1), q0)
	scale := dot(p1, q1)
	for i := range p1 {
		p1[i] /= scale
	}
	p0, err := c.bordered(q0, p1, p1, true)
	if err != nil {
		return 0, 0, err
	}
	addMultiple(p0, -dot(p0, q1), p1)
	f := c.forms(y)
	b00, err := f.square(state(q0))
	if err != nil {
		return 0, 0, err
	}
	b01, err := f.product(state(q0), state(q1))
	if err != nil {
		return 0, 0, err
	}
	return dot(p1, b00) / 2, dot(p0, b00) + dot(p1, b01), nil
}

func addMultiple(to []float64, by float64, v []float64) {
	for i := range to {
		to[i] += by * v[i]
	}
}
