package continuation

import (
	"fmt"
	"math"
	"slices"
)

// A Branch is a curve of steady states: the points of a run in the order in which
// they lie on it, its special points, and why it ends where it ends.
type Branch struct {
	model    *Model
	free     int
	points   []*Point
	start    int
	specials []Special
	ends     [2]End
	closed   bool
	notes    []string
	rejected []Rejection
	steps    int
}

// An EndReason says why a branch ends.
type EndReason int

// The reasons for the end of a branch.
const (
	LeftRange   EndReason = iota // reached the end of the parameter's range, landing on it
	LeftBound                    // reached a bound on a state, landing on it
	Closed                       // returned to its start
	AtSpecial                    // met a special point that it was told to stop at
	Condition                    // the user's condition holds
	StepTooFine                  // the step length fell below its minimum
	OutOfDomain                  // the model gave NaN or Inf, or panicked
	FoldAhead                    // a run in the natural parameter met a fold
	OutOfSteps                   // took as many steps as allowed
	Interrupted                  // was interrupted
	NotFollowed                  // was not followed in this direction
)

var endReasons = [...]string{
	"left the range", "left a bound", "closed on itself", "met a special point", "met a condition", "step too fine",
	"model undefined", "fold ahead", "out of steps", "interrupted", "not followed",
}

// String names the reason in a few words.
func (r EndReason) String() string { return endReasons[r] }

// An End is one of the two ends of a branch.
type End struct {
	Reason EndReason
	Text   string // in words, with the place: left the range at Coolant 320 K
	Point  *Point // the last point there
}

// A Rejection is a step that was tried and not taken.
type Rejection struct {
	Value  float64 // of the parameter where the step began
	Length float64 // of the step, in scaled arclength
	Reason string
}

// A Stretch is a part of a branch between special points.
type Stretch struct {
	From, To int // indices of its first and last point
	Unstable int // eigenvalues with positive real part, -1 when not asked for
}

// Model returns the model that the branch belongs to.
func (b *Branch) Model() *Model { return b.model }

// Parameter returns the parameter that was followed, with its value at the
// start.
func (b *Branch) Parameter() Parameter {
	return Parameter{b.model.parameters[b.free].Variable, b.points[b.start].Value()}
}

// Points returns the points in order: from the end that is reached when the
// start is left towards smaller values of the parameter to the other end. A
// closed branch begins and ends at the start, towards greater values.
func (b *Branch) Points() []*Point { return b.points }

// Start returns the index of the point that the run began at.
func (b *Branch) Start() int { return b.start }

// Specials returns the special points in the order of the branch.
func (b *Branch) Specials() []Special { return b.specials }

// Folds returns the folds in the order of the branch.
func (b *Branch) Folds() []*Fold { return only[*Fold](b.specials) }

// Events returns the points marked by events of the analyst's own, in the order of
// the branch.
func (b *Branch) Events() []*Event { return only[*Event](b.specials) }

// BranchPoints returns the simple stationary bifurcations in the order of the
// branch.
func (b *Branch) BranchPoints() []*BranchPoint { return only[*BranchPoint](b.specials) }

// HopfPoints returns the Hopf points in the order of the branch.
func (b *Branch) HopfPoints() []*Hopf { return only[*Hopf](b.specials) }

func only[T Special](all []Special) []T {
	var list []T
	for _, s := range all {
		if t, ok := s.(T); ok {
			list = append(list, t)
		}
	}
	return list
}

// Ends says why the branch ends where it ends, in the order of its points.
func (b *Branch) Ends() [2]End { return b.ends }

// Closed reports whether the branch is a closed curve.
func (b *Branch) Closed() bool { return b.closed }

// Interrupted reports whether the run was interrupted; the branch then holds
// what was computed until then.
func (b *Branch) Interrupted() bool {
	return b.ends[0].Reason == Interrupted || b.ends[1].Reason == Interrupted
}

// Notes holds what the run could not explain or confirm, one line each.
func (b *Branch) Notes() []string { return b.notes }

// Rejections lists the steps that were tried and not taken, with their reasons.
func (b *Branch) Rejections() []Rejection { return b.rejected }

// Steps returns the number of accepted steps.
func (b *Branch) Steps() int { return b.steps }

// Stretches cuts the branch at the special points where the number of unstable
// eigenvalues changes or the branch turns.
func (b *Branch) Stretches() []Stretch {
	var list []Stretch
	from := 0
	cut := func(to int) {
		if to > from || len(b.points) == 1 {
			list = append(list, Stretch{from, to, b.unstableWithin(from, to)})
		}
		from = to
	}
	for _, s := range b.specials {
		_, event := s.(*Event) // the state goes on as it was
		if i := s.Index(); !event && i > 0 && i < len(b.points)-1 {
			cut(i)
		}
	}
	cut(len(b.points) - 1)
	return list
}

// unstableWithin returns the count on the stretch between two points, which may
// be special points themselves.
func (b *Branch) unstableWithin(from, to int) int {
	if from+1 < to {
		return b.points[from+1].Unstable
	}
	for _, s := range b.specials {
		before, after := s.around()
		switch s.Index() {
		case from:
			return after
		case to:
			return before
		}
	}
	return b.points[from].Unstable
}

// LimitAbove returns the first fold that is met on the branch when the parameter
// grows from p: the limit of the steady state in use. p is a point of the branch,
// or the start that it was followed from.
func (b *Branch) LimitAbove(p *Point) (*Fold, error) { return b.limit(p, +1) }

// LimitBelow returns the first fold that is met when the parameter falls from p.
func (b *Branch) LimitBelow(p *Point) (*Fold, error) { return b.limit(p, -1) }

func (b *Branch) limit(p *Point, sign float64) (*Fold, error) {
	at, err := b.locate(p)
	if err != nil {
		return nil, err
	}
	name := b.model.parameters[b.free].Name
	word := map[float64]string{1: "above", -1: "below"}[sign]
	direction, err := b.direction(at, sign)
	if err != nil {
		return nil, err
	}
	fold := b.firstFold(at, direction)
	if fold != nil {
		return fold, nil
	}
	end := b.ends[0]
	if direction > 0 {
		end = b.ends[1]
	}
	return nil, fmt.Errorf("no fold %s %s %s on this branch: it %s", word, name, withUnit(b.points[at].Value(), b.model.parameters[b.free].Unit), end.Text)
}

// direction returns +1 or -1, the way along the points on which the parameter
// changes by sign from point at.
func (b *Branch) direction(at int, sign float64) (int, error) {
	for _, d := range []int{+1, -1} {
		if i := b.wrap(at + d); i >= 0 && sign*(b.points[i].Value()-b.points[at].Value()) > 0 {
			return d, nil
		}
	}
	way, end := "above", "greatest"
	if sign < 0 {
		way, end = "below", "least"
	}
	q := b.model.parameters[b.free]
	return 0, fmt.Errorf("the branch does not go %s %s %s: the value is the %s there; follow it over a wider range", way, q.Name, withUnit(b.points[at].Value(), q.Unit), end)
}

// firstFold returns the first fold on the way from point at.
func (b *Branch) firstFold(at, direction int) *Fold {
	for step := 1; step < len(b.points); step++ {
		i := b.wrap(at + direction*step)
		if i < 0 {
			return nil
		}
		for _, f := range b.Folds() {
			if f.index == i {
				return f
			}
		}
	}
	return nil
}

// wrap returns i as an index of a point, going round on a closed branch, and -1
// beyond an end.
func (b *Branch) wrap(i int) int {
	last := len(b.points) - 1
	if b.closed && last > 0 {
		return ((i % last) + last) % last
	}
	if i < 0 || i > last {
		return -1
	}
	return i
}

// locate returns the index of the point of the branch that p is: p itself, or the
// same steady state to the accuracy of a corrector. A run polishes its start, so
// that the analyst's own copy of it differs by rounding.
func (b *Branch) locate(p *Point) (int, error) {
	if p == nil {
		return 0, fmt.Errorf("there is no point to look from (nil)")
	}
	if p.model != b.model {
		return 0, fmt.Errorf("the point belongs to another model")
	}
	sizes := make([]float64, len(b.model.states))
	for i, q := range b.points {
		if p == q {
			return i, nil
		}
		for k, x := range q.State {
			sizes[k] = math.Max(sizes[k], math.Abs(x))
		}
	}
	for i, q := range b.points {
		if samePoint(p, q, sizes) {
			return i, nil
		}
	}
	return 0, fmt.Errorf("%s is not a point of this branch, which begins at %s", p, b.points[b.start])
}

// samePoint reports whether two points have the same parameters, and states that
// agree to rounding in the sizes that they take on the branch.
func samePoint(p, q *Point, sizes []float64) bool {
	for i := range p.State {
		if math.Abs(p.State[i]-q.State[i]) > 1e-9*sizes[i] {
			return false
		}
	}
	return slices.Equal(p.Parameters, q.Parameters)
}

// Range returns the least and the greatest value of the parameter on the branch.
func (b *Branch) Range() (least, greatest float64) {
	least, greatest = math.Inf(1), math.Inf(-1)
	for _, p := range b.points {
		least, greatest = math.Min(least, p.Value()), math.Max(greatest, p.Value())
	}
	return least, greatest
}

// String says the branch in one line.
func (b *Branch) String() string {
	least, greatest := b.Range()
	q := b.model.parameters[b.free]
	text := fmt.Sprintf("branch of %s in %s from %s to %s, %d points", b.model.name, q.Name, withUnit(least, q.Unit), withUnit(greatest, q.Unit), len(b.points))
	for _, s := range b.specials {
		text += "; " + s.Summary()
	}
	return text
}
