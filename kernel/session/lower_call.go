package session

import (
	"go/ast"
	"go/token"
	"go/types"
)

// selector lowers x.f that is not called: a field, a package's name, a method value or a method expression.
func (l *lowerer) selector(e *ast.SelectorExpr) ast.Expr {
	sel, ok := l.u.info.Selections[e]
	if !ok {
		return l.qualified(e)
	}
	switch sel.Kind() {
	case types.FieldVal:
		x, _ := l.path(l.expr(e.X), l.typeOf(e.X), l.fieldPath(e, sel))
		return x
	case types.MethodVal:
		return l.methodValue(e, sel)
	}
	return l.methodExpr(e)
}

// qualified lowers pkg.Name.
func (l *lowerer) qualified(e *ast.SelectorExpr) ast.Expr {
	obj := l.u.info.Uses[e.Sel]
	if f, ok := obj.(*types.Func); ok {
		if inst, ok := l.u.info.Instances[e.Sel]; ok {
			return l.instance(f, inst.TypeArgs)
		}
	}
	if obj == nil {
		l.fail(e.Pos(), "%s cannot be used here", e.Sel.Name)
	}
	return l.symbol(obj)
}

// fieldPath finds the way to a selected field in the instance being lowered.
func (l *lowerer) fieldPath(e *ast.SelectorExpr, sel *types.Selection) []int {
	if len(l.subst) == 0 {
		return sel.Index()
	}
	_, index, _ := types.LookupFieldOrMethod(l.typeOf(e.X), true, l.u.pkg, e.Sel.Name)
	return index
}

// path follows embedded fields, written out; within a compiled type it goes straight to the last one, for those between may be hidden.
func (l *lowerer) path(x ast.Expr, t types.Type, index []int) (ast.Expr, types.Type) {
	hidden := false
	for n, i := range index {
		if p, ok := t.Underlying().(*types.Pointer); ok {
			t = p.Elem()
		}
		hidden = hidden || l.compiled(t)
		st := t.Underlying().(*types.Struct)
		t = st.Field(i).Type()
		if !hidden || n == len(index)-1 {
			x = &ast.SelectorExpr{X: x, Sel: ast.NewIdent(fieldName(st, i))}
		}
	}
	return x, t
}

// compiled reports whether a type is one that a compiled package names.
func (l *lowerer) compiled(t types.Type) bool {
	n, ok := types.Unalias(t).(*types.Named)
	return ok && n.Obj().Pkg() != nil && n.Obj().Pkg() != l.u.pkg
}

// compiledAlong returns how many of the steps to a method lead to a compiled type, which finds its promoted methods itself.
func (l *lowerer) compiledAlong(t types.Type, index []int) int {
	for n, i := range index {
		if p, ok := t.Underlying().(*types.Pointer); ok {
			t = p.Elem()
		}
		if l.compiled(t) {
			return n
		}
		t = t.Underlying().(*types.Struct).Field(i).Type()
	}
	return len(index)
}

// A target is a method found for a receiver.
type target struct {
	fn      *types.Func
	recv    ast.Expr   // lowered receiver, after embedded fields
	typ     types.Type // its type
	dynamic bool       // the receiver is an interface that is an any in lowered code
	own     *def       // the definition, of a method made in cells
}

// method finds what a method selection calls.
func (l *lowerer) method(x ast.Expr, t types.Type, name string, pkg *types.Package) target {
	obj, index, _ := types.LookupFieldOrMethod(t, true, pkg, name)
	fn, ok := obj.(*types.Func)
	if !ok {
		l.fail(token.NoPos, "no method %s", name)
	}
	steps := index[:len(index)-1]
	recv, rt := l.path(x, t, steps[:l.compiledAlong(t, steps)])
	tg := target{fn: fn, recv: recv, typ: rt}
	switch {
	case types.IsInterface(rt):
		tg.dynamic = l.dynamic(rt)
	case l.compiled(rt):
	case fn.Pkg() == l.u.pkg:
		tg.own = l.u.objs[fn.Origin()]
		if tg.own == nil {
			l.fail(token.NoPos, "the method %s cannot be used here", name)
		}
	}
	return tg
}

// receiver adjusts the receiver of an own method to what its first parameter wants.
func (l *lowerer) receiver(tg target) ast.Expr {
	want := tg.fn.Type().(*types.Signature).Recv().Type()
	_, wantPtr := types.Unalias(want).(*types.Pointer)
	_, havePtr := types.Unalias(tg.typ).Underlying().(*types.Pointer)
	switch {
	case wantPtr && !havePtr:
		return &ast.UnaryExpr{Op: token.AND, X: tg.recv}
	case !wantPtr && havePtr:
		return paren(&ast.StarExpr{X: tg.recv})
	}
	return tg.recv
}

// ownMethod names the function of a method made in cells, an instance when its type is generic.
func (l *lowerer) ownMethod(tg target) ast.Expr {
	t := types.Unalias(tg.typ)
	if p, ok := t.(*types.Pointer); ok {
		t = types.Unalias(p.Elem())
	}
	n, ok := t.(*types.Named)
	if !ok || n.TypeArgs().Len() == 0 {
		return ast.NewIdent(tg.own.internal())
	}
	return ast.NewIdent(l.methodInstance(tg.own, tg.fn.Origin(), n))
}

// methodValue lowers x.Method as a value.
func (l *lowerer) methodValue(e *ast.SelectorExpr, sel *types.Selection) ast.Expr {
	tg := l.method(l.expr(e.X), l.typeOf(e.X), e.Sel.Name, l.lookupPackage(sel))
	sig := l.sub(l.typeOf(e)).(*types.Signature)
	switch {
	case tg.own != nil:
		return l.bound(l.ownMethod(tg), l.receiver(tg), tg, sig)
	case tg.dynamic:
		return &ast.TypeAssertExpr{X: hostCall("Method", tg.recv, strLit(tg.fn.Name())), Type: l.funcType(sig)}
	}
	return &ast.SelectorExpr{X: tg.recv, Sel: ast.NewIdent(tg.fn.Name())}
}

func (l *lowerer) lookupPackage(sel *types.Selection) *types.Package {
	if p := sel.Obj().Pkg(); p != nil {
		return p
	}
	return l.u.pkg
}

// bound makes a closure over a receiver that is evaluated now.
func (l *lowerer) bound(fun, recv ast.Expr, tg target, sig *types.Signature) ast.Expr {
	r := l.temp("b")
	want := l.recvType(tg)
	inner := l.forward(sig, func(args []ast.Expr, ellipsis bool) *ast.CallExpr {
		return spread(call(fun, append([]ast.Expr{ast.NewIdent(r)}, args...)...), ellipsis)
	})
	return call(&ast.FuncLit{
		Type: &ast.FuncType{
			Params:  &ast.FieldList{List: []*ast.Field{{Names: []*ast.Ident{ast.NewIdent(r)}, Type: l.typ(want)}}},
			Results: &ast.FieldList{List: []*ast.Field{{Type: l.funcType(sig)}}}},
		Body: &ast.BlockStmt{List: []ast.Stmt{&ast.ReturnStmt{Results: []ast.Expr{inner}}}}}, recv)
}

// recvType is the type of the receiver that a target's method declares, in the instance at hand.
func (l *lowerer) recvType(tg target) types.Type {
	want := types.Unalias(tg.fn.Type().(*types.Signature).Recv().Type())
	have := types.Unalias(tg.typ)
	if p, ok := have.(*types.Pointer); ok {
		have = p.Elem()
	}
	if _, ok := want.(*types.Pointer); ok {
		return types.NewPointer(have)
	}
	return have
}

func spread(c *ast.CallExpr, ellipsis bool) *ast.CallExpr {
	if ellipsis {
		c.Ellipsis = 1
	}
	return c
}

// forward writes a function literal that passes its parameters on.
func (l *lowerer) forward(sig *types.Signature, to func(args []ast.Expr, ellipsis bool) *ast.CallExpr) *ast.FuncLit {
	ft := l.funcType(sig)
	var args []ast.Expr
	for _, f := range ft.Params.List {
		n := l.temp("a")
		f.Names = []*ast.Ident{ast.NewIdent(n)}
		args = append(args, ast.NewIdent(n))
	}
	c := to(args, sig.Variadic())
	var body []ast.Stmt
	if sig.Results().Len() > 0 {
		body = []ast.Stmt{&ast.ReturnStmt{Results: []ast.Expr{c}}}
	} else {
		body = []ast.Stmt{exprStmt(c)}
	}
	return &ast.FuncLit{Type: ft, Body: &ast.BlockStmt{List: body}}
}

// methodExpr lowers T.Method.
func (l *lowerer) methodExpr(e *ast.SelectorExpr) ast.Expr {
	sig := l.typeOf(e).(*types.Signature)
	rt := sig.Params().At(0).Type()
	return l.forward(sig, func(args []ast.Expr, ellipsis bool) *ast.CallExpr {
		tg := l.method(args[0], rt, e.Sel.Name, l.u.pkg)
		return spread(l.callTarget(tg, args[1:], l.tailSignature(sig)), ellipsis)
	})
}

// tailSignature drops the receiver of a method expression.
func (l *lowerer) tailSignature(sig *types.Signature) *types.Signature {
	var ps []*types.Var
	for i := 1; i < sig.Params().Len(); i++ {
		ps = append(ps, sig.Params().At(i))
	}
	return types.NewSignatureType(nil, nil, nil, types.NewTuple(ps...), sig.Results(), sig.Variadic())
}

// callTarget calls a method with lowered arguments.
func (l *lowerer) callTarget(tg target, args []ast.Expr, sig *types.Signature) *ast.CallExpr {
	switch {
	case tg.own != nil:
		return call(l.ownMethod(tg), append([]ast.Expr{l.receiver(tg)}, args...)...)
	case tg.dynamic:
		return call(&ast.TypeAssertExpr{X: hostCall("Method", tg.recv, strLit(tg.fn.Name())), Type: l.funcType(sig)}, args...)
	}
	return call(&ast.SelectorExpr{X: tg.recv, Sel: ast.NewIdent(tg.fn.Name())}, args...)
}

// call lowers a call to a value or to several.
func (l *lowerer) call(e *ast.CallExpr) ast.Expr {
	if inner, n, ok := mustCall(e); ok {
		return l.mustExpr(inner, n)
	}
	fun := ast.Unparen(e.Fun)
	tv := l.u.info.Types[fun]
	if tv.IsType() {
		return l.conversion(e.Args[0], l.sub(tv.Type))
	}
	if tv.IsBuiltin() {
		return l.builtin(e, fun)
	}
	if x := l.special(e, fun); x != nil {
		return x
	}
	sig := l.sub(l.typeOf(fun)).Underlying().(*types.Signature)
	if len(e.Args) == 1 && sig.Params().Len() != 1 || len(e.Args) == 1 && sig.Variadic() {
		if tuple, ok := l.typeOf(e.Args[0]).(*types.Tuple); ok {
			return l.callSpread(e, fun, sig, tuple)
		}
	}
	args := l.arguments(e, sig, l.boxing(fun))
	return spread(l.callFun(fun, args, sig), e.Ellipsis.IsValid())
}

// callFun calls a function expression with lowered arguments.
func (l *lowerer) callFun(fun ast.Expr, args []ast.Expr, sig *types.Signature) *ast.CallExpr {
	if s, ok := fun.(*ast.SelectorExpr); ok {
		if sel, ok := l.u.info.Selections[s]; ok && sel.Kind() == types.MethodVal {
			tg := l.method(l.expr(s.X), l.typeOf(s.X), s.Sel.Name, l.lookupPackage(sel))
			return l.callTarget(tg, args, sig)
		}
	}
	x := l.expr(fun)
	switch fun.(type) {
	case *ast.FuncLit:
		x = paren(x)
	case *ast.CallExpr, *ast.TypeAssertExpr:
		return l.callResult(x, args, sig)
	}
	return call(x, args...)
}

// callResult calls what a call gave, by way of a variable: the interpreter cannot call a result in place.
func (l *lowerer) callResult(x ast.Expr, args []ast.Expr, sig *types.Signature) *ast.CallExpr {
	f := l.temp("f")
	ft := l.funcType(sig)
	get := &ast.FuncLit{Type: &ast.FuncType{Params: &ast.FieldList{}, Results: &ast.FieldList{List: []*ast.Field{{Type: ft}}}},
		Body: &ast.BlockStmt{List: []ast.Stmt{varStmt(f, ft, x), &ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent(f)}}}}}
	return call(call(paren(get)), args...)
}

// argBoxing says how values of cell types go to an any of a compiled function.
type argBoxing int

const (
	boxed   argBoxing = iota // with their type: they are kept or printed
	unboxed                  // plain: the function looks at them by reflection
)

// boxing tells which of the two a callee wants.
func (l *lowerer) boxing(fun ast.Expr) argBoxing {
	var obj types.Object
	switch f := fun.(type) {
	case *ast.SelectorExpr:
		obj = l.u.info.Uses[f.Sel]
	case *ast.Ident:
		obj = l.u.info.Uses[f]
	}
	fn, ok := obj.(*types.Func)
	if !ok || fn.Pkg() == nil || fn.Pkg() == l.u.pkg {
		return boxed
	}
	switch fn.Pkg().Path() {
	case "fmt", "errors", "context", "container/heap", "container/list", "container/ring", "sync", "sync/atomic", "slices", "maps":
		return boxed
	case "brinkline/display":
		if fn.Name() == "Show" || fn.Name() == "Render" {
			return boxed
		}
	}
	return unboxed
}

func (l *lowerer) arguments(e *ast.CallExpr, sig *types.Signature, how argBoxing) []ast.Expr {
	out := make([]ast.Expr, len(e.Args))
	for i, a := range e.Args {
		out[i] = l.argument(a, paramType(sig, i, e.Ellipsis.IsValid()), how)
	}
	return out
}

// paramType is the type of the i-th argument.
func paramType(sig *types.Signature, i int, ellipsis bool) types.Type {
	n := sig.Params().Len()
	if sig.Variadic() && i >= n-1 {
		t := sig.Params().At(n - 1).Type()
		if s, ok := t.Underlying().(*types.Slice); ok && !ellipsis {
			return s.Elem()
		}
		return t
	}
	return sig.Params().At(i).Type()
}

func (l *lowerer) argument(a ast.Expr, t types.Type, how argBoxing) ast.Expr {
	if how == unboxed && types.IsInterface(t) && l.dynamic(t) {
		if at := l.typeOf(a); types.IsInterface(at) {
			return hostCall("Plain", l.opened(a))
		}
		if !isUntyped(l.typeOf(a)) && l.u.info.Types[a].Value == nil {
			return l.expr(a)
		}
	}
	return l.exprTo(a, t)
}

// callSpread lowers g(f()) where f has several results.
func (l *lowerer) callSpread(e *ast.CallExpr, fun ast.Expr, sig *types.Signature, tuple *types.Tuple) ast.Expr {
	names, stmt := l.spreadInto(e.Args[0], tuple)
	var args []ast.Expr
	for i := range tuple.Len() {
		args = append(args, l.convert(ast.NewIdent(names[i]), tuple.At(i).Type(), paramType(sig, i, false)))
	}
	c := l.callFun(fun, args, sig)
	var results []ast.Expr
	for v := range sig.Results().Variables() {
		results = append(results, l.typ(v.Type()))
	}
	if len(results) == 0 {
		return closure(nil, stmt, exprStmt(c))
	}
	return closure(results, stmt, &ast.ReturnStmt{Results: []ast.Expr{c}})
}

// spreadInto puts the results of a call into new variables.
func (l *lowerer) spreadInto(e ast.Expr, tuple *types.Tuple) ([]string, ast.Stmt) {
	names := make([]string, tuple.Len())
	lhs := make([]ast.Expr, tuple.Len())
	for i := range names {
		names[i] = l.temp("m")
		lhs[i] = ast.NewIdent(names[i])
	}
	return names, &ast.AssignStmt{Lhs: lhs, Tok: token.DEFINE, Rhs: []ast.Expr{l.expr(e)}}
}

// resultTypes lists the types of a call's results.
func (l *lowerer) resultTypes(e ast.Expr) []types.Type {
	switch t := l.typeOf(e).(type) {
	case *types.Tuple:
		var out []types.Type
		for v := range t.Variables() {
			out = append(out, l.sub(v.Type()))
		}
		return out
	default:
		if tv := l.u.info.Types[e]; tv.IsVoid() {
			return nil
		}
		return []types.Type{t}
	}
}

// mustExpr lowers a call whose error stops the cell, in the middle of an expression.
func (l *lowerer) mustExpr(inner *ast.CallExpr, n int) ast.Expr {
	stmts, names := l.mustCallStmts(inner)
	rts := l.resultTypes(inner)
	var results []ast.Expr
	var ret ast.ReturnStmt
	for i := range n {
		results = append(results, l.typ(rts[i]))
		ret.Results = append(ret.Results, ast.NewIdent(names[i]))
	}
	stmts = append(stmts, l.checkStmt(names[n], inner))
	if n > 0 {
		stmts = append(stmts, &ret)
	}
	return closure(results, stmts...)
}

// mustCallStmts calls and keeps all results in variables.
func (l *lowerer) mustCallStmts(inner *ast.CallExpr) ([]ast.Stmt, []string) {
	rts := l.resultTypes(inner)
	names := make([]string, len(rts))
	lhs := make([]ast.Expr, len(rts))
	for i := range rts {
		names[i] = l.temp("e")
		lhs[i] = ast.NewIdent(names[i])
	}
	return []ast.Stmt{&ast.AssignStmt{Lhs: lhs, Tok: token.DEFINE, Rhs: []ast.Expr{l.call(inner)}}}, names
}

// checkStmt stops the cell when the error is not nil or the cell has been interrupted.
func (l *lowerer) checkStmt(name string, at ast.Node) ast.Stmt {
	return exprStmt(hostCall("Check", ast.NewIdent(name), intLit(l.position(at.Pos()))))
}

// conversion lowers T(x).
func (l *lowerer) conversion(x ast.Expr, t types.Type) ast.Expr {
	if types.IsInterface(t) {
		return l.exprTo(x, t)
	}
	from := l.typeOf(x)
	if isNil(from) {
		return l.zero(t)
	}
	if types.Identical(from, t) {
		return l.expr(x)
	}
	if _, ok := t.Underlying().(*types.Array); ok {
		if _, ok := from.Underlying().(*types.Slice); ok {
			return l.sliceToArray(x, t)
		}
	}
	arg := l.expr(x)
	if tv := l.u.info.Types[x]; tv.Value != nil && !isUntyped(from) {
		arg = l.constant(tv.Value, from, false)
	}
	return call(l.conversionFun(t), arg)
}

func (l *lowerer) sliceToArray(x ast.Expr, t types.Type) ast.Expr {
	s, a := l.temp("s"), l.temp("z")
	at := t.Underlying().(*types.Array)
	return closure([]ast.Expr{l.typ(t)},
		define(s, l.expr(x)),
		exprStmt(hostCall("NeedLength", call(ast.NewIdent("len"), ast.NewIdent(s)), intLit(int(at.Len())))),
		varStmt(a, l.typ(t), nil),
		exprStmt(call(ast.NewIdent("copy"), &ast.SliceExpr{X: ast.NewIdent(a)}, ast.NewIdent(s))),
		&ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent(a)}})
}

// special lowers calls of compiled functions that need to know types made in cells.
func (l *lowerer) special(e *ast.CallExpr, fun ast.Expr) ast.Expr {
	sel, ok := fun.(*ast.SelectorExpr)
	if !ok {
		return nil
	}
	fn, ok := l.u.info.Uses[sel.Sel].(*types.Func)
	if !ok || fn.Pkg() == nil {
		return nil
	}
	switch fn.FullName() {
	case "errors.As":
		return l.errorsAs(e)
	case "brinkline/continuation.NewModel":
		return l.newModel(e, fn)
	}
	return nil
}

// errorsAs passes the type of the target along.
func (l *lowerer) errorsAs(e *ast.CallExpr) ast.Expr {
	p, ok := l.typeOf(e.Args[1]).Underlying().(*types.Pointer)
	if !ok {
		return nil
	}
	target := l.expr(e.Args[1])
	return hostCall("ErrorsAs", l.exprTo(e.Args[0], errorType), intLit(l.runtimeType(p.Elem()).id), target)
}

// newModel passes the name of the model's function along, so that cards can say it. The source and its hash can travel the same way.
func (l *lowerer) newModel(e *ast.CallExpr, fn *types.Func) ast.Expr {
	sig := fn.Type().(*types.Signature)
	if e.Ellipsis.IsValid() || len(e.Args) < 2 {
		return nil
	}
	args := l.arguments(e, sig, unboxed)
	name := ""
	switch f := ast.Unparen(e.Args[0]).(type) {
	case *ast.Ident:
		name = f.Name
	case *ast.SelectorExpr:
		name = f.Sel.Name
	}
	return hostCall("NewModel", append([]ast.Expr{strLit(name)}, args...)...)
}
