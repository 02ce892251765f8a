package continuation

import (
	"errors"
	"fmt"
	"math"

	"brinkline/continuation/linalg"
)

// Settle finds a steady state near a guess by Newton's method with damping that
// does not depend on how the equations are scaled (Deuflhard, Newton Methods for
// Nonlinear Problems, 2004, section 3.3: the natural monotonicity test). The
// guess is a State, or a []float64 with the states in order.
func (m *Model) Settle(guess any) (*Point, error) {
	x, err := m.equations.state(guess)
	if err != nil {
		return nil, fmt.Errorf("model %s: %w", m.name, err)
	}
	return m.settle(x, m.values())
}

func (m *Model) settle(guess, params []float64) (*Point, error) {
	s := newSystem(m, guess, params, -1)
	n := newton{s: s, x: append([]float64(nil), guess...)}
	if err := n.run(); err != nil {
		return nil, fmt.Errorf("model %s: %w", m.name, err)
	}
	p := &Point{
		State: n.x, Parameters: append([]float64(nil), params...),
		Unstable: -1, Iterations: n.steps, model: m, free: -1,
	}
	if err := p.judge(s, n.jac); err != nil {
		return nil, fmt.Errorf("model %s: %w", m.name, err)
	}
	return p, nil
}

// judge sets the eigenvalues and their count from the Jacobian.
func (p *Point) judge(s *system, jac []float64) error {
	var e linalg.Eigen
	values, err := e.Values(jac, s.n)
	if err != nil {
		return err
	}
	p.Eigenvalues, p.Unstable = values, countUnstable(values)
	return nil
}

func countUnstable(values []complex128) int {
	count := 0
	for _, v := range values {
		if real(v) > 0 {
			count++
		}
	}
	return count
}

const (
	newtonSteps     = 60
	newtonTolerance = 1e-12
	leastDamping    = 1e-8
)

// newton is a damped Newton iteration for f(x, p) = 0 at fixed p.
type newton struct {
	s     *system
	x     []float64
	f     []float64
	jac   []float64
	lu    linalg.LU
	steps int

	firstResidual, residual float64
}

func (n *newton) run() error {
	n.f, n.jac = make([]float64, n.s.n), make([]float64, n.s.n*n.s.n)
	if err := checkGuess(n.s, n.x); err != nil {
		return err
	}
	if err := n.s.Eval(n.x, n.s.p, n.f); err != nil {
		return fmt.Errorf("no start: %w; change the guess or the parameters", err)
	}
	damping := 1.0
	step, trial := make([]float64, n.s.n), make([]float64, n.s.n)
	for n.steps = 1; n.steps <= newtonSteps; n.steps++ {
		if err := n.direction(step); err != nil {
			return err
		}
		size := n.size(step)
		if size <= newtonTolerance || (size < 1e-6 && n.atRounding()) {
			return n.finish(step)
		}
		next, err := n.damped(step, trial, size, damping)
		if err != nil {
			return err
		}
		damping = next
	}
	return n.failed("after %d steps", newtonSteps)
}

func checkGuess(s *system, x []float64) error {
	for i, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("the guess for %s is %v", s.m.states[i].Name, v)
		}
	}
	for i, v := range s.p {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("the parameter %s is %v", s.m.parameters[i].Name, v)
		}
	}
	return nil
}

// direction stores the Newton step in step.
func (n *newton) direction(step []float64) error {
	if err := n.s.diff.Jacobian(n.x, n.s.p, -1, n.jac); err != nil {
		return err
	}
	n.residual = n.scaledResidual()
	if n.steps == 1 {
		n.firstResidual = n.residual
	}
	copy(n.lu.Matrix(n.s.n), n.jac)
	n.equilibrate()
	if err := n.lu.Factor(); err != nil || n.lu.Condition() > 1e16 {
		return fmt.Errorf("f_x is singular at %s: the guess lies at or near a fold or a branch point; start from a guess farther from it, or at another value of the parameter",
			n.s.describe(n.x, n.s.p))
	}
	for i, v := range n.f {
		step[i] = -v / n.rowSize(i)
	}
	n.lu.Solve(step)
	for i := range step {
		step[i] *= n.columnSize(i)
	}
	return nil
}

// equilibrate scales rows and columns, so that pivots do not depend on units.
func (n *newton) equilibrate() {
	a := n.lu.Matrix(n.s.n)
	for i := range n.s.n {
		r := n.rowSize(i)
		for j := range n.s.n {
			a[i*n.s.n+j] *= n.columnSize(j) / r
		}
	}
}

func (n *newton) columnSize(j int) float64 { return math.Max(math.Abs(n.x[j]), n.s.sx[j]) }

// rowSize is the size of the terms of equation i: sum of |f_x| times the size of
// the states.
func (n *newton) rowSize(i int) float64 {
	sum := 0.0
	for j := range n.s.n {
		sum += math.Abs(n.jac[i*n.s.n+j]) * n.columnSize(j)
	}
	if sum == 0 {
		return 1
	}
	return sum
}

func (n *newton) scaledResidual() float64 {
	worst := 0.0
	for i, v := range n.f {
		worst = math.Max(worst, math.Abs(v)/n.rowSize(i))
	}
	return worst
}

// atRounding reports whether the residual is down to the rounding of its terms.
func (n *newton) atRounding() bool { return n.residual < 32*epsilon }

const epsilon = 0x1p-52

// size measures a step against the size of the states. A state without a scale
// is measured by its own value alone, so that the measure follows its unit.
func (n *newton) size(step []float64) float64 {
	worst := 0.0
	for i, d := range step {
		s := n.columnSize(i)
		if !n.s.tagged[i] && n.x[i] != 0 {
			s = math.Abs(n.x[i])
		}
		worst = math.Max(worst, math.Abs(d)/s)
	}
	return worst
}

func (n *newton) finish(step []float64) error {
	for i, d := range step {
		n.x[i] += d
	}
	if err := n.s.Eval(n.x, n.s.p, n.f); err != nil {
		return err
	}
	return n.s.diff.Jacobian(n.x, n.s.p, -1, n.jac)
}

// damped goes along the step as far as the natural monotonicity test allows: the
// simplified Newton step at the new point must be shorter than the step itself.
// It returns the damping to begin the next step with.
func (n *newton) damped(step, trial []float64, size, damping float64) (float64, error) {
	simple := make([]float64, n.s.n)
	var outside error
	for ; damping >= leastDamping; damping /= 2 {
		for i := range trial {
			trial[i] = n.x[i] + damping*step[i]
		}
		err := n.s.Eval(trial, n.s.p, n.f)
		if errors.Is(err, ErrInterrupted) {
			return 0, err
		}
		if err != nil {
			outside = err
			continue
		}
		for i, v := range n.f {
			simple[i] = -v / n.rowSize(i)
		}
		n.lu.Solve(simple)
		for i := range simple {
			simple[i] *= n.columnSize(i)
		}
		if n.size(simple) <= (1-damping/4)*size || n.size(simple) <= newtonTolerance {
			copy(n.x, trial)
			return math.Min(1, 4*damping), nil
		}
	}
	if outside != nil {
		return 0, fmt.Errorf("the iteration is led out of the model's domain: %w; try a guess nearer to a steady state", outside)
	}
	return 0, n.failed("after %d steps no shorter step helps", n.steps)
}

func (n *newton) failed(how string, steps int) error {
	return fmt.Errorf("no steady state found: %s; the residual, relative to the terms of its equation, went from %.2g to %.2g, last at %s; try another guess",
		fmt.Sprintf(how, steps), n.firstResidual, n.residual, n.s.describe(n.x, n.s.p))
}
