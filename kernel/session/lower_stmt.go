package session

import (
	"go/ast"
	"go/token"
	"go/types"
)

// block lowers a block.
func (l *lowerer) block(b *ast.BlockStmt) *ast.BlockStmt {
	if b == nil {
		return &ast.BlockStmt{}
	}
	return &ast.BlockStmt{List: l.stmts(b.List)}
}

func (l *lowerer) stmts(list []ast.Stmt) []ast.Stmt {
	var out []ast.Stmt
	for _, s := range list {
		out = append(out, l.stmt(s)...)
	}
	return out
}

// stmt lowers a statement, after one that records its position where it can fail.
func (l *lowerer) stmt(s ast.Stmt) []ast.Stmt {
	switch s := s.(type) {
	case *ast.BlockStmt:
		return []ast.Stmt{l.block(s)}
	case *ast.EmptyStmt, nil:
		return nil
	case *ast.LabeledStmt:
		return l.labeled(s)
	case *ast.BranchStmt:
		return l.branch(s)
	case *ast.ForStmt:
		return l.forStmt(s, "")
	case *ast.RangeStmt:
		return l.rangeStmt(s, "")
	}
	var out []ast.Stmt
	if l.canFail(s) {
		out = l.at(s.Pos())
	}
	return append(out, l.plainStmt(s)...)
}

func (l *lowerer) plainStmt(s ast.Stmt) []ast.Stmt {
	switch s := s.(type) {
	case *ast.ExprStmt:
		return l.exprStmt(s)
	case *ast.AssignStmt:
		return l.assignStmt(s)
	case *ast.DeclStmt:
		return l.declStmt(s)
	case *ast.IncDecStmt:
		return l.incDec(s)
	case *ast.ReturnStmt:
		return l.returnStmt(s)
	case *ast.IfStmt:
		return l.ifStmt(s)
	case *ast.SwitchStmt:
		return l.switchStmt(s, "")
	case *ast.TypeSwitchStmt:
		return l.typeSwitch(s, "")
	case *ast.SelectStmt:
		return l.selectStmt(s, "")
	case *ast.GoStmt:
		return l.goStmt(s)
	case *ast.DeferStmt:
		return l.deferStmt(s)
	case *ast.SendStmt:
		t := l.typeOf(s.Chan).Underlying().(*types.Chan)
		return []ast.Stmt{&ast.SendStmt{Chan: l.expr(s.Chan), Value: l.exprTo(s.Value, t.Elem())}}
	}
	l.fail(s.Pos(), "this statement cannot be used here")
	return nil
}

// canFail reports whether a statement may panic or call a function of a cell, in itself, not in blocks within it. Positions are
// recorded only before such statements, for each costs as much as an addition.
func (l *lowerer) canFail(s ast.Stmt) bool {
	found := false
	ast.Inspect(s, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.BlockStmt, *ast.FuncLit:
			return false
		case *ast.CallExpr:
			found = found || !l.harmless(n)
		case *ast.IndexExpr, *ast.SliceExpr, *ast.StarExpr, *ast.TypeAssertExpr, *ast.SendStmt, *ast.GoStmt, *ast.SelectStmt:
			found = true
		case *ast.SelectorExpr:
			if sel := l.u.info.Selections[n]; sel != nil {
				_, pointer := l.typeOf(n.X).Underlying().(*types.Pointer)
				found = found || pointer || sel.Indirect() || types.IsInterface(l.typeOf(n.X))
			}
		case *ast.BinaryExpr:
			found = found || fails(n.Op, l.typeOf(n))
		case *ast.AssignStmt:
			found = found || n.Tok != token.ASSIGN && n.Tok != token.DEFINE && fails(opOf[n.Tok], l.typeOf(n.Lhs[0]))
		case *ast.UnaryExpr:
			found = found || n.Op == token.ARROW
		}
		return !found
	})
	return found
}

// fails reports whether an operator may panic: shifts and integer divisions.
func fails(op token.Token, t types.Type) bool {
	switch op {
	case token.SHL, token.SHR:
		return true
	case token.QUO, token.REM:
		b, ok := t.Underlying().(*types.Basic)
		return !ok || b.Info()&types.IsInteger != 0
	}
	return false
}

// harmless reports whether a call neither panics nor leads back into a cell.
func (l *lowerer) harmless(c *ast.CallExpr) bool {
	fun := ast.Unparen(c.Fun)
	tv := l.u.info.Types[fun]
	if tv.IsType() {
		return true
	}
	if tv.IsBuiltin() {
		id, ok := fun.(*ast.Ident)
		return ok && id.Name != "panic" && id.Name != "make" && id.Name != "close" && id.Name != "append"
	}
	sel, ok := fun.(*ast.SelectorExpr)
	if !ok {
		return false
	}
	fn, ok := l.u.info.Uses[sel.Sel].(*types.Func)
	return ok && fn.Pkg() != nil && (fn.Pkg().Path() == "math" || fn.Pkg().Path() == "math/cmplx")
}

// mustStatement lowers "call, hand the values on, then check", so that what is assigned is assigned before the cell stops.
func (l *lowerer) mustStatement(inner *ast.CallExpr, n int, use func(values []string) []ast.Stmt) []ast.Stmt {
	stmts, names := l.mustCallStmts(inner)
	stmts = append(stmts, use(names[:n])...)
	return append(stmts, l.checkStmt(names[n], inner))
}

func (l *lowerer) exprStmt(s *ast.ExprStmt) []ast.Stmt {
	x := ast.Unparen(s.X)
	if inner, n, ok := mustCall(x); ok {
		return l.mustStatement(inner, n, func(values []string) []ast.Stmt {
			return []ast.Stmt{l.discard(values)}
		})
	}
	if c, ok := x.(*ast.CallExpr); ok {
		if tv := l.u.info.Types[c.Fun]; !tv.IsType() && !tv.IsBuiltin() {
			return []ast.Stmt{exprStmt(l.call(c))}
		}
		if tv := l.u.info.Types[c.Fun]; tv.IsBuiltin() && len(l.resultTypes(c)) == 0 {
			return []ast.Stmt{exprStmt(l.call(c))}
		}
	}
	if u, ok := x.(*ast.UnaryExpr); ok && u.Op == token.ARROW {
		return []ast.Stmt{exprStmt(l.expr(x))}
	}
	if tv := l.u.info.Types[x]; tv.IsType() || isNil(l.typeOf(x)) || tv.Value != nil {
		return nil
	}
	return []ast.Stmt{assign(ast.NewIdent("_"), l.expr(x))} // a value that nobody uses
}

// discard takes values that a call gave and nobody wants.
func (l *lowerer) discard(values []string) ast.Stmt {
	if len(values) == 0 {
		return &ast.BlockStmt{}
	}
	s := &ast.AssignStmt{Tok: token.ASSIGN}
	for _, v := range values {
		s.Lhs = append(s.Lhs, ast.NewIdent("_"))
		s.Rhs = append(s.Rhs, ast.NewIdent(v))
	}
	return s
}

// isCellVar reports whether a variable is bound at the top level of the cell, so that it outlives it.
func (l *lowerer) isCellVar(obj types.Object) bool {
	_, ok := l.locals[obj]
	return ok
}

// store declares a new variable with a value, or assigns to one of the session.
func (l *lowerer) store(obj *types.Var, x ast.Expr) []ast.Stmt {
	if l.isCellVar(obj) {
		return []ast.Stmt{assign(ast.NewIdent(l.declare(obj)), x), l.assigned(obj)}
	}
	t := l.typ(obj.Type())
	if _, lit := x.(*ast.CompositeLit); lit && l.loops > 0 {
		// The interpreter would build the literal in the variable of the iteration before, which a closure may still have.
		n := l.temp("c")
		return []ast.Stmt{varStmt(n, t, x), varStmt(l.declare(obj), l.typ(obj.Type()), ast.NewIdent(n))}
	}
	return []ast.Stmt{varStmt(l.declare(obj), t, x)}
}

// assigned tells the session that the cell has bound a variable, which stays even when the cell fails later.
func (l *lowerer) assigned(obj *types.Var) ast.Stmt {
	return exprStmt(hostCall("Assign", strLit(obj.Name())))
}

func (l *lowerer) assignStmt(s *ast.AssignStmt) []ast.Stmt {
	switch {
	case s.Tok != token.ASSIGN && s.Tok != token.DEFINE:
		return l.opAssign(s)
	case len(s.Rhs) == 1 && len(s.Lhs) > 1:
		return l.assignMany(s)
	}
	if len(s.Lhs) == 1 {
		return l.assignOne(s.Lhs[0], s.Rhs[0], s.Tok)
	}
	return l.assignParallel(s)
}

// newVarOf returns the variable that an identifier on the left of := declares, or nil.
func (l *lowerer) newVarOf(e ast.Expr, tok token.Token) *types.Var {
	id, ok := e.(*ast.Ident)
	if !ok || tok != token.DEFINE || id.Name == "_" {
		return nil
	}
	v, _ := l.u.info.Defs[id].(*types.Var)
	return v
}

func isBlank(e ast.Expr) bool {
	id, ok := ast.Unparen(e).(*ast.Ident)
	return ok && id.Name == "_"
}

func (l *lowerer) assignOne(lhs, rhs ast.Expr, tok token.Token) []ast.Stmt {
	if inner, n, ok := mustCall(ast.Unparen(rhs)); ok && n == 1 {
		return l.mustStatement(inner, n, func(values []string) []ast.Stmt {
			return l.put(lhs, ast.NewIdent(values[0]), l.resultTypes(inner)[0], tok)
		})
	}
	if v := l.newVarOf(lhs, tok); v != nil {
		x := l.exprTo(rhs, v.Type())
		return l.store(v, x)
	}
	if isBlank(lhs) {
		return l.blankAssign(rhs)
	}
	return []ast.Stmt{assign(l.lhs(lhs), l.exprTo(rhs, l.typeOf(lhs)))}
}

// blankAssign evaluates a value for its effects.
func (l *lowerer) blankAssign(rhs ast.Expr) []ast.Stmt {
	if isNil(l.typeOf(rhs)) || l.u.info.Types[rhs].Value != nil {
		return nil
	}
	return []ast.Stmt{varStmt(l.temp("u"), l.typ(types.Default(l.typeOf(rhs))), l.expr(rhs))}
}

// lhs lowers what is assigned to.
func (l *lowerer) lhs(e ast.Expr) ast.Expr {
	if isBlank(e) {
		return ast.NewIdent("_")
	}
	return l.expr(ast.Unparen(e))
}

// put assigns a lowered value of a type to what stands on the left.
func (l *lowerer) put(lhs ast.Expr, x ast.Expr, from types.Type, tok token.Token) []ast.Stmt {
	if v := l.newVarOf(lhs, tok); v != nil {
		return l.store(v, l.convert(x, from, v.Type()))
	}
	if isBlank(lhs) {
		return []ast.Stmt{assign(ast.NewIdent("_"), x)}
	}
	return []ast.Stmt{assign(l.lhs(lhs), l.convert(x, from, l.typeOf(lhs)))}
}

// assignParallel lowers a, b = x, y: all of the right first.
func (l *lowerer) assignParallel(s *ast.AssignStmt) []ast.Stmt {
	var out, puts []ast.Stmt
	var lhs []ast.Expr
	for _, e := range s.Lhs {
		stmts, x := l.settled(e, s.Tok)
		out = append(out, stmts...)
		lhs = append(lhs, x)
	}
	for i, e := range s.Rhs {
		t := l.typeOf(s.Lhs[i])
		if isBlank(s.Lhs[i]) {
			t = types.Default(l.typeOf(e))
		} else if v := l.newVarOf(s.Lhs[i], s.Tok); v != nil {
			t = l.sub(v.Type())
		}
		n := l.temp("v")
		out = append(out, varStmt(n, l.typ(t), l.exprTo(e, t)))
		switch v := l.newVarOf(s.Lhs[i], s.Tok); {
		case v != nil:
			puts = append(puts, l.store(v, ast.NewIdent(n))...)
		case isBlank(s.Lhs[i]):
		default:
			puts = append(puts, assign(lhs[i], ast.NewIdent(n)))
		}
	}
	return append(out, puts...)
}

// settled evaluates the operands of what is assigned to, so that other assignments of the statement do not change it.
func (l *lowerer) settled(e ast.Expr, tok token.Token) ([]ast.Stmt, ast.Expr) {
	e = ast.Unparen(e)
	if isBlank(e) || l.newVarOf(e, tok) != nil {
		return nil, nil
	}
	keep := func(x ast.Expr, t types.Type) (ast.Stmt, ast.Expr) {
		n := l.temp("o")
		return varStmt(n, l.typ(t), x), ast.NewIdent(n)
	}
	switch e := e.(type) {
	case *ast.IndexExpr:
		x, ok := l.expr(e).(*ast.IndexExpr)
		if !ok {
			return nil, l.lhs(e)
		}
		var out []ast.Stmt
		switch u := l.typeOf(e.X).Underlying().(type) {
		case *types.Map:
			s1, m := keep(x.X, u)
			s2, k := keep(x.Index, u.Key())
			return []ast.Stmt{s1, s2}, &ast.IndexExpr{X: m, Index: k}
		case *types.Slice:
			s1, m := keep(x.X, l.typeOf(e.X))
			out, x.X = append(out, s1), m
		}
		if l.u.info.Types[e.Index].Value == nil {
			s2, k := keep(x.Index, l.typeOf(e.Index))
			out, x.Index = append(out, s2), k
		}
		return out, x
	case *ast.StarExpr:
		s, p := keep(l.expr(e.X), l.typeOf(e.X))
		return []ast.Stmt{s}, &ast.StarExpr{X: p}
	case *ast.SelectorExpr:
		if p, ok := l.typeOf(e.X).Underlying().(*types.Pointer); ok && l.u.info.Selections[e] != nil {
			s, x := keep(l.expr(e.X), l.typeOf(e.X))
			f, _ := l.path(x, p, l.fieldPath(e, l.u.info.Selections[e]))
			return []ast.Stmt{s}, f
		}
	}
	return nil, l.lhs(e)
}

// assignMany lowers one expression that gives several values.
func (l *lowerer) assignMany(s *ast.AssignStmt) []ast.Stmt {
	rhs := ast.Unparen(s.Rhs[0])
	before, places := l.places(s.Lhs, s.Tok)
	if inner, n, ok := mustCall(rhs); ok {
		return append(before, l.mustStatement(inner, n, func(values []string) []ast.Stmt {
			return l.putAll(s.Lhs, places, values, l.resultTypes(inner), s.Tok)
		})...)
	}
	if c, ok := rhs.(*ast.CallExpr); ok {
		rts := l.resultTypes(c)
		names, stmt := l.temps("m", len(rts)), &ast.AssignStmt{Tok: token.DEFINE, Rhs: []ast.Expr{l.call(c)}}
		for _, n := range names {
			stmt.Lhs = append(stmt.Lhs, ast.NewIdent(n))
		}
		return append(append(before, stmt), l.putAll(s.Lhs, places, names, rts, s.Tok)...)
	}
	return append(before, l.commaOk(s.Lhs, places, rhs, s.Tok)...)
}

// places evaluates the operands of what several values are assigned to. A plain variable stays as it is.
func (l *lowerer) places(lhs []ast.Expr, tok token.Token) (before []ast.Stmt, places []ast.Expr) {
	places = make([]ast.Expr, len(lhs))
	for i, e := range lhs {
		if _, ident := ast.Unparen(e).(*ast.Ident); !ident {
			stmts, x := l.settled(e, tok)
			before, places[i] = append(before, stmts...), x
		}
	}
	return before, places
}

func (l *lowerer) temps(prefix string, n int) []string {
	out := make([]string, n)
	for i := range out {
		out[i] = l.temp(prefix)
	}
	return out
}

func (l *lowerer) putAll(lhs, places []ast.Expr, values []string, ts []types.Type, tok token.Token) []ast.Stmt {
	var out []ast.Stmt
	for i := range lhs {
		out = append(out, l.putAt(lhs[i], places[i], ast.NewIdent(values[i]), ts[i], tok)...)
	}
	return out
}

// putAt is put for a place that may have been evaluated already.
func (l *lowerer) putAt(lhs, place, x ast.Expr, from types.Type, tok token.Token) []ast.Stmt {
	if place == nil {
		return l.put(lhs, x, from, tok)
	}
	return []ast.Stmt{assign(place, l.convert(x, from, l.typeOf(lhs)))}
}

// commaOk lowers v, ok of a map, a channel or a type assertion.
func (l *lowerer) commaOk(lhs, places []ast.Expr, rhs ast.Expr, tok token.Token) []ast.Stmt {
	v, ok := l.temp("v"), l.temp("ok")
	t := l.typeOf(rhs)
	if tuple, is := t.(*types.Tuple); is {
		t = tuple.At(0).Type()
	}
	var out []ast.Stmt
	switch e := rhs.(type) {
	case *ast.TypeAssertExpr:
		out = l.assertOk(e, v, ok, l.typeOf(e.Type))
		t = l.typeOf(e.Type)
	default:
		out = []ast.Stmt{&ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(v), ast.NewIdent(ok)}, Tok: token.DEFINE, Rhs: []ast.Expr{l.twoValued(rhs)}}}
	}
	out = append(out, l.putAt(lhs[0], places[0], ast.NewIdent(v), t, tok)...)
	return append(out, l.putAt(lhs[1], places[1], ast.NewIdent(ok), types.Typ[types.Bool], tok)...)
}

// twoValued lowers the right side of v, ok := without parentheses around it, as the interpreter wants it.
func (l *lowerer) twoValued(e ast.Expr) ast.Expr {
	x := l.expr(e)
	for {
		p, ok := x.(*ast.ParenExpr)
		if !ok {
			return x
		}
		x = p.X
	}
}

// assertOk lowers v, ok := x.(T).
func (l *lowerer) assertOk(e *ast.TypeAssertExpr, v, ok string, t types.Type) []ast.Stmt {
	raw := l.temp("x")
	get := &ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(raw), ast.NewIdent(ok)}, Tok: token.DEFINE,
		Rhs: []ast.Expr{hostCall("TryAssert", intLit(l.runtimeType(t).id), l.opened(e.X))}}
	out := []ast.Stmt{get, varStmt(v, l.typ(t), nil)}
	return append(out, &ast.IfStmt{Cond: ast.NewIdent(ok), Body: &ast.BlockStmt{List: l.unpacked(v, raw, t)}})
}

// unpacked stores what the host's assertion gave into a variable of the type.
func (l *lowerer) unpacked(name, raw string, t types.Type) []ast.Stmt {
	switch {
	case types.IsInterface(t) && l.dynamic(t):
		return []ast.Stmt{assign(ast.NewIdent(name), ast.NewIdent(raw))}
	case types.IsInterface(t):
		return []ast.Stmt{assign(ast.NewIdent(name), l.toInterface(ast.NewIdent(raw), t))}
	}
	return []ast.Stmt{l.unpack(ast.NewIdent(raw), name)}
}

var opOf = map[token.Token]token.Token{
	token.ADD_ASSIGN: token.ADD, token.SUB_ASSIGN: token.SUB, token.MUL_ASSIGN: token.MUL, token.QUO_ASSIGN: token.QUO,
	token.REM_ASSIGN: token.REM, token.AND_ASSIGN: token.AND, token.OR_ASSIGN: token.OR, token.XOR_ASSIGN: token.XOR,
	token.SHL_ASSIGN: token.SHL, token.SHR_ASSIGN: token.SHR, token.AND_NOT_ASSIGN: token.AND_NOT,
}

// opAssign lowers x op= y.
func (l *lowerer) opAssign(s *ast.AssignStmt) []ast.Stmt {
	t := l.typeOf(s.Lhs[0])
	var y ast.Expr
	if s.Tok == token.SHL_ASSIGN || s.Tok == token.SHR_ASSIGN {
		y = l.shiftCount(s.Rhs[0])
	} else {
		y = l.exprTo(s.Rhs[0], t)
	}
	if _, ident := ast.Unparen(s.Lhs[0]).(*ast.Ident); ident || simplePlace(s.Lhs[0]) && simplePlace(s.Rhs[0]) {
		x := l.lhs(s.Lhs[0])
		return []ast.Stmt{assign(x, &ast.BinaryExpr{X: x, Op: opOf[s.Tok], Y: paren(y)})}
	}
	out, x := l.settled(s.Lhs[0], s.Tok)
	return append(out, assign(x, &ast.BinaryExpr{X: x, Op: opOf[s.Tok], Y: paren(y)}))
}

// simplePlace reports whether what is assigned to may be evaluated twice.
func simplePlace(e ast.Expr) bool {
	simple := true
	ast.Inspect(e, func(n ast.Node) bool {
		switch n.(type) {
		case *ast.CallExpr, *ast.FuncLit, *ast.TypeAssertExpr:
			simple = false
		case *ast.UnaryExpr:
			simple = false
		}
		return simple
	})
	return simple
}

func (l *lowerer) incDec(s *ast.IncDecStmt) []ast.Stmt {
	op := token.ADD
	if s.Tok == token.DEC {
		op = token.SUB
	}
	if simplePlace(s.X) {
		if _, ok := ast.Unparen(s.X).(*ast.Ident); ok {
			if _, named := types.Unalias(l.typeOf(s.X)).(*types.Basic); named {
				return []ast.Stmt{&ast.IncDecStmt{X: l.lhs(s.X), Tok: s.Tok}}
			}
		}
		x := l.lhs(s.X)
		return []ast.Stmt{assign(x, &ast.BinaryExpr{X: x, Op: op, Y: l.one(l.typeOf(s.X))})}
	}
	out, x := l.settled(s.X, s.Tok)
	return append(out, assign(x, &ast.BinaryExpr{X: x, Op: op, Y: l.one(l.typeOf(s.X))}))
}

func (l *lowerer) one(t types.Type) ast.Expr {
	if b, ok := t.Underlying().(*types.Basic); ok && b.Info()&types.IsComplex != 0 {
		return call(l.conversionFun(t), hostCall("Complex", floatLit(1), floatLit(0)))
	}
	return call(l.conversionFun(t), intLit(1))
}

// declStmt lowers a declaration within a function or at the top level of a cell.
func (l *lowerer) declStmt(s *ast.DeclStmt) []ast.Stmt {
	d := s.Decl.(*ast.GenDecl)
	if d.Tok != token.VAR {
		return nil // constants are folded; types are written where they are used
	}
	var out []ast.Stmt
	for _, spec := range d.Specs {
		out = append(out, l.valueSpec(spec.(*ast.ValueSpec))...)
	}
	return out
}

func (l *lowerer) valueSpec(vs *ast.ValueSpec) []ast.Stmt {
	if len(vs.Values) == 0 {
		var out []ast.Stmt
		for _, n := range vs.Names {
			if v, ok := l.u.info.Defs[n].(*types.Var); ok && n.Name != "_" {
				out = append(out, l.zeroStore(v)...)
			}
		}
		return out
	}
	lhs := make([]ast.Expr, len(vs.Names))
	for i, n := range vs.Names {
		lhs[i] = n
	}
	return l.assignStmt(&ast.AssignStmt{Lhs: lhs, TokPos: vs.Pos(), Tok: token.DEFINE, Rhs: vs.Values})
}

func (l *lowerer) zeroStore(v *types.Var) []ast.Stmt {
	if !l.isCellVar(v) {
		return []ast.Stmt{varStmt(l.declare(v), l.typ(v.Type()), nil)}
	}
	z := l.temp("z")
	return []ast.Stmt{varStmt(z, l.typ(v.Type()), nil), assign(ast.NewIdent(l.declare(v)), ast.NewIdent(z)), l.assigned(v)}
}

func (l *lowerer) returnStmt(s *ast.ReturnStmt) []ast.Stmt {
	if len(s.Results) == 0 {
		return []ast.Stmt{&ast.ReturnStmt{}}
	}
	if len(s.Results) == 1 {
		if inner, n, ok := mustCall(ast.Unparen(s.Results[0])); ok {
			stmts, names := l.mustCallStmts(inner)
			stmts = append(stmts, l.checkStmt(names[n], inner))
			return append(stmts, l.returnValues(names[:n], l.resultTypes(inner)))
		}
		if tuple, ok := l.typeOf(s.Results[0]).(*types.Tuple); ok {
			names, stmt := l.spreadInto(s.Results[0], tuple)
			return []ast.Stmt{stmt, l.returnValues(names, l.resultTypes(s.Results[0]))}
		}
	}
	ret := &ast.ReturnStmt{}
	var before []ast.Stmt
	for i, r := range s.Results {
		x := l.exprTo(r, l.results[i])
		_, isFunc := l.results[i].Underlying().(*types.Signature)
		if len(l.named) > 1 && l.u.info.Types[r].Value == nil || isFunc && !isNil(l.typeOf(r)) {
			// All results are evaluated before the named ones change, and the interpreter returns a function only from a variable.
			n := l.temp("r")
			before = append(before, varStmt(n, l.typ(l.results[i]), x))
			x = ast.NewIdent(n)
		}
		ret.Results = append(ret.Results, x)
	}
	return append(before, ret)
}

func (l *lowerer) returnValues(names []string, ts []types.Type) ast.Stmt {
	ret := &ast.ReturnStmt{}
	for i, n := range names {
		ret.Results = append(ret.Results, l.convert(ast.NewIdent(n), ts[i], l.results[i]))
	}
	return ret
}
