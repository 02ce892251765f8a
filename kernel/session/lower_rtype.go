package session

import (
	"go/ast"
	"go/types"
	"path"
	"reflect"
	"strconv"
	"strings"

	"brinkline/kernel/session/internal/symbols"
)

// runtimeType returns the session's description of a type, for boxes, type switches and printing.
func (l *lowerer) runtimeType(t types.Type) *rtype {
	t = types.Unalias(l.sub(t))
	key := l.typeKey(t)
	reg := l.u.s.rtypes
	if r := reg.byKey(key); r != nil {
		return r
	}
	r := reg.add(key, types.TypeString(t, l.displayQualifier))
	l.u.undo = append(l.u.undo, func() { reg.remove(key) })
	l.regs[key] = r
	l.describeType(r, t)
	return r
}

// displayQualifier writes package names as %T does.
func (l *lowerer) displayQualifier(p *types.Package) string {
	if p == l.u.pkg {
		return "main"
	}
	return p.Name()
}

func (l *lowerer) describeType(r *rtype, t types.Type) {
	r.own = l.mentionsOwn(t)
	_, r.named = t.(*types.Named)
	r.name = hiddenRE.ReplaceAllString(r.name, "$1")
	if !r.own && !(types.IsInterface(t) && l.dynamic(t)) {
		r.reflect = l.reflectType(t)
	}
	switch u := t.Underlying().(type) {
	case *types.Basic:
		r.kind = basicKinds[u.Kind()]
	case *types.Pointer:
		r.kind, r.elem = reflect.Pointer, l.runtimeType(u.Elem())
	case *types.Slice:
		r.kind, r.elem = reflect.Slice, l.runtimeType(u.Elem())
	case *types.Array:
		r.kind, r.elem = reflect.Array, l.runtimeType(u.Elem())
	case *types.Map:
		r.kind, r.keyType, r.elem = reflect.Map, l.runtimeType(u.Key()), l.runtimeType(u.Elem())
	case *types.Chan:
		r.kind = reflect.Chan
	case *types.Signature:
		r.kind = reflect.Func
	case *types.Struct:
		r.kind = reflect.Struct
		for i := range u.NumFields() {
			f := u.Field(i)
			r.fields = append(r.fields, rfield{name: f.Name(), typ: l.runtimeType(f.Type()), exported: f.Exported()})
		}
	case *types.Interface:
		r.kind = reflect.Interface
		l.describeInterface(r, t, u)
	}
}

func (l *lowerer) describeInterface(r *rtype, t types.Type, u *types.Interface) {
	for m := range u.Methods() {
		r.wants = append(r.wants, rwant{name: m.Name(), sig: l.typeKey(m.Type()), fn: l.reflectType(m.Type())})
	}
	if l.real(t) {
		r.reflect = l.reflectType(t)
		r.conv = l.converter(t)
	}
}

// converter offers the interpreter a function that makes a value of a compiled interface of any value.
func (l *lowerer) converter(t types.Type) string {
	key := interfaceKeyOf(t)
	name := "conv" + mark + strings.NewReplacer("/", mark+"s", ".", mark+"d", "-", mark+"h").Replace(key)
	if l.u.s.offered[name] {
		return name
	}
	rt := l.reflectType(t)
	if rt == nil {
		return ""
	}
	s := l.u.s
	fn := reflect.MakeFunc(reflect.FuncOf([]reflect.Type{anyType}, []reflect.Type{rt}, false), func(in []reflect.Value) []reflect.Value {
		out := reflect.New(rt).Elem()
		if v := s.asInterface(in[0].Interface(), rt); v != nil {
			out.Set(reflect.ValueOf(v))
		}
		return []reflect.Value{out}
	})
	if err := s.useSymbol(name, fn); err != nil {
		return ""
	}
	s.offered[name] = true
	return name
}

func interfaceKeyOf(t types.Type) string {
	n := types.Unalias(t).(*types.Named)
	if n.Obj().Pkg() == nil {
		return n.Obj().Name()
	}
	return n.Obj().Pkg().Path() + "." + n.Obj().Name()
}

var anyType = reflect.TypeFor[any]()

var basicKinds = map[types.BasicKind]reflect.Kind{
	types.Bool: reflect.Bool, types.Int: reflect.Int, types.Int8: reflect.Int8, types.Int16: reflect.Int16, types.Int32: reflect.Int32,
	types.Int64: reflect.Int64, types.Uint: reflect.Uint, types.Uint8: reflect.Uint8, types.Uint16: reflect.Uint16,
	types.Uint32: reflect.Uint32, types.Uint64: reflect.Uint64, types.Uintptr: reflect.Uintptr, types.Float32: reflect.Float32,
	types.Float64: reflect.Float64, types.Complex64: reflect.Complex64, types.Complex128: reflect.Complex128, types.String: reflect.String,
	types.UntypedBool: reflect.Bool, types.UntypedInt: reflect.Int, types.UntypedRune: reflect.Int32, types.UntypedFloat: reflect.Float64,
	types.UntypedComplex: reflect.Complex128, types.UntypedString: reflect.String,
}

var basicReflect = map[reflect.Kind]reflect.Type{
	reflect.Bool: reflect.TypeFor[bool](), reflect.Int: reflect.TypeFor[int](), reflect.Int8: reflect.TypeFor[int8](),
	reflect.Int16: reflect.TypeFor[int16](), reflect.Int32: reflect.TypeFor[int32](), reflect.Int64: reflect.TypeFor[int64](),
	reflect.Uint: reflect.TypeFor[uint](), reflect.Uint8: reflect.TypeFor[uint8](), reflect.Uint16: reflect.TypeFor[uint16](),
	reflect.Uint32: reflect.TypeFor[uint32](), reflect.Uint64: reflect.TypeFor[uint64](), reflect.Uintptr: reflect.TypeFor[uintptr](),
	reflect.Float32: reflect.TypeFor[float32](), reflect.Float64: reflect.TypeFor[float64](), reflect.Complex64: reflect.TypeFor[complex64](),
	reflect.Complex128: reflect.TypeFor[complex128](), reflect.String: reflect.TypeFor[string](),
}

// reflectType is the compiled type behind one that mentions no cell's type, or nil where there is none.
func (l *lowerer) reflectType(t types.Type) reflect.Type {
	t = types.Unalias(l.sub(t))
	if types.IsInterface(t) && l.dynamic(t) {
		return anyType
	}
	switch t := t.(type) {
	case *types.Basic:
		return basicReflect[basicKinds[t.Kind()]]
	case *types.Named:
		return l.namedReflect(t)
	case *types.Pointer:
		if e := l.reflectType(t.Elem()); e != nil {
			return reflect.PointerTo(e)
		}
	case *types.Slice:
		if e := l.reflectType(t.Elem()); e != nil {
			return reflect.SliceOf(e)
		}
	case *types.Array:
		if e := l.reflectType(t.Elem()); e != nil {
			return reflect.ArrayOf(int(t.Len()), e)
		}
	case *types.Map:
		if k, e := l.reflectType(t.Key()), l.reflectType(t.Elem()); k != nil && e != nil {
			return reflect.MapOf(k, e)
		}
	case *types.Chan:
		if e := l.reflectType(t.Elem()); e != nil {
			return reflect.ChanOf(reflect.BothDir, e)
		}
	case *types.Signature:
		in, out := l.reflectTypes(t.Params()), l.reflectTypes(t.Results())
		if in != nil && out != nil {
			return reflect.FuncOf(in, out, t.Variadic())
		}
	case *types.Struct:
		return l.structReflect(t)
	}
	return nil
}

func (l *lowerer) namedReflect(t *types.Named) reflect.Type {
	if t.Obj().Pkg() == nil {
		return reflect.TypeFor[error]()
	}
	if t.Obj().Pkg() == l.u.pkg {
		return nil
	}
	p := t.Obj().Pkg()
	if v, ok := symbols.Of(path.Join(p.Path(), p.Name()))[t.Obj().Name()]; ok && t.TypeArgs().Len() == 0 {
		return v.Type().Elem()
	}
	if p.Path() == "iter" {
		return l.reflectType(t.Underlying())
	}
	return nil
}

func (l *lowerer) reflectTypes(t *types.Tuple) []reflect.Type {
	out := make([]reflect.Type, 0, t.Len())
	for v := range t.Variables() {
		r := l.reflectType(v.Type())
		if r == nil {
			return nil
		}
		out = append(out, r)
	}
	return out
}

func (l *lowerer) structReflect(t *types.Struct) reflect.Type {
	fields := make([]reflect.StructField, t.NumFields())
	for i := range fields {
		f := t.Field(i)
		ft := l.reflectType(f.Type())
		if ft == nil || !f.Exported() {
			return nil
		}
		fields[i] = reflect.StructField{Name: f.Name(), Type: ft, Tag: reflect.StructTag(t.Tag(i))}
	}
	return reflect.StructOf(fields)
}

// registerMethods tells the runtime types of this unit, and those whose methods changed, which functions are their methods.
func (e *emitter) registerMethods() {
	for _, name := range e.u.pkg.Scope().Names() {
		tn, ok := e.u.pkg.Scope().Lookup(name).(*types.TypeName)
		if !ok || tn.IsAlias() {
			continue
		}
		n, ok := tn.Type().(*types.Named)
		if !ok || n.TypeParams().Len() > 0 || types.IsInterface(n) {
			continue
		}
		e.function(nil).registerType(n)
	}
	for {
		before := len(e.registered)
		for _, r := range e.pendingTypes {
			if types.IsInterface(r) {
				continue
			}
			e.function(nil).registerType(r)
		}
		if len(e.registered) == before {
			return
		}
	}
}

// registerType registers all methods of a cell's type that the interpreter could be asked for by name.
func (l *lowerer) registerType(n *types.Named) {
	key := l.typeKey(n)
	if l.registered[key] {
		return
	}
	l.registered[key] = true
	d := l.u.objs[n.Origin().Obj()]
	r := l.u.s.rtypes.byKey(key)
	isNew := l.regs[key] != nil || r == nil || d != nil && l.u.fresh[d]
	ms := types.NewMethodSet(types.NewPointer(n))
	for i := range ms.Len() {
		sel := ms.At(i)
		fn := sel.Obj().(*types.Func)
		if own := l.u.objs[fn.Origin()]; !isNew && (own == nil || !l.u.fresh[own]) {
			continue
		}
		r = l.runtimeType(n)
		l.registerMethod(r, n, fn, sel)
	}
}

func (l *lowerer) registerMethod(r *rtype, n *types.Named, fn *types.Func, sel *types.Selection) {
	sig := sel.Type().(*types.Signature)
	byValue := types.NewMethodSet(n).Lookup(fn.Pkg(), fn.Name()) != nil
	recv := types.Type(n)
	if !byValue {
		recv = types.NewPointer(n)
	}
	full := types.NewSignatureType(nil, nil, nil, prepend(recv, sig.Params()), sig.Results(), sig.Variadic())
	lit := l.forward(full, func(args []ast.Expr, ellipsis bool) *ast.CallExpr {
		tg := l.method(args[0], recv, fn.Name(), fn.Pkg())
		return spread(l.callTarget(tg, args[1:], sig), ellipsis)
	})
	l.prolog = append(l.prolog, exprStmt(hostCall("Register", intLit(r.id), strLit(fn.Name()), strLit(l.typeKey(stripRecv(sig))),
		ast.NewIdent(strconv.FormatBool(!byValue)), lit)))
}

func stripRecv(sig *types.Signature) *types.Signature {
	return types.NewSignatureType(nil, nil, nil, sig.Params(), sig.Results(), sig.Variadic())
}

func prepend(t types.Type, params *types.Tuple) *types.Tuple {
	vars := []*types.Var{types.NewParam(0, nil, "", t)}
	for v := range params.Variables() {
		vars = append(vars, types.NewParam(0, nil, "", v.Type()))
	}
	return types.NewTuple(vars...)
}
