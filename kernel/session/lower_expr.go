package session

import (
	"go/ast"
	"go/token"
	"go/types"
)

// expr lowers an expression to a value of its own type.
func (l *lowerer) expr(e ast.Expr) ast.Expr {
	if tv, ok := l.u.info.Types[e]; ok && tv.Value != nil {
		return l.constant(tv.Value, tv.Type, false)
	}
	switch e := e.(type) {
	case *ast.Ident:
		return l.ident(e)
	case *ast.ParenExpr:
		return paren(l.expr(e.X))
	case *ast.SelectorExpr:
		return l.selector(e)
	case *ast.CallExpr:
		return l.call(e)
	case *ast.BinaryExpr:
		return l.binary(e)
	case *ast.UnaryExpr:
		return l.unary(e)
	case *ast.StarExpr:
		return &ast.StarExpr{X: l.expr(e.X)}
	case *ast.IndexExpr:
		return l.index(e)
	case *ast.IndexListExpr:
		return l.genericFunc(e.X)
	case *ast.SliceExpr:
		return l.slice(e)
	case *ast.TypeAssertExpr:
		return l.assertion(e)
	case *ast.CompositeLit:
		return l.composite(e, l.typeOf(e))
	case *ast.FuncLit:
		return l.funcLit(e)
	}
	l.fail(e.Pos(), "this expression cannot be used here")
	return nil
}

func (l *lowerer) ident(e *ast.Ident) ast.Expr {
	switch obj := l.u.info.ObjectOf(e).(type) {
	case *types.Nil:
		return ast.NewIdent("nil")
	case *types.Var:
		if e.Name == "_" {
			return ast.NewIdent("_")
		}
		return l.variable(obj)
	case *types.Func:
		return l.funcValue(e, obj)
	}
	if e.Name == "_" {
		return ast.NewIdent("_")
	}
	l.fail(e.Pos(), "%s is not a value", e.Name)
	return nil
}

// variable refers to a local variable, a session variable or one of a compiled package.
func (l *lowerer) variable(obj *types.Var) ast.Expr {
	if v := l.u.varObjs[obj]; v != nil {
		return ast.NewIdent(v.internal())
	}
	if obj.Pkg() != nil && obj.Pkg() != l.u.pkg {
		return l.symbol(obj)
	}
	return ast.NewIdent(l.declare(obj))
}

// funcValue refers to a function, or to the instance of a generic one.
func (l *lowerer) funcValue(id *ast.Ident, obj *types.Func) ast.Expr {
	if inst, ok := l.u.info.Instances[id]; ok {
		return l.instance(obj, inst.TypeArgs)
	}
	if obj.Pkg() != l.u.pkg {
		return l.symbol(obj)
	}
	d := l.u.objs[obj]
	if d == nil {
		l.fail(id.Pos(), "%s cannot be used here", obj.Name())
	}
	return ast.NewIdent(d.internal())
}

// genericFunc refers to an explicitly instantiated function.
func (l *lowerer) genericFunc(x ast.Expr) ast.Expr {
	switch x := x.(type) {
	case *ast.Ident:
		return l.ident(x)
	case *ast.SelectorExpr:
		return l.selector(x)
	}
	l.fail(x.Pos(), "this instance cannot be used here")
	return nil
}

func (l *lowerer) binary(e *ast.BinaryExpr) ast.Expr {
	switch e.Op {
	case token.EQL, token.NEQ:
		return l.comparison(e)
	case token.SHL, token.SHR:
		return paren(&ast.BinaryExpr{X: l.shifted(e), Op: e.Op, Y: l.shiftCount(e.Y)})
	case token.LAND, token.LOR:
		return paren(&ast.BinaryExpr{X: l.expr(e.X), Op: e.Op, Y: l.expr(e.Y)})
	}
	t := l.typeOf(e.X)
	if isUntyped(t) {
		t = l.typeOf(e.Y)
	}
	return paren(&ast.BinaryExpr{X: l.exprTo(e.X, t), Op: e.Op, Y: l.exprTo(e.Y, t)})
}

// shiftCount lowers the right operand of a shift; a constant may be written as a float or complex.
func (l *lowerer) shiftCount(e ast.Expr) ast.Expr {
	if tv := l.u.info.Types[e]; tv.Value != nil {
		return call(ast.NewIdent("uint"), literal(tv.Value, types.Typ[types.Uint]))
	}
	if t := l.typeOf(e); isUntyped(t) {
		return call(ast.NewIdent("uint"), l.expr(e))
	}
	return l.expr(e)
}

// shifted lowers the left operand of a shift, whose type is that of the whole.
func (l *lowerer) shifted(e *ast.BinaryExpr) ast.Expr {
	if tv := l.u.info.Types[e.X]; tv.Value != nil {
		t := l.typeOf(e)
		if isUntyped(t) {
			t = types.Typ[types.Int]
		}
		return call(l.conversionFun(t), literal(tv.Value, t.Underlying().(*types.Basic)))
	}
	return l.expr(e.X)
}

// comparison lowers == and !=; interfaces and structs are compared by the host, as Go does.
func (l *lowerer) comparison(e *ast.BinaryExpr) ast.Expr {
	x, y := l.typeOf(e.X), l.typeOf(e.Y)
	if isNil(x) || isNil(y) {
		return l.nilComparison(e, x, y)
	}
	if types.IsInterface(x) || types.IsInterface(y) {
		anyT := types.NewInterfaceType(nil, nil)
		eq := hostCall("Equal", l.exprTo(e.X, anyT), l.exprTo(e.Y, anyT))
		return negate(eq, e.Op)
	}
	t := x
	if isUntyped(t) {
		t = y
	}
	switch t.Underlying().(type) {
	case *types.Struct, *types.Array:
		return negate(hostCall("Same", l.expr(e.X), l.expr(e.Y)), e.Op)
	case *types.Chan:
		return negate(hostCall("SameChan", l.expr(e.X), l.expr(e.Y)), e.Op)
	case *types.Pointer:
		return negate(hostCall("Same", l.expr(e.X), l.expr(e.Y)), e.Op)
	}
	return paren(&ast.BinaryExpr{X: l.exprTo(e.X, t), Op: e.Op, Y: l.exprTo(e.Y, t)})
}

func isNil(t types.Type) bool {
	b, ok := t.(*types.Basic)
	return ok && b.Kind() == types.UntypedNil
}

func negate(x ast.Expr, op token.Token) ast.Expr {
	if op == token.NEQ {
		return &ast.UnaryExpr{Op: token.NOT, X: x}
	}
	return x
}

func (l *lowerer) nilComparison(e *ast.BinaryExpr, x, y types.Type) ast.Expr {
	v, t := e.X, x
	if isNil(x) {
		v, t = e.Y, y
	}
	return negate(l.isNil(l.expr(v), t), e.Op)
}

// isNil compares a lowered value with nil.
func (l *lowerer) isNil(x ast.Expr, t types.Type) ast.Expr {
	switch t.Underlying().(type) {
	case *types.Signature:
		return hostCall("NilFunc", x)
	case *types.Interface:
		return hostCall("IsNil", x)
	}
	return paren(&ast.BinaryExpr{X: x, Op: token.EQL, Y: ast.NewIdent("nil")})
}

func (l *lowerer) unary(e *ast.UnaryExpr) ast.Expr {
	switch e.Op {
	case token.AND:
		x := ast.Unparen(e.X)
		if lit, ok := x.(*ast.CompositeLit); ok {
			return &ast.UnaryExpr{Op: token.AND, X: l.composite(lit, l.typeOf(lit))}
		}
		return &ast.UnaryExpr{Op: token.AND, X: l.expr(x)}
	case token.ARROW:
		return paren(&ast.UnaryExpr{Op: token.ARROW, X: l.expr(e.X)})
	}
	return paren(&ast.UnaryExpr{Op: e.Op, X: l.expr(e.X)})
}

func (l *lowerer) index(e *ast.IndexExpr) ast.Expr {
	if tv := l.u.info.Types[e.X]; !tv.IsValue() || isGenericFunc(tv.Type) {
		return l.genericFunc(e.X)
	}
	t := l.typeOf(e.X)
	switch u := t.Underlying().(type) {
	case *types.Map:
		if isNil(l.typeOf(e.Index)) && !types.IsInterface(u.Key()) {
			return &ast.IndexExpr{X: l.expr(e.X), Index: l.zero(u.Key())}
		}
		return &ast.IndexExpr{X: l.expr(e.X), Index: l.exprTo(e.Index, u.Key())}
	case *types.Pointer:
		return &ast.IndexExpr{X: paren(&ast.StarExpr{X: l.expr(e.X)}), Index: l.expr(e.Index)}
	}
	return &ast.IndexExpr{X: l.expr(e.X), Index: l.expr(e.Index)}
}

func isGenericFunc(t types.Type) bool {
	sig, ok := t.(*types.Signature)
	return ok && sig.TypeParams().Len() > 0
}

func (l *lowerer) slice(e *ast.SliceExpr) ast.Expr {
	opt := func(x ast.Expr) ast.Expr {
		if x == nil {
			return nil
		}
		return l.expr(x)
	}
	x := l.expr(e.X)
	if _, ok := l.typeOf(e.X).Underlying().(*types.Pointer); ok {
		x = paren(&ast.StarExpr{X: x})
	}
	return &ast.SliceExpr{X: x, Low: opt(e.Low), High: opt(e.High), Max: opt(e.Max), Slice3: e.Slice3}
}

// funcLit lowers a function literal; its body is part of the function around it.
func (l *lowerer) funcLit(e *ast.FuncLit) ast.Expr {
	results, named := l.results, l.named
	defer func() { l.results, l.named = results, named }()
	sig := l.typeOf(e).(*types.Signature)
	ft := l.signature(sig, &ast.FieldList{}, l.paramVars(e.Type.Params), l.paramVars(e.Type.Results))
	return &ast.FuncLit{Type: ft, Body: l.funcBody(e.Body, "func")}
}

// composite lowers a literal of the given type, which may be left out in the source.
func (l *lowerer) composite(e *ast.CompositeLit, t types.Type) ast.Expr {
	t = l.sub(t)
	switch u := t.Underlying().(type) {
	case *types.Pointer:
		return &ast.UnaryExpr{Op: token.AND, X: l.composite(e, u.Elem())}
	case *types.Struct:
		return l.structLit(e, t, u)
	case *types.Map:
		return l.mapLit(e, t, u)
	case *types.Slice:
		return l.listLit(e, t, u.Elem())
	case *types.Array:
		return l.listLit(e, t, u.Elem())
	}
	l.fail(e.Pos(), "this literal cannot be used here")
	return nil
}

func (l *lowerer) structLit(e *ast.CompositeLit, t types.Type, st *types.Struct) ast.Expr {
	out := &ast.CompositeLit{Type: l.typ(t)}
	for i, elt := range e.Elts {
		at, val := i, elt
		if kv, ok := elt.(*ast.KeyValueExpr); ok {
			at, val = fieldIndex(st, kv.Key.(*ast.Ident).Name), kv.Value
		}
		f := st.Field(at)
		out.Elts = append(out.Elts, &ast.KeyValueExpr{Key: ast.NewIdent(fieldName(st, at)), Value: l.element(val, f.Type())})
	}
	return out
}

func fieldIndex(st *types.Struct, name string) int {
	for i := range st.NumFields() {
		if st.Field(i).Name() == name {
			return i
		}
	}
	return -1
}

// element lowers an element of a literal, which may itself be a literal without its type.
func (l *lowerer) element(e ast.Expr, t types.Type) ast.Expr {
	if lit, ok := e.(*ast.CompositeLit); ok && lit.Type == nil {
		return l.composite(lit, t)
	}
	return l.exprTo(e, t)
}

func (l *lowerer) mapLit(e *ast.CompositeLit, t types.Type, m *types.Map) ast.Expr {
	out := &ast.CompositeLit{Type: l.typ(t)}
	for _, elt := range e.Elts {
		kv := elt.(*ast.KeyValueExpr)
		out.Elts = append(out.Elts, &ast.KeyValueExpr{Key: l.element(kv.Key, m.Key()), Value: l.element(kv.Value, m.Elem())})
	}
	return out
}

func (l *lowerer) listLit(e *ast.CompositeLit, t types.Type, elem types.Type) ast.Expr {
	out := &ast.CompositeLit{Type: l.typ(t)}
	for _, elt := range e.Elts {
		if kv, ok := elt.(*ast.KeyValueExpr); ok {
			out.Elts = append(out.Elts, &ast.KeyValueExpr{Key: l.expr(kv.Key), Value: l.element(kv.Value, elem)})
			continue
		}
		out.Elts = append(out.Elts, l.element(elt, elem))
	}
	return out
}

// assertion lowers x.(T) that panics when it fails.
func (l *lowerer) assertion(e *ast.TypeAssertExpr) ast.Expr {
	t := l.typeOf(e.Type)
	if types.IsInterface(t) && l.dynamic(t) {
		return hostCall("Assert", intLit(l.runtimeType(t).id), l.opened(e.X))
	}
	x := hostCall("Assert", intLit(l.runtimeType(t).id), l.opened(e.X))
	if types.IsInterface(t) {
		return l.toInterface(x, t)
	}
	if _, ok := t.Underlying().(*types.Basic); ok {
		return &ast.TypeAssertExpr{X: x, Type: l.typ(t)}
	}
	v := l.temp("x")
	return closure([]ast.Expr{l.typ(t)}, varStmt(v, l.typ(t), nil), l.unpack(x, v), &ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent(v)}})
}

// unpack stores what the host's assertion gave into a variable. The interpreter's own assertion fails for some types.
func (l *lowerer) unpack(x ast.Expr, name string) ast.Stmt {
	return exprStmt(hostCall("Unpack", x, &ast.UnaryExpr{Op: token.AND, X: ast.NewIdent(name)}))
}

// opened lowers an interface value to the dynamic form.
func (l *lowerer) opened(e ast.Expr) ast.Expr {
	return l.toDynamic(l.expr(e), l.typeOf(e))
}
