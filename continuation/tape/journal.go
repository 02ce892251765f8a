package tape

import (
	"go/ast"
	"go/token"
)

// A journal keeps the old values of the cells that one side of a condition
// writes, so that the other side starts from the same state.
type journal struct {
	serial int32
	log    []entry
	outer  *journal
}

type entry struct {
	c     *cell
	v     value
	stamp int32
}

func (r *recorder) serial() int32 {
	if r.top == nil {
		return 0
	}
	return r.top.serial
}

func (r *recorder) set(c *cell, v value) {
	if j := r.top; j != nil && c.stamp != j.serial {
		j.log = append(j.log, entry{c, c.v, c.stamp})
		c.stamp = j.serial
	}
	c.v = v
}

func (r *recorder) begin() {
	r.serials++
	r.top = &journal{serial: r.serials, outer: r.top}
}

// undo ends the journal, restores what was written under it and returns what
// had been written.
func (r *recorder) undo() []entry {
	j := r.top
	written := make([]entry, len(j.log))
	for i, e := range j.log {
		written[i] = entry{c: e.c, v: e.c.v}
	}
	for i := len(j.log) - 1; i >= 0; i-- {
		e := j.log[i]
		e.c.v, e.c.stamp = e.v, e.stamp
	}
	r.top = j.outer
	return written
}

// join stores for each cell that either side wrote the value of the side that
// the condition takes. The present values are those of neither side. at is the
// condition, which becomes a guard when the sides do not fit together.
func (r *recorder) join(at ast.Node, cond int32, yes, no []entry) {
	other := make(map[*cell]value, len(no))
	for _, e := range no {
		other[e.c] = e.v
	}
	for _, e := range yes {
		b, ok := other[e.c]
		if !ok {
			b = e.c.v
		}
		delete(other, e.c)
		r.set(e.c, r.merge(at, cond, e.v, b))
	}
	for _, e := range no {
		if v, ok := other[e.c]; ok {
			r.set(e.c, r.merge(at, cond, e.c.v, v))
		}
	}
}

func (r *recorder) merge(at ast.Node, cond int32, a, b value) value {
	switch {
	case a.kind == kNone:
		return b
	case b.kind == kNone || same(a, b):
		return a
	case a.kind == kFloat && b.kind == kFloat:
		return float(r.g.choose(cond, a.id(), b.id()))
	case (a.kind == kBool || a.kind == kTruth) && (b.kind == kBool || b.kind == kTruth):
		return r.truthOf(r.either(cond, r.node(a), r.node(b)))
	case a.kind == kFace && b.kind == kFace:
		fa, fb := a.ref.(*face), b.ref.(*face)
		if sameType(fa.typ, fb.typ) {
			return value{kind: kFace, ref: &face{fa.typ, r.merge(at, cond, fa.v, fb.v)}}
		}
	case a.kind == kGroup && b.kind == kGroup:
		ga, gb := a.ref.(*group), b.ref.(*group)
		if len(ga.cells) == len(gb.cells) {
			g := r.newGroup(len(ga.cells))
			for i := range g.cells {
				g.cells[i].v = r.merge(at, cond, ga.cells[i].v, gb.cells[i].v)
			}
			return value{kind: kGroup, ref: g}
		}
	}
	r.mustGuard(at.Pos())
	return value{}
}

// same reports whether two values are one.
func same(a, b value) bool {
	if a.kind != b.kind || a.n != b.n {
		return false
	}
	switch a.kind {
	case kSlice:
		return *a.ref.(*slice) == *b.ref.(*slice)
	case kFunc:
		x, y := a.ref.(*closure), b.ref.(*closure)
		return x == y || x.lit == nil && x.recv == nil && y.recv == nil && x.decl == y.decl && x.math == y.math
	case kTuple:
		return false
	}
	return a.ref == b.ref
}

// A fork starts the recording anew with the condition at pos as a guard.
type fork struct{ pos token.Pos }

func (r *recorder) mustGuard(pos token.Pos) { panic(fork{pos}) }
