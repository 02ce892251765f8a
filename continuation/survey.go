package continuation

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// A SurveyOption changes how much a survey tries.
type SurveyOption func(*surveyPlan) error

type surveyPlan struct {
	effort  int
	most    int
	workers int
	follow  []FollowOption
}

const (
	usualEffort = 64
	usualMost   = 1000
)

// Effort sets how many starts in a row must find nothing new before a survey ends
// (default 64).
func Effort(starts int) SurveyOption {
	return func(p *surveyPlan) error {
		if starts < 1 {
			return fmt.Errorf("Effort(%d): at least one start is needed", starts)
		}
		p.effort = starts
		return nil
	}
}

// MostStates ends a survey that has found so many steady states (default 1000): a
// model that has a whole curve of them would never end.
func MostStates(n int) SurveyOption {
	return func(p *surveyPlan) error {
		if n < 1 {
			return fmt.Errorf("MostStates(%d): at least one is needed", n)
		}
		p.most = n
		return nil
	}
}

// Workers sets how many goroutines a survey uses (default one for each core). The
// result does not depend on it.
func Workers(n int) SurveyOption {
	return func(p *surveyPlan) error {
		if n < 1 {
			return fmt.Errorf("Workers(%d): at least one is needed", n)
		}
		p.workers = n
		return nil
	}
}

func newSurveyPlan(opts []SurveyOption) (*surveyPlan, error) {
	p := &surveyPlan{effort: usualEffort, most: usualMost}
	for _, set := range opts {
		if err := set(p); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// lag is how far starts may run ahead of what is known: starts before that do not
// know of each other. It bounds the cores that a survey can use.
const lag = 16

// Survey looks for all steady states of the model in a box of states, with the
// parameters that the model was made with. Starts from a low-discrepancy sequence
// (Sobol' 1967; Joe & Kuo 2008), the middle of the box first, go into a damped Newton
// iteration from which the steady states known so far are deflated (Farrell, Birkisson
// & Funke 2015), each again and again until it finds nothing more. The survey ends when
// a number of starts in a row, see [Effort], has found nothing new in the box.
//
// That is an effort, and no proof that there are no others: [Survey.Statement] says
// how much was tried. The result is the same on any number of cores.
//
// The error is for a box that does not fit, for a model that cannot be evaluated
// anywhere in it, and for a survey that finds nothing. An interrupt keeps what was
// found.
func (m *Model) Survey(box Box, opts ...SurveyOption) (*Survey, error) {
	plan, err := newSurveyPlan(opts)
	if err != nil {
		return nil, fmt.Errorf("Survey of %s: %w", m.name, err)
	}
	f, err := m.frame(box, -1)
	if err != nil {
		return nil, fmt.Errorf("Survey of %s: %w", m.name, err)
	}
	s := newSearch(m, f, m.values(), plan)
	s.task = "Survey"
	s.run()
	if err := s.nothing(); err != nil {
		return nil, fmt.Errorf("Survey of %s: %w", m.name, err)
	}
	return s.survey(), nil
}

// A search is a survey at work.
type search struct {
	m      *Model
	frame  *frame
	p      []float64
	plan   *surveyPlan
	spread *spread
	task   string

	known    [][]float64 // deflated from the starts to come, in and out of the box
	roots    []*root     // of the same
	inside   int
	doubtful [][]float64
	effort   TriedStarts
	failed   error // why the model could not be evaluated at a start
	undefind int   // starts at which it could not
	stopped  error // an interrupt
}

// A root is a steady state that was found.
type root struct {
	point  *Point
	error  []float64 // of the state, estimated
	vague  bool      // f_x is nearly singular
	inside bool
}

func newSearch(m *Model, f *frame, p []float64, plan *surveyPlan) *search {
	return &search{m: m, frame: f, p: p, plan: plan, spread: newSpread(len(m.states))}
}

func (s *search) run() {
	inOrder(s.m.workers(s.plan.workers), lag, s.next, s.take)
	s.m.tellSurvey(s.task, s.effort.Starts, 1, true)
}

// done reports whether no more starts are to be tried, if those under way find
// nothing.
func (s *search) done(underway int) bool {
	return s.stopped != nil || s.effort.Barren+underway >= s.plan.effort || s.inside >= s.plan.most
}

func (s *search) next(i int) func() catch {
	if s.done(i - s.effort.Starts) {
		return nil
	}
	known := s.known[:len(s.known):len(s.known)]
	return func() catch { return s.from(i, known) }
}

// A catch is what one start has brought.
type catch struct {
	roots       []*root
	doubtful    [][]float64
	runs        int
	evaluations int
	undefined   error
	interrupted error
}

// from hunts from start number i until nothing more is found.
func (s *search) from(i int, known [][]float64) (c catch) {
	n := len(s.m.states)
	u, start := make([]float64, n), make([]float64, n)
	s.spread.start(i, u)
	s.frame.at(u, start)
	sys := newSystem(s.m, start, s.p, -1)
	s.frame.scale(sys)
	defer func() { c.evaluations = sys.evaluations }()
	known = slices.Clone(known)
	for {
		c.runs++
		h := newHunt(sys, s.frame, start)
		h.known = known
		h.radius = deflationRadii[i%len(deflationRadii)]
		if err := h.run(); err != nil {
			c.note(err, h)
			return c
		}
		r, err := s.polish(h, sys)
		switch {
		case err != nil:
			c.note(err, h)
			c.doubt(h)
			return c
		case isKnown(r.point.State, r.error, known):
			return c
		}
		c.roots = append(c.roots, r)
		known = append(known, r.point.State)
	}
}

// note keeps what ended a hunt, where that says more than that it found nothing.
func (c *catch) note(err error, h *hunt) {
	switch {
	case errors.Is(err, ErrInterrupted):
		c.interrupted = err
	case h.steps == 0:
		c.undefined = err
	}
}

// doubt keeps a place at which the equations vanish to rounding though no steady
// state could be confirmed.
func (c *catch) doubt(h *hunt) {
	if c.interrupted == nil && h.residual < 1e-9 {
		c.doubtful = append(c.doubtful, h.x)
	}
}

// scale gives the states without a tag their size in the box, by which all are
// measured now.
func (f *frame) scale(s *system) {
	for i := range s.sx {
		if !s.tagged[i] {
			s.sx[i] = f.width[i] / 2
			s.tagged[i] = true
		}
	}
}

// polish goes on from where a hunt has ended with the equations themselves. States
// without a tag are then measured by themselves, so that small ones are exact too;
// where that does not converge, as for a state that is 0, by the box.
func (s *search) polish(h *hunt, sys *system) (*root, error) {
	n, err := s.settle(h, sys, false)
	byBox := err != nil && !errors.Is(err, ErrInterrupted)
	if byBox {
		n, err = s.settle(h, sys, true)
	}
	if err != nil {
		return nil, err
	}
	for i, v := range n.x {
		if math.Abs(v) < 1e-100*s.frame.width[i] {
			n.x[i] = 0 // Newton's method comes ever nearer, and never to it
		}
	}
	p := &Point{
		State: n.x, Parameters: slices.Clone(s.p),
		Unstable: -1, Iterations: h.steps + n.steps, model: s.m, free: -1,
	}
	if err := p.judge(sys, n.jac); err != nil {
		return nil, err
	}
	most := n.uncertainty(h.most)
	r := &root{point: p, error: n.uncertainty(nil), inside: s.frame.holds(n.x)}
	if byBox {
		r.error = most
	}
	for i, e := range most {
		r.vague = r.vague || e > 1e-7*s.frame.width[i]
	}
	return r, nil
}

func (s *search) settle(h *hunt, sys *system, byBox bool) (*newton, error) {
	for i, v := range s.m.states {
		sys.tagged[i] = byBox || v.Scale > 0
	}
	defer s.frame.scale(sys)
	n := &newton{s: sys, x: slices.Clone(h.x)}
	return n, n.run()
}

// uncertainty estimates the error of a converged state: what the rounding of f comes to
// through the inverse of f_x, with terms as large as they are there, or as those met on
// the way if these are given.
func (n *newton) uncertainty(most []float64) []float64 {
	size := n.s.n
	sum, column := make([]float64, size), make([]float64, size)
	for k := range size {
		clear(column)
		column[k] = 8 * epsilon
		if most != nil {
			column[k] *= math.Max(1, most[k]/n.rowSize(k))
		}
		n.lu.Solve(column)
		for i, v := range column {
			sum[i] += math.Abs(v) * n.columnSize(i)
		}
	}
	return sum
}

// isKnown reports whether a state is one of those known: the same to rounding, or to
// the error that its condition allows.
func isKnown(x, uncertain []float64, known [][]float64) bool {
	return slices.ContainsFunc(known, func(r []float64) bool { return sameState(x, r, uncertain) })
}

const double = 1e-7 // relative distance at which two steady states are one

func sameState(x, y, uncertain []float64) bool {
	for i := range x {
		size := math.Max(math.Abs(x[i]), math.Abs(y[i]))
		if math.Abs(x[i]-y[i]) > double*size+4*uncertain[i] {
			return false
		}
	}
	return true
}

// take merges what start has brought, in the order of the starts.
func (s *search) take(c catch) {
	s.effort.Starts++
	s.effort.Barren++
	s.effort.Runs += c.runs
	s.effort.Evaluations += c.evaluations
	if c.interrupted != nil && s.stopped == nil {
		s.stopped = c.interrupted
	}
	if c.undefined != nil {
		s.undefind++
		s.failed = c.undefined
	}
	for _, r := range c.roots {
		if isKnown(r.point.State, r.error, s.known) {
			continue
		}
		s.known = append(s.known, r.point.State)
		s.roots = append(s.roots, r)
		if r.inside {
			s.inside++
			s.effort.Barren = 0
		}
	}
	s.doubtful = append(s.doubtful, c.doubtful...)
	s.m.tellSurvey(s.task, s.effort.Starts, float64(s.effort.Barren)/float64(s.effort.Barren+s.plan.effort), false)
}

func (m *Model) tellSurvey(task string, starts int, fraction float64, done bool) {
	if m.observer != nil {
		m.observer.Progress(Progress{Task: task, Steps: starts, Fraction: fraction, Value: math.NaN(), Done: done})
	}
}

// nothing says what was tried when there is nothing to show.
func (s *search) nothing() error {
	switch {
	case s.inside > 0:
		return nil
	case s.stopped != nil:
		return fmt.Errorf("%w before a steady state was found, after %s", ErrInterrupted, s.effort)
	case s.undefind == s.effort.Starts:
		return fmt.Errorf("the model could not be evaluated at any of %d starts in the box: %w", s.effort.Starts, s.failed)
	case len(s.known) > 0:
		return fmt.Errorf("no steady state in the box, but %d near it, the first at %s; tried: %s", len(s.known), s.roots[0].point.place(), s.effort)
	}
	return fmt.Errorf("no steady state found in the box; tried: %s; look in a wider box, or try more with Effort", s.effort)
}
