package continuation

import (
	"math"
	"reflect"

	"brinkline/continuation/linalg"
)

// A defining system is what a locus is followed on: the equations of a model with
// extra unknowns (the first parameter, for Hopf points also ω²) and as many extra
// equations that say that the steady state is singular. The walker sees it as a
// model in the second parameter.
type defining interface {
	// extra stores the values of the extra equations at the point whose Jacobian is
	// at hand in the core.
	extra(c *core, y, out []float64) error
	// gradients stores the derivatives of the extra equations with respect to
	// (x, p_j, [κ]) in rows; column n stands for p_j.
	gradients(c *core, y []float64, j int, rows [][]float64) error
	// renew takes new borders from the point at hand.
	renew(c *core, y []float64) error
	// unknowns returns how many extra unknowns there are besides x.
	unknowns() int
	// copy returns the same system with the same borders.
	copy() defining
}

// A core evaluates the model under a defining system.
type core struct {
	s      *system
	n      int
	first  int // index of the first parameter, an unknown here
	def    defining
	p      []float64
	fx     []float64 // n x n, in the user's units
	scaled []float64 // the same with scaled states and equations
	rows   []float64 // sizes of the equations when the borders were chosen
}

// load puts the parameters of y and p together.
func (c *core) load(y, p []float64) {
	copy(c.p, p)
	c.p[c.first] = y[c.n]
}

// jacobian takes f_x at y.
func (c *core) jacobian(y []float64) error {
	if err := c.s.diff.Jacobian(y[:c.n], c.p, -1, c.fx); err != nil {
		return err
	}
	for i := range c.n {
		for k := range c.n {
			c.scaled[i*c.n+k] = c.fx[i*c.n+k] * c.s.sx[k] / c.rows[i]
		}
	}
	return nil
}

// size chooses the sizes of the equations at y.
func (c *core) size(y []float64) error {
	if err := c.s.diff.Jacobian(y[:c.n], c.p, -1, c.fx); err != nil {
		return err
	}
	for i := range c.n {
		sum := 0.0
		for k := range c.n {
			sum += math.Abs(c.fx[i*c.n+k]) * c.s.sx[k]
		}
		c.rows[i] = math.Max(c.rows[i], sum)
		if c.rows[i] == 0 {
			c.rows[i] = 1
		}
	}
	return c.jacobian(y)
}

// adjoint returns wᵀ f_zz[(v, 0), ·] in z = (x, p_j) for scaled w and v, with
// respect to the user's z.
func (c *core) adjoint(y []float64, j int, w, v []float64) ([]float64, error) {
	left, along, out := make([]float64, c.n), make([]float64, c.n+1), make([]float64, c.n+1)
	for i := range c.n {
		left[i], along[i] = w[i]/c.rows[i], v[i]*c.s.sx[i]
	}
	err := c.s.diff.Adjoint(y[:c.n], c.p, j, left, along, out)
	return out, err
}

// eval makes the core a model: what the walker's system calls.
func (c *core) eval(y, p, f []float64) {
	fail := func() {
		for i := range f {
			f[i] = math.NaN()
		}
	}
	c.load(y, p)
	if c.s.Eval(y[:c.n], c.p, f[:c.n]) != nil || c.jacobian(y) != nil || c.def.extra(c, y, f[c.n:]) != nil {
		fail()
	}
}

func (c *core) state(guess any) ([]float64, error) { return guess.([]float64), nil }

func (c *core) user(x, p []float64) (state, params reflect.Value) {
	c.load(x, p)
	return c.s.eq.user(x[:c.n], c.p)
}

// own returns the core itself: both directions of a run use it in turn.
func (c *core) own() equations { return c }

// For makes the core its own differentiator.
func (c *core) For(e Evaluator) Differentiator {
	return &coreDerivatives{core: c, numeric: differences{}.For(e)}
}

// Describe says where the derivatives come from.
func (c *core) Describe() string { return c.s.m.der.Describe() }

type coreDerivatives struct {
	*core
	numeric Differentiator
}

// Jacobian assembles the derivative of equations and extra equations.
func (c *coreDerivatives) Jacobian(y, p []float64, j int, jac []float64) error {
	n, q := c.n, c.def.unknowns()
	width := n + q + 1
	if j < 0 {
		width--
	}
	c.load(y, p)
	base := make([]float64, n*(n+1))
	if err := c.s.diff.Jacobian(y[:n], c.p, c.first, base); err != nil {
		return err
	}
	clear(jac[:(n+q)*width])
	for i := range n {
		copy(jac[i*width:], base[i*(n+1):(i+1)*(n+1)])
	}
	if err := c.jacobian(y); err != nil {
		return err
	}
	rows := make([][]float64, q)
	for r := range rows {
		rows[r] = jac[(n+r)*width : (n+r+1)*width]
	}
	if err := c.def.gradients(c.core, y, c.first, rows); err != nil {
		return err
	}
	if j < 0 {
		return nil
	}
	return c.second(y, j, jac, width)
}

// second fills the last column, the derivatives with respect to the second
// parameter.
func (c *coreDerivatives) second(y []float64, j int, jac []float64, width int) error {
	n, q := c.n, c.def.unknowns()
	col := make([]float64, n)
	if err := c.s.diff.Parameter(y[:n], c.p, j, col); err != nil {
		return err
	}
	for i, v := range col {
		jac[i*width+width-1] = v
	}
	rows := make([][]float64, q)
	for r := range rows {
		rows[r] = make([]float64, width)
	}
	if err := c.def.gradients(c.core, y, j, rows); err != nil {
		return err
	}
	for r := range rows {
		jac[(n+r)*width+width-1] = rows[r][n]
	}
	return nil
}

// Parameter, Second and Adjoint of the augmented equations are not needed exactly
// by the walker: the predictor goes along the tangent.
func (c *coreDerivatives) Parameter(y, p []float64, j int, col []float64) error {
	return c.numeric.Parameter(y, p, j, col)
}

func (c *coreDerivatives) Second(y, p []float64, j int, a, out []float64) error {
	return &DomainError{What: "second derivatives of a locus are not taken"}
}

func (c *coreDerivatives) Adjoint(y, p []float64, j int, w, a, out []float64) error {
	return c.numeric.Adjoint(y, p, j, w, a, out)
}

// foldDefining says that f_x is singular: g = 0 from the bordered f_x.
type foldDefining struct {
	b, c []float64
	v, w []float64
	g    float64
	lu   linalg.LU
}

func (d *foldDefining) unknowns() int { return 1 }

func (d *foldDefining) solve(c *core) error {
	n, m := c.n, c.n+1
	a := d.lu.Matrix(m)
	for i := range n {
		copy(a[i*m:], c.scaled[i*n:(i+1)*n])
		a[i*m+n] = d.b[i]
	}
	copy(a[n*m:], d.c)
	a[n*m+n] = 0
	if err := d.lu.Factor(); err != nil {
		return &refusal{reason: "two eigenvalues vanish together"}
	}
	v, w := make([]float64, m), make([]float64, m)
	v[n], w[n] = 1, 1
	d.lu.Solve(v)
	d.lu.SolveTransposed(w)
	d.v, d.w, d.g = v[:n], w[:n], v[n]
	return nil
}

func (d *foldDefining) extra(c *core, y, out []float64) error {
	err := d.solve(c)
	out[0] = d.g
	return err
}

func (d *foldDefining) gradients(c *core, y []float64, j int, rows [][]float64) error {
	if err := d.solve(c); err != nil {
		return err
	}
	g, err := c.adjoint(y, j, d.w, d.v)
	if err != nil {
		return err
	}
	for k, v := range g {
		rows[0][k] = -v
	}
	return nil
}

func (d *foldDefining) renew(c *core, y []float64) error {
	if err := d.solve(c); err != nil {
		return err
	}
	d.b, d.c = unit(d.w), unit(d.v)
	return nil
}

func unit(v []float64) []float64 {
	length := norm(v)
	u := make([]float64, len(v))
	for i, x := range v {
		u[i] = x / length
	}
	return u
}
