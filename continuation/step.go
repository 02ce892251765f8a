package continuation

import (
	"errors"
	"fmt"
	"math"
)

const (
	aimedTurn     = 0.12 // radians between tangents that a step aims at
	aimedContract = 0.02 // first contraction rate of the corrector that it aims at
	mostGrowth    = 2.0
)

// advance takes one accepted step from the last node: it shortens the step until
// the corrector converges, the tangent does not turn too far, and whatever
// happened between the two nodes is explained. It appends the special points
// met, the values landed at, and the new node; at an end it sets t.end instead
// of, or besides, appending. The error is an interrupt.
func (t *tracer) advance() error {
	a := t.nodes[len(t.nodes)-1]
	t.grow(a)
	for {
		chain, err := t.attempt(a, t.ds)
		if err == nil {
			t.accept(a, chain)
			return nil
		}
		if errors.Is(err, ErrInterrupted) {
			return err
		}
		var no *refusal
		if !errors.As(err, &no) {
			return err
		}
		t.rejected = append(t.rejected, Rejection{a.lambda, t.ds, no.reason})
		t.lost = no.cause
		if t.ds <= t.plan.least {
			t.giveUp(a, no)
			return nil
		}
		t.ds = math.Max(t.ds/2, t.plan.least)
	}
}

// attempt tries a step of length ds and returns the nodes that it adds.
func (t *tracer) attempt(a *node, ds float64) ([]*node, error) {
	b, err := t.reach(a, ds)
	if err != nil {
		return nil, err
	}
	arc := t.between(a, b)
	if near := t.closure(arc); near != nil {
		b, arc = near, t.between(a, near)
		t.end = &End{Reason: Closed}
	}
	chain, err := t.explain(arc)
	if err == nil && len(chain) == 0 {
		chain, err = t.cancelled(a, b)
	}
	if err != nil {
		t.end = nil
		return nil, err
	}
	return t.cut(a, append(chain, b))
}

// cancelled returns the special points on the new arc that cancel each other, and
// puts those on the last one in their places.
func (t *tracer) cancelled(a, b *node) ([]*node, error) {
	last := len(t.nodes) - 1
	if last < 1 {
		return nil, nil
	}
	before, after, err := t.hidden(t.nodes[last-1], a, b)
	if err != nil {
		return nil, err
	}
	if len(before) > 0 {
		t.nodes = append(t.nodes[:last], append(before, a)...)
	}
	return after, nil
}

// reach predicts and corrects.
func (t *tracer) reach(a *node, ds float64) (*node, error) {
	z, ds, bounded := t.predict(a, ds)
	border := t.localParameter(a)
	if bounded {
		border = make([]float64, t.n+1)
		border[t.n] = math.Copysign(1, a.t[t.n])
	}
	b := t.fresh()
	t.place(b, z)
	if err := t.correct(b, border); err != nil {
		return nil, err
	}
	if bounded {
		// Exactly, not up to the rounding of the scaled value.
		if math.Abs(b.lambda-t.plan.low) < math.Abs(b.lambda-t.plan.high) {
			b.lambda = t.plan.low
		} else {
			b.lambda = t.plan.high
		}
	}
	if err := t.complete(b, border, a.t); err != nil {
		return nil, err
	}
	if t.plan.local == natural && (b.t[t.n] > 0) != (a.t[t.n] > 0) {
		return nil, &refusal{reason: "the parameter turns back"}
	}
	cos := dot(a.t, b.t)
	if turn := math.Acos(math.Max(-1, math.Min(1, cos))); turn > t.plan.maxTurn {
		return nil, &refusal{reason: fmt.Sprintf("the tangent turns by %.2g radians", turn)}
	}
	moved := t.scaled(b)
	for i := range moved {
		moved[i] -= z[i]
	}
	if far := norm(moved); far > 0.5*ds {
		return nil, &refusal{reason: fmt.Sprintf("the corrector moved by %.2g of the step", far/ds)}
	}
	b.step, b.arc = ds, a.arc+ds
	return b, nil
}

// predict goes a step along the tangent and the curvature. A step that would
// leave the range of the parameter is shortened to end on its bound: the model
// need not be defined beyond.
func (t *tracer) predict(a *node, ds float64) (z []float64, length float64, bounded bool) {
	forward := func(ds float64) float64 {
		lambda := ds * a.t[t.n]
		if a.k != nil {
			lambda += ds * ds / 2 * a.k[t.n]
		}
		return a.lambda + t.S[t.n]*lambda
	}
	bound := t.plan.high
	if forward(ds) < t.plan.low {
		bound = t.plan.low
	}
	if end := forward(ds); end < t.plan.low || end > t.plan.high {
		low, high := 0.0, ds
		for range 60 {
			mid := (low + high) / 2
			if v := forward(mid); v < t.plan.low || v > t.plan.high {
				high = mid
			} else {
				low = mid
			}
		}
		ds, bounded = high, true
	}
	z = t.scaled(a)
	for i := range z {
		z[i] += ds * a.t[i]
		if a.k != nil {
			z[i] += ds * ds / 2 * a.k[i]
		}
	}
	if bounded {
		z[t.n] = bound / t.S[t.n]
	}
	return z, ds, bounded
}

// localParameter returns the row that holds the step: the tangent, or one
// component.
func (t *tracer) localParameter(a *node) []float64 {
	k := -1
	switch t.plan.local {
	case arclength:
		return a.t
	case natural:
		k = t.n
	case automatic:
		k = largest(a.t)
	default:
		k = find(t.s.m.states, t.plan.local)
	}
	row := make([]float64, t.n+1)
	row[k] = 1
	if a.t[k] < 0 {
		row[k] = -1
	}
	return row
}

func largest(v []float64) int {
	k := 0
	for i, x := range v {
		if math.Abs(x) > math.Abs(v[k]) {
			k = i
		}
	}
	return k
}

// accept appends the nodes of a step and chooses the length of the next.
func (t *tracer) accept(a *node, chain []*node) {
	if len(chain) == 0 {
		return // the start lies on the bound that the step would leave by
	}
	b := chain[len(chain)-1]
	if last := len(t.nodes) - 2; last >= 0 {
		t.nodes[last].fx = nil // only the two neighbours of a step need it
	}
	for _, c := range chain[:len(chain)-1] {
		c.fx = nil
	}
	t.nodes = append(t.nodes, chain...)
	t.steps++
	if t.plan.locus != nil {
		// A border that cannot be renewed serves on for a while.
		_ = t.plan.locus.moved(t, b)
	}
	turn := math.Acos(math.Max(-1, math.Min(1, dot(a.t, b.t))))
	factor := mostGrowth
	factor = math.Min(factor, aimedTurn/math.Max(turn, 1e-6))
	// The predictor's error, and with it the first contraction rate, falls with
	// the third power of the step (Deuflhard 2004, section 5.1).
	factor = math.Min(factor, math.Cbrt(aimedContract/math.Max(b.contract, 1e-9)))
	t.ds = math.Min(t.plan.most, math.Max(t.plan.least, t.ds*math.Max(factor, 0.3)))
	if len(chain) > 1 {
		// A special point or a landing lies behind; the new node may be close to
		// it, which says nothing about the length of a step.
		t.ds = math.Max(t.ds, b.step)
	}
}

// giveUp ends the run at a node from which even the shortest step fails.
func (t *tracer) giveUp(a *node, no *refusal) {
	place := t.where(a)
	var domain *DomainError
	switch {
	case errors.As(no.cause, &domain):
		t.end = &End{Reason: OutOfDomain, Text: fmt.Sprintf("stopped at %s: %v", place, domain)}
	case t.plan.local == natural:
		t.end = &End{Reason: FoldAhead, Text: fmt.Sprintf("stopped at %s: a fold is near, which a run in the natural parameter cannot pass; follow without Natural() to go round it", place)}
	case t.plan.local != arclength && t.plan.local != automatic:
		t.end = &End{Reason: StepTooFine, Text: fmt.Sprintf("stopped at %s: %s turns back near there and cannot be held; use arclength or LocalAutomatic()", place, t.plan.local)}
	default:
		t.end = &End{Reason: StepTooFine, Text: fmt.Sprintf("stopped at %s: the step length fell below %.2g (%s)", place, t.plan.least, no.reason)}
	}
}

func (t *tracer) where(a *node) string {
	q := t.s.m.parameters[t.s.free]
	return q.Name + " " + withUnit(a.lambda, q.Unit)
}

// closure returns the end of the step at the start of the run, when the curve
// has come back to it.
func (t *tracer) closure(c *arc) *node {
	first := t.nodes[0]
	if t.steps < 3 || first.t == nil {
		return nil
	}
	u, off := c.project(t.scaled(first))
	if u <= 0 || u > 1 || off > 0.05 {
		return nil
	}
	_, d := c.at(u)
	tangent, _ := t.inScales(first)
	if dot(d, tangent) < 0.9*norm(d) {
		return nil
	}
	end := *first
	end.arc, end.step = c.a.arc+u*c.b.step, u*c.b.step
	end.t, end.scales = tangent, t.S
	end.k, end.special = nil, nil
	return &end
}

// cut walks along the nodes of a step, puts in the values to land at, and ends
// the chain at the first bound, special point to stop at, or condition.
func (t *tracer) cut(a *node, chain []*node) ([]*node, error) {
	var out []*node
	for _, b := range chain {
		parts, err := t.segments(a, b)
		if err != nil {
			return nil, err
		}
		for _, p := range parts {
			out = append(out, p)
			if t.stops(p) {
				return out, nil
			}
		}
		if t.end != nil && t.end.Reason != Closed {
			return out, nil
		}
		a = b
	}
	if t.end != nil && t.end.Reason == Closed {
		t.end.Text = fmt.Sprintf("closed on itself at %s", t.where(chain[len(chain)-1]))
	}
	return out, nil
}

// segments returns the nodes from a (left out) to b, with events and landings
// between, and sets t.end when a bound cuts the stretch.
func (t *tracer) segments(a, b *node) ([]*node, error) {
	last, end, err := t.bounds(t.between(a, b))
	if err != nil {
		return nil, err
	}
	if last == a {
		t.end = end
		return nil, nil
	}
	if last != nil {
		b = last
	}
	var out, events []*node
	if len(t.plan.watches) > 0 {
		if events, err = t.events(a, b); err != nil {
			return nil, err
		}
	}
	for _, next := range append(events, b) {
		landed, err := t.landings(t.between(a, next))
		if err != nil {
			return nil, err
		}
		out = append(append(out, landed...), next)
		a = next
	}
	if end != nil {
		t.end = end
	}
	return out, nil
}
