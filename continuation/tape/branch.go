package tape

import (
	"go/ast"
	"go/token"
)

// A flow says how a statement ends.
type flow struct {
	how    how
	target *construct // of break and continue
}

type how uint8

const (
	onward how = iota
	returned
	broke
	continued
	fellThrough
)

// A construct is a loop or a switch, which can be left.
type construct struct {
	label   string
	loop    bool
	endless bool // a loop without a condition of its own
	outer   *construct
}

// An exit is a return, break or continue under a condition on floats: it is
// done on one side, and the other side goes on. Both meet where the construct
// ends that the exit leaves. Of two exits that are pending, the older one has
// the last word.
type exit struct {
	flow    flow
	call    *activation // whose return it is
	cond    int32       // what holds on the side that left
	at      ast.Node
	written []entry // by the side that left
	journal *journal
	path    int32 // before
}

// decide runs yes or no, whichever the condition says, or both when it is a
// condition on floats.
func (r *recorder) decide(at ast.Node, cond value, yes, no func() flow) flow {
	if cond.kind == kTruth && r.guarded[at.Pos()] {
		cond = boolean(r.guard(at, cond.id()))
	}
	switch {
	case cond.kind == kBool && cond.n != 0:
		return yes()
	case cond.kind == kBool:
		return no()
	case cond.kind != kTruth:
		r.refuse(at, "the condition cannot be recorded")
	}
	id := cond.id()
	r.noteMend(at, id)
	not := r.not(id)
	f, first, exits := r.under(at, id, yes)
	g, second, more := r.under(at, not, no)
	for _, e := range exits {
		e.cond = r.both(id, e.cond)
		r.leave(e)
	}
	for _, e := range more {
		e.cond = r.both(not, e.cond)
		r.leave(e)
	}
	if f == g {
		r.join(at, id, first, second)
		return f
	}
	return r.part(at, id, f, g, first, second)
}

// under runs one side of a condition. It returns how it ended, what it wrote,
// and the exits in it that are pending.
func (r *recorder) under(at ast.Node, cond int32, side func() flow) (flow, []entry, []exit) {
	path, mark := r.path, len(r.exits)
	r.path = r.both(path, cond)
	r.inside = append(r.inside, at.Pos())
	r.begin()
	f := side()
	exits, main := r.collect(mark)
	if len(exits) > 0 {
		before := written(r.top, r.top.outer)
		for k := range exits {
			exits[k].written = overlay(before, exits[k].written)
		}
		r.replay(main)
	}
	wrote := r.undo()
	r.inside = r.inside[:len(r.inside)-1]
	r.path = path
	return f, wrote, exits
}

// part handles sides that end differently: the one that leaves waits as an
// exit, the other goes on.
func (r *recorder) part(at ast.Node, cond int32, f, g flow, first, second []entry) flow {
	if f.how == fellThrough || g.how == fellThrough {
		r.mustGuard(at.Pos())
	}
	for _, side := range [...]flow{f, g} {
		r.ended(at, side)
	}
	leaves := f
	if !further(f, g) {
		leaves, g, first, second, cond = g, f, second, first, r.not(cond)
	}
	r.leave(exit{flow: leaves, call: r.call, cond: cond, at: at, written: first})
	r.replay(second)
	return g
}

// ended looks at what a side that leaves would end: a loop that runs until a
// condition on floats holds is recorded with guards, when it is bounded.
func (r *recorder) ended(at ast.Node, side flow) {
	switch side.how {
	case broke:
		if side.target.loop {
			r.bounded(at, side.target)
			r.mustGuard(at.Pos())
		}
	case returned:
		for c := r.call.inside; c != nil; c = c.outer {
			r.bounded(at, c)
		}
	}
}

// bounded refuses loops that only floats can end.
func (r *recorder) bounded(at ast.Node, c *construct) {
	if c.loop && c.endless {
		r.refuse(at, "the loop runs until a float condition holds")
	}
}

// leave makes an exit wait. What is written from here on is the other side's.
func (r *recorder) leave(e exit) {
	if len(r.exits) >= maxExits {
		r.mustGuard(e.at.Pos())
	}
	e.path = r.path
	r.path = r.both(r.path, r.not(e.cond))
	r.inside = append(r.inside, e.at.Pos())
	r.begin()
	e.journal = r.top
	r.exits = append(r.exits, e)
}

func (r *recorder) replay(written []entry) {
	for _, e := range written {
		r.set(e.c, e.v)
	}
}

// collect takes the exits above mark off and returns them, each with all that
// was written since the first of them began, and the same of the main path.
func (r *recorder) collect(mark int) (exits []exit, main []entry) {
	if len(r.exits) == mark {
		return nil, nil
	}
	base := r.exits[mark].journal.outer
	exits = append(exits, r.exits[mark:]...)
	r.exits = r.exits[:mark]
	for k := len(exits) - 1; k >= 0; k-- {
		e := &exits[k]
		main = r.undo()
		r.inside = r.inside[:len(r.inside)-1]
		r.path = e.path
		if k > 0 {
			e.written = overlay(written(r.top, base), e.written)
			r.replay(main)
		}
	}
	return exits, main
}

// written lists the cells that the journals from j down to below know, with
// their present values.
func written(j, below *journal) []entry {
	var out []entry
	seen := map[*cell]bool{}
	for ; j != below; j = j.outer {
		for _, e := range j.log {
			if !seen[e.c] {
				seen[e.c] = true
				out = append(out, entry{c: e.c, v: e.c.v})
			}
		}
	}
	return out
}

func overlay(under, over []entry) []entry {
	if len(under) == 0 {
		return over
	}
	hidden := make(map[*cell]bool, len(over))
	for _, e := range over {
		hidden[e.c] = true
	}
	for _, e := range under {
		if !hidden[e.c] {
			over = append(over[:len(over):len(over)], e)
		}
	}
	return over
}

// meet ends the exits above mark that end as reached says, at the place where
// the main path arrives; others go on waiting.
func (r *recorder) meet(mark int, reached flow) {
	if len(r.exits) == mark {
		return
	}
	exits, main := r.collect(mark)
	arrived := int32(-1)
	var waiting, here []exit
	for _, e := range exits {
		if e.flow == reached && e.call == r.call {
			here = append(here, e)
			if arrived < 0 {
				arrived = e.cond
			} else {
				arrived = r.g.binary(opOr, arrived, e.cond)
			}
			continue
		}
		if arrived >= 0 {
			e.cond = r.both(e.cond, r.not(arrived))
		}
		waiting = append(waiting, e)
	}
	for _, e := range waiting {
		r.leave(e)
	}
	for k := len(here) - 1; k >= 0; k-- {
		main = r.combine(here[k], main)
	}
	r.replay(main)
}

// combine selects between what an exit and what the main path wrote.
func (r *recorder) combine(e exit, main []entry) []entry {
	r.begin()
	r.join(e.at, e.cond, e.written, main)
	return r.undo()
}

func (r *recorder) not(id int32) int32 { return r.g.unary(opNot, id, 0) }

// both is the condition that a and b hold; -1 always holds.
func (r *recorder) both(a, b int32) int32 {
	if a < 0 {
		return b
	}
	return r.g.binary(opAnd, a, b)
}

// further reports whether flow f leaves more than g does.
func further(f, g flow) bool {
	if f.how == returned || g.how == returned {
		return f.how == returned
	}
	if f.how == onward || g.how == onward {
		return f.how != onward
	}
	for c := g.target; c != nil; c = c.outer {
		if c == f.target {
			return true // f leaves the outer construct
		}
	}
	return false
}

// guard keeps the side of a condition that the sample point takes.
func (r *recorder) guard(at ast.Node, cond int32) bool {
	if v, ok := r.g.known(cond); ok {
		return v != 0
	}
	g := guard{path: r.path, cond: cond, want: r.g.sample[cond] != 0, pos: at.Pos()}
	for _, old := range r.p.guards {
		if old.path == g.path && old.cond == g.cond {
			return g.want
		}
	}
	r.p.guards = append(r.p.guards, g)
	return g.want
}

// A guard is a condition of which a tape has only one side. It counts where the
// conditions around it hold.
type guard struct {
	path int32 // node, or -1
	cond int32 // node
	want bool
	pos  token.Pos
}
