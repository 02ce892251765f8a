package tape

import (
	"go/ast"
	"go/token"
	"go/types"
)

func (r *recorder) unary(e *ast.UnaryExpr) value {
	if e.Op == token.AND {
		x := ast.Unparen(e.X)
		return value{kind: kPointer, ref: r.address(x)}
	}
	if e.Op == token.ARROW {
		r.refuse(e, "communication over channels cannot be recorded")
	}
	x := r.expr(e.X)
	r.g.at = e.OpPos
	switch {
	case e.Op == token.NOT && x.kind == kBool:
		return boolean(x.n == 0)
	case e.Op == token.NOT && x.kind == kTruth:
		return r.truthOf(r.not(x.id()))
	case x.kind == kFloat && e.Op == token.SUB:
		return float(r.g.unary(opNeg, x.id(), 0))
	case x.kind == kFloat && e.Op == token.ADD:
		return x
	case x.kind == kInt:
		return r.wholeUnary(e, x)
	}
	r.refuse(e, "this operation cannot be recorded")
	return value{}
}

func (r *recorder) wholeUnary(e *ast.UnaryExpr, x value) value {
	t := r.typeOf(e)
	switch e.Op {
	case token.SUB:
		return integer(wrap(-x.n, t))
	case token.XOR:
		return integer(wrap(^x.n, t))
	}
	return x
}

// truthOf returns a condition, concrete where it is known.
func (r *recorder) truthOf(id int32) value {
	if v, ok := r.g.known(id); ok {
		return boolean(v != 0)
	}
	return value{kind: kTruth, n: int64(id)}
}

// node returns the node of a float or of a truth.
func (r *recorder) node(v value) int32 {
	if v.kind == kBool {
		return r.g.constant(float64(v.n))
	}
	return v.id()
}

func (r *recorder) binary(e *ast.BinaryExpr) value {
	switch e.Op {
	case token.LAND, token.LOR:
		return r.logic(e)
	case token.EQL, token.NEQ:
		x := r.copyOf(r.expr(e.X))
		y := r.expr(e.Y)
		r.g.at = e.OpPos
		tx, ty := r.typeOf(e.X), r.typeOf(e.Y)
		v := r.equal(e, r.implicit(x, tx, ty), r.implicit(y, ty, tx))
		if e.Op == token.NEQ {
			return r.negate(v)
		}
		return v
	case token.LSS, token.LEQ, token.GTR, token.GEQ:
		x, y := r.operands(e)
		return r.ordered(e, x, y)
	}
	x, y := r.operands(e)
	return r.arithmetic(e, e.Op, x, y, r.typeOf(e))
}

// operands evaluates both sides. Where the right side calls a function that
// changes what the left side reads, the language leaves open which value counts,
// and compilers differ.
func (r *recorder) operands(e *ast.BinaryExpr) (x, y value) {
	x, y = r.expr(e.X), r.expr(e.Y)
	if r.calls(e.Y) && !r.calls(e.X) && !same(x, r.expr(e.X)) {
		r.refuse(e, "the right side changes what the left side reads; the language leaves their order open")
	}
	r.g.at = e.OpPos
	return x, y
}

// calls reports whether an expression calls a function of the model.
func (r *recorder) calls(e ast.Expr) bool {
	if known, ok := r.calling[e]; ok {
		return known
	}
	found := false
	ast.Inspect(e, func(n ast.Node) bool {
		c, ok := n.(*ast.CallExpr)
		if !ok || found {
			return !found
		}
		fun := ast.Unparen(c.Fun)
		if s, ok := fun.(*ast.SelectorExpr); ok {
			if f, ok := r.src.Info.Uses[s.Sel].(*types.Func); ok && f.Pkg() != nil && f.Pkg().Path() == "math" {
				return true
			}
		}
		tv := r.src.Info.Types[fun]
		found = !tv.IsType() && !tv.IsBuiltin()
		return !found
	})
	if r.calling == nil {
		r.calling = map[ast.Expr]bool{}
	}
	r.calling[e] = found
	return found
}

func (r *recorder) negate(v value) value {
	if v.kind == kBool {
		return boolean(v.n == 0)
	}
	return r.truthOf(r.not(v.id()))
}

// logic evaluates && and ||: the second operand only where the first leaves it
// open.
func (r *recorder) logic(e *ast.BinaryExpr) value {
	x := r.expr(e.X)
	if e.Op == token.LOR {
		x = r.negate(x)
	}
	result := r.newCell(value{})
	short := boolean(e.Op == token.LOR)
	r.decide(spot(e.OpPos), x,
		func() flow { r.set(result, r.expr(e.Y)); return flow{} },
		func() flow { r.set(result, short); return flow{} })
	return result.v
}

// equal compares two values.
func (r *recorder) equal(at ast.Node, x, y value) value {
	switch {
	case x.kind == kFloat && y.kind == kFloat:
		return r.truthOf(r.g.binary(opEqual, x.id(), y.id()))
	case x.kind == kTruth || y.kind == kTruth:
		a, b := r.node(x), r.node(y)
		return r.truthOf(r.either(a, b, r.not(b)))
	case x.kind == kGroup && y.kind == kGroup:
		return r.equalGroups(at, x.ref.(*group), y.ref.(*group))
	case x.kind == kFace && y.kind == kFace:
		a, b := x.ref.(*face), y.ref.(*face)
		if !sameType(a.typ, b.typ) {
			return boolean(false)
		}
		return r.equal(at, a.v, b.v)
	case x.kind == kSlice && y.kind == kSlice, x.kind == kNone, y.kind == kNone:
		r.refuse(at, "this comparison cannot be recorded")
	}
	return boolean(same(x, y))
}

// either is b where the truth a holds, else c; all three are truths.
func (r *recorder) either(a, b, c int32) int32 {
	return r.g.binary(opOr, r.g.binary(opAnd, a, b), r.g.binary(opAnd, r.not(a), c))
}

func (r *recorder) equalGroups(at ast.Node, a, b *group) value {
	all := boolean(true)
	for i := range a.cells {
		v := r.equal(at, a.cells[i].v, b.cells[i].v)
		switch {
		case v.kind == kBool && v.n == 0:
			return v
		case v.kind == kTruth:
			all = r.truthOf(r.g.binary(opAnd, r.node(all), v.id()))
		}
	}
	return all
}

func (r *recorder) ordered(e *ast.BinaryExpr, x, y value) value {
	op := e.Op
	if op == token.GTR || op == token.GEQ {
		x, y = y, x
		op = map[token.Token]token.Token{token.GTR: token.LSS, token.GEQ: token.LEQ}[op]
	}
	switch {
	case x.kind == kFloat && y.kind == kFloat:
		if op == token.LSS {
			return r.truthOf(r.g.binary(opLess, x.id(), y.id()))
		}
		return r.truthOf(r.g.binary(opLessEq, x.id(), y.id()))
	case x.kind == kInt && y.kind == kInt:
		if unsigned(r.typeOf(e.X)) {
			return boolean(uint64(x.n) < uint64(y.n) || op == token.LEQ && x.n == y.n)
		}
		return boolean(x.n < y.n || op == token.LEQ && x.n == y.n)
	case x.kind == kString && y.kind == kString:
		a, b := x.ref.(string), y.ref.(string)
		return boolean(a < b || op == token.LEQ && a == b)
	}
	r.refuse(e, "this comparison cannot be recorded")
	return value{}
}

func unsigned(t types.Type) bool {
	b, ok := t.Underlying().(*types.Basic)
	return ok && b.Info()&types.IsUnsigned != 0
}

var floatOps = map[token.Token]Op{token.ADD: opAdd, token.SUB: opSub, token.MUL: opMul, token.QUO: opDiv}

// arithmetic does x op y in type t.
func (r *recorder) arithmetic(at ast.Node, op token.Token, x, y value, t types.Type) value {
	switch {
	case x.kind == kFloat && y.kind == kFloat:
		return float(r.g.binary(floatOps[op], x.id(), y.id()))
	case x.kind == kInt && y.kind == kInt:
		return integer(r.whole(at, op, x.n, y.n, t))
	case x.kind == kString && y.kind == kString && op == token.ADD:
		return value{kind: kString, ref: x.ref.(string) + y.ref.(string)}
	}
	r.refuse(at, "this operation cannot be recorded")
	return value{}
}

// whole does integer arithmetic.
func (r *recorder) whole(at ast.Node, op token.Token, x, y int64, t types.Type) int64 {
	switch op {
	case token.ADD:
		return wrap(x+y, t)
	case token.SUB:
		return wrap(x-y, t)
	case token.MUL:
		return wrap(x*y, t)
	case token.AND:
		return x & y
	case token.OR:
		return x | y
	case token.XOR:
		return wrap(x^y, t)
	case token.AND_NOT:
		return x &^ y
	case token.SHL, token.SHR:
		return r.shift(at, op, x, y, t)
	case token.QUO, token.REM:
		return r.divide(at, op, x, y, t)
	}
	r.refuse(at, "this operation cannot be recorded")
	return 0
}

func (r *recorder) shift(at ast.Node, op token.Token, x, y int64, t types.Type) int64 {
	if y < 0 {
		r.refuse(at, "negative shift amount")
	}
	switch {
	case op == token.SHL:
		return wrap(x<<uint64(y), t)
	case unsigned(t):
		return int64(uint64(x) >> uint64(y))
	}
	return x >> uint64(y)
}

func (r *recorder) divide(at ast.Node, op token.Token, x, y int64, t types.Type) int64 {
	switch {
	case y == 0:
		r.refuse(at, "an integer is divided by zero")
	case unsigned(t) && op == token.QUO:
		return int64(uint64(x) / uint64(y))
	case unsigned(t):
		return int64(uint64(x) % uint64(y))
	case op == token.QUO:
		return wrap(x/y, t)
	}
	return x % y
}

// wrap brings an integer into the range of its type.
func wrap(n int64, t types.Type) int64 {
	b, _ := t.Underlying().(*types.Basic)
	switch b.Kind() {
	case types.Int8:
		return int64(int8(n))
	case types.Int16:
		return int64(int16(n))
	case types.Int32, types.UntypedRune:
		return int64(int32(n))
	case types.Uint8:
		return int64(uint8(n))
	case types.Uint16:
		return int64(uint16(n))
	case types.Uint32:
		return int64(uint32(n))
	}
	return n
}
