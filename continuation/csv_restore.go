package continuation

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
)

// restore refines the special points of a branch that was read, each on the arc between
// its neighbours.
func (b *Branch) restore(s *sheet, remarks int) error {
	t, err := b.tracer()
	if err != nil {
		return err
	}
	for i := range b.points {
		for _, kind := range strings.Split(s.rows[i][remarks], "; ") {
			if kind == "" || kind == startRemark {
				continue
			}
			special, err := b.special(t, i, kind)
			if err != nil {
				return fmt.Errorf("row %d, %s: %w: the file belongs to another model, or to this one before it was changed", i+1, kind, err)
			}
			b.specials = append(b.specials, special.on(b.points[i], i, false))
		}
	}
	b.notes = append(b.notes, t.notes...)
	return nil
}

// tracer makes a tracer in scales that fit the branch.
func (b *Branch) tracer() (*tracer, error) {
	low, high := b.Range()
	plan, err := newPlan(nil)
	if err != nil {
		return nil, err
	}
	if low < high {
		plan.low, plan.high = low, high
	}
	first := b.points[b.start]
	t := newTracer(newSystem(b.model, first.State, first.Parameters, b.free), plan)
	for i := range t.known {
		for _, p := range b.points {
			t.known[i] = math.Max(t.known[i], math.Abs(p.State[i]))
		}
	}
	if err := t.setScales(first.State, first.Value()); err != nil {
		return nil, err
	}
	// The sizes of the equations are the largest met along the branch.
	for i := range b.points {
		if err := t.evaluate(b.node(t, i)); err != nil {
			return nil, fmt.Errorf("row %d: %w", i+1, err)
		}
		t.naturalRows()
	}
	for _, p := range b.points {
		p.sizes = &sizes{t.s.sx, t.most, t.S[t.n]}
	}
	return t, nil
}

// node makes a node of a point.
func (b *Branch) node(t *tracer, i int) *node {
	p := b.points[i]
	a := &node{x: p.State, lambda: p.Value(), t: make([]float64, t.n+1), scales: t.S, unstable: p.Unstable, arc: p.Arclength}
	for k := range a.t {
		a.t[k] = p.Tangent[k] / t.S[k]
	}
	length := norm(a.t)
	for k := range a.t {
		a.t[k] /= length
	}
	return a
}

// special refines the special point that a row is said to be.
func (b *Branch) special(t *tracer, i int, kind string) (Special, error) {
	before, after := b.node(t, max(i-1, 0)), b.node(t, min(i+1, len(b.points)-1))
	c := t.between(before, after)
	var found *node
	var err error
	switch kind {
	case "fold":
		found, err = t.refineFold(c)
	case "Hopf point":
		found, err = t.refineHopf(c)
	case "simple stationary bifurcation":
		// From the point itself; where that is too near for Newton's method to see its
		// way, from the middle between its neighbours.
		if found, err = t.refineBranchPoint(t.around(c, b.node(t, i))); err != nil {
			found, err = t.refineBranchPoint(c)
		}
	case "multiple bifurcation":
		found, err = t.refineMultiple(c)
	default:
		e := &Event{Name: kind}
		t.certify(c, b.node(t, i), &e.found, refined{})
		return e, nil
	}
	if err != nil {
		return nil, err
	}
	if off := math.Abs(found.lambda - b.points[i].Value()); off > 1e-6*(math.Abs(found.lambda)+t.S[t.n]) {
		return nil, fmt.Errorf("it lies at %s by this model", withUnit(found.lambda, b.model.parameters[b.free].Unit))
	}
	return found.special, nil
}

// around returns a short arc on which a node lies in the middle, with the counts of a long
// one.
func (t *tracer) around(c *arc, at *node) *arc {
	ends := [2]node{*at, *at}
	for k, side := range []float64{-1, 1} {
		z := t.scaled(at)
		addMultiple(z, side*1e-3*c.length, at.t)
		ends[k].x = make([]float64, t.n)
		t.place(&ends[k], z)
	}
	ends[0].unstable, ends[1].unstable = c.a.unstable, c.b.unstable
	return t.between(&ends[0], &ends[1])
}

// ReadLocus reads the points of a locus that [Locus.WriteCSV] wrote, as a list: the two
// parameters are those of the first two columns. Every row must be a steady state of this
// model with the other parameters as they are in it. The special points are read with their
// places, without coefficients.
func (m *Model) ReadLocus(r io.Reader, kind string) (*Locus, error) {
	l, err := m.readLocus(r, kind)
	if err != nil {
		return nil, fmt.Errorf("ReadLocus: %w", err)
	}
	return l, nil
}

func (m *Model) readLocus(r io.Reader, kind string) (*Locus, error) {
	if !slices.Contains([]string{"fold", "Hopf point"}, kind) {
		return nil, fmt.Errorf("the kind is %q; it must be fold or Hopf point", kind)
	}
	s, err := readSheet(r)
	if err != nil {
		return nil, err
	}
	l := &Locus{model: m, kind: kind, branch: &Branch{model: m}}
	var params [2]int
	for i := range params {
		name, _ := heading(s.header[i])
		if params[i], err = m.parameterIndex(name); err != nil {
			return nil, fmt.Errorf("the first two columns are those of the parameters: %w", err)
		}
	}
	l.first, l.second = params[0], params[1]
	wanted := append([]Variable{m.parameters[l.first].Variable, m.parameters[l.second].Variable}, m.states...)
	for _, name := range []string{"quadratic coefficient", "frequency", "first Lyapunov coefficient", remarkColumn} {
		wanted = append(wanted, Variable{Name: name})
	}
	columns := make([]int, len(wanted))
	for k, v := range wanted {
		if columns[k], err = s.need(v); err != nil {
			return nil, err
		}
	}
	for row := range s.rows {
		if err := l.addRow(s, row, columns); err != nil {
			return nil, err
		}
	}
	for i, p := range []*LocusPoint{l.points[0], l.points[len(l.points)-1]} {
		l.branch.ends[i] = End{Reason: NotFollowed, Text: "was read from a file that ends there", Point: p.Point}
	}
	return l, nil
}

func (l *Locus) addRow(s *sheet, row int, columns []int) error {
	m, n := l.model, len(l.model.states)
	v := make([]float64, len(columns)-1)
	for k := range v {
		var err error
		if v[k], err = s.number(row, columns[k]); err != nil {
			return err
		}
	}
	p := &Point{State: v[2 : 2+n : 2+n], Parameters: m.values(), Parameter: m.parameters[l.second].Name, Unstable: -1, model: m, free: l.second}
	p.Parameters[l.first], p.Parameters[l.second] = v[0], v[1]
	if err := p.holds(row); err != nil {
		return err
	}
	at := &LocusPoint{Point: p, First: v[0], Second: v[1], Quadratic: v[2+n], Omega: v[3+n], Lyapunov: v[4+n], first: l.first}
	if kind := s.rows[row][columns[len(columns)-1]]; kind != "" {
		l.specials = append(l.specials, &LocusSpecial{Kind: kind, Where: at, index: len(l.points)})
	}
	l.points = append(l.points, at)
	return nil
}
