package continuation

import (
	"errors"
	"math"
	"slices"
)

// A landing is what a start in state and parameter together has come to.
type landing struct {
	point       *Point // nil when it came to nothing in the box
	known       bool   // on a branch that was known when it started
	evaluations int
	undefined   error
	interrupted error
}

// atRandom looks for branches that the surveys have not met.
func (a *atlas) atRandom() {
	n := len(a.m.states)
	spread := newSpread(n + 1)
	next := func(i int) func() landing {
		if a.stopped != nil || len(a.branches) >= a.opts.most || a.random.Barren+i-a.random.Starts >= a.opts.effort {
			return nil
		}
		branches := slices.Clone(a.branches)
		return func() landing {
			u := make([]float64, n+1)
			spread.start(i, u)
			return a.land(u, branches)
		}
	}
	inOrder(a.m.workers(a.opts.workers), lag, next, a.take)
	a.m.tellSurvey("Look for more branches", a.random.Starts, 1, true)
}

func (a *atlas) take(l landing) {
	a.random.Starts++
	a.random.Barren++
	a.random.Runs++
	a.random.Evaluations += l.evaluations
	a.add(TriedStarts{Starts: 1, Runs: 1, Evaluations: l.evaluations})
	switch {
	case l.interrupted != nil:
		a.stopped = l.interrupted
	case l.undefined != nil:
		a.failed = l.undefined
	case l.point != nil && !l.known && a.include(l.point):
		a.random.Barren = 0
	}
	a.m.tellSurvey("Look for more branches", a.random.Starts, float64(a.random.Barren)/float64(a.opts.effort), false)
}

// land brings the start with coordinates u onto the nearest branch.
func (a *atlas) land(u []float64, branches []*Branch) (l landing) {
	n := len(u) - 1
	z := make([]float64, n+1)
	a.frame.at(u, z)
	p := a.m.values()
	p[a.j] = z[n]
	t := a.tracer(&Point{State: z[:n], Parameters: p})
	defer func() { l.evaluations = t.s.evaluations }()
	at := t.fresh()
	copy(at.x, z)
	at.lambda = z[n]
	if err := t.nearest(at, a.frame); err != nil {
		var domain *DomainError
		switch {
		case errors.Is(err, ErrInterrupted):
			l.interrupted = err
		case errors.As(err, &domain):
			l.undefined = err
		}
		return l
	}
	p[a.j] = at.lambda
	found := &Point{State: at.x, Parameters: p, Unstable: -1, model: a.m, free: -1}
	if !a.frame.holds(append(slices.Clone(at.x), at.lambda)) {
		return l
	}
	l.point, l.known = found, a.onAny(found, branches)
	return l
}

var errFar = errors.New("no branch is near")

const nearestSteps = 50

// nearest brings a node onto a branch by Newton's method in n equations and n+1
// unknowns, each step the shortest (Gauss-Newton; Deuflhard, Newton Methods for
// Nonlinear Problems, 2004, section 4.4), damped by the natural monotonicity test.
func (t *tracer) nearest(a *node, f *frame) error {
	if err := t.s.F(a.x, a.lambda, t.f); err != nil {
		return err
	}
	damping := 1.0
	trial := t.fresh()
	for range nearestSteps {
		if err := t.s.Fz(a.x, a.lambda, t.jac); err != nil {
			return err
		}
		t.fixRows()
		if err := t.shortest(a); err != nil {
			return err
		}
		step := t.solveRows()
		size := norm(step)
		if size < 1e-11 {
			t.move(a, a, step, 1)
			return nil
		}
		if longest := 1 / size; damping > longest {
			damping = longest
		}
		for ; ; damping /= 2 {
			if damping < 1e-3 {
				return errFar
			}
			t.move(trial, a, step, damping)
			err := t.s.F(trial.x, trial.lambda, t.f)
			if errors.Is(err, ErrInterrupted) {
				return err
			}
			if err == nil && norm(t.solveRows()) <= (1-damping/4)*size {
				break
			}
		}
		t.move(a, trial, step, 0)
		damping = math.Min(1, 4*damping)
		if f.beyond(append(slices.Clone(a.x), a.lambda)) > 1 {
			return errFar
		}
	}
	return errFar
}

// fixRows sets the sizes of the equations to those that they have here.
func (t *tracer) fixRows() {
	for i := range t.n {
		sum := 0.0
		for k, s := range t.S {
			sum += math.Abs(t.jac[i*(t.n+1)+k]) * s
		}
		t.rows[i] = sum
		if sum == 0 {
			t.rows[i] = 1
		}
	}
}

// shortest factors [F_z; tᵀ] with t the null vector of F_z, across which a step is the
// shortest.
func (t *tracer) shortest(a *node) error {
	c := make([]float64, t.n+1)
	for k := range c { // some row that is not a null vector's complement
		c[k] = 1 / float64(k+2)
	}
	if t.border(c) != nil || t.lu.Condition() > 1e13 {
		return errFar
	}
	null := make([]float64, t.n+1)
	null[t.n] = 1
	t.lu.Solve(null)
	length := norm(null)
	for i := range null {
		null[i] /= length
	}
	if t.border(null) != nil {
		return errFar
	}
	return nil
}

// solveRows returns the step for the residual at hand with the factors at hand.
func (t *tracer) solveRows() []float64 {
	step := make([]float64, t.n+1)
	for i, v := range t.f {
		step[i] = -v / t.rows[i]
	}
	t.lu.Solve(step)
	return step
}

// move places a node so many steps from another.
func (t *tracer) move(to, from *node, step []float64, damping float64) {
	z := t.scaled(from)
	for i := range z {
		z[i] += damping * step[i]
	}
	t.place(to, z)
}
