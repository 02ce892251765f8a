package tape

import (
	"fmt"
	"go/ast"
)

// A model may mend a quotient near the place where it is 0/0:
//
//	if math.Abs(x) < 1e-6 {
//		return 1 - x/2
//	}
//	return x / math.Expm1(x)
//
// The value is right, and so may the first derivative be; the second is not that
// of the function. Such conditions are noted, as the tape cannot know which was
// meant.

// smallest is what a bound must be below to look like a mended quotient.
const smallest = 1e-2

// noteMend notes a condition that looks like the mending of a quotient.
func (r *recorder) noteMend(at ast.Node, cond int32) {
	text, ok := r.mend(cond)
	if !ok {
		return
	}
	note := fmt.Sprintf("%s: %s; derivatives there are those of that side", r.src.place(at.Pos()), text)
	for _, old := range r.p.notes {
		if old == note {
			return
		}
	}
	r.p.notes = append(r.p.notes, note)
}

// mend recognises |x| < small, x*x < small and x == constant.
func (r *recorder) mend(cond int32) (string, bool) {
	n := r.g.nodes[cond]
	switch n.op {
	case opNot:
		return r.mend(n.a)
	case opEqual:
		for _, id := range [...]int32{n.a, n.b} {
			if v, ok := r.g.known(id); ok {
				return fmt.Sprintf("one side is for the single value %g", v), true
			}
		}
	case opLess, opLessEq:
		for _, pair := range [...][2]int32{{n.a, n.b}, {n.b, n.a}} {
			v, ok := r.g.known(pair[1])
			if ok && v > 0 && v < smallest && r.magnitude(pair[0]) {
				return fmt.Sprintf("one side is for sizes below %g only", v), true
			}
		}
	}
	return "", false
}

// magnitude reports whether a node is |x| or x*x.
func (r *recorder) magnitude(id int32) bool {
	n := r.g.nodes[id]
	return n.op == opAbs || n.op == opMul && n.a == n.b
}

// Notes returns what an analyst should know of the derivatives of this tape.
func (p *Program) Notes() []string { return append([]string(nil), p.notes...) }
