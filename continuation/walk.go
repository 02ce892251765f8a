package continuation

import (
	"fmt"
)

// A Walk follows a branch step by step.
type Walk struct {
	// StepLength is the length of the next step in scaled arclength. It is
	// chosen anew after each step; set it to try another.
	StepLength float64

	t       *tracer
	history []float64 // step lengths before each kept step
	counts  []int     // nodes before each kept step
}

// Walk begins to follow a branch from this steady state step by step, towards
// greater values of the parameter first; see [Walk.Turn]. It takes the same
// options as [Point.Follow].
func (p *Point) Walk(parameter string, opts ...FollowOption) (*Walk, error) {
	plan, err := newPlan(opts)
	if err != nil {
		return nil, fmt.Errorf("Walk %s: %w", parameter, err)
	}
	j, err := p.model.parameterIndex(parameter)
	if err != nil {
		return nil, fmt.Errorf("Walk: %w", err)
	}
	t, err := begin(p, j, plan)
	if err != nil {
		return nil, fmt.Errorf("Walk %s: %w", parameter, err)
	}
	w := &Walk{t: t, StepLength: t.ds}
	if !plan.up {
		w.Turn()
	}
	return w, nil
}

// Step takes n accepted steps and returns the points that they add, special
// points and landings among them. Where it cannot go on it stops early and says
// so in the error; what was computed is kept and returned. After a special point
// or a condition that it was told to stop at, the next Step goes on.
func (w *Walk) Step(n int) ([]*Point, error) {
	if n < 1 {
		return nil, fmt.Errorf("Step(%d): at least one step is needed", n)
	}
	if !positive(w.StepLength) {
		return nil, fmt.Errorf("StepLength is %g: a step length must be positive", w.StepLength)
	}
	before := len(w.t.nodes)
	w.goOn()
	for range n {
		if w.t.end != nil {
			return w.since(before), fmt.Errorf("the walk %s", w.t.end.Text)
		}
		if err := w.one(); err != nil {
			return w.since(before), err
		}
	}
	return w.since(before), nil
}

// goOn lets a walk go on after an end that is not final: a special point or a
// condition to stop at, an interrupt, a failed step that may now be shorter.
func (w *Walk) goOn() {
	if e := w.t.end; e != nil && e.Reason != LeftRange && e.Reason != LeftBound && e.Reason != Closed {
		w.t.end = nil
	}
	if w.t.end == nil {
		w.t.leaving()
	}
}

func (w *Walk) one() error {
	w.history = append(w.history, w.StepLength)
	w.counts = append(w.counts, len(w.t.nodes))
	w.t.ds = w.StepLength
	err := w.t.advance()
	w.StepLength = w.t.ds
	return err
}

func (w *Walk) since(i int) []*Point {
	var list []*Point
	for _, a := range w.t.nodes[i:] {
		list = append(list, w.t.point(a))
	}
	return list
}

// Here returns the point that the walk stands at.
func (w *Walk) Here() *Point { return w.t.point(w.t.nodes[len(w.t.nodes)-1]) }

// Turn turns the walk round: steps from here on go the other way.
func (w *Walk) Turn() {
	here := w.t.nodes[len(w.t.nodes)-1]
	back := *here
	back.t, back.det = negated(here.t), -here.det
	w.t.nodes[len(w.t.nodes)-1] = &back
	w.t.end = nil
}

// Back takes back the last n steps, with the points that they added.
func (w *Walk) Back(n int) error {
	if n < 0 || n > len(w.counts) {
		return fmt.Errorf("Back(%d): the walk has %d steps to take back", n, len(w.counts))
	}
	if n == 0 {
		return nil
	}
	at := len(w.counts) - n
	w.t.nodes = w.t.nodes[:w.counts[at]]
	w.StepLength = w.history[at]
	w.counts, w.history = w.counts[:at], w.history[:at]
	w.t.steps -= min(n, w.t.steps)
	w.t.end = nil
	return nil
}

// Steer holds a state, or the parameter, as local parameter from here on;
// "arclength" goes back to arclength and "automatic" chooses at each step.
func (w *Walk) Steer(name string) error {
	switch name {
	case "arclength", "":
		w.t.plan.local = arclength
	case automatic:
		w.t.plan.local = automatic
	case w.t.s.m.parameters[w.t.s.free].Name:
		w.t.plan.local = natural
	default:
		if _, err := w.t.s.m.stateIndex(name); err != nil {
			return fmt.Errorf("Steer: %w, or arclength or automatic", err)
		}
		w.t.plan.local = name
	}
	w.t.end = nil
	return nil
}

// Ended says why the walk cannot go on, in words, and is empty while it can.
func (w *Walk) Ended() string {
	if w.t.end == nil {
		return ""
	}
	return w.t.end.Text
}

// Branch returns what was walked, in the order of the walk.
func (w *Walk) Branch() *Branch {
	b := &Branch{model: w.t.s.m, free: w.t.s.free}
	for _, a := range w.t.nodes {
		b.add(w.t, a, false)
	}
	b.steps, b.notes, b.rejected = w.t.steps, w.t.notes, w.t.rejected
	b.ends[0] = End{Reason: NotFollowed, Text: "began at " + w.t.where(w.t.nodes[0])}
	b.ends[1] = End{Reason: NotFollowed, Text: "stands at " + w.t.where(w.t.nodes[len(w.t.nodes)-1])}
	if w.t.end != nil {
		b.ends[1] = *w.t.end
		b.closed = w.t.end.Reason == Closed
	}
	b.ends[0].Point, b.ends[1].Point = b.points[0], b.points[len(b.points)-1]
	return b
}

// String says where the walk stands.
func (w *Walk) String() string {
	text := fmt.Sprintf("walk in %s: %d steps, stands at %s, next step %.3g", w.t.s.m.parameters[w.t.s.free].Name, w.t.steps, w.t.where(w.t.nodes[len(w.t.nodes)-1]), w.StepLength)
	if w.t.end != nil {
		text += "; it " + w.t.end.Text
	}
	return text
}
