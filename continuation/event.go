package continuation

import (
	"errors"
	"fmt"
	"math"
)

// An Event is a point at which a function of the analyst's own is zero: a
// temperature that reaches its limit, two flows that become equal.
type Event struct {
	found
	Name string
}

// Kind returns the name that the analyst gave.
func (e *Event) Kind() string { return e.Name }

// Summary says the event in one line.
func (e *Event) Summary() string { return e.summary(e.Name) }

// String says the event in one line.
func (e *Event) String() string { return e.Summary() }

func (e *Event) on(p *Point, index int, reversed bool) Special {
	c := *e
	c.found = e.moved(p, index, reversed)
	return &c
}

// A watch is an event to look for.
type watch struct {
	name string
	f    func(*Point) float64
	stop bool
	// quiet: NaN is an answer and no reason for a note.
	quiet bool
}

// Mark marks every point of the branch at which f is zero under a name, located to
// rounding.
func Mark(name string, f func(*Point) float64) FollowOption { return watchFor(name, f, false) }

// StopAt ends the branch where f is zero, at a point that is marked with the name.
func StopAt(name string, f func(*Point) float64) FollowOption { return watchFor(name, f, true) }

func watchFor(name string, f func(*Point) float64, stop bool) FollowOption {
	return func(p *plan) error {
		if name == "" || f == nil {
			return fmt.Errorf("an event wants a name and a function of the point")
		}
		for _, w := range p.watches {
			if w.name == name {
				return fmt.Errorf("two events are named %s", name)
			}
		}
		p.watches = append(p.watches, watch{name: name, f: f, stop: stop})
		return nil
	}
}

// events returns the nodes from a to b (both left out) at which an event's function
// is zero, in order.
func (t *tracer) events(a, b *node) ([]*node, error) {
	var list []*node
	arc := t.between(a, b)
	for _, w := range t.plan.watches {
		e, err := t.event(arc, w)
		if err != nil {
			return nil, err
		}
		if e == nil {
			continue
		}
		at := len(list)
		for at > 0 && list[at-1].arc > e.arc {
			at--
		}
		list = append(list[:at], append([]*node{e}, list[at:]...)...)
	}
	return list, nil
}

// event finds the zero of one function on an arc whose ends have values of
// different signs.
func (t *tracer) event(c *arc, w watch) (*node, error) {
	fa, fb := w.f(t.point(c.a)), w.f(t.point(c.b))
	if math.IsNaN(fa) || math.IsNaN(fb) {
		if w.quiet {
			return nil, nil
		}
		t.noteOnce(fmt.Sprintf("the event %q is NaN near %s and is not looked for there", w.name, t.where(c.b)))
		return nil, nil
	}
	if fa == 0 && c.a.arc == 0 && len(t.nodes) == 1 {
		return nil, nil // the start; marked neither twice nor on one side
	}
	if (fa > 0) == (fb > 0) || fa == 0 {
		return nil, nil
	}
	defer func(usual float64) { t.tolerance = usual }(t.tolerance)
	t.tolerance = math.Min(t.tolerance, 1e-12)
	var failed error
	root, width := bracket(fa, fb, func(u float64) float64 {
		m, err := t.middle(c, u)
		if err != nil {
			failed = err
			return 0
		}
		return w.f(t.point(m))
	})
	if failed == nil {
		var m *node
		if m, failed = t.middle(c, root); failed == nil {
			t.mark(c, m, w, width)
			return m, nil
		}
	}
	if errors.Is(failed, ErrInterrupted) {
		return nil, failed
	}
	t.noteOnce(fmt.Sprintf("the event %q near %s could not be located: %v", w.name, t.where(c.a), failed))
	return nil, nil
}

func (t *tracer) mark(c *arc, m *node, w watch, width float64) {
	e := &Event{Name: w.name}
	t.certify(c, m, &e.found, refined{})
	along := (width + t.tolerance) * c.length
	e.Uncertainty = along*math.Abs(m.t[t.n])*t.S[t.n] + t.roundingOf(m.lambda)
	e.digits = reliableDigits(m.lambda, e.Uncertainty)
	m.special = e
}

func (t *tracer) noteOnce(text string) {
	for _, n := range t.notes {
		if n == text {
			return
		}
	}
	t.notes = append(t.notes, text)
}
