package continuation

import (
	"errors"
	"fmt"
	"math"
)

// A TimeOption changes how a model is integrated in time.
type TimeOption func(*timePlan) error

type timePlan struct {
	tolerance float64
	floor     float64
	maxSteps  int
	limit     float64 // time at which Relax gives up
}

func newTimePlan(opts []TimeOption) (*timePlan, error) {
	p := &timePlan{tolerance: 1e-6, floor: 1e-3, maxSteps: 100_000, limit: math.Inf(1)}
	for _, set := range opts {
		if err := set(p); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// Accuracy sets the relative tolerance of an integration in time (default 1e-6): the
// estimated error of a step in each state is held below it, relative to the state or to
// a small part (see [AccuracyFloor]) of the greatest size that the state has had.
func Accuracy(tolerance float64) TimeOption {
	return func(p *timePlan) error {
		if !positive(tolerance) || tolerance > 0.1 {
			return fmt.Errorf("Accuracy(%g): a tolerance must be positive and at most 0.1", tolerance)
		}
		p.tolerance = tolerance
		return nil
	}
}

// AccuracyFloor says below which part of its greatest size a state need not be exact
// (default 0.001).
func AccuracyFloor(part float64) TimeOption {
	return func(p *timePlan) error {
		if !(part >= 0 && part <= 1) {
			return fmt.Errorf("AccuracyFloor(%g): a part between 0 and 1 is wanted", part)
		}
		p.floor = part
		return nil
	}
}

// MaxTimeSteps limits the number of accepted steps in time (default 100000).
func MaxTimeSteps(n int) TimeOption {
	return func(p *timePlan) error {
		if n < 1 {
			return fmt.Errorf("MaxTimeSteps(%d): at least one step is needed", n)
		}
		p.maxSteps = n
		return nil
	}
}

// TimeLimit ends a relaxation at that time, in the model's unit of time (default
// none).
func TimeLimit(t float64) TimeOption {
	return func(p *timePlan) error {
		if !positive(t) {
			return fmt.Errorf("TimeLimit(%g): a time must be positive", t)
		}
		p.limit = t
		return nil
	}
}

// Simulate integrates dx/dt = f(x, p) from a state for a time, by an L-stable
// Rosenbrock method of order 4 with embedded error estimate (Hairer & Wanner, Solving
// Ordinary Differential Equations II, 1996, section IV.7 and VI.4), which serves stiff
// models too. The time is in the unit in which the model gives its rates of change. The
// parameters are those that the model was made with.
//
// A trajectory that ends early says why; the error is for what cannot begin, among it a
// [Balance], which has no time behind it.
func (m *Model) Simulate(from any, time float64, opts ...TimeOption) (*Trajectory, error) {
	if !positive(time) {
		return nil, fmt.Errorf("Simulate of %s for a time of %g: a time must be positive", m.name, time)
	}
	c, err := m.clock("Simulate", from, opts)
	if err != nil {
		return nil, err
	}
	for c.why == nil && c.t < time {
		c.advance(time - c.t)
	}
	c.finish(fmt.Sprintf("reached time %.6g", time))
	return c.path, nil
}

// A clock integrates one trajectory.
type clock struct {
	plan *timePlan
	s    *system
	r    *rosenbrock
	path *Trajectory
	task string

	t          float64
	x, f       []float64
	h          float64   // next step
	size       []float64 // the greatest that each state has had, or its tag
	weight     []float64
	next, err  []float64
	fnext      []float64
	before     float64 // error of the last accepted step, over the tolerance
	refused    bool    // the last step was
	begun      bool    // f_x at x is there
	why        error   // why it cannot go on
	lastDomain error
	timescale  float64 // the shortest at the start
	unsized    []bool  // states that were 0 at the start and whose size nothing told
}

var (
	errTimeSteps = errors.New("out of steps")
	errTooFine   = errors.New("step too fine")
)

// clock makes one that stands at the start.
func (m *Model) clock(task string, from any, opts []TimeOption) (*clock, error) {
	fail := func(err error) (*clock, error) { return nil, fmt.Errorf("%s of %s: %w", task, m.name, err) }
	if m.balance {
		return fail(errors.New("the model is a balance without time behind it, so nothing moves; find its states with Settle or Survey"))
	}
	plan, err := newTimePlan(opts)
	if err != nil {
		return fail(err)
	}
	x, err := m.equations.state(from)
	if err != nil {
		return fail(err)
	}
	p := m.values()
	s := newSystem(m, x, p, -1)
	if err := checkGuess(s, x); err != nil {
		return fail(err)
	}
	n := s.n
	c := &clock{plan: plan, s: s, task: task, x: x, f: make([]float64, n), size: make([]float64, n), weight: make([]float64, n),
		next: make([]float64, n), err: make([]float64, n), fnext: make([]float64, n), before: 1}
	c.path = &Trajectory{model: m, parameters: p}
	if err := s.Eval(x, p, c.f); err != nil {
		return fail(fmt.Errorf("no start: %w; change the start or the parameters", err))
	}
	c.r = newRosenbrock(s)
	c.path.add(0, x, c.f)
	return c, c.first()
}

// first guesses the first step: one on which the states change by a hundredth, and
// their rates of change too (Hairer, Nørsett & Wanner, Solving Ordinary Differential
// Equations I, section II.4).
func (c *clock) first() error {
	c.grow(c.x)
	if c.begin(); c.why != nil {
		return fmt.Errorf("%s of %s: no start: %w", c.task, c.s.m.name, c.why)
	}
	c.guessSizes()
	c.unsized = make([]bool, len(c.size))
	for i, v := range c.size {
		c.unsized[i] = v == 0
	}
	c.weigh(c.x, 0)
	d0, d1 := weighted(c.x, c.weight), weighted(c.f, c.weight)
	h := 1e-6
	if d0 > 1e-5 && d1 > 1e-5 {
		h = 0.01 * d0 / d1
	}
	for i := range c.next {
		c.next[i] = c.x[i] + h*c.f[i]
	}
	if err := c.s.Eval(c.next, c.s.p, c.fnext); err != nil {
		if errors.Is(err, ErrInterrupted) {
			return fmt.Errorf("%s of %s: %w", c.task, c.s.m.name, err)
		}
		c.h = h * 1e-3
		return nil
	}
	for i := range c.err {
		c.err[i] = (c.fnext[i] - c.f[i]) / h
	}
	d2 := weighted(c.err, c.weight)
	c.h = math.Min(100*h, math.Pow(0.01/math.Max(math.Max(d1, d2), 1e-15), 0.25))
	return nil
}

// guessSizes gives the states that are 0 at the start, and have no scale, the size to
// which the others drive them: where its own decay stops it, or as far as it comes
// within the time in which the others change.
func (c *clock) guessSizes() {
	c.timescale = c.doubling()
	n := c.s.n
	known := append([]float64(nil), c.size...)
	for range n {
		changed := false
		for i := range n {
			if known[i] > 0 {
				continue
			}
			drive := math.Abs(c.f[i])
			for k, v := range c.size {
				if k != i {
					drive = math.Max(drive, math.Abs(c.r.jac[i*n+k])*v)
				}
			}
			size := drive / math.Max(math.Abs(c.r.jac[i*n+i]), 1/c.timescale)
			changed = changed || size > 2*c.size[i]
			c.size[i] = math.Max(c.size[i], size)
		}
		if !changed {
			return
		}
	}
}

// doubling is the shortest time in which a state that is not 0 would double.
func (c *clock) doubling() float64 {
	rate := 0.0
	for i, v := range c.x {
		if v != 0 {
			rate = math.Max(rate, math.Abs(c.f[i]/v))
		}
	}
	if rate == 0 {
		return 1
	}
	return 1 / rate
}

// grow takes note of the sizes of the states.
func (c *clock) grow(x []float64) {
	for i, v := range x {
		if c.s.tagged[i] {
			c.size[i] = c.s.sx[i]
		}
		c.size[i] = math.Max(c.size[i], math.Abs(v))
		if !c.s.tagged[i] && c.size[i] > 0 {
			c.s.sx[i] = c.size[i]
		}
	}
}

// weigh sets the error that each state may have in a step of length h to x. A state
// that has only begun to leave 0 has no relative error to speak of in very short steps.
func (c *clock) weigh(x []float64, h float64) {
	for i := range c.weight {
		if c.unsized[i] && h < 1e-6*c.timescale {
			c.weight[i] = math.Inf(1)
			continue
		}
		size := math.Max(math.Max(math.Abs(c.x[i]), math.Abs(x[i])), c.plan.floor*c.size[i])
		c.weight[i] = c.plan.tolerance * size
	}
}

// advance takes one accepted step of at most that length, or sets why there is none.
func (c *clock) advance(most float64) {
	if !c.begin() {
		return
	}
	for {
		if c.path.Steps >= c.plan.maxSteps {
			c.why = errTimeSteps
			return
		}
		h, cut := c.h, false
		if h >= most {
			h, cut = most, true
		} else if h > most/2 {
			h = most / 2 // two alike, not a long one and a splinter
		}
		if c.t+h == c.t || h < 1e-290 {
			c.why = errTooFine
			return
		}
		if c.try(h, cut) || c.why != nil {
			return
		}
	}
}

// begin takes f_x at the state where the clock stands.
func (c *clock) begin() bool {
	if c.begun {
		return true
	}
	if err := c.r.begin(c.x); err != nil {
		c.fail(err)
		if c.why == nil {
			c.why = err
		}
		return false
	}
	c.begun = true
	return true
}

// fail notes an error of the model; only an interrupt is final.
func (c *clock) fail(err error) {
	if errors.Is(err, ErrInterrupted) {
		c.why = err
		return
	}
	var domain *DomainError
	if errors.As(err, &domain) {
		c.lastDomain = err
	}
}

// try takes a step of length h if its error allows, and chooses the next length by the
// predictive controller of Gustafsson (Hairer & Wanner, section IV.8).
func (c *clock) try(h float64, cut bool) bool {
	err := c.r.step(c.x, c.f, h, c.next, c.err)
	if err == nil {
		err = c.s.Eval(c.next, c.s.p, c.fnext)
	}
	if err != nil {
		c.fail(err)
		c.h, c.refused = h/4, true
		c.path.Rejected++
		return false
	}
	c.weigh(c.next, h)
	off := weighted(c.err, c.weight)
	factor := math.Min(5, math.Max(0.15, 0.9*math.Pow(math.Max(off, 1e-12), -0.25)))
	if off > 1 || math.IsNaN(off) || c.acrossPole() {
		c.h, c.refused = h*math.Min(factor, 0.5), true
		c.path.Rejected++
		return false
	}
	if c.path.Steps > 0 {
		predicted := 0.9 * math.Pow(c.before/(math.Max(off, 1e-12)*math.Max(off, 1e-2)), 0.25)
		factor = math.Min(factor, math.Max(0.15, predicted))
	}
	if c.refused {
		factor = math.Min(factor, 1)
	}
	c.before, c.refused = math.Max(off, 1e-2), false
	if next := h * factor; !cut || next < c.h {
		c.h = next
	}
	c.accept(c.t+h, c.next, c.fnext)
	return true
}

// acrossPole reports whether a state has gone far against the direction in which it
// moves at both ends of the step: a method with rational steps can pass the infinity of
// a solution that explodes, which no solution can.
func (c *clock) acrossPole() bool {
	for i, v := range c.next {
		d := v - c.x[i]
		if d*c.f[i] < 0 && d*c.fnext[i] < 0 && math.Abs(d) > 0.5*math.Max(math.Abs(v), math.Abs(c.x[i])) {
			return true
		}
	}
	return false
}

func (c *clock) accept(t float64, x, f []float64) {
	c.t = t
	copy(c.x, x)
	copy(c.f, f)
	c.begun = false
	c.path.Steps++
	c.grow(x)
	c.path.add(t, x, f)
}

// finish says why the trajectory ends; done is what to say when nothing stopped it.
func (c *clock) finish(done string) {
	c.path.Evaluations = c.s.evaluations
	var domain *DomainError
	switch {
	case c.why == nil:
		c.path.Ended = done
	case errors.Is(c.why, ErrInterrupted):
		c.path.Ended = fmt.Sprintf("was interrupted at time %.6g", c.t)
		c.path.stopped = true
	case errors.Is(c.why, errTimeSteps):
		c.path.Ended = fmt.Sprintf("took all %d steps and stopped at time %.6g; allow more with MaxTimeSteps", c.path.Steps, c.t)
	case errors.As(c.lastDomain, &domain):
		c.path.Ended = fmt.Sprintf("stopped at time %.6g: %v", c.t, domain)
	default:
		c.path.Ended = fmt.Sprintf("stopped at time %.6g, where the states change ever faster (%v)", c.t, c.why)
	}
}
