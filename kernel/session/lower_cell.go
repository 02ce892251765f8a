package session

import (
	"go/ast"
	"go/token"
	"go/types"
)

// cellBody lowers the statements of the cell.
func (l *lowerer) cellBody() []ast.Stmt {
	var out []ast.Stmt
	list := l.u.body.List
	for i, s := range list {
		if _, empty := s.(*ast.EmptyStmt); empty {
			continue
		}
		if n := l.position(s.Pos()); n >= 0 {
			out = append(out, assign(ast.NewIdent(lineVar), intLit(n)), assign(ast.NewIdent(posVar), intLit(n)))
		}
		if es, ok := s.(*ast.ExprStmt); ok && i == len(list)-1 && l.u.sp.shows {
			out = append(out, l.show(es)...)
			continue
		}
		out = append(out, l.stmt(s)...)
	}
	return out
}

// show lowers the last expression of a cell, whose values are shown.
func (l *lowerer) show(s *ast.ExprStmt) []ast.Stmt {
	x := ast.Unparen(s.X)
	if inner, n, ok := mustCall(x); ok {
		if l.u.isFprint(inner) {
			return l.exprStmt(s)
		}
		stmts, names := l.mustCallStmts(inner)
		rts := l.resultTypes(inner)
		args := []ast.Expr{ast.NewIdent(names[n])}
		for i := range n {
			args = append(args, l.toDynamicAny(ast.NewIdent(names[i]), rts[i]))
		}
		return append(stmts, exprStmt(hostCall("ShowTaken", args...)), l.checkStmt(names[n], inner))
	}
	if tv := l.u.info.Types[x]; tv.IsType() || isNil(l.typeOf(x)) {
		return nil
	}
	if c, ok := x.(*ast.CallExpr); ok {
		rts := l.resultTypes(c)
		if len(rts) == 0 || l.isPrint(c) {
			return l.exprStmt(s)
		}
		if tuple, ok := l.typeOf(c).(*types.Tuple); ok {
			names, stmt := l.spreadInto(c, tuple)
			var args []ast.Expr
			for i, n := range names {
				args = append(args, l.toDynamicAny(ast.NewIdent(n), rts[i]))
			}
			return []ast.Stmt{stmt, exprStmt(hostCall("Show", args...))}
		}
	}
	return []ast.Stmt{exprStmt(hostCall("Show", l.exprTo(x, types.NewInterfaceType(nil, nil))))}
}

func (l *lowerer) isPrint(c *ast.CallExpr) bool { return l.u.isPrint(c) }

func (l *lowerer) toDynamicAny(x ast.Expr, t types.Type) ast.Expr {
	return l.convert(x, t, types.NewInterfaceType(nil, nil))
}

// rangeFunc lowers range over a function: the body becomes a function literal, and what leaves the loop is carried out after the call.
func (l *lowerer) rangeFunc(s *ast.RangeStmt, name string, sig *types.Signature) []ast.Stmt {
	yield := sig.Params().At(0).Type().Underlying().(*types.Signature)
	rb := &rangeBody{l: l, label: name, exit: l.temp("exit")}
	var params []*ast.Field
	var bind []ast.Stmt
	for i, e := range []ast.Expr{s.Key, s.Value} {
		if i >= yield.Params().Len() {
			break
		}
		n := l.temp("y")
		t := yield.Params().At(i).Type()
		params = append(params, &ast.Field{Names: []*ast.Ident{ast.NewIdent(n)}, Type: l.typ(t)})
		bind = append(bind, l.bindRange(e, s.Tok, ast.NewIdent(n), t)...)
	}
	lowered := l.block(s.Body).List
	rb.inner = labels(lowered)
	body := rb.list(lowered)
	body = append(append(bind, body...), &ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent("true")}})
	lit := &ast.FuncLit{Type: &ast.FuncType{Params: &ast.FieldList{List: params},
		Results: &ast.FieldList{List: []*ast.Field{{Type: ast.NewIdent("bool")}}}}, Body: &ast.BlockStmt{List: body}}
	head := []ast.Stmt{varStmt(rb.exit, ast.NewIdent("int"), intLit(0))}
	for i, t := range l.results {
		rb.values = append(rb.values, l.temp("ret"))
		head = append(head, varStmt(rb.values[i], l.typ(t), nil))
	}
	rb.fillReturns()
	f := l.expr(s.X)
	if _, isLit := ast.Unparen(s.X).(*ast.FuncLit); isLit {
		f = paren(f)
	}
	out := append(head, exprStmt(call(f, lit)))
	return scoped(append(out, rb.after()...))
}

// rangeBody rewrites the statements that leave the body of a range over a function.
type rangeBody struct {
	l       *lowerer
	label   string
	exit    string // variable: 0 for the end, else which way out
	values  []string
	inner   map[string]bool // labels within the body
	ways    []ast.Stmt      // what to do after the call, from 1
	returns []*pendingReturn
}

// pendingReturn is a return within the body whose values are to be kept.
type pendingReturn struct {
	block *ast.BlockStmt
	ret   *ast.ReturnStmt
	way   int
}

func (rb *rangeBody) leave(after ast.Stmt) ast.Stmt {
	rb.ways = append(rb.ways, after)
	return &ast.BlockStmt{List: []ast.Stmt{
		assign(ast.NewIdent(rb.exit), intLit(len(rb.ways))),
		&ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent("false")}}}}
}

// list rewrites the statements of the body.
func (rb *rangeBody) list(list []ast.Stmt) []ast.Stmt {
	out := make([]ast.Stmt, len(list))
	for i, s := range list {
		out[i] = rb.stmt(s, 0, 0)
	}
	return out
}

// stmt rewrites one statement. breaks and continues count what an unlabelled break and continue can leave within the body.
func (rb *rangeBody) stmt(s ast.Stmt, breaks, continues int) ast.Stmt {
	sub := func(list []ast.Stmt, b, c int) []ast.Stmt {
		out := make([]ast.Stmt, len(list))
		for i, s := range list {
			out[i] = rb.stmt(s, b, c)
		}
		return out
	}
	switch s := s.(type) {
	case *ast.BlockStmt:
		return &ast.BlockStmt{List: sub(s.List, breaks, continues)}
	case *ast.IfStmt:
		c := *s
		c.Body = &ast.BlockStmt{List: sub(s.Body.List, breaks, continues)}
		if s.Else != nil {
			c.Else = rb.stmt(s.Else, breaks, continues)
		}
		return &c
	case *ast.ForStmt:
		c := *s
		c.Body = &ast.BlockStmt{List: sub(s.Body.List, breaks+1, continues+1)}
		return &c
	case *ast.RangeStmt:
		c := *s
		c.Body = &ast.BlockStmt{List: sub(s.Body.List, breaks+1, continues+1)}
		return &c
	case *ast.SwitchStmt:
		c := *s
		c.Body = &ast.BlockStmt{List: sub(s.Body.List, breaks+1, continues)}
		return &c
	case *ast.SelectStmt:
		c := *s
		c.Body = &ast.BlockStmt{List: sub(s.Body.List, breaks+1, continues)}
		return &c
	case *ast.CaseClause:
		c := *s
		c.Body = sub(s.Body, breaks, continues)
		return &c
	case *ast.CommClause:
		c := *s
		c.Body = sub(s.Body, breaks, continues)
		return &c
	case *ast.LabeledStmt:
		c := *s
		c.Stmt = rb.stmt(s.Stmt, breaks, continues)
		return &c
	case *ast.BranchStmt:
		return rb.branch(s, breaks, continues)
	case *ast.ReturnStmt:
		b := &ast.BlockStmt{}
		rb.ways = append(rb.ways, nil)
		rb.returns = append(rb.returns, &pendingReturn{b, s, len(rb.ways)})
		return b
	}
	return s
}

func (rb *rangeBody) branch(s *ast.BranchStmt, breaks, continues int) ast.Stmt {
	no := &ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent("false")}}
	yes := &ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent("true")}}
	own := s.Label != nil && s.Label.Name == rb.label
	switch {
	case s.Tok == token.BREAK && (s.Label == nil && breaks == 0 || own):
		return no
	case s.Tok == token.CONTINUE && (s.Label == nil && continues == 0 || own):
		return yes
	case s.Label != nil && !rb.isInner(s.Label.Name):
		return rb.leave(s)
	}
	return s
}

// isInner reports whether a label stands within the body.
func (rb *rangeBody) isInner(name string) bool { return rb.inner[name] }

// labels lists the labels within a list of statements.
func labels(list []ast.Stmt) map[string]bool {
	out := map[string]bool{}
	for _, s := range list {
		ast.Inspect(s, func(n ast.Node) bool {
			if ls, ok := n.(*ast.LabeledStmt); ok {
				out[ls.Label.Name] = true
			}
			return true
		})
	}
	return out
}

// fillReturns writes the blocks that stand for returns: keep the values, leave the loop.
func (rb *rangeBody) fillReturns() {
	for _, p := range rb.returns {
		s := p.ret
		if len(s.Results) == len(rb.values) {
			for i, r := range s.Results {
				p.block.List = append(p.block.List, assign(ast.NewIdent(rb.values[i]), r))
			}
		}
		p.block.List = append(p.block.List, assign(ast.NewIdent(rb.exit), intLit(p.way)),
			&ast.ReturnStmt{Results: []ast.Expr{ast.NewIdent("false")}})
		after := &ast.ReturnStmt{}
		if len(s.Results) > 0 {
			for _, v := range rb.values {
				after.Results = append(after.Results, ast.NewIdent(v))
			}
		}
		rb.ways[p.way-1] = after
	}
}

// after carries out what left the loop.
func (rb *rangeBody) after() []ast.Stmt {
	var out []ast.Stmt
	for i, w := range rb.ways {
		out = append(out, &ast.IfStmt{
			Cond: &ast.BinaryExpr{X: ast.NewIdent(rb.exit), Op: token.EQL, Y: intLit(i + 1)},
			Body: &ast.BlockStmt{List: []ast.Stmt{w}}})
	}
	return out
}
