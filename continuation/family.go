package continuation

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"sync"
)

// A Family is a set of branches of one model in one parameter, one for each value of a
// second one.
type Family struct {
	model    *Model
	first    int
	second   int
	members  []*Member
	resumed  int
	finished bool
}

// A Member is one branch of a family.
type Member struct {
	Value  float64 // of the second parameter
	Branch *Branch // nil where there is none, and when it was not reached yet
	Reason string  // why there is none
}

// Sweep follows this steady state in a parameter for each of the values of a second
// parameter, in the order given. The starts lie on the branch through here in the second
// parameter, up to its first fold on each side; values beyond have no branch, with the
// reason. The options are those of [Point.Follow] for the first parameter.
//
// Branches are followed on all cores unless the model is [Sequential]; the result does not
// depend on it. An interrupted sweep keeps what it has: the branches that are complete, and
// the one under way. The model remembers them, and the same call again goes on from there.
func (p *Point) Sweep(parameter, second string, values []float64, opts ...FollowOption) (*Family, error) {
	f, plan, err := p.family(parameter, second, values, opts)
	if err != nil {
		return nil, fmt.Errorf("Sweep: %w", err)
	}
	starts, err := p.starts(f, values)
	if err != nil {
		return nil, fmt.Errorf("Sweep: %w", err)
	}
	key := p.sweepKey(f, plan, values)
	f.resume(p.model.sweeps.recall(key))
	f.run(starts, opts)
	p.model.sweeps.keep(key, f)
	return f, nil
}

func (p *Point) family(parameter, second string, values []float64, opts []FollowOption) (*Family, *plan, error) {
	i, err := p.model.parameterIndex(parameter)
	if err != nil {
		return nil, nil, err
	}
	j, err := p.model.parameterIndex(second)
	if err != nil {
		return nil, nil, err
	}
	if i == j {
		return nil, nil, fmt.Errorf("%s is followed; the values are for another parameter", parameter)
	}
	if len(values) == 0 {
		return nil, nil, fmt.Errorf("no values of %s are given", second)
	}
	f := &Family{model: p.model, first: i, second: j}
	for k, v := range values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, nil, fmt.Errorf("value %d of %s is %v", k+1, second, v)
		}
		if slices.Contains(values[:k], v) {
			return nil, nil, fmt.Errorf("the value %g of %s is given twice", v, second)
		}
		f.members = append(f.members, &Member{Value: v, Reason: "not followed yet"})
	}
	plan, err := newPlan(opts)
	if err == nil {
		err = plan.check(p, i)
	}
	return f, plan, err
}

// starts returns the steady states at the values, nil where there is none.
func (p *Point) starts(f *Family, values []float64) ([]*Point, error) {
	now := p.Parameters[f.second]
	low, high := math.Min(slices.Min(values), now), math.Max(slices.Max(values), now)
	list := make([]*Point, len(values))
	if low == high {
		list[0] = p
		return list, nil
	}
	b, err := p.Follow(p.model.parameters[f.second].Name, Within(low, high), LandAt(values...), StopAtFold(), WithoutEigenvalues())
	if err != nil {
		return nil, err
	}
	for k, v := range values {
		if list[k] = firstAt(b, v); list[k] == nil {
			end := b.ends[0]
			if v > now {
				end = b.ends[1]
			}
			f.members[k].Reason = "no start: the branch in " + p.model.parameters[f.second].Name + " " + end.Text
		}
	}
	return list, nil
}

// firstAt returns the point of a branch at a value that is nearest to its start along it.
func firstAt(b *Branch, value float64) *Point {
	best := -1
	for i, q := range b.points {
		if q.Value() == value && (best < 0 || abs(i-b.start) < abs(best-b.start)) {
			best = i
		}
	}
	if best < 0 {
		return nil
	}
	return b.points[best]
}

func abs(i int) int { return max(i, -i) }

// run follows what is missing.
func (f *Family) run(starts []*Point, opts []FollowOption) {
	// Branches that are followed at once must not talk at once.
	quiet := *f.model
	quiet.observer = nil
	var todo []int
	for k, m := range f.members {
		if m.Branch == nil && starts[k] != nil {
			todo = append(todo, k)
		}
	}
	stopped, done := false, 0
	next := func(i int) func() *Member {
		if i >= len(todo) || stopped {
			return nil
		}
		k := todo[i]
		return func() *Member { return f.member(&quiet, starts[k], f.members[k].Value, opts) }
	}
	workers := f.model.workers(0)
	inOrder(workers, 2*workers-1, next, func(m *Member) {
		f.members[todo[done]] = m
		done++
		stopped = stopped || (m.Branch != nil && m.Branch.Interrupted()) || m.Reason == ErrInterrupted.Error()
		f.tell(done, len(todo), false)
	})
	f.finished = !stopped
	f.tell(done, len(todo), true)
}

func (f *Family) tell(done, of int, last bool) {
	if o := f.model.observer; o != nil {
		o.Progress(Progress{Task: "Sweep " + f.model.parameters[f.second].Name, Steps: done, Fraction: float64(done) / math.Max(float64(of), 1), Value: math.NaN(), Done: last})
	}
}

// member follows one branch.
func (f *Family) member(quiet *Model, start *Point, value float64, opts []FollowOption) *Member {
	m := &Member{Value: value}
	at := *start
	at.model, at.free, at.Parameter, at.Tangent = quiet, -1, "", nil
	b, err := at.Follow(f.model.parameters[f.first].Name, opts...)
	switch {
	case errors.Is(err, ErrInterrupted):
		m.Reason = ErrInterrupted.Error()
	case err != nil:
		m.Reason = err.Error()
	default:
		m.Branch = b.movedTo(f.model)
	}
	return m
}

// movedTo makes a branch one of another copy of its model.
func (b *Branch) movedTo(m *Model) *Branch {
	b.model = m
	for _, p := range b.points {
		p.model = m
	}
	return b
}

// A sweepMemory holds the sweeps of a model that were interrupted.
type sweepMemory struct {
	mu         sync.Mutex
	unfinished map[string]*Family
}

func (s *sweepMemory) recall(key string) *Family {
	if s == nil || key == "" {
		return nil
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.unfinished[key]
}

func (s *sweepMemory) keep(key string, f *Family) {
	if s == nil || key == "" {
		return
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.unfinished == nil {
		s.unfinished = map[string]*Family{}
	}
	delete(s.unfinished, key)
	if !f.finished {
		s.unfinished[key] = f
	}
}

// sweepKey names a sweep by all that decides its result; empty when that cannot be
// compared, because functions of the analyst's belong to it.
func (p *Point) sweepKey(f *Family, plan *plan, values []float64) string {
	if len(plan.until) > 0 || len(plan.watches) > 0 {
		return ""
	}
	return fmt.Sprintf("%d %d %x %x %x %+v", f.first, f.second, values, p.State, p.Parameters, *plan)
}

// resume takes over complete branches.
func (f *Family) resume(old *Family) {
	if old == nil {
		return
	}
	for k, m := range old.members {
		if m.Branch != nil && !m.Branch.Interrupted() {
			f.members[k] = m
			f.resumed++
		}
	}
}

// Model returns the model.
func (f *Family) Model() *Model { return f.model }

// Parameter returns the parameter that was followed.
func (f *Family) Parameter() Parameter { return f.model.parameters[f.first] }

// Second returns the parameter whose values the members have.
func (f *Family) Second() Parameter { return f.model.parameters[f.second] }

// Members returns one member for each value, in the order given.
func (f *Family) Members() []*Member { return f.members }

// Resumed returns how many members were taken over from an interrupted sweep.
func (f *Family) Resumed() int { return f.resumed }

// Interrupted reports whether members are missing because of an interrupt.
func (f *Family) Interrupted() bool { return !f.finished }

// Branches returns the branches that there are, in the order of the members.
func (f *Family) Branches() []*Branch {
	var list []*Branch
	for _, m := range f.members {
		if m.Branch != nil {
			list = append(list, m.Branch)
		}
	}
	return list
}

// Missing returns the members without a branch.
func (f *Family) Missing() []*Member {
	var list []*Member
	for _, m := range f.members {
		if m.Branch == nil {
			list = append(list, m)
		}
	}
	return list
}

// String says the family in one line.
func (f *Family) String() string {
	text := fmt.Sprintf("family of %d branches of %s in %s for %d values of %s", len(f.Branches()), f.model.name, f.Parameter().Name, len(f.members), f.Second().Name)
	if f.Interrupted() {
		text += "; interrupted"
	}
	return text
}
