package continuation

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Follow follows the branch through this steady state in a parameter, in both
// directions unless told otherwise, by pseudo-arclength (Keller, Numerical
// solution of bifurcation and nonlinear eigenvalue problems, 1977; Allgower &
// Georg, Numerical Continuation Methods, 1990): a predictor along tangent and
// curvature, Newton's method on the bordered system, steps chosen from the
// corrector's contraction rate and the angle between tangents.
//
// The error is for what cannot begin: an unknown name, options that do not fit, a
// start outside the range or where the model fails. A run that ends early is a
// branch with a reason.
func (p *Point) Follow(parameter string, opts ...FollowOption) (*Branch, error) {
	plan, err := newPlan(opts)
	if err != nil {
		return nil, fmt.Errorf("Follow %s: %w", parameter, err)
	}
	j, err := p.model.parameterIndex(parameter)
	if err != nil {
		return nil, fmt.Errorf("Follow: %w", err)
	}
	up, err := begin(p, j, plan)
	if err != nil {
		return nil, fmt.Errorf("Follow %s: %w", parameter, err)
	}
	r := &run{plan: plan, task: "Follow " + parameter, up: up}
	return r.both(), nil
}

// begin makes a tracer that stands at the start, facing greater values of the
// parameter.
func begin(p *Point, j int, plan *plan) (*tracer, error) {
	if err := plan.check(p, j); err != nil {
		return nil, err
	}
	s := newSystem(p.model, p.State, p.Parameters, j)
	t := newTracer(s, plan)
	t.learn(p.sizes)
	lambda := p.Parameters[j]
	if err := t.setScales(p.State, lambda); err != nil {
		return nil, fmt.Errorf("no start: %w", err)
	}
	a := t.fresh()
	copy(a.x, p.State)
	a.lambda = lambda
	if err := t.stand(a); err != nil {
		return nil, err
	}
	t.nodes = []*node{a}
	if err := t.startAtFold(a); err != nil {
		return nil, err
	}
	return t, nil
}

// startAtFold marks a start that is a fold itself: no change of sign on either
// side of it would show.
func (t *tracer) startAtFold(a *node) error {
	if math.Abs(a.t[t.n]) > 1e-5 || t.plan.locus != nil {
		return nil
	}
	ahead, err := t.reach(a, t.plan.first)
	if err != nil {
		return notRefusal(err)
	}
	back := *a
	back.t, back.k, back.det = negated(a.t), nil, -a.det
	behind, err := t.reach(&back, t.plan.first)
	if err != nil {
		return notRefusal(err)
	}
	behind.t, behind.det = negated(behind.t), -behind.det
	behind.arc = -behind.arc
	fold, err := t.refineFold(t.between(behind, ahead))
	if err != nil {
		return notRefusal(err)
	}
	if near := t.between(a, fold); near.length < 1e-6 {
		a.special = fold.special
	}
	return nil
}

// notRefusal keeps interrupts and drops refusals.
func notRefusal(err error) error {
	if errors.Is(err, ErrInterrupted) {
		return err
	}
	return nil
}

func negated(v []float64) []float64 {
	w := make([]float64, len(v))
	for i, x := range v {
		w[i] = -x
	}
	return w
}

// learn takes over sizes from the run that the start comes from.
func (t *tracer) learn(from *sizes) {
	if from == nil {
		return
	}
	for i, v := range from.states {
		if !t.s.tagged[i] {
			t.s.sx[i] = math.Max(t.s.sx[i], v)
			t.known[i] = v
		}
	}
	copy(t.most, from.equations)
}

// check looks at what the options say about this start.
func (plan *plan) check(p *Point, j int) error {
	q := p.model.parameters[j]
	now := p.Parameters[j]
	if now < plan.low || now > plan.high {
		return fmt.Errorf("the start has %s %s, outside the range %s to %s: settle a start inside it or widen Within",
			q.Name, withUnit(now, q.Unit), withUnit(plan.low, q.Unit), withUnit(plan.high, q.Unit))
	}
	for _, b := range plan.bounds {
		i, err := p.model.stateIndex(b.name)
		if err != nil {
			return fmt.Errorf("Bound: %w", err)
		}
		if v := p.State[i]; v < b.low || v > b.high {
			return fmt.Errorf("the start has %s %.6g, outside its bounds %g to %g: widen Bound", b.name, v, b.low, b.high)
		}
	}
	switch plan.local {
	case arclength, natural, automatic:
	case q.Name:
		plan.local = natural
	default:
		if _, err := p.model.stateIndex(plan.local); err != nil {
			return fmt.Errorf("Local: %w", err)
		}
	}
	return nil
}

// stand polishes the start at its value of the parameter and gives it a tangent.
// The null space of F_z shows whether there is one tangent, or the start is a
// branch point.
func (t *tracer) stand(a *node) error {
	if err := t.evaluate(a); err != nil {
		return fmt.Errorf("no start: %w", err)
	}
	t.naturalRows()
	direction, err := t.onlyTangent(a)
	if err != nil {
		return err
	}
	if direction[t.n] < 0 {
		direction = negated(direction)
	}
	// Held at its parameter where that is possible: the start is a point of the
	// analyst's and should not move in λ.
	lambda := a.lambda
	border := direction
	if math.Abs(direction[t.n]) > 1e-4 {
		border = make([]float64, t.n+1)
		border[t.n] = 1
	}
	if err := t.correct(a, border); err != nil {
		if errors.Is(err, ErrInterrupted) {
			return err
		}
		return fmt.Errorf("the start at %s does not hold as a steady state: %w; settle it again", t.where(a), err)
	}
	if border[t.n] == 1 {
		a.lambda = lambda
	}
	return t.complete(a, border, direction)
}

func (t *tracer) onlyTangent(a *node) ([]float64, error) {
	var svd mat.SVD
	if !svd.Factorize(t.scaledJacobian(), mat.SVDFull) {
		return nil, &refusal{reason: "the singular values at the start did not converge"}
	}
	values := svd.Values(nil)
	if values[len(values)-1] < 1e-9 {
		return nil, fmt.Errorf("the start at %s is a singular point where branches cross (or every equation is flat there): settle a start away from it", t.where(a))
	}
	var v mat.Dense
	svd.VTo(&v)
	return mat.Col(nil, t.n, &v), nil
}

// turned returns a tracer at the same start, facing the other way.
func (t *tracer) turned() *tracer {
	o := newTracer(t.s, t.plan)
	first := t.nodes[0]
	copy(o.S, first.scales)
	copy(o.most, t.most)
	for i := range o.n {
		if !o.s.tagged[i] {
			o.s.sx[i] = o.S[i] / math.Sqrt(float64(o.n))
		}
	}
	a := *first
	a.t, a.det = negated(first.t), -first.det
	a.arc = 0
	o.nodes = []*node{&a}
	return o
}

// A run follows a branch in both directions.
type run struct {
	plan     *plan
	task     string
	up, down *tracer
	steps    int
}

func (r *run) both() *Branch {
	if r.plan.up {
		r.drive(r.up)
	} else {
		r.up.end = &End{Reason: NotFollowed, Text: "was not followed towards greater values"}
	}
	closed := r.up.end.Reason == Closed
	if r.plan.locus != nil {
		r.plan.locus.restart()
	}
	r.down = r.up.turned()
	switch {
	case closed:
	case r.up.end.Reason == Interrupted:
		r.down.end = &End{Reason: Interrupted, Text: r.up.end.Text}
	case r.plan.down:
		r.drive(r.down)
	default:
		r.down.end = &End{Reason: NotFollowed, Text: "was not followed towards smaller values"}
	}
	b := r.join()
	r.tell(r.up, true)
	return b
}

// leaving sets the end of a tracer that stands on a bound and faces outward.
func (t *tracer) leaving() {
	a := t.nodes[len(t.nodes)-1]
	if (a.lambda == t.plan.high && a.t[t.n] > 0) || (a.lambda == t.plan.low && a.t[t.n] < 0) {
		t.end = &End{Reason: LeftRange, Text: "left the range at " + t.where(a)}
	}
}

// drive advances a tracer to its end.
func (r *run) drive(t *tracer) {
	t.leaving()
	for t.end == nil {
		if t.steps >= t.plan.maxSteps {
			last := t.nodes[len(t.nodes)-1]
			t.end = &End{Reason: OutOfSteps, Text: fmt.Sprintf("took all %d steps and stopped at %s; allow more with MaxSteps", t.steps, t.where(last))}
			break
		}
		if err := t.advance(); err != nil {
			t.halt(err)
			break
		}
		r.steps++
		r.tell(t, false)
	}
}

// halt ends a run by an error of advance: an interrupt.
func (t *tracer) halt(err error) {
	last := t.nodes[len(t.nodes)-1]
	reason, text := StepTooFine, "stopped at "+t.where(last)+": "+err.Error()
	if errors.Is(err, ErrInterrupted) {
		reason, text = Interrupted, "was interrupted at "+t.where(last)
	}
	t.end = &End{Reason: reason, Text: text}
}

func (r *run) tell(t *tracer, done bool) {
	o := t.s.m.observer
	if o == nil {
		return
	}
	last := t.nodes[len(t.nodes)-1]
	o.Progress(Progress{Task: r.task, Steps: r.steps, Fraction: r.fraction(t, last, done), Value: last.lambda, Done: done, Partial: r.join})
}

// fraction guesses how much of the work is done, from the share of the range
// that the tracer has come through. A fold makes it fall back, as the work ahead
// grows.
func (r *run) fraction(t *tracer, last *node, done bool) float64 {
	if done {
		return 1
	}
	from := t.nodes[0].lambda
	to := t.plan.high
	if t == r.down {
		to = t.plan.low
	}
	if math.IsInf(to, 0) || to == from {
		return math.Min(0.99, float64(t.steps)/float64(t.plan.maxSteps))
	}
	share := math.Max(0, math.Min(0.99, (last.lambda-from)/(to-from)))
	switch {
	case !r.plan.up || !r.plan.down:
		return share
	case t == r.down:
		return 0.5 + share/2
	default:
		return share / 2
	}
}

// join makes one branch of both directions.
func (r *run) join() *Branch {
	t := r.up
	b := &Branch{model: t.s.m, free: t.s.free}
	if r.down != nil && len(r.down.nodes) > 1 {
		for i := len(r.down.nodes) - 1; i > 0; i-- {
			b.add(r.down, r.down.nodes[i], true)
		}
	}
	b.start = len(b.points)
	for _, a := range r.up.nodes {
		b.add(r.up, a, false)
	}
	b.finish(r)
	return b
}

// add appends a node as a point.
func (b *Branch) add(t *tracer, a *node, reversed bool) {
	p := t.point(a)
	if reversed {
		p.Tangent = negated(p.Tangent)
		p.Arclength = -p.Arclength
	}
	if s := a.special; s != nil {
		s = s.on(p, len(b.points), reversed)
		b.specials = append(b.specials, s)
	}
	b.points = append(b.points, p)
}

// finish sets ends, notes and counts.
func (b *Branch) finish(r *run) {
	for i, t := range []*tracer{r.down, r.up} {
		if t == nil {
			continue
		}
		if t.end != nil {
			b.ends[i] = *t.end
		}
		b.notes = append(b.notes, t.notes...)
		b.rejected = append(b.rejected, t.rejected...)
		b.steps += t.steps
	}
	if r.up.end != nil && r.up.end.Reason == Closed {
		b.closed = true
		b.ends[0] = b.ends[1]
	}
	b.ends[0].Point, b.ends[1].Point = b.points[0], b.points[len(b.points)-1]
	b.countAtStart()
}

// countAtStart sets the counts around a special point that the run began at from
// the points beside it.
func (b *Branch) countAtStart() {
	for _, s := range b.specials {
		if s.Index() != b.start {
			continue
		}
		before, after := s.around()
		if b.start > 0 {
			before = b.points[b.start-1].Unstable
		}
		if b.start < len(b.points)-1 {
			after = b.points[b.start+1].Unstable
		}
		s.recount(before, after)
	}
}

// point makes the point of a node, in the user's units.
func (t *tracer) point(a *node) *Point {
	p := &Point{
		State: a.x, Parameters: append([]float64(nil), t.s.p...), Parameter: t.s.m.parameters[t.s.free].Name,
		Eigenvalues: a.eigenvalues, Unstable: a.unstable,
		StepLength: a.step, Arclength: a.arc, Iterations: a.iterations, model: t.s.m, free: t.s.free,
		sizes: &sizes{t.s.sx, t.most, t.S[t.n]},
	}
	p.Parameters[t.s.free] = a.lambda
	p.Tangent = make([]float64, len(a.t))
	for i, v := range a.t {
		p.Tangent[i] = v * a.scales[i]
	}
	return p
}
