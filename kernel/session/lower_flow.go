package session

import (
	"go/ast"
	"go/token"
	"go/types"
)

// labeled lowers a statement with a label; the label goes to the loop or switch itself, past what lowering puts before it.
func (l *lowerer) labeled(s *ast.LabeledStmt) []ast.Stmt {
	name := s.Label.Name
	switch inner := s.Stmt.(type) {
	case *ast.ForStmt:
		return l.forStmt(inner, name)
	case *ast.RangeStmt:
		return l.rangeStmt(inner, name)
	case *ast.SwitchStmt:
		return l.switchStmt(inner, name)
	case *ast.TypeSwitchStmt:
		return l.typeSwitch(inner, name)
	case *ast.SelectStmt:
		return l.selectStmt(inner, name)
	}
	// The label stands before a statement that does something: of labels that only lead to gotos the interpreter never finds the end.
	step := assign(ast.NewIdent(callsVar), ast.NewIdent(callsVar))
	return append([]ast.Stmt{&ast.LabeledStmt{Label: ast.NewIdent(name), Stmt: step}}, l.stmt(s.Stmt)...)
}

func label(name string, s ast.Stmt) ast.Stmt {
	if name == "" {
		return s
	}
	return &ast.LabeledStmt{Label: ast.NewIdent(name), Stmt: s}
}

func (l *lowerer) branch(s *ast.BranchStmt) []ast.Stmt {
	b := &ast.BranchStmt{Tok: s.Tok}
	if s.Label != nil {
		b.Label = ast.NewIdent(s.Label.Name)
	}
	return []ast.Stmt{b}
}

// scoped wraps statements that declare in a block of their own.
func scoped(list []ast.Stmt) []ast.Stmt { return []ast.Stmt{&ast.BlockStmt{List: list}} }

func (l *lowerer) ifStmt(s *ast.IfStmt) []ast.Stmt {
	out := &ast.IfStmt{}
	var init []ast.Stmt
	if s.Init != nil {
		init = l.stmt(s.Init)
	}
	out.Cond = l.expr(s.Cond)
	out.Body = l.block(s.Body)
	switch e := s.Else.(type) {
	case *ast.BlockStmt:
		out.Else = l.block(e)
	case *ast.IfStmt:
		list := append(l.elsePosition(e), l.ifStmt(e)...)
		if only, ok := list[0].(*ast.IfStmt); ok && len(list) == 1 {
			out.Else = only
		} else {
			out.Else = &ast.BlockStmt{List: list}
		}
	}
	if init == nil {
		return []ast.Stmt{out}
	}
	return scoped(append(init, out))
}

func (l *lowerer) elsePosition(e *ast.IfStmt) []ast.Stmt {
	if l.canFail(e) {
		return l.at(e.Pos())
	}
	return nil
}

// forStmt lowers a loop with a condition. Variables that a closure or a pointer may keep are new in each iteration.
func (l *lowerer) forStmt(s *ast.ForStmt, name string) []ast.Stmt {
	vars := l.loopVars(s.Init)
	if kept := l.anyKept(vars, s.Body, s.Cond, s.Post); kept {
		return l.freshFor(s, name, vars)
	}
	out := &ast.ForStmt{}
	var init, post []ast.Stmt
	if s.Init != nil {
		init = l.stmt(s.Init)
	}
	if s.Cond != nil {
		out.Cond = l.expr(s.Cond)
	}
	if s.Post != nil {
		post = l.plainStmt(s.Post)
	}
	l.loops++
	body := l.block(s.Body)
	l.loops--
	if len(post) == 1 {
		out.Post = post[0]
	} else if len(post) > 1 {
		out.Post = exprStmt(closure(nil, post...))
	}
	if s.Cond != nil && l.canFail(exprStmt(s.Cond)) {
		body.List = append(body.List, l.at(s.Cond.Pos())...)
	}
	out.Body = body
	return scoped(append(init, label(name, out)))
}

// loopVars lists the variables that the first clause of a loop declares.
func (l *lowerer) loopVars(init ast.Stmt) []*types.Var {
	a, ok := init.(*ast.AssignStmt)
	if !ok || a.Tok != token.DEFINE {
		return nil
	}
	var out []*types.Var
	for _, e := range a.Lhs {
		if v := l.newVarOf(e, token.DEFINE); v != nil {
			out = append(out, v)
		}
	}
	return out
}

// anyKept reports whether a variable may outlive the iteration: a function literal mentions it or its address is taken.
func (l *lowerer) anyKept(vars []*types.Var, nodes ...ast.Node) bool {
	if len(vars) == 0 {
		return false
	}
	is := map[types.Object]bool{}
	for _, v := range vars {
		is[v] = true
	}
	for _, n := range nodes {
		if n == nil || isNilNode(n) {
			continue
		}
		if l.keeps(n, is, false) {
			return true
		}
	}
	return false
}

func isNilNode(n ast.Node) bool {
	switch n := n.(type) {
	case ast.Expr:
		return n == nil
	case ast.Stmt:
		return n == nil
	}
	return false
}

func (l *lowerer) keeps(n ast.Node, is map[types.Object]bool, inside bool) bool {
	found := false
	ast.Inspect(n, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.FuncLit:
			if !inside {
				found = found || l.keeps(n.Body, is, true)
				return false
			}
		case *ast.UnaryExpr:
			if n.Op == token.AND && mentions(l, n.X, is) {
				found = true
			}
		case *ast.SelectorExpr:
			if sel := l.u.info.Selections[n]; sel != nil && sel.Kind() == types.MethodVal && mentions(l, n.X, is) {
				found = true
			}
		case *ast.SliceExpr:
			if _, ok := l.typeOf(n.X).Underlying().(*types.Array); ok && mentions(l, n.X, is) {
				found = true
			}
		case *ast.Ident:
			if inside && is[l.u.info.ObjectOf(n)] {
				found = true
			}
		}
		return !found
	})
	return found
}

func mentions(l *lowerer, e ast.Expr, is map[types.Object]bool) bool {
	found := false
	ast.Inspect(e, func(n ast.Node) bool {
		if id, ok := n.(*ast.Ident); ok && is[l.u.info.ObjectOf(id)] {
			found = true
		}
		return !found
	})
	return found
}

// freshFor lowers a loop whose variables are kept: each iteration copies the variables of the one before, then runs the last clause.
func (l *lowerer) freshFor(s *ast.ForStmt, name string, vars []*types.Var) []ast.Stmt {
	l.loops++
	defer func() { l.loops-- }()
	init := l.stmt(s.Init)
	first := l.temp("first")
	var before, top []ast.Stmt
	before = append(before, init...)
	for _, v := range vars {
		p := l.temp("p")
		old := l.declare(v)
		before = append(before, varStmt(p, &ast.StarExpr{X: l.typ(v.Type())}, &ast.UnaryExpr{Op: token.AND, X: ast.NewIdent(old)}))
		fresh := l.redeclare(v)
		top = append(top,
			varStmt(fresh, l.typ(v.Type()), &ast.StarExpr{X: ast.NewIdent(p)}),
			assign(ast.NewIdent(p), &ast.UnaryExpr{Op: token.AND, X: ast.NewIdent(fresh)}))
	}
	before = append(before, varStmt(first, ast.NewIdent("bool"), ast.NewIdent("true")))
	step := &ast.IfStmt{Cond: ast.NewIdent(first), Body: &ast.BlockStmt{List: []ast.Stmt{assign(ast.NewIdent(first), ast.NewIdent("false"))}}}
	if s.Post != nil {
		step.Else = &ast.BlockStmt{List: l.plainStmt(s.Post)}
	}
	top = append(top, step)
	if s.Cond != nil {
		top = append(top, &ast.IfStmt{Cond: &ast.UnaryExpr{Op: token.NOT, X: paren(l.expr(s.Cond))},
			Body: &ast.BlockStmt{List: []ast.Stmt{&ast.BranchStmt{Tok: token.BREAK}}}})
	}
	top = append(top, l.block(s.Body))
	return scoped(append(before, label(name, &ast.ForStmt{Body: &ast.BlockStmt{List: top}})))
}

// redeclare gives a variable a new name from here on.
func (l *lowerer) redeclare(v *types.Var) string {
	delete(l.names, v)
	return l.declare(v)
}

// rangeStmt lowers a range loop by what it ranges over.
func (l *lowerer) rangeStmt(s *ast.RangeStmt, name string) []ast.Stmt {
	l.loops++
	defer func() { l.loops-- }()
	pos := l.at(s.Pos())
	t := l.typeOf(s.X).Underlying()
	if p, ok := t.(*types.Pointer); ok {
		t = p.Elem().Underlying()
	}
	var out []ast.Stmt
	switch u := t.(type) {
	case *types.Basic:
		if u.Info()&types.IsString != 0 {
			out = l.rangeString(s, name)
		} else {
			out = l.rangeInt(s, name)
		}
	case *types.Slice:
		out = l.rangeList(s, name, u.Elem(), false)
	case *types.Array:
		out = l.rangeList(s, name, u.Elem(), true)
	case *types.Map:
		out = l.rangeNative(s, name, u.Key(), u.Elem())
	case *types.Chan:
		out = l.rangeChan(s, name, u.Elem())
	case *types.Signature:
		out = l.rangeFunc(s, name, u)
	default:
		l.fail(s.Pos(), "this range cannot be used here")
	}
	return append(pos, out...)
}

// bindRange gives the variables of an iteration their values.
func (l *lowerer) bindRange(e ast.Expr, tok token.Token, x ast.Expr, from types.Type) []ast.Stmt {
	if e == nil || isBlank(e) {
		return nil
	}
	return l.put(e, x, from, tok)
}

// rangeInt lowers range over an integer.
func (l *lowerer) rangeInt(s *ast.RangeStmt, name string) []ast.Stmt {
	t := l.typeOf(s.X)
	if isUntyped(t) {
		t = types.Typ[types.Int]
		if s.Key != nil && !isBlank(s.Key) {
			t = l.typeOf(s.Key)
		}
	}
	n, i := l.temp("n"), l.temp("i")
	head := []ast.Stmt{varStmt(n, l.typ(t), l.exprTo(s.X, t)), varStmt(i, l.typ(t), l.constantInt(0, t))}
	body := l.bindRange(s.Key, s.Tok, ast.NewIdent(i), t)
	body = append(body, l.block(s.Body).List...)
	return scoped(append(head, label(name, countLoop(i, n, body))))
}

func (l *lowerer) constantInt(n int, t types.Type) ast.Expr {
	return call(l.conversionFun(t), intLit(n))
}

// countLoop writes for ; i < n; i++ { body }.
func countLoop(i, n string, body []ast.Stmt) ast.Stmt {
	return &ast.ForStmt{
		Cond: &ast.BinaryExpr{X: ast.NewIdent(i), Op: token.LSS, Y: ast.NewIdent(n)},
		Post: &ast.IncDecStmt{X: ast.NewIdent(i), Tok: token.INC},
		Body: &ast.BlockStmt{List: body},
	}
}

// rangeList lowers range over a slice or an array.
func (l *lowerer) rangeList(s *ast.RangeStmt, name string, elem types.Type, array bool) []ast.Stmt {
	x, n, i := l.temp("x"), l.temp("n"), l.temp("i")
	lt := l.typeOf(s.X)
	var head []ast.Stmt
	item := ast.Expr(ast.NewIdent(x))
	if p, ok := lt.Underlying().(*types.Pointer); ok {
		item = paren(&ast.StarExpr{X: ast.NewIdent(x)})
		array = true
		lt = types.NewPointer(p.Elem())
	}
	if (s.Value == nil || isBlank(s.Value)) && array {
		// only the length counts, which needs no copy
		size := arrayLen(l.typeOf(s.X))
		head = append(head, varStmt(n, ast.NewIdent("int"), intLit(size)))
	} else {
		head = append(head, varStmt(x, l.typ(lt), l.expr(s.X)),
			varStmt(n, ast.NewIdent("int"), call(ast.NewIdent("len"), item)))
	}
	head = append(head, varStmt(i, ast.NewIdent("int"), intLit(0)))
	body := l.bindRange(s.Key, s.Tok, ast.NewIdent(i), types.Typ[types.Int])
	body = append(body, l.bindRange(s.Value, s.Tok, &ast.IndexExpr{X: item, Index: ast.NewIdent(i)}, elem)...)
	body = append(body, l.block(s.Body).List...)
	return scoped(append(head, label(name, countLoop(i, n, body))))
}

func arrayLen(t types.Type) int {
	u := t.Underlying()
	if p, ok := u.(*types.Pointer); ok {
		u = p.Elem().Underlying()
	}
	return int(u.(*types.Array).Len())
}

// rangeNative leaves the loop to the interpreter, with variables that are new in each iteration.
func (l *lowerer) rangeNative(s *ast.RangeStmt, name string, kt, vt types.Type) []ast.Stmt {
	k, v := l.temp("k"), l.temp("v")
	x := l.temp("x")
	out := &ast.RangeStmt{Tok: token.DEFINE, Key: ast.NewIdent(k), X: ast.NewIdent(x)}
	body := l.bindRange(s.Key, s.Tok, ast.NewIdent(k), kt)
	if s.Value != nil && !isBlank(s.Value) {
		out.Value = ast.NewIdent(v)
		body = append(body, l.bindRange(s.Value, s.Tok, ast.NewIdent(v), vt)...)
	}
	body = append(body, l.block(s.Body).List...)
	out.Body = &ast.BlockStmt{List: body}
	head := varStmt(x, l.typ(types.Default(l.typeOf(s.X))), l.expr(s.X))
	return scoped([]ast.Stmt{head, label(name, out)})
}

// rangeString lowers range over the characters of a string.
func (l *lowerer) rangeString(s *ast.RangeStmt, name string) []ast.Stmt {
	x, i, r, w := l.temp("x"), l.temp("i"), l.temp("r"), l.temp("w")
	str := types.Typ[types.String]
	head := []ast.Stmt{
		varStmt(x, ast.NewIdent("string"), l.conversionTo(s.X, str)),
		varStmt(i, ast.NewIdent("int"), intLit(0)),
		varStmt(w, ast.NewIdent("int"), intLit(1)),
	}
	at := &ast.IndexExpr{X: ast.NewIdent(x), Index: ast.NewIdent(i)}
	body := []ast.Stmt{
		varStmt(r, ast.NewIdent("rune"), call(ast.NewIdent("rune"), at)),
		assign(ast.NewIdent(w), intLit(1)),
		&ast.IfStmt{Cond: &ast.BinaryExpr{X: ast.NewIdent(r), Op: token.GEQ, Y: intLit(0x80)}, Body: &ast.BlockStmt{List: []ast.Stmt{
			&ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(r), ast.NewIdent(w)}, Tok: token.ASSIGN,
				Rhs: []ast.Expr{hostCall("Rune", ast.NewIdent(x), ast.NewIdent(i))}}}}},
	}
	body = append(body, l.bindRange(s.Key, s.Tok, ast.NewIdent(i), types.Typ[types.Int])...)
	body = append(body, l.bindRange(s.Value, s.Tok, ast.NewIdent(r), types.Typ[types.Rune])...)
	body = append(body, l.block(s.Body).List...)
	loop := &ast.ForStmt{
		Cond: &ast.BinaryExpr{X: ast.NewIdent(i), Op: token.LSS, Y: call(ast.NewIdent("len"), ast.NewIdent(x))},
		Post: assign(ast.NewIdent(i), &ast.BinaryExpr{X: ast.NewIdent(i), Op: token.ADD, Y: ast.NewIdent(w)}),
		Body: &ast.BlockStmt{List: body},
	}
	return scoped(append(head, label(name, loop)))
}

// conversionTo lowers an expression and converts it to a basic type.
func (l *lowerer) conversionTo(e ast.Expr, t *types.Basic) ast.Expr {
	x := l.expr(e)
	if types.Identical(l.typeOf(e), t) || isUntyped(l.typeOf(e)) {
		return x
	}
	return call(ast.NewIdent(t.Name()), x)
}

// rangeChan lowers range over a channel.
func (l *lowerer) rangeChan(s *ast.RangeStmt, name string, elem types.Type) []ast.Stmt {
	c, v, ok := l.temp("c"), l.temp("v"), l.temp("ok")
	head := varStmt(c, l.typ(l.typeOf(s.X)), l.expr(s.X))
	body := []ast.Stmt{
		&ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(v), ast.NewIdent(ok)}, Tok: token.DEFINE,
			Rhs: []ast.Expr{&ast.UnaryExpr{Op: token.ARROW, X: ast.NewIdent(c)}}},
		&ast.IfStmt{Cond: &ast.UnaryExpr{Op: token.NOT, X: ast.NewIdent(ok)},
			Body: &ast.BlockStmt{List: []ast.Stmt{&ast.BranchStmt{Tok: token.BREAK}}}},
	}
	body = append(body, l.bindRange(s.Key, s.Tok, ast.NewIdent(v), elem)...)
	body = append(body, l.block(s.Body).List...)
	return scoped([]ast.Stmt{head, label(name, &ast.ForStmt{Body: &ast.BlockStmt{List: body}})})
}

// switchStmt lowers a switch over a value to one over conditions.
func (l *lowerer) switchStmt(s *ast.SwitchStmt, name string) []ast.Stmt {
	var head []ast.Stmt
	if s.Init != nil {
		head = l.stmt(s.Init)
	}
	out := &ast.SwitchStmt{Body: &ast.BlockStmt{}}
	var tag ast.Expr
	var tagType types.Type
	if s.Tag != nil {
		tagType = types.Default(l.typeOf(s.Tag))
		n := l.temp("tag")
		head = append(head, varStmt(n, l.typ(tagType), l.exprTo(s.Tag, tagType)))
		tag = ast.NewIdent(n)
	}
	for _, c := range s.Body.List {
		cc := c.(*ast.CaseClause)
		clause := &ast.CaseClause{Body: l.stmts(cc.Body)}
		for _, e := range cc.List {
			if tag == nil {
				clause.List = append(clause.List, l.condition(e))
			} else {
				clause.List = append(clause.List, l.caseCond(tag, tagType, e))
			}
		}
		clause.List = joined(clause.List)
		out.Body.List = append(out.Body.List, clause)
	}
	return scoped(append(head, label(name, out)))
}

// condition lowers a case of a switch without a tag, which may be true in an interface.
func (l *lowerer) condition(e ast.Expr) ast.Expr {
	if types.IsInterface(l.typeOf(e)) {
		return hostCall("Equal", hostCall("Any", ast.NewIdent("true")), l.opened(e))
	}
	return l.expr(e)
}

// joined makes one condition of several.
func joined(conds []ast.Expr) []ast.Expr {
	if len(conds) < 2 {
		return conds
	}
	x := conds[0]
	for _, c := range conds[1:] {
		x = paren(&ast.BinaryExpr{X: x, Op: token.LOR, Y: c})
	}
	return []ast.Expr{x}
}

func (l *lowerer) caseCond(tag ast.Expr, tagType types.Type, e ast.Expr) ast.Expr {
	et := l.typeOf(e)
	switch {
	case isNil(et):
		return l.isNil(tag, tagType)
	case types.IsInterface(tagType) || types.IsInterface(et):
		anyT := types.NewInterfaceType(nil, nil)
		return hostCall("Equal", l.convert(tag, tagType, anyT), l.exprTo(e, anyT))
	}
	switch tagType.Underlying().(type) {
	case *types.Struct, *types.Array, *types.Pointer:
		return hostCall("Same", tag, l.expr(e))
	case *types.Chan:
		return hostCall("SameChan", tag, l.expr(e))
	}
	return paren(&ast.BinaryExpr{X: tag, Op: token.EQL, Y: l.exprTo(e, tagType)})
}

// typeSwitch lowers a switch over types.
func (l *lowerer) typeSwitch(s *ast.TypeSwitchStmt, name string) []ast.Stmt {
	var head []ast.Stmt
	if s.Init != nil {
		head = l.stmt(s.Init)
	}
	x := typeSwitchOperand(s)
	n := l.temp("x")
	xt := l.typeOf(x)
	head = append(head, varStmt(n, &ast.InterfaceType{Methods: &ast.FieldList{}}, l.opened(x)))
	out := &ast.SwitchStmt{Body: &ast.BlockStmt{}}
	for _, c := range s.Body.List {
		out.Body.List = append(out.Body.List, l.typeClause(c.(*ast.CaseClause), n, x, xt))
	}
	return scoped(append(head, label(name, out)))
}

func typeSwitchOperand(s *ast.TypeSwitchStmt) ast.Expr {
	switch a := s.Assign.(type) {
	case *ast.AssignStmt:
		return ast.Unparen(a.Rhs[0]).(*ast.TypeAssertExpr).X
	case *ast.ExprStmt:
		return ast.Unparen(a.X).(*ast.TypeAssertExpr).X
	}
	return nil
}

func (l *lowerer) typeClause(cc *ast.CaseClause, n string, x ast.Expr, xt types.Type) ast.Stmt {
	clause := &ast.CaseClause{}
	for _, e := range cc.List {
		if isNil(l.typeOf(e)) {
			clause.List = append(clause.List, hostCall("IsNil", ast.NewIdent(n)))
			continue
		}
		clause.List = append(clause.List, hostCall("Is", intLit(l.runtimeType(l.typeOf(e)).id), ast.NewIdent(n)))
	}
	clause.List = joined(clause.List)
	if v, ok := l.u.info.Implicits[cc].(*types.Var); ok {
		clause.Body = append(clause.Body, l.clauseVar(v, n, xt)...)
	}
	clause.Body = append(clause.Body, l.stmts(cc.Body)...)
	return clause
}

// clauseVar declares the variable of a type switch with the type that it has in this clause.
func (l *lowerer) clauseVar(v *types.Var, n string, xt types.Type) []ast.Stmt {
	t := l.sub(v.Type())
	name := l.declare(v)
	if types.IsInterface(t) && l.dynamic(t) {
		return []ast.Stmt{varStmt(name, l.typ(t), ast.NewIdent(n))}
	}
	if types.IsInterface(t) && types.Identical(t, xt) { // the operand's own type: nil is possible
		raw := l.temp("x")
		ok := l.temp("ok")
		return []ast.Stmt{
			varStmt(name, l.typ(t), nil),
			&ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(raw), ast.NewIdent(ok)}, Tok: token.DEFINE,
				Rhs: []ast.Expr{hostCall("TryAssert", intLit(l.runtimeType(t).id), ast.NewIdent(n))}},
			&ast.IfStmt{Cond: ast.NewIdent(ok), Body: &ast.BlockStmt{List: l.unpacked(name, raw, t)}},
		}
	}
	raw := l.temp("x")
	return append([]ast.Stmt{
		define(raw, hostCall("Assert", intLit(l.runtimeType(t).id), ast.NewIdent(n))),
		varStmt(name, l.typ(t), nil),
	}, l.unpacked(name, raw, t)...)
}

// selectStmt lowers a select.
func (l *lowerer) selectStmt(s *ast.SelectStmt, name string) []ast.Stmt {
	out := &ast.SelectStmt{Body: &ast.BlockStmt{}}
	var head []ast.Stmt
	for _, c := range s.Body.List {
		cc := c.(*ast.CommClause)
		clause := &ast.CommClause{}
		var body []ast.Stmt
		switch comm := cc.Comm.(type) {
		case *ast.SendStmt:
			t := l.typeOf(comm.Chan).Underlying().(*types.Chan)
			ch, v := l.temp("c"), l.temp("v")
			head = append(head, varStmt(ch, l.typ(l.typeOf(comm.Chan)), l.expr(comm.Chan)), varStmt(v, l.typ(t.Elem()), l.exprTo(comm.Value, t.Elem())))
			clause.Comm = &ast.SendStmt{Chan: ast.NewIdent(ch), Value: ast.NewIdent(v)}
		case *ast.ExprStmt:
			ch := l.selectChan(comm.X, &head)
			clause.Comm = exprStmt(&ast.UnaryExpr{Op: token.ARROW, X: ch})
		case *ast.AssignStmt:
			ch := l.selectChan(comm.Rhs[0], &head)
			clause.Comm, body = l.selectReceive(comm, ch)
		}
		clause.Body = append(body, l.stmts(cc.Body)...)
		out.Body.List = append(out.Body.List, clause)
	}
	return scoped(append(head, label(name, out)))
}

// selectChan evaluates the channel of a receive before the select.
func (l *lowerer) selectChan(x ast.Expr, head *[]ast.Stmt) ast.Expr {
	u := ast.Unparen(x).(*ast.UnaryExpr)
	ch := l.temp("c")
	*head = append(*head, varStmt(ch, l.typ(l.typeOf(u.X)), l.expr(u.X)))
	return ast.NewIdent(ch)
}

func (l *lowerer) selectReceive(a *ast.AssignStmt, ch ast.Expr) (ast.Stmt, []ast.Stmt) {
	v, ok := l.temp("v"), l.temp("ok")
	recv := &ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(v)}, Tok: token.DEFINE, Rhs: []ast.Expr{&ast.UnaryExpr{Op: token.ARROW, X: ch}}}
	u := ast.Unparen(a.Rhs[0]).(*ast.UnaryExpr)
	elem := l.typeOf(u.X).Underlying().(*types.Chan).Elem()
	body := l.put(a.Lhs[0], ast.NewIdent(v), elem, a.Tok)
	if len(a.Lhs) == 2 {
		recv.Lhs = append(recv.Lhs, ast.NewIdent(ok))
		body = append(body, l.put(a.Lhs[1], ast.NewIdent(ok), types.Typ[types.Bool], a.Tok)...)
	}
	return recv, body
}

// frozen separates what a call evaluates now, as parameters with their arguments, from the call itself, which refers to them.
func (l *lowerer) frozen(c *ast.CallExpr) (params []*ast.Field, args []ast.Expr, left *ast.CallExpr) {
	fun := ast.Unparen(c.Fun)
	x, ok := l.expr(c).(*ast.CallExpr)
	if !ok {
		l.fail(c.Pos(), "this call cannot be deferred or started")
	}
	ts := l.frozenTypes(c, fun, len(x.Args))
	freeze := func(t, a ast.Expr) ast.Expr {
		n := l.temp("f")
		params = append(params, &ast.Field{Names: []*ast.Ident{ast.NewIdent(n)}, Type: t})
		args = append(args, a)
		return ast.NewIdent(n)
	}
	for i, a := range x.Args {
		if _, lit := a.(*ast.BasicLit); lit || isNilIdent(a) || ts[i] == nil {
			continue
		}
		x.Args[i] = freeze(ts[i], a)
	}
	if l.computedCallee(x.Fun) {
		x.Fun = freeze(l.typ(l.typeOf(fun)), x.Fun)
	}
	return params, args, x
}

// computedCallee reports whether what is called has to be evaluated now.
func (l *lowerer) computedCallee(f ast.Expr) bool {
	switch f := f.(type) {
	case *ast.ParenExpr:
		return false // a function literal
	case *ast.Ident:
		return !isInternal(f.Name) && types.Universe.Lookup(f.Name) == nil
	case *ast.SelectorExpr:
		return !isHost(f)
	}
	return true
}

// frozenTypes lists the types of the arguments of a lowered call, nil where an argument may stay where it is.
func (l *lowerer) frozenTypes(c *ast.CallExpr, fun ast.Expr, n int) []ast.Expr {
	out := make([]ast.Expr, n)
	if tv := l.u.info.Types[fun]; tv.IsBuiltin() || tv.IsType() {
		if len(c.Args) != n {
			return out
		}
		for i, a := range c.Args {
			t := l.typeOf(a)
			if name, ok := fun.(*ast.Ident); ok && (name.Name == "panic" || name.Name == "print" || name.Name == "println") {
				t = types.NewInterfaceType(nil, nil)
			}
			if !isNil(t) {
				out[i] = l.typ(types.Default(t))
			}
		}
		return out
	}
	sig, ok := l.typeOf(fun).Underlying().(*types.Signature)
	if !ok {
		return out
	}
	at := 0
	if n == len(c.Args)+1 { // the receiver of a method made in cells goes first
		if s, ok := fun.(*ast.SelectorExpr); ok {
			if sel, ok := l.u.info.Selections[s]; ok {
				tg := l.method(l.expr(s.X), l.typeOf(s.X), s.Sel.Name, l.lookupPackage(sel))
				out[0], at = l.typ(l.recvType(tg)), 1
			}
		}
	}
	for i := range c.Args {
		if at+i < n {
			out[at+i] = l.typ(paramType(sig, i, c.Ellipsis.IsValid()))
		}
	}
	return out
}

func isHost(s *ast.SelectorExpr) bool {
	id, ok := s.X.(*ast.Ident)
	return ok && id.Name == hostName
}

func isNilIdent(e ast.Expr) bool {
	id, ok := e.(*ast.Ident)
	return ok && id.Name == "nil"
}

// goStmt starts a goroutine through the host, which catches its panics and counts it.
func (l *lowerer) goStmt(s *ast.GoStmt) []ast.Stmt {
	params, args, x := l.frozen(s.Call)
	body := funcLit(nil, exprStmt(x))
	start := exprStmt(hostCall("Go", body, intLit(l.position(s.Pos()))))
	return []ast.Stmt{exprStmt(call(paren(funcLit(params, start)), args...))}
}

func funcLit(params []*ast.Field, body ...ast.Stmt) *ast.FuncLit {
	return &ast.FuncLit{Type: &ast.FuncType{Params: &ast.FieldList{List: params}}, Body: &ast.BlockStmt{List: body}}
}

// deferStmt defers a call. A function literal and a cell's function go as they are, so that recover works in them. The arguments are
// put into new variables, for the interpreter keeps only where they were.
func (l *lowerer) deferStmt(s *ast.DeferStmt) []ast.Stmt {
	fun := ast.Unparen(s.Call.Fun)
	var params []*ast.Field
	var args []ast.Expr
	var x *ast.CallExpr
	if lit, ok := fun.(*ast.FuncLit); ok {
		args = l.arguments(s.Call, l.typeOf(lit).(*types.Signature), boxed)
		x = spread(call(l.funcLit(lit), args...), s.Call.Ellipsis.IsValid())
		sig := l.typeOf(lit).(*types.Signature)
		return l.deferFresh(x, func(i int) ast.Expr { return l.typ(paramType(sig, i, s.Call.Ellipsis.IsValid())) })
	}
	if l.isOwnFunc(fun) {
		if x, ok := l.call(s.Call).(*ast.CallExpr); ok {
			ts := l.frozenTypes(s.Call, fun, len(x.Args))
			return l.deferFresh(x, func(i int) ast.Expr { return ts[i] })
		}
	}
	params, args, x = l.frozen(s.Call)
	return l.deferFresh(call(funcLit(params, exprStmt(x)), args...), func(i int) ast.Expr { return params[i].Type })
}

func (l *lowerer) deferFresh(x *ast.CallExpr, typ func(i int) ast.Expr) []ast.Stmt {
	var out []ast.Stmt
	for i, a := range x.Args {
		if _, lit := a.(*ast.BasicLit); lit || isNilIdent(a) || typ(i) == nil {
			continue
		}
		if _, lit := a.(*ast.CompositeLit); lit {
			n := l.temp("d")
			out = append(out, varStmt(n, typ(i), a))
			a = ast.NewIdent(n)
		}
		n := l.temp("d")
		out = append(out, varStmt(n, typ(i), a))
		x.Args[i] = ast.NewIdent(n)
	}
	return append(out, &ast.DeferStmt{Call: x})
}

// isOwnFunc reports whether a callee is a function or method made in cells, called directly.
func (l *lowerer) isOwnFunc(fun ast.Expr) bool {
	switch f := fun.(type) {
	case *ast.Ident:
		fn, ok := l.u.info.Uses[f].(*types.Func)
		return ok && fn.Pkg() == l.u.pkg
	case *ast.SelectorExpr:
		fn, ok := l.u.info.Uses[f.Sel].(*types.Func)
		return ok && fn.Pkg() == l.u.pkg && l.u.objs[fn.Origin()] != nil
	}
	return false
}
