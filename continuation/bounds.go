package continuation

import (
	"fmt"
	"math"
	"slices"
)

// An exit is a component that leaves its interval on an arc.
type exit struct {
	component int
	value     float64 // of the bound
	fraction  float64 // of the arc, about
	name      string
}

// bounds returns the node at which the arc first leaves the range of the
// parameter or a bound on a state, landing on it exactly, and nil when it stays
// inside.
func (t *tracer) bounds(c *arc) (*node, *End, error) {
	var first *exit
	consider := func(component int, low, high float64, name string) {
		at := t.component(c.b, component)
		bound := low
		switch {
		case at >= high && t.component(c.a, component) <= high:
			bound = high
		case at > low || t.component(c.a, component) < low:
			return
		}
		u := c.crossing(component, bound/t.S[component])
		if first == nil || u < first.fraction {
			first = &exit{component, bound, u, name}
		}
	}
	q := t.s.m.parameters[t.s.free]
	consider(t.n, t.plan.low, t.plan.high, q.Name)
	for _, b := range t.plan.bounds {
		if i := find(t.s.m.states, b.name); i >= 0 {
			consider(i, b.low, b.high, b.name)
		}
	}
	if first == nil {
		return nil, nil, nil
	}
	reason, unit := LeftRange, q.Unit
	if first.component < t.n {
		reason, unit = LeftBound, t.s.m.states[first.component].Unit
	}
	end := &End{Reason: reason, Text: fmt.Sprintf("left the %s at %s %s", map[EndReason]string{LeftRange: "range", LeftBound: "bounds"}[reason], first.name, withUnit(first.value, unit))}
	for _, there := range []*node{c.b, c.a} {
		if t.component(there, first.component) == first.value {
			return there, end, nil
		}
	}
	node, err := t.land(c, first.component, first.value)
	return node, end, err
}

func (t *tracer) component(a *node, i int) float64 {
	if i == t.n {
		return a.lambda
	}
	return a.x[i]
}

// landings returns the nodes at the wanted values of the parameter inside the
// arc.
func (t *tracer) landings(c *arc) ([]*node, error) {
	low, high := math.Min(c.a.lambda, c.b.lambda), math.Max(c.a.lambda, c.b.lambda)
	var wanted []float64
	for _, v := range t.plan.land {
		if low < v && v < high && !slices.Contains(wanted, v) {
			wanted = append(wanted, v)
		}
	}
	slices.Sort(wanted)
	if c.b.lambda < c.a.lambda {
		slices.Reverse(wanted)
	}
	var out []*node
	for _, v := range wanted {
		node, err := t.land(c, t.n, v)
		if err != nil {
			return nil, err
		}
		out = append(out, node)
	}
	return out, nil
}

// stops sets t.end when the run was told to stop at such a node.
func (t *tracer) stops(a *node) bool {
	if a.special != nil {
		_, fold := a.special.(*Fold)
		if t.plan.stopAtAny || (t.plan.stopAtFold && fold) || t.plan.stopsAt(a.special) {
			t.end = &End{Reason: AtSpecial, Text: "met the " + a.special.Summary()}
			return true
		}
	}
	for _, holds := range t.plan.until {
		if holds(t.point(a)) {
			t.end = &End{Reason: Condition, Text: "met the condition at " + t.where(a)}
			return true
		}
	}
	return false
}

// stopsAt reports whether a special point is an event to stop at.
func (p *plan) stopsAt(s Special) bool {
	e, ok := s.(*Event)
	if !ok {
		return false
	}
	for _, w := range p.watches {
		if w.name == e.Name {
			return w.stop
		}
	}
	return false
}
