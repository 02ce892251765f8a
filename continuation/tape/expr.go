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

func (r *recorder) selector(e *ast.SelectorExpr) value {
	sel := r.src.Info.Selections[e]
	switch {
	case sel == nil:
		if f, ok := r.src.Info.Uses[e.Sel].(*types.Func); ok {
			return r.declared(e, f, nil)
		}
		return r.usable(e, r.fieldCell(e).v)
	case sel.Kind() == types.FieldVal:
		return r.usable(e, r.fieldCell(e).v)
	case sel.Kind() == types.MethodVal:
		return r.method(e, sel)
	}
	// T.method: the receiver becomes the first argument.
	f := r.declared(e, sel.Obj().(*types.Func), nil)
	c := *f.ref.(*closure)
	c.expr = true
	return value{kind: kFunc, ref: &c}
}

func (r *recorder) usable(at ast.Expr, v value) value {
	if v.kind == kNone {
		r.refuse(at, "a value of type %s cannot be recorded", r.typeName(r.typeOf(at)))
	}
	return v
}

// method returns a method with its receiver.
func (r *recorder) method(e *ast.SelectorExpr, sel *types.Selection) value {
	f := sel.Obj().(*types.Func)
	path := sel.Index()
	recv, t := r.expr(e.X), r.typeOf(e.X)
	var at *cell
	if len(path) > 1 {
		at = r.fieldPath(e, recv, path[:len(path)-1])
		recv, t = at.v, fieldType(t, path[:len(path)-1])
	}
	for recv.kind == kFace {
		// The method of what the interface holds, which may come from an
		// embedded field that is an interface again.
		content := recv.ref.(*face)
		obj, index, _ := types.LookupFieldOrMethod(content.typ, true, f.Pkg(), f.Name())
		concrete, ok := obj.(*types.Func)
		if !ok {
			r.refuse(e, "the method %s cannot be recorded", f.Name())
		}
		f, recv, t, at = concrete, content.v, content.typ, r.newCell(content.v)
		if len(index) > 1 {
			at = r.fieldPath(e, recv, index[:len(index)-1])
			recv, t = at.v, fieldType(t, index[:len(index)-1])
		}
	}
	if types.IsInterface(f.Signature().Recv().Type()) {
		r.refuse(e, "the method %s of an interface without value is called", f.Name())
	}
	if isPointer(f.Signature().Recv().Type()) {
		if !isPointer(t) {
			if at == nil {
				at = r.address(e.X)
			}
			recv = value{kind: kPointer, ref: at}
		}
	} else {
		if isPointer(t) {
			recv = r.deref(e, recv).v
		}
		recv = r.copyOf(recv)
	}
	return r.declared(e, f, &recv)
}

func isPointer(t types.Type) bool {
	_, ok := t.Underlying().(*types.Pointer)
	return ok
}

// fieldType follows a path of fields from a type, through pointers.
func fieldType(t types.Type, path []int) types.Type {
	for _, i := range path {
		if p, ok := t.Underlying().(*types.Pointer); ok {
			t = p.Elem()
		}
		t = t.Underlying().(*types.Struct).Field(i).Type()
	}
	return t
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

// literal returns a closure over the variables that it uses.
func (r *recorder) literal(e *ast.FuncLit) value {
	env := map[types.Object]*cell{}
	ast.Inspect(e.Body, func(n ast.Node) bool {
		if id, ok := n.(*ast.Ident); ok {
			if obj := r.src.Info.Uses[id]; obj != nil {
				if c := r.call.env[obj]; c != nil {
					env[obj] = c
				}
			}
		}
		return true
	})
	sig, _ := r.typeOf(e).Underlying().(*types.Signature)
	return value{kind: kFunc, ref: &closure{lit: e, env: env, sig: sig}}
}

func (r *recorder) composite(e *ast.CompositeLit, t types.Type) value {
	switch u := t.Underlying().(type) {
	case *types.Struct:
		v := r.zero(e, t)
		g := v.ref.(*group)
		for i, x := range e.Elts {
			at := i
			if kv, ok := x.(*ast.KeyValueExpr); ok {
				at, x = r.fieldIndex(u, kv.Key), kv.Value
			}
			r.assign(x, &g.cells[at], r.element(x, u.Field(at).Type()))
		}
		return v
	case *types.Array:
		g := r.zeros(e, u.Elem(), int(u.Len()))
		r.elements(e, u.Elem(), func(int) *group { return g })
		return value{kind: kGroup, ref: g}
	case *types.Slice:
		g := &group{}
		r.elements(e, u.Elem(), func(n int) *group {
			if n > len(g.cells) {
				more := r.zeros(e, u.Elem(), n)
				copy(more.cells, g.cells)
				g = more
			}
			return g
		})
		return sliceOf(g)
	case *types.Pointer:
		return value{kind: kPointer, ref: r.newCell(r.composite(e, u.Elem()))}
	case *types.Map:
		r.refuse(e, "maps cannot be recorded")
	}
	r.refuse(e, "a value of type %s cannot be recorded", r.typeName(t))
	return value{}
}

func (r *recorder) fieldIndex(u *types.Struct, key ast.Expr) int {
	name := key.(*ast.Ident).Name
	for i := range u.NumFields() {
		if u.Field(i).Name() == name {
			return i
		}
	}
	r.refuse(key, "no field %s", name)
	return 0
}

// elements evaluates the elements of a composite literal; room returns a group
// with at least n cells.
func (r *recorder) elements(e *ast.CompositeLit, elem types.Type, room func(n int) *group) {
	most, at := 0, 0
	for _, x := range e.Elts {
		if kv, ok := x.(*ast.KeyValueExpr); ok {
			at = r.bound(kv.Key, 0)
		}
		at++
		most = max(most, at)
	}
	g := room(most)
	at = 0
	for _, x := range e.Elts {
		if kv, ok := x.(*ast.KeyValueExpr); ok {
			at, x = r.bound(kv.Key, 0), kv.Value
		}
		r.assign(x, &g.cells[at], r.element(x, elem))
		at++
	}
}

// element evaluates an element of a composite literal, whose type may be left
// out.
func (r *recorder) element(x ast.Expr, t types.Type) value {
	if lit, ok := x.(*ast.CompositeLit); ok && lit.Type == nil {
		return r.composite(lit, t)
	}
	return r.copyOf(r.implicit(r.expr(x), r.typeOf(x), t))
}

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
