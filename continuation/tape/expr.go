package tape

import (
	"go/ast"
	"go/constant"
	"go/token"
	"go/types"
	"math"
)

var nan = math.NaN()

// A spot is a position as a node of the syntax tree.
type spot token.Pos

func (p spot) Pos() token.Pos { return token.Pos(p) }
func (p spot) End() token.Pos { return token.Pos(p) }

func (r *recorder) typeOf(e ast.Expr) types.Type {
	t := r.src.Info.TypeOf(e)
	if t == nil || t == types.Typ[types.Invalid] {
		reason := r.src.fault(e)
		if reason == "" {
			reason = "this expression has no type"
		}
		r.refuse(e, "%s", reason)
	}
	if _, generic := types.Unalias(t).(*types.TypeParam); generic {
		r.refuse(e, "generic functions cannot be recorded")
	}
	return t
}

// expr evaluates an expression. A struct or array that stands in a variable is
// returned as it is, not copied.
func (r *recorder) expr(e ast.Expr) value {
	r.work(e, 1)
	if tv, ok := r.src.Info.Types[e]; ok && tv.Value != nil {
		return r.constantOf(e, tv.Type, tv.Value)
	}
	switch e := e.(type) {
	case *ast.ParenExpr:
		return r.expr(e.X)
	case *ast.Ident:
		return r.name(e)
	case *ast.BinaryExpr:
		return r.binary(e)
	case *ast.UnaryExpr:
		return r.unary(e)
	case *ast.CallExpr:
		return r.callExpr(e)
	case *ast.IndexExpr:
		return r.index(e)
	case *ast.SelectorExpr:
		return r.selector(e)
	case *ast.StarExpr:
		return r.address(e).v
	case *ast.SliceExpr:
		return r.sliceExpr(e)
	case *ast.CompositeLit:
		return r.composite(e, r.typeOf(e))
	case *ast.FuncLit:
		return r.literal(e)
	case *ast.TypeAssertExpr:
		return r.assertion(e)
	}
	r.refuse(e, "this expression cannot be recorded")
	return value{}
}

func (r *recorder) constantOf(e ast.Expr, t types.Type, v constant.Value) value {
	u, ok := t.Underlying().(*types.Basic)
	if !ok { // an interface
		d := types.Default(constantType(v))
		return value{kind: kFace, ref: &face{d, r.constantOf(e, d, v)}}
	}
	info := u.Info()
	switch {
	case isFloat(u):
		x, _ := constant.Float64Val(constant.ToFloat(v))
		return float(r.g.constant(x))
	case info&types.IsInteger != 0:
		v = constant.ToInt(v)
		if n, exact := constant.Int64Val(v); exact {
			return integer(n)
		}
		n, _ := constant.Uint64Val(v)
		return integer(int64(n))
	case info&types.IsBoolean != 0:
		return boolean(constant.BoolVal(v))
	case info&types.IsString != 0:
		return value{kind: kString, ref: constant.StringVal(v)}
	}
	r.refuse(e, "%s", unsupported(u))
	return value{}
}

func constantType(v constant.Value) types.Type {
	switch v.Kind() {
	case constant.Bool:
		return types.Typ[types.UntypedBool]
	case constant.String:
		return types.Typ[types.UntypedString]
	case constant.Int:
		return types.Typ[types.UntypedInt]
	}
	return types.Typ[types.UntypedFloat]
}

func (r *recorder) name(e *ast.Ident) value {
	switch obj := r.src.Info.ObjectOf(e).(type) {
	case *types.Var:
		return r.variable(e, obj).v
	case *types.Func:
		return r.declared(e, obj, nil)
	case *types.Nil:
		return value{kind: kNil}
	}
	r.typeOf(e) // says what the checker says, if it does
	r.refuse(e, "%s cannot be recorded", e.Name)
	return value{}
}

// variable finds the cell of a variable.
func (r *recorder) variable(at ast.Node, v *types.Var) *cell {
	if c := r.call.env[v]; c != nil {
		return c
	}
	return r.outside(at, v)
}

// declared returns a declared function as a value.
func (r *recorder) declared(at ast.Node, f *types.Func, recv *value) value {
	sig := f.Signature()
	if sig.TypeParams() != nil || sig.RecvTypeParams() != nil {
		r.refuse(at, "generic functions cannot be recorded")
	}
	if f.Pkg() != nil && f.Pkg().Path() == "math" {
		return value{kind: kFunc, ref: &closure{math: f.Name(), sig: sig}}
	}
	decl := r.src.decls[f]
	if decl == nil || decl.Body == nil {
		r.refuse(at, "it calls %s, whose source is not part of the model", r.functionName(f))
	}
	return value{kind: kFunc, ref: &closure{decl: decl, sig: sig, recv: recv}}
}

func (r *recorder) functionName(f *types.Func) string {
	if f.Pkg() == nil || f.Pkg().Path() == "main" || f.Pkg().Path() == "model" {
		return f.Name()
	}
	return f.Pkg().Name() + "." + f.Name()
}

// address returns the cell that an expression denotes.
func (r *recorder) address(e ast.Expr) *cell {
	switch e := e.(type) {
	case *ast.ParenExpr:
		return r.address(e.X)
	case *ast.Ident:
		if v, ok := r.src.Info.ObjectOf(e).(*types.Var); ok {
			return r.variable(e, v)
		}
	case *ast.SelectorExpr:
		return r.fieldCell(e)
	case *ast.IndexExpr:
		return r.elementCell(e)
	case *ast.StarExpr:
		return r.deref(e, r.expr(e.X))
	case *ast.CompositeLit:
		return r.newCell(r.composite(e, r.typeOf(e)))
	}
	r.refuse(e, "this cannot be assigned to")
	return nil
}

func (r *recorder) deref(at ast.Node, p value) *cell {
	switch {
	case p.kind == kPointer:
		return p.ref.(*cell)
	case p.kind == kNil:
		r.refuse(at, "a nil pointer is followed")
	}
	r.refuse(at, "this pointer cannot be recorded")
	return nil
}

// fieldCell returns the cell of a field.
func (r *recorder) fieldCell(e *ast.SelectorExpr) *cell {
	sel := r.src.Info.Selections[e]
	if sel == nil {
		if v, ok := r.src.Info.Uses[e.Sel].(*types.Var); ok {
			return r.outside(e, v) // of another package
		}
		r.typeOf(e)
		r.refuse(e, "this cannot be recorded")
	}
	return r.fieldPath(e, r.expr(e.X), sel.Index())
}

func (r *recorder) fieldPath(at ast.Node, v value, path []int) *cell {
	var c *cell
	for _, i := range path {
		if v.kind == kPointer || v.kind == kNil {
			v = r.deref(at, v).v
		}
		g, ok := v.ref.(*group)
		if !ok {
			r.refuse(at, "this value cannot be recorded")
		}
		c = &g.cells[i]
		v = c.v
	}
	return c
}

func (r *recorder) index(e *ast.IndexExpr) value {
	if tv := r.src.Info.Types[e.Index]; tv.IsType() {
		r.refuse(e, "generic functions cannot be recorded")
	}
	x := r.expr(e.X)
	if x.kind == kString {
		text := x.ref.(string)
		return integer(int64(text[r.within(e, r.expr(e.Index), len(text))]))
	}
	return r.usable(e, r.elementOf(e, x).v)
}

func (r *recorder) elementCell(e *ast.IndexExpr) *cell { return r.elementOf(e, r.expr(e.X)) }

func (r *recorder) elementOf(e *ast.IndexExpr, x value) *cell {
	if _, ok := r.typeOf(e.X).Underlying().(*types.Map); ok {
		r.refuse(e, "maps cannot be recorded")
	}
	i := r.expr(e.Index)
	if x.kind == kPointer {
		x = x.ref.(*cell).v
	}
	switch ref := x.ref.(type) {
	case *group:
		return &ref.cells[r.within(e, i, len(ref.cells))]
	case *slice:
		return ref.at(r.within(e, i, ref.len))
	}
	if x.kind == kNil {
		r.within(e, i, 0)
	}
	r.refuse(e, "this cannot be indexed in a recording")
	return nil
}

func (r *recorder) within(e *ast.IndexExpr, i value, n int) int {
	if i.kind != kInt {
		r.refuse(e.Index, "the index depends on a float")
	}
	if i.n < 0 || i.n >= int64(n) {
		r.refuse(e, "index %d out of range with length %d", i.n, n)
	}
	return int(i.n)
}

func (r *recorder) sliceExpr(e *ast.SliceExpr) value {
	x := r.expr(e.X)
	if x.kind == kPointer {
		x = x.ref.(*cell).v
	}
	var s slice
	switch ref := x.ref.(type) {
	case *group:
		s = slice{ref, 0, len(ref.cells), len(ref.cells)}
	case *slice:
		s = *ref
	case string:
		low, high := r.bound(e.Low, 0), r.bound(e.High, len(ref))
		if low < 0 || low > high || high > len(ref) {
			r.refuse(e, "slice bounds out of range")
		}
		return value{kind: kString, ref: ref[low:high]}
	default:
		if x.kind != kNil {
			r.refuse(e, "this cannot be sliced in a recording")
		}
		s.base = &group{}
	}
	low, high, most := r.bound(e.Low, 0), r.bound(e.High, s.len), r.bound(e.Max, s.cap)
	if low < 0 || low > high || high > most || most > s.cap {
		r.refuse(e, "slice bounds out of range")
	}
	if x.kind == kNil {
		return x
	}
	return value{kind: kSlice, ref: &slice{s.base, s.off + low, high - low, most - low}}
}

func (r *recorder) bound(e ast.Expr, otherwise int) int {
	if e == nil {
		return otherwise
	}
	v := r.expr(e)
	if v.kind != kInt {
		r.refuse(e, "the index depends on a float")
	}
	return int(v.n)
}
