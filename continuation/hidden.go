package continuation

import "math"

// Two events of one kind within a step cancel: the count and all signs are the
// same at both ends. What betrays them is that an eigenvalue comes near the
// imaginary axis between them. Through the real parts at three neighbouring nodes
// goes a parabola; where its vertex crosses the axis, or comes near it, the branch
// is looked at there.

const (
	nearMiss   = 0.3 // of the nearest real part at the nodes, that a vertex must stay away
	hiddenTrys = 4
)

// hidden looks for events that cancel on the arcs (z, a) and (a, b), and returns
// the special points found on each.
func (t *tracer) hidden(z, a, b *node) (before, after []*node, err error) {
	if t.plan.spectra == noValues || z.special != nil || a.special != nil || b.special != nil {
		return nil, nil, nil
	}
	if b.clear = t.proved(z, a, b); b.clear {
		return nil, nil, nil
	}
	defer func(usual bool) { t.stable.want = usual }(t.stable.want)
	t.stable.want = true
	for _, n := range []*node{z, a, b} {
		if err := t.values(n); err != nil {
			return nil, nil, notRefusal(err)
		}
	}
	switch s, ok := vertex(z, a, b); {
	case !ok:
	case s < a.arc && !a.clear:
		before, err = t.probe(z, a, s, hiddenTrys)
	case s >= a.arc:
		after, err = t.probe(a, b, s, hiddenTrys)
	}
	return before, after, err
}

// vertex returns the arclength at which one of the eigenvalues, counted by falling
// real part, is predicted to reach or nearly reach the imaginary axis between
// three nodes on which it has one sign.
func vertex(z, a, b *node) (float64, bool) {
	for k := range a.eigenvalues {
		r := [3]float64{real(z.eigenvalues[k]), real(a.eigenvalues[k]), real(b.eigenvalues[k])}
		if (r[0] > 0) != (r[1] > 0) || (r[1] > 0) != (r[2] > 0) {
			continue
		}
		h1, h2 := a.arc-z.arc, b.arc-a.arc
		d1, d2 := (r[1]-r[0])/h1, (r[2]-r[1])/h2
		curve := (d2 - d1) / (h1 + h2)
		if curve == 0 || (curve > 0) != (r[1] > 0) {
			continue // bends away from the axis
		}
		slope := (d1*h2 + d2*h1) / (h1 + h2) // at a
		at := a.arc - slope/(2*curve)
		if at <= z.arc || at >= b.arc {
			continue
		}
		value := r[1] - slope*slope/(4*curve)
		nearest := math.Min(math.Abs(r[0]), math.Min(math.Abs(r[1]), math.Abs(r[2])))
		if (value > 0) != (r[1] > 0) || math.Abs(value) < nearMiss*nearest {
			return at, true
		}
	}
	return 0, false
}

// probe takes the node at arclength s between two nodes. Where something changed
// on the way to it, both parts are explained; else the parabola is drawn anew.
func (t *tracer) probe(a, b *node, s float64, trys int) ([]*node, error) {
	c := t.between(a, b)
	u := (s - a.arc) / (b.arc - a.arc)
	if trys == 0 || u < 1e-3 || u > 1-1e-3 {
		return nil, nil
	}
	m, err := t.middle(c, u)
	if err != nil {
		return nil, notRefusal(err)
	}
	if m.unstable == a.unstable && m.det == a.det {
		if next, ok := vertex(a, m, b); ok && next != s {
			return t.probe(a, b, next, trys-1)
		}
		return nil, nil
	}
	left, err := t.resolve(t.between(a, m), 1)
	if err != nil {
		return nil, notRefusal(err)
	}
	right, err := t.resolve(t.between(m, b), 1)
	if err != nil {
		return nil, notRefusal(err)
	}
	return append(left, right...), nil
}
