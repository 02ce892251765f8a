package continuation

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Following passes options of [Point.Follow] to [Model.FollowAll], such as MaxSteps.
func Following(opts ...FollowOption) SurveyOption {
	return func(p *surveyPlan) error { p.follow = append(p.follow, opts...); return nil }
}

const (
	sliceCount  = 7    // values of the parameter at which a survey is made
	sliceEffort = 4    // part of the effort that each of them gets
	margin      = 0.01 // widths by which a branch may leave the box before it ends
)

// FollowAll follows all branches in a box of states and one parameter: the box names
// the parameter too, with the range in which it is followed,
//
//	plant.FollowAll("Coolant", continuation.Box{
//		"Coolant": {280, 320}, "Conversion": {0, 1}, "Temperature": {250, 450}})
//
// It surveys the states (see [Model.Survey]) at seven values of the parameter, follows
// the branch of every steady state that lies on none yet, and leaves every branch point
// on the branch that crosses there. Then starts from a low-discrepancy sequence in
// state and parameter together, brought onto the nearest branch by Newton's method in n
// equations and n+1 unknowns, look for branches that lie between, until so many in a
// row, see [Effort], have come to known ones. A branch ends where it leaves the range,
// or the box by more than a hundredth of its width. No branch is there twice.
//
// That is an effort, and no proof that there are no others: [Diagram.Statement] says
// how much was tried. The result is the same on any number of cores. The error is for
// what does not fit and for finding nothing; an interrupt keeps what was found.
func (m *Model) FollowAll(parameter string, box Box, opts ...SurveyOption) (*Diagram, error) {
	a, err := m.newAtlas(parameter, box, opts)
	if err != nil {
		return nil, fmt.Errorf("FollowAll: %w", err)
	}
	a.atSlices()
	a.atRandom()
	if err := a.nothing(); err != nil {
		return nil, fmt.Errorf("FollowAll %s: %w", parameter, err)
	}
	return a.diagram(), nil
}

// An atlas is a region at work: the branches found so far.
type atlas struct {
	m        *Model
	j        int
	frame    *frame // of the states, then the parameter
	states   *frame
	opts     *surveyPlan
	plan     *plan
	branches []*Branch
	effort   TriedStarts // all of it
	random   TriedStarts // starts in state and parameter together
	notes    []string
	failed   error
	stopped  error
}

func (m *Model) newAtlas(parameter string, box Box, opts []SurveyOption) (*atlas, error) {
	j, err := m.parameterIndex(parameter)
	if err != nil {
		return nil, err
	}
	a := &atlas{m: m, j: j}
	if a.opts, err = newSurveyPlan(opts); err != nil {
		return nil, err
	}
	if a.plan, err = newPlan(a.opts.follow); err != nil {
		return nil, err
	}
	if !math.IsInf(a.plan.low, 0) || !math.IsInf(a.plan.high, 0) {
		return nil, fmt.Errorf("the range of %s is the one that the box gives: leave Within out", parameter)
	}
	if a.frame, err = m.frame(box, j); err != nil {
		return nil, err
	}
	n := len(m.states)
	a.states = &frame{a.frame.low[:n], a.frame.width[:n]}
	a.plan.low, a.plan.high = a.frame.low[n], a.frame.low[n]+a.frame.width[n]
	for i, v := range m.states {
		low, width := a.frame.low[i], a.frame.width[i]
		a.plan.bounds = append(a.plan.bounds, bound{v.Name, low - margin*width, low + (1+margin)*width})
	}
	return a, nil
}

// atSlices surveys the states at values of the parameter and follows what it finds.
func (a *atlas) atSlices() {
	var starts []*Point
	effort := *a.opts
	effort.effort = max(8, effort.effort/sliceEffort)
	for k := range sliceCount {
		p := a.m.values()
		p[a.j] = a.plan.low + (float64(k)+0.5)/sliceCount*(a.plan.high-a.plan.low)
		s := newSearch(a.m, a.states, p, &effort)
		s.task = fmt.Sprintf("Survey at %s %.5g", a.m.parameters[a.j].Name, p[a.j])
		s.run()
		a.add(s.effort)
		if s.failed != nil {
			a.failed = s.failed
		}
		if a.stopped = s.stopped; a.stopped != nil {
			break
		}
		starts = append(starts, s.survey().points...)
	}
	for _, p := range starts {
		a.include(p)
	}
}

func (a *atlas) add(t TriedStarts) {
	a.effort.Starts += t.Starts
	a.effort.Runs += t.Runs
	a.effort.Evaluations += t.Evaluations
}

// include follows the branch through a steady state, if it is none of those known, and
// those that cross it.
func (a *atlas) include(p *Point) (isNew bool) {
	if a.stopped != nil || len(a.branches) >= a.opts.most || a.onAny(p, a.branches) {
		return false
	}
	b, err := a.follow(p)
	if err != nil {
		a.note(p, err)
		return false
	}
	a.keep(b)
	return true
}

func (a *atlas) follow(p *Point) (*Branch, error) {
	plan := *a.plan
	up, err := begin(p, a.j, &plan)
	if err != nil {
		return nil, err
	}
	name := a.m.parameters[a.j].Name
	r := &run{plan: &plan, task: fmt.Sprintf("Follow %s, branch %d", name, len(a.branches)+1), up: up}
	return r.both(), nil
}

// note keeps why a steady state could not be followed.
func (a *atlas) note(p *Point, err error) {
	if errors.Is(err, ErrInterrupted) {
		a.stopped = err
		return
	}
	a.notes = append(a.notes, fmt.Sprintf("the steady state at %s could not be followed: %v", p.place(), err))
}

// keep adds a branch, drops those that it contains, and leaves its branch points.
func (a *atlas) keep(b *Branch) {
	if b.Interrupted() {
		a.stopped = ErrInterrupted
	}
	a.branches = slices.DeleteFunc(a.branches, func(old *Branch) bool {
		ends := old.Ends()
		return len(old.points) > 1 && a.on(old.points[old.start], b) && a.on(ends[0].Point, b) && a.on(ends[1].Point, b)
	})
	a.branches = append(a.branches, b)
	for _, s := range b.BranchPoints() {
		if a.stopped == nil && len(a.branches) < a.opts.most {
			a.leave(s)
		}
	}
}

// leave follows the branch that crosses at a branch point, if it is none of those
// known: a few steps of it show that.
func (a *atlas) leave(s *BranchPoint) {
	probe, err := s.Leave(MaxSteps(6))
	if err != nil {
		a.note(s.Where(), err)
		return
	}
	last := len(probe.points) - 1
	for _, i := range []int{0, last} {
		// The point before the last: the last may lie on a bound.
		p := probe.points[min(max(i, 1), max(last-1, 0))]
		if i != probe.start && a.states.holds(p.State) && !a.onAny(p, a.branches) {
			if b, err := s.Leave(); err == nil {
				a.keep(b)
			}
			return
		}
	}
}

func (a *atlas) nothing() error {
	if len(a.branches) > 0 {
		return nil
	}
	if a.stopped != nil {
		return fmt.Errorf("%w before a branch was found, after %s", ErrInterrupted, a.effort)
	}
	if a.failed != nil {
		return fmt.Errorf("no branch found in the box; tried: %s; at some of them the model could not be evaluated: %w", a.effort, a.failed)
	}
	if len(a.notes) > 0 {
		return errors.New(a.notes[0])
	}
	return fmt.Errorf("no branch found in the box; tried: %s; look in a wider box, or try more with Effort", a.effort)
}
