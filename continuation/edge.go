package continuation

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"brinkline/continuation/linalg"
)

// An edge is a point of the surface in the space of the parameters on which the
// steady state in use is lost.
type edge struct {
	kind     string // as a special point names itself
	x, p, u  []float64
	t        float64   // along the line on which it was found
	normal   []float64 // unit vector in u, away from the steady state in use; nil at a branch point
	v, w     []float64 // null vectors of a fold in the user's units
	omega    float64   // of a Hopf point
	unstable int       // eigenvalues with positive real part besides the critical ones; -1 unknown
	error    float64   // estimated, of t
	sizes    []float64 // of the states, as far as they are known
}

// errNoEdge says that a line meets no limit, and why.
type errNoEdge struct{ why string }

func (e *errNoEdge) Error() string { return e.why }

// isSafe reports whether a line could be followed to its end without a limit.
func isSafe(err error) bool { var no *errNoEdge; return errors.As(err, &no) && no.why == "" }

// traced follows the steady state along a line up to the distance far, and returns the
// first limit: whatever special point comes first. The error is an *errNoEdge with an
// empty reason where the whole line was passed without one.
func (m *Model) traced(x []float64, l *line, far float64) (*edge, error) {
	b, err := m.followed(x, l, far)
	if err != nil {
		return nil, err
	}
	switch end := b.ends[1]; end.Reason {
	case Interrupted:
		return nil, ErrInterrupted
	case LeftRange:
		return nil, &errNoEdge{}
	case AtSpecial:
		return m.edgeAt(b.specials[len(b.specials)-1], l)
	default:
		return nil, &errNoEdge{end.Text}
	}
}

// followed follows the steady state along a line to the first special point, up to the
// distance far.
func (m *Model) followed(x []float64, l *line, far float64) (*Branch, error) {
	pm := m.along(l)
	p := make([]float64, len(pm.parameters))
	l.at(0, p[:len(m.parameters)])
	opts := []FollowOption{Within(0, far), Upward(), StopAtSpecial()}
	if m.balance {
		opts = append(opts, WithoutEigenvalues())
	}
	plan, err := newPlan(opts)
	if err != nil {
		return nil, err
	}
	up, err := begin(&Point{State: x, Parameters: p, Unstable: -1, model: pm, free: -1}, len(m.parameters), plan)
	if err != nil {
		return nil, err
	}
	return (&run{plan: plan, task: "limit", up: up}).both(), nil
}

// edgeAt makes an edge of a special point on a line.
func (m *Model) edgeAt(s Special, l *line) (*edge, error) {
	at := s.Where()
	e := &edge{kind: s.Kind(), x: at.State, t: at.Value(), p: make([]float64, len(m.parameters)), unstable: at.Unstable}
	if at.sizes != nil {
		e.sizes = at.sizes.states
	}
	l.at(e.t, e.p)
	e.u = append([]float64(nil), l.u...)
	var gradient []float64
	switch s := s.(type) {
	case *Fold:
		e.v, e.w, e.error = s.Right, s.Left, s.Uncertainty
		gradient = negated(s.sensitivities[:len(m.parameters)])
	case *Hopf:
		e.omega, e.error = s.Omega, s.Uncertainty
		sys := m.systemAt(e)
		var err error
		if gradient, _, err = sys.hopfSlopes(e.x, e.p, s.Omega, l.space.index); err != nil {
			return nil, err
		}
	default:
		return e, nil
	}
	return e, e.orient(gradient, l)
}

// systemAt makes a system that knows the sizes of the states.
func (m *Model) systemAt(e *edge) *system {
	s := newSystem(m, e.x, e.p, -1)
	s.learn(e.sizes)
	return s
}

// learn takes over sizes of states for those without a tag.
func (s *system) learn(sizes []float64) {
	for i, v := range sizes {
		if !s.tagged[i] && v > 0 {
			s.sx[i] = v
		}
	}
}

// orient sets the normal from a gradient with respect to all parameters.
func (e *edge) orient(gradient []float64, l *line) error {
	n := make([]float64, l.space.dim())
	l.space.pull(gradient, l.slopes, n)
	size := norm(n)
	if !(size > 0) || math.IsInf(size, 0) {
		return fmt.Errorf("the %s does not move with any of the parameters that vary", e.kind)
	}
	if dot(n, l.e) < 0 {
		size = -size
	}
	for i := range n {
		n[i] /= size
	}
	e.normal = n
	return nil
}

// hopfSlopes returns d Re μ/dp_j of the pair near iω at a steady state, for the
// parameters listed, in a list of all, and the pair itself:
//
//	μ_p = p̄ᵀ (f_xp q - f_xx[q, f_x⁻¹ f_p]),  <p, q> = 1.
func (s *system) hopfSlopes(x, p []float64, omega float64, list []int) ([]float64, *criticalPair, error) {
	n := s.n
	fx := make([]float64, n*n)
	if err := s.diff.Jacobian(x, p, -1, fx); err != nil {
		return nil, nil, err
	}
	pair, err := newCriticalPair(fx, s.sx, omega)
	if err != nil {
		return nil, nil, err
	}
	re, im := split(pair.q)
	slopes := make([]float64, len(p))
	for _, j := range list {
		way := make([]float64, n+1)
		if err := s.diff.Parameter(x, p, j, way[:n]); err != nil {
			return nil, nil, err
		}
		for i := range n {
			way[i] = -way[i]
		}
		if err := solveShifted(fx, n, 0, way[:n], nil); err != nil {
			return nil, nil, err
		}
		way[n] = 1
		f := forms{s, n, x, p, j, append(append([]float64(nil), s.sx...), s.sp[j])}
		b, err := f.bilinear(re, im, way, make([]float64, n+1))
		if err != nil {
			return nil, nil, err
		}
		slopes[j] = real(hermitian(pair.p, b))
	}
	return slopes, pair, nil
}

// A scout refines limits on one line after the other, from limits near by. It is used
// by one goroutine.
type scout struct {
	m     *Model
	line  *line
	c     *core
	der   *coreDerivatives
	inner *system
	lu    linalg.LU
	jac   []float64
	f     []float64

	solved int // limits refined
}

func newScout(m *Model, sp *space, near *edge) *scout {
	l := sp.line(make([]float64, sp.dim()), make([]float64, sp.dim()))
	copy(l.origin, near.u)
	pm := m.along(l)
	p := append(append([]float64(nil), sp.base...), 0)
	s := newSystem(pm, near.x, p, len(m.parameters))
	s.learn(near.sizes)
	n := s.n
	c := &core{
		s: s, n: n, first: len(m.parameters), p: p,
		fx: make([]float64, n*n), scaled: make([]float64, n*n), rows: make([]float64, n),
	}
	return &scout{m: m, line: l, c: c, der: &coreDerivatives{core: c}, inner: s.diff.(*pathRun).inner}
}

// on finds the limit on the line origin + t e from a limit near by, by Newton's method
// on the minimally augmented system. Where that fails from afar it goes there by steps.
func (s *scout) on(origin, e []float64, near *edge) (*edge, error) {
	found, err := s.newton(origin, e, near)
	for parts := 2; err != nil && parts <= 8 && near.normal != nil; parts *= 2 {
		if errors.Is(err, ErrInterrupted) {
			return nil, err
		}
		found, err = s.stepwise(origin, e, near, parts)
	}
	return found, err
}

// stepwise turns and moves the line from where the near limit lies.
func (s *scout) stepwise(origin, e []float64, near *edge, parts int) (*edge, error) {
	target := s.meets(origin, e, near)
	at := near
	for k := 1; k <= parts; k++ {
		o := make([]float64, len(origin))
		share := float64(k) / float64(parts)
		for i := range o {
			// Lines through points between the limit and where its tangent plane
			// meets the line wanted.
			o[i] = near.u[i] + share*(origin[i]+target*e[i]-near.u[i]) - target*e[i]
		}
		var err error
		if at, err = s.newton(o, e, at); err != nil {
			return nil, err
		}
	}
	return s.newton(origin, e, at)
}

// meets returns the t at which the line meets the tangent plane of a limit.
func (s *scout) meets(origin, e []float64, near *edge) float64 {
	if near.normal == nil {
		return near.t
	}
	up, gap := dot(near.normal, e), 0.0
	for i, v := range near.normal {
		gap += v * (near.u[i] - origin[i])
	}
	if math.Abs(up) < 0.05 {
		return near.t
	}
	return gap / up
}

func (s *scout) newton(origin, e []float64, near *edge) (*edge, error) {
	copy(s.line.origin, origin)
	copy(s.line.e, e)
	y := append(append([]float64(nil), near.x...), s.meets(origin, e, near))
	y, err := s.begin(y, near)
	if err != nil {
		return nil, err
	}
	last, err := s.iterate(y)
	if err != nil {
		return nil, err
	}
	s.solved++
	return s.edge(y, near, last)
}

// begin sets up the defining equations.
func (s *scout) begin(y []float64, near *edge) ([]float64, error) {
	c := s.c
	clear(c.rows)
	c.load(y, c.p)
	if err := c.size(y); err != nil {
		return nil, err
	}
	if near.omega > 0 {
		pair, err := newCriticalPair(c.fx, c.s.sx, near.omega)
		if err != nil {
			return nil, err
		}
		d := &hopfDefining{}
		c.def = d
		y = append(y, near.omega*near.omega)
		return y, d.begin(c, y, pair)
	}
	if near.v == nil {
		return nil, &refusal{reason: "the limit is no fold and no Hopf point"}
	}
	d := &foldDefining{b: make([]float64, c.n), c: make([]float64, c.n)}
	for i := range c.n {
		d.c[i], d.b[i] = near.v[i]/c.s.sx[i], near.w[i]*c.rows[i]
	}
	d.b, d.c = unit(d.b), unit(d.c)
	c.def = d
	return y, nil
}

// iterate runs Newton's method on y and returns the last correction of t.
func (s *scout) iterate(y []float64) (float64, error) {
	c, n := s.c, len(y)
	s.jac, s.f = make([]float64, n*n), make([]float64, n)
	previous := math.Inf(1)
	for range 25 {
		d, size, err := s.step(y)
		if err != nil {
			return 0, err
		}
		if math.IsNaN(size) || size > 20 {
			return 0, &refusal{reason: "the refinement diverges"}
		}
		stalled := size > 0.5*previous && size < 1e-9
		if !stalled {
			for i := range y {
				y[i] += d[i]
			}
			c.load(y, c.p)
		}
		if stalled || size < 1e-12 {
			return math.Abs(d[c.n]), nil
		}
		if size > 4*previous && size > 1e-6 {
			return 0, &refusal{reason: "the refinement diverges"}
		}
		previous = size
	}
	return 0, &refusal{reason: "the refinement does not converge"}
}

// step returns Newton's correction and its scaled size.
func (s *scout) step(y []float64) ([]float64, float64, error) {
	c, n := s.c, len(y)
	c.load(y, c.p)
	if err := s.der.Jacobian(y, c.p, -1, s.jac); err != nil {
		return nil, 0, err
	}
	if err := c.s.Eval(y[:c.n], c.p, s.f[:c.n]); err != nil {
		return nil, 0, err
	}
	if err := c.def.extra(c, y, s.f[c.n:]); err != nil {
		return nil, 0, err
	}
	sizes := make([]float64, n)
	for i := range sizes {
		sizes[i] = 1
	}
	for i := range c.n {
		sizes[i] = math.Max(c.s.sx[i], math.Abs(y[i]))
	}
	if n > c.n+1 {
		sizes[c.n+1] = math.Abs(y[c.n+1])
	}
	a, d := s.lu.Matrix(n), make([]float64, n)
	for i := range n {
		row := 0.0
		for k := range n {
			a[i*n+k] = s.jac[i*n+k] * sizes[k]
			row = math.Max(row, math.Abs(a[i*n+k]))
		}
		if row == 0 {
			row = 1
		}
		for k := range n {
			a[i*n+k] /= row
		}
		d[i] = -s.f[i] / row
	}
	if err := s.lu.Factor(); err != nil {
		return nil, 0, &refusal{reason: "the limit is degenerate there"}
	}
	s.lu.Solve(d)
	size := 0.0
	for i := range d {
		size = math.Max(size, math.Abs(d[i]))
		d[i] *= sizes[i]
	}
	return d, size, nil
}

// edge makes the edge of a solution.
func (s *scout) edge(y []float64, near *edge, last float64) (*edge, error) {
	c := s.c
	n := c.n
	e := &edge{kind: near.kind, x: append([]float64(nil), y[:n]...), t: y[n], p: make([]float64, len(s.m.parameters)), unstable: -1, error: last, sizes: near.sizes}
	s.line.at(e.t, e.p)
	e.u = append([]float64(nil), s.line.u...)
	if err := c.jacobian(y); err != nil {
		return nil, err
	}
	if err := s.sameSheet(e, near, y); err != nil {
		return nil, err
	}
	gradient, err := s.gradient(e, y)
	if err != nil {
		return nil, err
	}
	return e, e.orient(gradient, s.line)
}

// sameSheet refuses a limit that has another number of unstable eigenvalues than the
// near one: it is no limit of the steady state in use.
func (s *scout) sameSheet(e, near *edge, y []float64) error {
	if near.unstable < 0 {
		return nil
	}
	critical := []complex128{0}
	if near.omega > 0 {
		if !(y[s.c.n+1] > 0) {
			return &refusal{reason: "the pair is real there"}
		}
		omega := math.Sqrt(y[s.c.n+1])
		critical = []complex128{complex(0, omega), complex(0, -omega)}
	}
	values := s.c.eigenvalues()
	for _, c := range critical {
		values = without(values, c)
	}
	e.unstable = countUnstable(values)
	if e.unstable != near.unstable {
		return &refusal{reason: "the limit there is one of another steady state"}
	}
	return nil
}

// without returns the values without the one that is nearest to c.
func without(values []complex128, c complex128) []complex128 {
	if len(values) == 0 {
		return nil
	}
	nearest := 0
	for i, v := range values {
		if cmplx.Abs(v-c) < cmplx.Abs(values[nearest]-c) {
			nearest = i
		}
	}
	return slices.Delete(slices.Clone(values), nearest, nearest+1)
}

// gradient returns that of the limit with respect to the parameters that vary.
func (s *scout) gradient(e *edge, y []float64) ([]float64, error) {
	c, n := s.c, s.c.n
	list := s.line.space.index
	if _, hopf := c.def.(*hopfDefining); hopf {
		e.omega = math.Sqrt(y[n+1])
		g, _, err := s.inner.hopfSlopes(e.x, e.p, e.omega, list)
		return g, err
	}
	d := c.def.(*foldDefining)
	if err := d.solve(c); err != nil {
		return nil, err
	}
	e.v, e.w = make([]float64, n), make([]float64, n)
	for i := range n {
		e.v[i], e.w[i] = d.v[i]*c.s.sx[i], d.w[i]/c.rows[i]
	}
	g, col := make([]float64, len(e.p)), make([]float64, n)
	for _, j := range list {
		if err := s.inner.diff.Parameter(e.x, e.p, j, col); err != nil {
			return nil, err
		}
		g[j] = dot(e.w, col)
	}
	return g, nil
}
