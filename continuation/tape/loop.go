package tape

import (
	"go/ast"
	"go/token"
	"go/types"
)

func (r *recorder) forStmt(s *ast.ForStmt, label string) flow {
	if s.Init != nil {
		r.stmt(s.Init, "")
	}
	own := r.loopVariables(s)
	c := r.enter(&construct{label: label, loop: true, endless: s.Cond == nil})
	mark := len(r.exits)
	for r.goesOn(s) {
		f, done := r.iteration(s.Body, c)
		if done {
			return r.close(c, mark, f)
		}
		for _, obj := range own {
			// Each iteration has variables of its own.
			r.call.env[obj] = r.newCell(r.copyOf(r.call.env[obj].v))
		}
		if s.Post != nil {
			r.stmt(s.Post, "")
		}
		r.work(s, 1)
	}
	return r.close(c, mark, flow{})
}

func (r *recorder) loopVariables(s *ast.ForStmt) []types.Object {
	var own []types.Object
	if init, ok := s.Init.(*ast.AssignStmt); ok && init.Tok == token.DEFINE {
		for _, e := range init.Lhs {
			if obj := r.src.Info.Defs[e.(*ast.Ident)]; obj != nil && obj.Name() != "_" {
				own = append(own, obj)
			}
		}
	}
	return own
}

// goesOn evaluates the condition of a loop. One on floats is a guard, where an
// integer bounds the loop.
func (r *recorder) goesOn(s *ast.ForStmt) bool {
	if s.Cond == nil {
		return true
	}
	v := r.expr(s.Cond)
	switch v.kind {
	case kBool:
		return v.n != 0
	case kTruth:
		if !r.counts(s.Cond) {
			r.refuse(s, "the loop runs until a float condition holds")
		}
		return r.guard(s.Cond, v.id())
	}
	r.refuse(s.Cond, "the condition cannot be recorded")
	return false
}

// counts reports whether a condition has a part on integers that must hold.
func (r *recorder) counts(e ast.Expr) bool {
	b, ok := ast.Unparen(e).(*ast.BinaryExpr)
	if !ok {
		return false
	}
	if b.Op == token.LAND {
		return r.counts(b.X) || r.counts(b.Y)
	}
	t, ok := r.typeOf(b.X).Underlying().(*types.Basic)
	return ok && t.Info()&types.IsInteger != 0
}

// iteration runs the body of a loop once. done says that the loop ends, as f
// says.
func (r *recorder) iteration(body *ast.BlockStmt, c *construct) (f flow, done bool) {
	mark := len(r.exits)
	f = r.block(body.List)
	next := flow{continued, c}
	if f.how == onward || f == next {
		r.meet(mark, next)
		return flow{}, false
	}
	r.missed(mark, next)
	return f, true
}

func (r *recorder) rangeStmt(s *ast.RangeStmt, label string) flow {
	x := r.expr(s.X)
	n, at := r.ranged(s, x)
	c := r.enter(&construct{label: label, loop: true})
	mark := len(r.exits)
	for i := range n {
		r.work(s, 1)
		r.rangeAssign(s, s.Key, integer(int64(i)))
		if s.Value != nil {
			r.rangeAssign(s, s.Value, at(i))
		}
		if f, done := r.iteration(s.Body, c); done {
			return r.close(c, mark, f)
		}
	}
	return r.close(c, mark, flow{})
}

// ranged returns the number of iterations, and the value of each.
func (r *recorder) ranged(s *ast.RangeStmt, x value) (int, func(int) value) {
	switch r.typeOf(s.X).Underlying().(type) {
	case *types.Basic:
		if x.kind == kInt {
			return int(max(x.n, 0)), nil
		}
	case *types.Array:
		if s.Value != nil {
			x = r.copyOf(x)
		}
		g := x.ref.(*group)
		return len(g.cells), func(i int) value { return g.cells[i].v }
	case *types.Pointer:
		if x.kind == kPointer {
			g := x.ref.(*cell).v.ref.(*group)
			return len(g.cells), func(i int) value { return g.cells[i].v }
		}
	case *types.Slice:
		if x.kind == kNil {
			return 0, nil
		}
		if l, ok := x.ref.(*slice); ok {
			return l.len, func(i int) value { return l.at(i).v }
		}
	case *types.Map:
		r.refuse(s, "maps cannot be recorded")
	case *types.Chan:
		r.refuse(s, "communication over channels cannot be recorded")
	case *types.Signature:
		r.refuse(s, "range over a function cannot be recorded")
	}
	r.refuse(s, "this range cannot be recorded")
	return 0, nil
}

func (r *recorder) rangeAssign(s *ast.RangeStmt, e ast.Expr, v value) {
	if e == nil {
		return
	}
	if id, ok := e.(*ast.Ident); ok {
		if id.Name == "_" {
			return
		}
		if s.Tok == token.DEFINE {
			r.define(r.src.Info.Defs[id], v)
			return
		}
	}
	r.assign(s, r.address(e), r.copyOf(v))
}

func (r *recorder) switchStmt(s *ast.SwitchStmt, label string) flow {
	if s.Init != nil {
		r.stmt(s.Init, "")
	}
	tag := boolean(true)
	var t types.Type = types.Typ[types.Bool]
	if s.Tag != nil {
		tag, t = r.copyOf(r.expr(s.Tag)), r.typeOf(s.Tag)
	}
	var clauses []*ast.CaseClause
	for _, b := range s.Body.List {
		clauses = append(clauses, b.(*ast.CaseClause))
	}
	c := r.enter(&construct{label: label})
	mark := len(r.exits)
	f := r.cases(s, clauses, 0, 0, tag, t)
	return r.close(c, mark, f)
}

// cases tries expression k of clause i and what comes after it.
func (r *recorder) cases(s *ast.SwitchStmt, clauses []*ast.CaseClause, i, k int, tag value, t types.Type) flow {
	for i < len(clauses) && k == len(clauses[i].List) {
		i, k = i+1, 0
	}
	if i == len(clauses) {
		for d, c := range clauses {
			if c.List == nil {
				return r.clause(clauses, d)
			}
		}
		return flow{}
	}
	e := clauses[i].List[k]
	v := r.expr(e)
	cond := v
	if s.Tag != nil {
		cond = r.equal(e, r.implicit(tag, t, r.typeOf(e)), r.implicit(v, r.typeOf(e), t))
	}
	return r.decide(e, cond,
		func() flow { return r.clause(clauses, i) },
		func() flow { return r.cases(s, clauses, i, k+1, tag, t) })
}

func (r *recorder) clause(clauses []*ast.CaseClause, i int) flow {
	f := r.block(clauses[i].Body)
	if f.how == fellThrough {
		return r.clause(clauses, i+1)
	}
	return f
}
