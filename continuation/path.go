package continuation

import (
	"math"
	"reflect"
)

// along makes a model of one more parameter: the distance t along a line in the space
// of the parameters, p = p(t). Its derivatives are those of the model by the chain rule,
//
//	F_t = Σ f_{p_k} p_k',  F_xt = Σ f_{x p_k} p_k',
//
// exact where the model's are; F_tt, which only the predictor uses, by differences.
func (m *Model) along(l *line) *Model {
	c := *m
	c.equations = &pathEquations{equations: m.equations, line: l.own(), p: make([]float64, len(m.parameters))}
	c.der = &pathDerivatives{m: m, line: l}
	c.parameters = append(append([]Parameter(nil), m.parameters...), Parameter{Variable{Name: "distance", Scale: 1}, 0})
	c.quantities, c.observer = nil, nil
	return &c
}

// pathEquations evaluates a model on a line.
type pathEquations struct {
	equations
	line *line
	p    []float64
}

func (e *pathEquations) eval(x, p, f []float64) {
	e.line.at(p[len(p)-1], e.p)
	e.equations.eval(x, e.p, f)
}

func (e *pathEquations) user(x, p []float64) (state, params reflect.Value) {
	e.line.at(p[len(p)-1], e.p)
	return e.equations.user(x, e.p)
}

func (e *pathEquations) own() equations {
	return &pathEquations{e.equations.own(), e.line.own(), make([]float64, len(e.p))}
}

type pathDerivatives struct {
	m    *Model
	line *line
}

func (d *pathDerivatives) Describe() string { return d.m.der.Describe() }

// numeric reports whether the model has no better derivatives than differences: then
// those of the equations on the line are as good, and cheaper.
func (d *pathDerivatives) numeric() bool {
	switch der := d.m.der.(type) {
	case differences:
		return true
	case *exact:
		if der.src == nil {
			return true
		}
		_, err := der.first()
		return err != nil
	}
	return false
}

// For makes the differentiator, and lets the system evaluate by what the model's own
// derivatives evaluate by.
func (d *pathDerivatives) For(ev Evaluator) Differentiator {
	s := ev.(*system)
	inner := &system{
		m: d.m, n: s.n, free: -1, eq: d.m.equations.own(), ctx: s.ctx,
		p: append([]float64(nil), d.line.space.base...), sx: s.sx, sp: s.sp[:len(d.m.parameters)], tagged: s.tagged,
	}
	inner.diff = d.m.der.For(inner)
	k := d.line.space.dim()
	run := &pathRun{
		inner: inner, line: d.line, p: make([]float64, len(d.m.parameters)), speed: make([]float64, k), sizes: s.sp,
		col: make([]float64, s.n), fx: make([]float64, s.n*s.n), wide: make([]float64, s.n+1), along: make([]float64, s.n+1),
	}
	s.eq = &pathEquations{equations: inner.eq, line: d.line, p: make([]float64, len(d.m.parameters))}
	run.composed = differences{}.For(s)
	run.numeric = d.numeric()
	return run
}

// A pathRun differentiates on a line. The index of t is that after the last parameter.
type pathRun struct {
	inner    *system
	line     *line
	composed Differentiator // of the equations on the line, by differences
	numeric  bool

	p, speed      []float64
	sizes         []float64
	col, fx       []float64
	wide, along   []float64
	ahead, behind []float64
}

// set goes to the point of the line.
func (r *pathRun) set(p []float64) {
	r.line.at(p[len(p)-1], r.p)
	r.line.speed(r.speed)
}

func (r *pathRun) isPath(j int) bool { return j == len(r.p) }

func (r *pathRun) Jacobian(x, p []float64, j int, jac []float64) error {
	n := r.inner.n
	r.set(p)
	switch {
	case j < 0:
		return r.inner.diff.Jacobian(x, r.p, -1, jac)
	case !r.isPath(j):
		return r.inner.diff.Jacobian(x, r.p, j, jac)
	case r.numeric:
		return r.composed.Jacobian(x, p, j, jac)
	}
	if err := r.inner.diff.Jacobian(x, r.p, -1, r.fx); err != nil {
		return err
	}
	if err := r.Parameter(x, p, j, r.col); err != nil {
		return err
	}
	for i := range n {
		copy(jac[i*(n+1):], r.fx[i*n:(i+1)*n])
		jac[i*(n+1)+n] = r.col[i]
	}
	return nil
}

// Parameter stores F_t, or f_{p_j} for a parameter of the model.
func (r *pathRun) Parameter(x, p []float64, j int, col []float64) error {
	r.set(p)
	if !r.isPath(j) {
		return r.inner.diff.Parameter(x, r.p, j, col)
	}
	if r.numeric {
		return r.composed.Parameter(x, p, j, col)
	}
	one := make([]float64, len(col))
	clear(col)
	for k, v := range r.speed {
		if v == 0 {
			continue
		}
		if err := r.inner.diff.Parameter(x, r.p, r.line.space.index[k], one); err != nil {
			return err
		}
		addMultiple(col, v, one)
	}
	return nil
}

// Second stores F_zz[a, a].
func (r *pathRun) Second(x, p []float64, j int, a, out []float64) error {
	n := r.inner.n
	r.set(p)
	switch {
	case j >= 0 && !r.isPath(j):
		return r.inner.diff.Second(x, r.p, j, a, out)
	case j < 0 || a[n] == 0:
		return r.inner.diff.Second(x, r.p, r.any(), r.still(a), out)
	case r.numeric:
		return r.composed.Second(x, p, j, a, out)
	}
	if err := r.inner.diff.Second(x, r.p, r.any(), r.still(a), out); err != nil {
		return err
	}
	if err := r.mixed(x, a, out); err != nil {
		return err
	}
	twice, err := r.twice(x, p)
	if err != nil {
		return err
	}
	addMultiple(out, a[n]*a[n], twice)
	return nil
}

// any returns some parameter of the model and still the direction of the states in a,
// with no part along it.
func (r *pathRun) any() int { return r.line.space.index[0] }

func (r *pathRun) still(a []float64) []float64 {
	copy(r.along, a[:r.inner.n])
	r.along[r.inner.n] = 0
	return r.along
}

// mixed adds 2 a_t F_xt a_x by polarisation in each parameter.
func (r *pathRun) mixed(x, a, out []float64) error {
	n := r.inner.n
	one := make([]float64, n)
	copy(r.along, a[:n])
	for k, v := range r.speed {
		if v == 0 {
			continue
		}
		// In units in which both parts are of one size.
		size := r.sizes[r.line.space.index[k]]
		for _, sign := range []float64{1, -1} {
			r.along[n] = sign * size
			if err := r.inner.diff.Second(x, r.p, r.line.space.index[k], r.along, one); err != nil {
				return err
			}
			addMultiple(out, sign*v*a[n]/(2*size), one)
		}
	}
	return nil
}

// twice returns F_tt by a central difference of F_t.
func (r *pathRun) twice(x, p []float64) ([]float64, error) {
	const h = 1e-4
	n, last := r.inner.n, len(p)-1
	if r.ahead == nil {
		r.ahead, r.behind = make([]float64, n), make([]float64, n)
	}
	q := append([]float64(nil), p...)
	for _, side := range []struct {
		t   float64
		out []float64
	}{{p[last] + h, r.ahead}, {p[last] - h, r.behind}} {
		q[last] = side.t
		if err := r.Parameter(x, q, last, side.out); err != nil {
			return nil, err
		}
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = (r.ahead[i] - r.behind[i]) / (2 * h)
	}
	r.set(p)
	return out, nil
}

// Adjoint stores wᵀ F_zz[a, ·].
func (r *pathRun) Adjoint(x, p []float64, j int, w, a, out []float64) error {
	n := r.inner.n
	r.set(p)
	if j < 0 {
		err := r.inner.diff.Adjoint(x, r.p, r.any(), w, r.still(a), r.wide)
		copy(out, r.wide[:n])
		return err
	}
	if !r.isPath(j) {
		return r.inner.diff.Adjoint(x, r.p, j, w, a, out)
	}
	if r.numeric {
		return r.composed.Adjoint(x, p, j, w, a, out)
	}
	if err := r.inner.diff.Adjoint(x, r.p, r.any(), w, r.still(a), out); err != nil {
		return err
	}
	out[n] = 0
	return r.adjointOfPath(x, p, w, a, out)
}

// adjointOfPath adds what belongs to t.
func (r *pathRun) adjointOfPath(x, p []float64, w, a, out []float64) error {
	n := r.inner.n
	copy(r.along, a[:n])
	for k, v := range r.speed {
		if v == 0 {
			continue
		}
		r.along[n] = 0
		if err := r.inner.diff.Adjoint(x, r.p, r.line.space.index[k], w, r.along, r.wide); err != nil {
			return err
		}
		out[n] += v * r.wide[n]
		if a[n] == 0 {
			continue
		}
		only := make([]float64, n+1)
		only[n] = a[n] * v
		if err := r.inner.diff.Adjoint(x, r.p, r.line.space.index[k], w, only, r.wide); err != nil {
			return err
		}
		addMultiple(out[:n], 1, r.wide[:n])
	}
	if a[n] == 0 {
		return nil
	}
	twice, err := r.twice(x, p)
	if err != nil {
		return err
	}
	out[n] += a[n] * dot(w, twice)
	return nil
}

// Third stores F_zzz[a, a, a].
func (r *pathRun) Third(x, p []float64, j int, a, out []float64) error {
	n := r.inner.n
	r.set(p)
	third, ok := r.inner.diff.(ThirdOrder)
	if !ok {
		third = differences{}.For(r.inner).(ThirdOrder)
	}
	switch {
	case j >= 0 && !r.isPath(j):
		return third.Third(x, r.p, j, a, out)
	case j < 0 || a[n] == 0:
		return third.Third(x, r.p, r.any(), r.still(a), out)
	}
	return r.composed.(ThirdOrder).Third(x, p, j, a, out)
}

// Accuracy returns the relative error of first derivatives.
func (r *pathRun) Accuracy() float64 {
	if r.numeric {
		return math.Max(accuracy(r.composed), accuracy(r.inner.diff))
	}
	return accuracy(r.inner.diff)
}
