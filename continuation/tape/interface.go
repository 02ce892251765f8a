package tape

import (
	"go/ast"
	"go/types"
)

// implicit converts to an interface where an assignment does.
func (r *recorder) implicit(v value, from, to types.Type) value {
	if to == nil || from == nil || !types.IsInterface(to) || types.IsInterface(from) || v.kind == kNil && isNil(from) {
		return v
	}
	return value{kind: kFace, ref: &face{types.Default(from), r.copyOf(v)}}
}

func isNil(t types.Type) bool {
	b, ok := t.(*types.Basic)
	return ok && b.Kind() == types.UntypedNil
}

func sameType(a, b types.Type) bool { return types.Identical(a, b) }

func (r *recorder) assertion(e *ast.TypeAssertExpr) value {
	v, t := r.expr(e.X), r.src.Info.TypeOf(e)
	tuple, commaOk := t.(*types.Tuple)
	if commaOk {
		t = tuple.At(0).Type()
	}
	content, ok := r.matches(v, t)
	if commaOk {
		if !ok {
			content = r.zero(e, t)
		}
		return value{kind: kTuple, ref: []value{content, boolean(ok)}}
	}
	if !ok {
		r.refuse(e, "the type assertion fails")
	}
	return content
}

// matches reports whether the content of an interface has type t, and returns it
// as such.
func (r *recorder) matches(v value, t types.Type) (value, bool) {
	content, ok := v.ref.(*face)
	if v.kind != kFace || !ok {
		return value{}, false
	}
	if i, ok := t.Underlying().(*types.Interface); ok {
		return v, types.Implements(content.typ, i)
	}
	return content.v, sameType(content.typ, t)
}

func (r *recorder) typeSwitch(s *ast.TypeSwitchStmt, label string) flow {
	if s.Init != nil {
		r.stmt(s.Init, "")
	}
	var x ast.Expr
	switch a := s.Assign.(type) {
	case *ast.ExprStmt:
		x = a.X
	case *ast.AssignStmt:
		x = a.Rhs[0]
	}
	v := r.expr(ast.Unparen(x).(*ast.TypeAssertExpr).X)
	c := r.enter(&construct{label: label})
	mark := len(r.exits)
	return r.close(c, mark, r.typeCases(s, v))
}

func (r *recorder) typeCases(s *ast.TypeSwitchStmt, v value) flow {
	var otherwise *ast.CaseClause
	for _, b := range s.Body.List {
		clause := b.(*ast.CaseClause)
		if clause.List == nil {
			otherwise = clause
		}
		for _, e := range clause.List {
			t := r.src.Info.TypeOf(e)
			content, ok := v, isNil(t) && v.kind == kNil
			if !isNil(t) {
				content, ok = r.matches(v, t)
			}
			if ok {
				if len(clause.List) > 1 {
					content = v
				}
				r.define(r.src.Info.Implicits[clause], content)
				return r.block(clause.Body)
			}
		}
	}
	if otherwise == nil {
		return flow{}
	}
	r.define(r.src.Info.Implicits[otherwise], v)
	return r.block(otherwise.Body)
}
