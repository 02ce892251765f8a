package tape

import (
	"go/ast"
	"go/token"
	"go/types"
)

// An activation is a call at work.
type activation struct {
	env     map[types.Object]*cell
	results []*cell
	sig     *types.Signature
	inside  *construct
	mark    int // exits that were pending when it began
	outer   *activation
}

func (r *recorder) block(list []ast.Stmt) flow {
	for _, s := range list {
		if f := r.stmt(s, ""); f.how != onward {
			return f
		}
	}
	return flow{}
}

func (r *recorder) stmt(s ast.Stmt, label string) flow {
	r.work(s, 1)
	switch s := s.(type) {
	case *ast.BlockStmt:
		return r.block(s.List)
	case *ast.AssignStmt:
		r.assignment(s)
	case *ast.ExprStmt:
		r.expr(s.X)
	case *ast.IncDecStmt:
		op := token.ADD
		if s.Tok == token.DEC {
			op = token.SUB
		}
		c := r.address(s.X)
		t := r.typeOf(s.X)
		r.assign(s, c, r.arithmetic(s, op, c.v, r.one(t), t))
	case *ast.DeclStmt:
		r.declare(s)
	case *ast.IfStmt:
		return r.ifStmt(s)
	case *ast.ForStmt:
		return r.forStmt(s, label)
	case *ast.RangeStmt:
		return r.rangeStmt(s, label)
	case *ast.SwitchStmt:
		return r.switchStmt(s, label)
	case *ast.TypeSwitchStmt:
		return r.typeSwitch(s, label)
	case *ast.ReturnStmt:
		return r.returnStmt(s)
	case *ast.BranchStmt:
		return r.branchStmt(s)
	case *ast.LabeledStmt:
		return r.stmt(s.Stmt, s.Label.Name)
	case *ast.EmptyStmt:
	default:
		r.refuse(s, "%s cannot be recorded", statementName(s))
	}
	return flow{}
}

func statementName(s ast.Stmt) string {
	switch s.(type) {
	case *ast.GoStmt:
		return "a go statement"
	case *ast.DeferStmt:
		return "a defer statement"
	case *ast.SendStmt, *ast.SelectStmt:
		return "communication over channels"
	}
	return "this statement"
}

func (r *recorder) one(t types.Type) value {
	if isFloat(t) {
		return float(r.g.constant(1))
	}
	return integer(1)
}

func (r *recorder) assignment(s *ast.AssignStmt) {
	if s.Tok != token.ASSIGN && s.Tok != token.DEFINE {
		c := r.address(s.Lhs[0])
		t := r.typeOf(s.Lhs[0])
		r.g.at = s.TokPos
		y := r.expr(s.Rhs[0])
		r.g.at = s.TokPos
		r.assign(s, c, r.arithmetic(s, assignOps[s.Tok], c.v, y, t))
		return
	}
	if len(s.Lhs) == 1 && len(s.Rhs) == 1 {
		r.store(s, s.Lhs[0], r.target(s, s.Lhs[0]), r.expr(s.Rhs[0]), r.typeOf(s.Rhs[0]))
		return
	}
	targets := make([]*cell, len(s.Lhs))
	for i, e := range s.Lhs {
		targets[i] = r.target(s, e)
	}
	values, kinds := r.several(s.Rhs)
	if len(values) != len(s.Lhs) {
		r.refuse(s, "this assignment cannot be recorded")
	}
	for i := range values {
		values[i] = r.copyOf(values[i])
	}
	for i, e := range s.Lhs {
		r.store(s, e, targets[i], values[i], kinds[i])
	}
}

var assignOps = map[token.Token]token.Token{
	token.ADD_ASSIGN: token.ADD, token.SUB_ASSIGN: token.SUB, token.MUL_ASSIGN: token.MUL, token.QUO_ASSIGN: token.QUO,
	token.REM_ASSIGN: token.REM, token.AND_ASSIGN: token.AND, token.OR_ASSIGN: token.OR, token.XOR_ASSIGN: token.XOR,
	token.SHL_ASSIGN: token.SHL, token.SHR_ASSIGN: token.SHR, token.AND_NOT_ASSIGN: token.AND_NOT,
}

// several evaluates a list of expressions, or one call with several results.
func (r *recorder) several(list []ast.Expr) ([]value, []types.Type) {
	if len(list) == 1 {
		v := r.expr(list[0])
		if v.kind != kTuple {
			return []value{v}, []types.Type{r.typeOf(list[0])}
		}
		tuple, _ := r.typeOf(list[0]).(*types.Tuple)
		values := v.ref.([]value)
		kinds := make([]types.Type, len(values))
		for i := range kinds {
			kinds[i] = tuple.At(i).Type()
		}
		return values, kinds
	}
	values, kinds := make([]value, len(list)), make([]types.Type, len(list))
	for i, e := range list {
		values[i] = r.copyOf(r.expr(e))
		kinds[i] = r.typeOf(e)
	}
	return values, kinds
}

// target returns the cell that an assignment writes to; nil for the blank name
// and for variables that the statement declares.
func (r *recorder) target(s *ast.AssignStmt, e ast.Expr) *cell {
	if id, ok := e.(*ast.Ident); ok {
		if id.Name == "_" || s.Tok == token.DEFINE && r.src.Info.Defs[id] != nil {
			return nil
		}
	}
	return r.address(e)
}

func (r *recorder) store(s *ast.AssignStmt, e ast.Expr, c *cell, v value, t types.Type) {
	if c != nil {
		r.assign(s, c, r.implicit(v, t, r.typeOf(e)))
		return
	}
	if id := e.(*ast.Ident); id.Name != "_" {
		obj := r.src.Info.Defs[id]
		r.define(obj, r.implicit(v, t, obj.Type()))
	}
}

// define makes a new variable.
func (r *recorder) define(obj types.Object, v value) {
	if obj != nil {
		r.call.env[obj] = r.newCell(r.copyOf(v))
	}
}

func (r *recorder) declare(s *ast.DeclStmt) {
	d := s.Decl.(*ast.GenDecl)
	if d.Tok != token.VAR {
		return
	}
	for _, spec := range d.Specs {
		spec := spec.(*ast.ValueSpec)
		if len(spec.Values) == 0 {
			for _, id := range spec.Names {
				if obj := r.src.Info.Defs[id]; obj != nil {
					r.define(obj, r.zero(id, obj.Type()))
				}
			}
			continue
		}
		values, kinds := r.several(spec.Values)
		for i, id := range spec.Names {
			if obj := r.src.Info.Defs[id]; obj != nil && id.Name != "_" {
				r.define(obj, r.implicit(values[i], kinds[i], obj.Type()))
			}
		}
	}
}

func (r *recorder) ifStmt(s *ast.IfStmt) flow {
	if s.Init != nil {
		r.stmt(s.Init, "")
	}
	cond := r.expr(s.Cond)
	return r.decide(s, cond,
		func() flow { return r.block(s.Body.List) },
		func() flow {
			if s.Else == nil {
				return flow{}
			}
			return r.stmt(s.Else, "")
		})
}

func (r *recorder) returnStmt(s *ast.ReturnStmt) flow {
	a := r.call
	if len(s.Results) > 0 {
		values, kinds := r.several(s.Results)
		for i := range values {
			values[i] = r.copyOf(values[i])
		}
		for i, c := range a.results {
			r.assign(s, c, r.implicit(values[i], kinds[i], a.sig.Results().At(i).Type()))
		}
	}
	return flow{how: returned}
}

func (r *recorder) branchStmt(s *ast.BranchStmt) flow {
	switch s.Tok {
	case token.FALLTHROUGH:
		return flow{how: fellThrough}
	case token.GOTO:
		r.refuse(s, "goto cannot be recorded")
	}
	for c := r.call.inside; c != nil; c = c.outer {
		if s.Label != nil && c.label != s.Label.Name {
			continue
		}
		if s.Tok == token.CONTINUE {
			if c.loop {
				return flow{continued, c}
			}
			continue
		}
		return flow{broke, c}
	}
	r.refuse(s, "this statement cannot be recorded")
	return flow{}
}

// enter makes c the innermost construct.
func (r *recorder) enter(c *construct) *construct {
	c.outer = r.call.inside
	r.call.inside = c
	return c
}

// close ends a construct that the main path left as f says.
func (r *recorder) close(c *construct, mark int, f flow) flow {
	r.call.inside = c.outer
	left := flow{broke, c}
	if f.how != onward && f != left {
		r.missed(mark, left)
		return f
	}
	r.meet(mark, left)
	return flow{}
}

// missed makes guards of exits that wait for the main path at a place to which
// it does not come.
func (r *recorder) missed(mark int, place flow) {
	for _, e := range r.exits[mark:] {
		if e.flow == place {
			r.mustGuard(e.at.Pos())
		}
	}
}
