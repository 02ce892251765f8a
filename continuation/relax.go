package continuation

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"brinkline/continuation/linalg"
)

// A Relaxation is what becomes of a model that is left to itself: the trajectory, and
// the steady state or the oscillation that it comes to.
type Relaxation struct {
	path  *Trajectory
	rest  *Point
	cycle *Oscillation
	why   string // why there is no steady state
}

// An Oscillation is a periodic motion that a relaxation has come to.
type Oscillation struct {
	Period      float64 // in the model's unit of time
	Uncertainty float64 // of the period: how much the last ones differ, and the tolerance
	// Repeats is by how much the states differ from one period to the next, at most,
	// relative to their swing.
	Repeats         float64
	Least, Greatest []float64 // of each state within a period
	Mean            []float64 // of each state over a period
}

// Trajectory returns the states in time.
func (r *Relaxation) Trajectory() *Trajectory { return r.path }

// Model returns the model.
func (r *Relaxation) Model() *Model { return r.path.model }

// Steady returns the steady state that was come to, polished by Newton's method. The
// error says what there is in its place: an oscillation, or a motion that went on.
func (r *Relaxation) Steady() (*Point, error) {
	if r.rest == nil {
		return nil, fmt.Errorf("Relax of %s came to no steady state: it %s", r.path.model.name, r.why)
	}
	return r.rest, nil
}

// Oscillation returns the oscillation that was come to, nil when there is none.
func (r *Relaxation) Oscillation() *Oscillation { return r.cycle }

// Interrupted reports whether the integration was interrupted.
func (r *Relaxation) Interrupted() bool { return r.path.stopped }

// String says in one line what was come to.
func (r *Relaxation) String() string {
	if r.rest != nil {
		t, _ := r.path.End()
		return fmt.Sprintf("%s relaxes by time %.4g to the %s", r.path.model.name, t, r.rest)
	}
	return r.path.model.name + " " + r.why
}

// Relax integrates dx/dt = f(x, p) from a state until it has come to rest, and then
// polishes the steady state by Newton's method, or until it repeats itself: an
// oscillation, whose period is measured. The integrator is that of [Model.Simulate].
//
// At rest means: a Newton step away from a stable steady state by less than 1e-5 of the
// size of each state. An oscillation means: the last returns to a section across the
// trajectory agree within 0.001 of the swing, and what they still change would, at the
// rate at which that falls, sum up to no more; a spiral that closes slowly is none.
//
// A relaxation that comes to neither says so in [Relaxation.Steady]; the error is for
// what cannot begin, among it a [Balance], which has no time behind it.
func (m *Model) Relax(guess any, opts ...TimeOption) (*Relaxation, error) {
	c, err := m.clock("Relax", guess, opts)
	if err != nil {
		return nil, err
	}
	r := &relaxing{clock: c, returns: returns{clock: c}}
	for !r.over() && c.why == nil {
		r.step()
	}
	return r.result(), nil
}

// A relaxing is a relaxation at work.
type relaxing struct {
	*clock
	returns
	rest    *Point
	outcome string // why it is over, when it came to no end of its own kind
	lu      linalg.LU
	told    int
}

func (r *relaxing) over() bool { return r.rest != nil || r.found != nil || r.outcome != "" }

func (r *relaxing) step() {
	if !r.begin() {
		return
	}
	if r.look(); r.over() {
		return
	}
	left := r.plan.limit - r.t
	if left <= 0 {
		r.outcome = fmt.Sprintf("was still moving at the time limit %.6g", r.t)
		return
	}
	r.remember()
	if r.advance(left); r.why == nil {
		r.passed()
		r.tell(false)
	}
}

func (r *relaxing) tell(done bool) {
	if o := r.s.m.observer; o != nil {
		r.told++
		fraction := 0.0
		if !math.IsInf(r.plan.limit, 0) {
			fraction = r.t / r.plan.limit
		}
		o.Progress(Progress{Task: "Relax", Steps: r.path.Steps, Fraction: fraction, Value: math.NaN(), Done: done})
	}
}

const (
	atRest  = 1e-5 // distance from the steady state, relative to the sizes of the states
	slowly  = 1e-2 // change in a step that is worth a look
	stuck   = 1e-10
	endless = 1e-8 // change within the whole time so far that is none
)

// look sees whether a steady state is close by. f_x at the present state is there.
func (r *relaxing) look() {
	if r.path.Steps > 0 && r.changed() > slowly {
		return
	}
	far := r.distance() // NaN compares with nothing
	if far > atRest {
		return
	}
	n, err := r.polish()
	if math.IsNaN(far) || err != nil {
		if r.path.Steps > 0 && r.drift() < endless { // something is conserved
			r.outcome = fmt.Sprintf("came to rest at time %.4g where f_x is singular, so that Newton's method cannot confirm it: a total may be conserved; put it in place of one of the equations", r.t)
		}
		return
	}
	if r.apart(n.x, r.x) > 10*atRest {
		return
	}
	p := &Point{State: n.x, Parameters: r.path.parameters, Unstable: -1, Iterations: n.steps, model: r.s.m, free: -1}
	if p.judge(r.s, n.jac) != nil {
		return
	}
	if p.Unstable == 0 {
		r.rest = p
	} else if far < stuck {
		r.outcome = fmt.Sprintf("stands still in an unstable steady state (%d eigenvalues with positive real part), %s: start a little away from it", p.Unstable, p.place())
	}
}

// polish goes on by Newton's method; a state that dies out is measured by the size that
// it has had when it has none of its own to converge to.
func (r *relaxing) polish() (*newton, error) {
	n := &newton{s: r.s, x: slices.Clone(r.x)}
	err := n.run()
	if err == nil || errors.Is(err, ErrInterrupted) {
		return n, err
	}
	own := r.s.tagged
	r.s.tagged = slices.Repeat([]bool{true}, r.s.n)
	defer func() { r.s.tagged = own }()
	n = &newton{s: r.s, x: slices.Clone(r.x)}
	return n, n.run()
}

// changed is by how much the last step has changed the states, relative to their
// sizes.
func (r *relaxing) changed() float64 { return r.apart(r.x, r.x0) }

func (r *relaxing) apart(x, y []float64) float64 {
	worst := 0.0
	for i, s := range r.s.sx {
		worst = math.Max(worst, math.Abs(x[i]-y[i])/s)
	}
	return worst
}

// drift is how far the states would come in as much time as has passed.
func (r *relaxing) drift() float64 {
	worst := 0.0
	for i, s := range r.s.sx {
		worst = math.Max(worst, math.Abs(r.f[i])*r.t/s)
	}
	return worst
}

// distance is the length of the Newton step to a steady state relative to the sizes of
// the states, NaN when f_x is singular.
func (r *relaxing) distance() float64 {
	n := r.s.n
	a, d := r.lu.Matrix(n), make([]float64, n)
	for i := range n {
		row := 0.0
		for k := range n {
			a[i*n+k] = r.r.jac[i*n+k] * r.s.sx[k]
			row = math.Max(row, math.Abs(a[i*n+k]))
		}
		if row == 0 {
			return math.NaN()
		}
		for k := range n {
			a[i*n+k] /= row
		}
		d[i] = -r.f[i] / row
	}
	if r.lu.Factor() != nil || r.lu.Condition() > 1e14 {
		return math.NaN()
	}
	r.lu.Solve(d)
	worst := 0.0
	for _, v := range d {
		worst = math.Max(worst, math.Abs(v))
	}
	return worst
}

func (r *relaxing) result() *Relaxation {
	out := &Relaxation{path: r.path, rest: r.rest, cycle: r.found}
	r.finish(r.outcome)
	switch {
	case r.rest != nil:
		r.path.Ended = fmt.Sprintf("came to rest by time %.4g", r.t)
	case r.found != nil:
		r.path.Ended = "oscillates with period " + r.found.periodText()
	case errors.Is(r.why, errTimeSteps):
		r.path.Ended = "was still moving: it " + r.path.Ended
	}
	out.why = r.path.Ended
	r.tell(true)
	return out
}

// periodText writes the period with the digits that can be relied on.
func (o *Oscillation) periodText() string { return FormatUncertain(o.Period, o.Uncertainty, 8) }

// String says the oscillation in a few words.
func (o *Oscillation) String() string { return "oscillation with period " + o.periodText() }
