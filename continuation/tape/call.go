package tape

import (
	"go/ast"
	"go/types"
	"maps"
	"math"
	"reflect"
)

func (r *recorder) callExpr(e *ast.CallExpr) value {
	fun := ast.Unparen(e.Fun)
	if tv := r.src.Info.Types[fun]; tv.IsType() {
		return r.conversion(e, tv.Type)
	} else if tv.IsBuiltin() {
		return r.builtin(e, fun)
	}
	f := r.expr(fun)
	if f.kind != kFunc {
		if f.kind == kNil {
			r.refuse(e, "a nil function is called")
		}
		r.refuse(e, "it calls a function whose source is not known")
	}
	c := f.ref.(*closure)
	args := r.arguments(e, c)
	r.g.at = e.Lparen
	if c.math != "" {
		return r.mathCall(e, c.math, args)
	}
	return r.invoke(e, c, args)
}

// arguments evaluates the arguments of a call, converted to the types of the
// parameters; those of a variadic function in a slice.
func (r *recorder) arguments(e *ast.CallExpr, c *closure) []value {
	if len(e.Args) == 0 && !c.sig.Variadic() {
		return nil
	}
	values, kinds := []value(nil), []types.Type(nil)
	if len(e.Args) > 0 {
		values, kinds = r.several(e.Args)
	}
	if c.expr { // the receiver comes first
		return values
	}
	params := c.sig.Params()
	fixed := params.Len()
	if c.sig.Variadic() && !e.Ellipsis.IsValid() {
		fixed--
		elem := params.At(fixed).Type().Underlying().(*types.Slice).Elem()
		rest := value{kind: kNil}
		if len(values) > fixed {
			g := r.newGroup(len(values) - fixed)
			for i := range g.cells {
				g.cells[i].v = r.copyOf(r.implicit(values[fixed+i], kinds[fixed+i], elem))
			}
			rest = sliceOf(g)
		}
		values = append(values[:fixed:fixed], rest)
	}
	for i := range fixed {
		values[i] = r.implicit(values[i], kinds[i], params.At(i).Type())
	}
	return values
}

// invoke runs a function of the source.
func (r *recorder) invoke(at ast.Node, c *closure, args []value) value {
	if r.depth++; r.depth > maxDepth {
		r.refuse(at, "calls are nested more than %d deep", maxDepth)
	}
	a := &activation{env: maps.Clone(c.env), sig: c.sig, outer: r.call, mark: len(r.exits)}
	if a.env == nil {
		a.env = map[types.Object]*cell{}
	}
	r.call = a
	typ, body := r.bind(c, args)
	r.results(typ)
	r.block(body.List)
	r.meet(a.mark, flow{how: returned})
	r.call = a.outer
	r.depth--
	switch len(a.results) {
	case 0:
		return value{kind: kTuple}
	case 1:
		return a.results[0].v
	}
	values := make([]value, len(a.results))
	for i, c := range a.results {
		values[i] = c.v
	}
	return value{kind: kTuple, ref: values}
}

// bind makes variables of the arguments.
func (r *recorder) bind(c *closure, args []value) (*ast.FuncType, *ast.BlockStmt) {
	typ, body := (*ast.FuncType)(nil), (*ast.BlockStmt)(nil)
	if c.lit != nil {
		typ, body = c.lit.Type, c.lit.Body
	} else {
		typ, body = c.decl.Type, c.decl.Body
		if c.decl.Recv != nil {
			recv := c.recv
			if c.expr {
				recv, args = &args[0], args[1:]
			}
			for _, f := range c.decl.Recv.List {
				for _, id := range f.Names {
					r.define(r.src.Info.Defs[id], *recv)
				}
			}
		}
	}
	i := 0
	for _, f := range typ.Params.List {
		for _, id := range f.Names {
			r.define(r.src.Info.Defs[id], args[i])
			i++
		}
		if len(f.Names) == 0 {
			i++
		}
	}
	return typ, body
}

// results makes variables of the results.
func (r *recorder) results(typ *ast.FuncType) {
	if typ.Results == nil {
		return
	}
	for _, f := range typ.Results.List {
		t := r.src.Info.TypeOf(f.Type)
		for _, id := range f.Names {
			c := r.newCell(r.zero(id, t))
			if obj := r.src.Info.Defs[id]; obj != nil {
				r.call.env[obj] = c
			}
			r.call.results = append(r.call.results, c)
		}
		if len(f.Names) == 0 {
			r.call.results = append(r.call.results, r.newCell(r.zero(f.Type, t)))
		}
	}
}

func (r *recorder) conversion(e *ast.CallExpr, to types.Type) value {
	x := r.expr(e.Args[0])
	from := r.typeOf(e.Args[0])
	if types.IsInterface(to) {
		return r.implicit(x, from, to)
	}
	b, ok := to.Underlying().(*types.Basic)
	if !ok {
		return x
	}
	info := b.Info()
	switch {
	case isFloat(b) && x.kind == kFloat:
		return x
	case isFloat(b) && x.kind == kInt && unsigned(from):
		return float(r.g.constant(float64(uint64(x.n))))
	case isFloat(b) && x.kind == kInt:
		return float(r.g.constant(float64(x.n)))
	case info&types.IsInteger != 0 && x.kind == kInt:
		return integer(wrap(x.n, to))
	case info&types.IsInteger != 0 && x.kind == kFloat:
		return r.toInteger(e, x, to)
	case info&types.IsBoolean != 0 && (x.kind == kBool || x.kind == kTruth), info&types.IsString != 0 && x.kind == kString:
		return x
	}
	r.refuse(e, "the conversion to %s cannot be recorded", r.typeName(to))
	return value{}
}

func (r *recorder) toInteger(e *ast.CallExpr, x value, to types.Type) value {
	v, ok := r.g.known(x.id())
	if !ok {
		r.refuse(e, "a float becomes an integer")
	}
	if v = math.Trunc(v); !(math.Abs(v) < 1<<63) || float64(wrap(int64(v), to)) != v {
		r.refuse(e, "the float %g does not fit into %s", v, r.typeName(to))
	}
	return integer(int64(v))
}

func (r *recorder) builtin(e *ast.CallExpr, fun ast.Expr) value {
	name := ""
	if id, ok := fun.(*ast.Ident); ok {
		name = id.Name
	}
	switch name {
	case "len", "cap":
		return r.length(e, name)
	case "append":
		return r.appendCall(e)
	case "make":
		return r.makeCall(e)
	case "new":
		return r.newCall(e)
	case "copy":
		return r.copyCall(e)
	case "min", "max":
		return r.extreme(e, name)
	case "clear":
		return r.clearCall(e)
	case "panic":
		r.refuse(e, "the model panics here")
	}
	r.refuse(e, "%s cannot be recorded", name)
	return value{}
}

func (r *recorder) newCall(e *ast.CallExpr) value {
	if !r.src.Info.Types[e.Args[0]].IsType() {
		return value{kind: kPointer, ref: r.newCell(r.copyOf(r.expr(e.Args[0])))}
	}
	return value{kind: kPointer, ref: r.newCell(r.zero(e, r.typeOf(e.Args[0])))}
}

func (r *recorder) length(e *ast.CallExpr, name string) value {
	x := r.expr(e.Args[0])
	if x.kind == kPointer {
		x = x.ref.(*cell).v
	}
	switch ref := x.ref.(type) {
	case *group:
		return integer(int64(len(ref.cells)))
	case *slice:
		if name == "cap" {
			return integer(int64(ref.cap))
		}
		return integer(int64(ref.len))
	case string:
		return integer(int64(len(ref)))
	}
	if x.kind == kNil {
		return integer(0)
	}
	r.refuse(e, "%s of this cannot be recorded", name)
	return value{}
}

func (r *recorder) makeCall(e *ast.CallExpr) value {
	s, ok := r.typeOf(e.Args[0]).Underlying().(*types.Slice)
	if !ok {
		r.refuse(e, "only slices can be made in a recording; maps and channels cannot")
	}
	n := r.bound(e.Args[1], 0)
	room := n
	if len(e.Args) > 2 {
		room = r.bound(e.Args[2], n)
	}
	if n < 0 || room < n {
		r.refuse(e, "make with a length out of range")
	}
	return value{kind: kSlice, ref: &slice{r.zeros(e, s.Elem(), room), 0, n, room}}
}

// content returns the slice behind a value; nil is empty.
func (r *recorder) content(at ast.Node, v value) *slice {
	switch {
	case v.kind == kSlice:
		return v.ref.(*slice)
	case v.kind == kNil:
		return &slice{base: &group{}}
	}
	r.refuse(at, "this cannot be used as a slice in a recording")
	return nil
}

func (r *recorder) appendCall(e *ast.CallExpr) value {
	first := r.expr(e.Args[0])
	s := *r.content(e, first)
	elem := r.typeOf(e.Args[0]).Underlying().(*types.Slice).Elem()
	var more []value
	if e.Ellipsis.IsValid() {
		from := r.content(e, r.expr(e.Args[1]))
		for i := range from.len {
			more = append(more, r.copyOf(from.at(i).v))
		}
	} else {
		for _, x := range e.Args[1:] {
			more = append(more, r.copyOf(r.implicit(r.expr(x), r.typeOf(x), elem)))
		}
	}
	if len(more) == 0 {
		return first
	}
	if s.len+len(more) > s.cap {
		s = r.grown(e, s, elem, s.len+len(more))
	}
	for i, v := range more {
		r.assign(e, s.at(s.len+i), v)
	}
	s.len += len(more)
	return value{kind: kSlice, ref: &s}
}

// grown moves a slice to a larger array, as large as Go's would be: whether a
// later append writes to the same array depends on it.
func (r *recorder) grown(e *ast.CallExpr, s slice, elem types.Type, n int) slice {
	size := int(sizes.Sizeof(elem))
	t := reflect.SliceOf(reflect.ArrayOf(size, reflect.TypeFor[byte]()))
	if size%8 == 0 {
		t = reflect.SliceOf(reflect.ArrayOf(size/8, reflect.TypeFor[float64]()))
	}
	full := reflect.MakeSlice(t, s.len, s.cap)
	room := reflect.AppendSlice(full, reflect.MakeSlice(t, n-s.len, n-s.len)).Cap()
	g := r.zeros(e, elem, room)
	for i := range s.len {
		g.cells[i].v = r.copyOf(s.at(i).v)
	}
	return slice{g, 0, s.len, room}
}

var sizes = types.SizesFor("gc", "amd64")

func (r *recorder) copyCall(e *ast.CallExpr) value {
	to, from := r.content(e, r.expr(e.Args[0])), r.content(e, r.expr(e.Args[1]))
	n := min(to.len, from.len)
	r.work(e, n)
	values := make([]value, n)
	for i := range values {
		values[i] = r.copyOf(from.at(i).v)
	}
	for i, v := range values {
		r.assign(e, to.at(i), v)
	}
	return integer(int64(n))
}

func (r *recorder) clearCall(e *ast.CallExpr) value {
	s, ok := r.typeOf(e.Args[0]).Underlying().(*types.Slice)
	if !ok {
		r.refuse(e, "maps cannot be recorded")
	}
	list := r.content(e, r.expr(e.Args[0]))
	for i := range list.len {
		r.assign(e, list.at(i), r.zero(e, s.Elem()))
	}
	return value{kind: kTuple}
}

// extreme evaluates the min and max of the language.
func (r *recorder) extreme(e *ast.CallExpr, name string) value {
	op := opGreatest
	if name == "min" {
		op = opLeast
	}
	v := r.expr(e.Args[0])
	for _, x := range e.Args[1:] {
		w := r.expr(x)
		switch {
		case v.kind == kFloat && w.kind == kFloat:
			r.g.at = e.Lparen
			v = float(r.g.binary(op, v.id(), w.id()))
		case v.kind == kInt && w.kind == kInt:
			less := w.n < v.n
			if unsigned(r.typeOf(e)) {
				less = uint64(w.n) < uint64(v.n)
			}
			if less == (op == opLeast) && w.n != v.n {
				v = w
			}
		default:
			r.refuse(e, "%s of these cannot be recorded", name)
		}
	}
	return v
}
