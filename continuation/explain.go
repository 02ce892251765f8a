package continuation

import (
	"errors"
	"fmt"
	"math"
)

const (
	shortestArc = 1e-9 // scaled length below which an arc is not divided further
	deepest     = 40
)

// explain returns the special points on an arc, in order. Every change between
// its ends (of the direction in λ, of the sign of the bordered determinant, of
// the number of unstable eigenvalues) must be accounted for by a special point
// that a refinement confirms; else the arc is divided. What stays unexplained at
// a jump of the determinant refuses the step; what stays unexplained otherwise
// is noted.
func (t *tracer) explain(c *arc) ([]*node, error) {
	if t.plan.locus != nil {
		return nil, nil // a locus has events of its own kinds
	}
	return t.resolve(c, 0)
}

// changes says what differs between the ends of an arc.
type changes struct {
	turn   bool // the sign of dλ/ds
	branch bool // the sign of det [F_z; tᵀ]
	count  int  // of unstable eigenvalues, 0 when not counted
}

func (t *tracer) changes(c *arc) changes {
	ch := changes{
		turn:   c.a.special == nil && c.b.special == nil && (c.a.t[t.n] < 0) != (c.b.t[t.n] < 0),
		branch: c.a.det != c.b.det && c.a.det != 0 && c.b.det != 0,
	}
	// At a special point itself the count and the signs are those of rounding.
	if c.a.special != nil || c.b.special != nil {
		return ch
	}
	if t.plan.spectra != noValues && !t.s.m.balance {
		ch.count = c.b.unstable - c.a.unstable
	}
	return ch
}

// accounts reports whether the change of the count is that of the event.
func (t *tracer) accounts(ch changes, by int) bool {
	return t.plan.spectra == noValues || t.s.m.balance || ch.count == by || ch.count == -by
}

func (t *tracer) resolve(c *arc, depth int) ([]*node, error) {
	ch := t.changes(c)
	if !ch.turn && !ch.branch && ch.count == 0 {
		return t.dip(c, depth)
	}
	var found *node
	var err error
	switch {
	case ch.turn && !ch.branch && t.accounts(ch, 1):
		found, err = t.refineFold(c)
	case ch.branch && !ch.turn && t.accounts(ch, 1):
		found, err = t.refineBranchPoint(c)
	case !ch.turn && !ch.branch && (ch.count == 2 || ch.count == -2):
		found, err = t.refineHopf(c)
	}
	if errors.Is(err, ErrInterrupted) {
		return nil, err
	}
	if found != nil {
		return []*node{found}, nil
	}
	if found == nil && c.length < multipleArc && (ch.count > 1 || ch.count < -1) {
		if found, err = t.refineMultiple(c); found != nil {
			return []*node{found}, nil
		}
		if errors.Is(err, ErrInterrupted) {
			return nil, err
		}
	}
	if c.length < shortestArc || depth > deepest {
		return nil, t.unexplained(c, ch, err)
	}
	return t.divide(c, 0.5, depth)
}

// divide explains both parts of an arc.
func (t *tracer) divide(c *arc, u float64, depth int) ([]*node, error) {
	m, err := t.middle(c, u)
	if err != nil {
		return nil, err
	}
	left, err := t.resolve(t.between(c.a, m), depth+1)
	if err != nil {
		return nil, err
	}
	right, err := t.resolve(t.between(m, c.b), depth+1)
	if err != nil {
		return nil, err
	}
	return append(left, right...), nil
}

// dip looks for two folds within an arc whose ends show none: the cubic through
// dλ/ds and its slopes at both ends has an extremum between them at which it
// comes near zero or crosses it.
func (t *tracer) dip(c *arc, depth int) ([]*node, error) {
	if c.a.k == nil || c.b.k == nil || depth > 12 || c.length < 1e-6 {
		return nil, nil
	}
	ta, tb := math.Abs(c.a.t[t.n]), math.Abs(c.b.t[t.n])
	sign := 1.0
	if c.a.t[t.n] < 0 {
		sign = -1
	}
	// Falling towards zero from both ends, or there is no dip.
	da, db := sign*c.a.k[t.n]*c.length, sign*c.b.k[t.n]*c.length
	if da >= 0 || db <= 0 {
		return nil, nil
	}
	least, at := math.Inf(1), 0.5
	for i := 1; i < 64; i++ {
		u := float64(i) / 64
		v := (1+u*u*(2*u-3))*ta + u*(1-u)*(1-u)*da + u*u*(3-2*u)*tb + u*u*(u-1)*db
		if v < least {
			least, at = v, u
		}
	}
	if least > 0.3*math.Min(ta, tb) {
		return nil, nil
	}
	return t.divide(c, at, depth)
}

// unexplained refuses the step when the determinant jumps, since another branch
// may have been jumped to, and else notes what could not be accounted for.
func (t *tracer) unexplained(c *arc, ch changes, err error) error {
	why := ""
	if err != nil {
		why = ": " + err.Error()
	}
	if ch.branch || ch.turn {
		return &refusal{reason: fmt.Sprintf("something changes sign at %s that is no simple singular point%s", t.where(c.a), why)}
	}
	note := fmt.Sprintf("unexplained at %s: the number of unstable eigenvalues goes from %d to %d%s", t.where(c.a), c.a.unstable, c.b.unstable, why)
	t.notes = append(t.notes, note)
	return nil
}
