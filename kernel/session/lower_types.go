package session

import (
	"go/ast"
	"go/token"
	"go/types"
	"path"
	"slices"
	"strconv"
	"strings"

	"brinkline/kernel/session/internal/symbols"
)

// sub replaces type parameters by the type arguments of the instance being lowered.
func (l *lowerer) sub(t types.Type) types.Type {
	if len(l.subst) == 0 || t == nil {
		return t
	}
	return substitute(t, l.subst)
}

func substitute(t types.Type, m map[*types.TypeParam]types.Type) types.Type {
	s := func(t types.Type) types.Type { return substitute(t, m) }
	tuple := func(t *types.Tuple) *types.Tuple {
		vars := make([]*types.Var, t.Len())
		for i := range vars {
			v := t.At(i)
			vars[i] = types.NewParam(v.Pos(), v.Pkg(), v.Name(), s(v.Type()))
		}
		return types.NewTuple(vars...)
	}
	switch t := t.(type) {
	case *types.TypeParam:
		if r, ok := m[t]; ok {
			return r
		}
	case *types.Alias:
		return s(types.Unalias(t))
	case *types.Pointer:
		return types.NewPointer(s(t.Elem()))
	case *types.Slice:
		return types.NewSlice(s(t.Elem()))
	case *types.Array:
		return types.NewArray(s(t.Elem()), t.Len())
	case *types.Map:
		return types.NewMap(s(t.Key()), s(t.Elem()))
	case *types.Chan:
		return types.NewChan(t.Dir(), s(t.Elem()))
	case *types.Tuple:
		return tuple(t)
	case *types.Signature:
		return types.NewSignatureType(nil, nil, nil, tuple(t.Params()), tuple(t.Results()), t.Variadic())
	case *types.Struct:
		fields := make([]*types.Var, t.NumFields())
		tags := make([]string, t.NumFields())
		for i := range fields {
			f := t.Field(i)
			fields[i], tags[i] = types.NewField(f.Pos(), f.Pkg(), f.Name(), s(f.Type()), f.Embedded()), t.Tag(i)
		}
		return types.NewStruct(fields, tags)
	case *types.Named:
		args := t.TypeArgs()
		if args.Len() == 0 {
			return t
		}
		list := make([]types.Type, args.Len())
		for i := range list {
			list[i] = s(args.At(i))
		}
		inst, err := types.Instantiate(nil, t.Origin(), list, false)
		if err == nil {
			return inst
		}
	case *types.Interface:
		if t.NumMethods() == 0 {
			return t
		}
		var methods []*types.Func
		for f := range t.Methods() {
			methods = append(methods, types.NewFunc(f.Pos(), f.Pkg(), f.Name(), s(f.Type()).(*types.Signature)))
		}
		return types.NewInterfaceType(methods, nil).Complete()
	}
	return t
}

// isDynamic reports whether an interface type is an any in lowered code: all but those that compiled packages name.
func isDynamic(t types.Type, own *types.Package) bool {
	t = types.Unalias(t)
	if !types.IsInterface(t) {
		return false
	}
	n, ok := t.(*types.Named)
	if !ok {
		return true
	}
	if n.Obj().Pkg() == nil {
		return n.Obj().Name() != "error"
	}
	return n.Obj().Pkg() == own || t.Underlying().(*types.Interface).NumMethods() == 0
}

func (l *lowerer) dynamic(t types.Type) bool { return isDynamic(t, l.u.pkg) }

// real reports whether an interface type stays what it is: error and those that compiled packages name.
func (l *lowerer) real(t types.Type) bool { return types.IsInterface(t) && !l.dynamic(t) }

// typ writes a type in lowered code.
func (l *lowerer) typ(t types.Type) ast.Expr {
	t = types.Unalias(l.sub(t))
	if types.IsInterface(t) && l.dynamic(t) {
		return &ast.InterfaceType{Methods: &ast.FieldList{}}
	}
	switch t := t.(type) {
	case *types.Basic:
		return ast.NewIdent(basicName(t))
	case *types.Named:
		return l.namedType(t)
	case *types.Pointer:
		return &ast.StarExpr{X: l.typ(t.Elem())}
	case *types.Slice:
		return &ast.ArrayType{Elt: l.typ(t.Elem())}
	case *types.Array:
		return &ast.ArrayType{Len: intLit(int(t.Len())), Elt: l.typ(t.Elem())}
	case *types.Map:
		return &ast.MapType{Key: l.typ(t.Key()), Value: l.typ(t.Elem())}
	case *types.Chan:
		return &ast.ChanType{Dir: chanDir(t.Dir()), Value: l.typ(t.Elem())}
	case *types.Signature:
		return l.funcType(t)
	case *types.Struct:
		return l.structType(t)
	}
	return &ast.InterfaceType{Methods: &ast.FieldList{}}
}

func basicName(t *types.Basic) string {
	d := types.Default(t).(*types.Basic)
	if d.Kind() == types.UntypedNil || d.Kind() == types.Invalid {
		return "any"
	}
	return types.Typ[d.Kind()].Name()
}

func chanDir(d types.ChanDir) ast.ChanDir {
	switch d {
	case types.SendOnly:
		return ast.SEND
	case types.RecvOnly:
		return ast.RECV
	}
	return ast.SEND | ast.RECV
}

func (l *lowerer) funcType(t *types.Signature) *ast.FuncType {
	params, results := &ast.FieldList{}, &ast.FieldList{}
	for i := range t.Params().Len() {
		pt := t.Params().At(i).Type()
		if t.Variadic() && i == t.Params().Len()-1 {
			params.List = append(params.List, &ast.Field{Type: &ast.Ellipsis{Elt: l.typ(pt.(*types.Slice).Elem())}})
			continue
		}
		params.List = append(params.List, &ast.Field{Type: l.typ(pt)})
	}
	for v := range t.Results().Variables() {
		results.List = append(results.List, &ast.Field{Type: l.typ(v.Type())})
	}
	return &ast.FuncType{Params: params, Results: results}
}

func (l *lowerer) structType(t *types.Struct) ast.Expr {
	fl := &ast.FieldList{}
	for i := range t.NumFields() {
		f := t.Field(i)
		field := &ast.Field{Names: []*ast.Ident{ast.NewIdent(fieldName(t, i))}, Type: l.typ(f.Type())}
		if tag := t.Tag(i); tag != "" {
			field.Tag = &ast.BasicLit{Kind: token.STRING, Value: strconv.Quote(tag)}
		}
		fl.List = append(fl.List, field)
	}
	return &ast.StructType{Fields: fl}
}

// fieldName is the name of a field in lowered code: blank ones get names, for the interpreter takes one only once.
func fieldName(t *types.Struct, i int) string {
	if n := t.Field(i).Name(); n != "_" {
		return n
	}
	return "blank" + mark + strconv.Itoa(i)
}

func (l *lowerer) namedType(t *types.Named) ast.Expr {
	obj := t.Obj()
	if obj.Pkg() == nil {
		return ast.NewIdent(obj.Name()) // error
	}
	if obj.Pkg() == l.u.pkg {
		return ast.NewIdent(l.ownType(t))
	}
	if t.TypeArgs().Len() > 0 {
		if p := obj.Pkg().Path(); p == "iter" {
			return l.typ(t.Underlying())
		}
		l.fail(token.NoPos, "the generic type %s of a compiled package cannot be used in cells", types.TypeString(t, shortQualifier))
	}
	if !obj.Exported() {
		l.fail(token.NoPos, "the type %s cannot be used in cells", types.TypeString(t, shortQualifier))
	}
	return l.symbol(obj)
}

func shortQualifier(p *types.Package) string { return p.Name() }

// symbol refers to a name of a compiled package and makes it known to the interpreter.
func (l *lowerer) symbol(obj types.Object) ast.Expr {
	p := obj.Pkg()
	name := hiddenOfPath(p.Path()) + mark + "x" + obj.Name()
	if !l.u.s.offer(name, path.Join(p.Path(), p.Name()), obj.Name()) {
		l.fail(token.NoPos, "%s.%s cannot be used in cells", p.Name(), obj.Name())
	}
	return host(name)
}

// offer makes a compiled value known to the interpreter under an internal name.
func (s *Session) offer(name, table, symbol string) bool {
	if s.offered[name] {
		return true
	}
	v, ok := s.override[table+"."+symbol]
	if !ok {
		if v, ok = symbols.Of(table)[symbol]; !ok {
			return false
		}
	}
	if err := s.useSymbol(name, v); err != nil {
		return false
	}
	s.offered[name] = true
	return true
}

// ownType is the internal name of a type made in cells; it is emitted when this unit brings it.
func (l *lowerer) ownType(t *types.Named) string {
	d := l.u.objs[t.Origin().Obj()]
	name := ""
	switch {
	case d == nil:
		name = l.localType(t)
	case t.TypeArgs().Len() > 0:
		key := l.argsKey(t.TypeArgs())
		known := d.instances[key]
		if known != "" {
			l.pendingTypes = append(l.pendingTypes, l.sub(t).(*types.Named))
			return known
		}
		name = d.internal() + mark + "i" + strconv.Itoa(l.u.s.nextIndex())
		l.newInstance(d, key, name)
	default:
		name = d.internal()
		if !l.u.fresh[d] {
			return name
		}
	}
	if l.types[name] {
		return name
	}
	if refersToItself(t) {
		l.fail(l.definedAt(t), "the type %s refers to itself other than through a struct; cells cannot run that: put it in a struct",
			t.Obj().Name())
	}
	l.types[name] = true
	if !types.IsInterface(t) && (t.TypeArgs().Len() > 0 || d == nil) {
		l.pendingTypes = append(l.pendingTypes, l.sub(t).(*types.Named))
	}
	spec := &ast.TypeSpec{Name: ast.NewIdent(name)}
	l.decls = append(l.decls, &ast.GenDecl{Tok: token.TYPE, Specs: []ast.Spec{spec}})
	spec.Type = l.typ(t.Underlying())
	return name
}

// definedAt is the position of a type's definition.
func (l *lowerer) definedAt(t *types.Named) token.Pos { return t.Origin().Obj().Pos() }

// refersToItself reports whether a type is part of itself without a struct or interface in between. The interpreter cannot build such
// types and, of some, would never stop trying.
func refersToItself(t *types.Named) bool {
	seen := map[string]bool{}
	var visit func(types.Type) bool
	visit = func(u types.Type) bool {
		switch u := types.Unalias(u).(type) {
		case *types.Named:
			if u.Origin() == t.Origin() {
				return true
			}
			key := types.TypeString(u, nil)
			if seen[key] {
				return false
			}
			seen[key] = true
			return visit(u.Underlying())
		case *types.Pointer:
			return visit(u.Elem())
		case *types.Slice:
			return visit(u.Elem())
		case *types.Array:
			return visit(u.Elem())
		case *types.Map:
			return visit(u.Key()) || visit(u.Elem())
		case *types.Chan:
			return visit(u.Elem())
		case *types.Signature:
			return visit(u.Params()) || visit(u.Results())
		case *types.Tuple:
			for v := range u.Variables() {
				if visit(v.Type()) {
					return true
				}
			}
		}
		return false
	}
	return visit(t.Underlying())
}

// localType names a type declared within a function.
func (l *lowerer) localType(t *types.Named) string {
	key := localKey{t.Origin().Obj(), l.argsKey(t.TypeArgs())}
	for _, a := range sortedParams(l.subst) {
		if sc := a.Obj().Parent(); sc == nil || !sc.Contains(t.Origin().Obj().Pos()) {
			continue // not declared within that function
		}
		key.args += "/" + l.typeKey(l.subst[a])
	}
	if n := l.localNames[key]; n != "" {
		return n
	}
	n := t.Obj().Name() + mark + strconv.Itoa(l.u.s.nextIndex())
	l.localNames[key] = n
	return n
}

// localKey tells instances of a type declared in a generic function apart.
type localKey struct {
	obj  *types.TypeName
	args string
}

func sortedParams(m map[*types.TypeParam]types.Type) []*types.TypeParam {
	var out []*types.TypeParam
	for p := range m {
		out = append(out, p)
	}
	slices.SortFunc(out, func(a, b *types.TypeParam) int { return int(a.Obj().Pos()) - int(b.Obj().Pos()) })
	return out
}

func (l *lowerer) argsKey(args *types.TypeList) string {
	var b strings.Builder
	for i := range args.Len() {
		b.WriteString(l.typeKey(args.At(i)))
		b.WriteByte(';')
	}
	return b.String()
}

// typeKey writes a type so that two types have the same key exactly when they are identical, also across cells.
func (l *lowerer) typeKey(t types.Type) string {
	return types.TypeString(l.rekey(l.sub(t)), func(p *types.Package) string {
		if p == l.u.pkg {
			return ""
		}
		return p.Path()
	})
}

// rekey replaces cell types by ones that carry their internal name.
func (l *lowerer) rekey(t types.Type) types.Type {
	r := l.rekey
	switch t := t.(type) {
	case *types.Alias:
		return r(types.Unalias(t))
	case *types.Named:
		if t.Obj().Pkg() != l.u.pkg {
			return t
		}
		name := ""
		if d := l.u.objs[t.Origin().Obj()]; d != nil {
			name = d.internal()
		} else {
			name = l.localType(t)
		}
		if args := t.TypeArgs(); args.Len() > 0 {
			name += "[" + l.argsKey(args) + "]"
		}
		return types.NewNamed(types.NewTypeName(0, nil, name, nil), types.Typ[types.Int], nil)
	case *types.Pointer:
		return types.NewPointer(r(t.Elem()))
	case *types.Slice:
		return types.NewSlice(r(t.Elem()))
	case *types.Array:
		return types.NewArray(r(t.Elem()), t.Len())
	case *types.Map:
		return types.NewMap(r(t.Key()), r(t.Elem()))
	case *types.Chan:
		return types.NewChan(t.Dir(), r(t.Elem()))
	case *types.Signature:
		return types.NewSignatureType(nil, nil, nil, l.rekeyTuple(t.Params()), l.rekeyTuple(t.Results()), t.Variadic())
	case *types.Struct:
		fields := make([]*types.Var, t.NumFields())
		tags := make([]string, t.NumFields())
		for i := range fields {
			f := t.Field(i)
			fields[i], tags[i] = types.NewField(0, f.Pkg(), f.Name(), r(f.Type()), f.Embedded()), t.Tag(i)
		}
		return types.NewStruct(fields, tags)
	case *types.Interface:
		var ms []*types.Func
		for f := range t.Methods() {
			ms = append(ms, types.NewFunc(0, f.Pkg(), f.Name(), r(f.Type()).(*types.Signature)))
		}
		return types.NewInterfaceType(ms, nil).Complete()
	}
	return t
}

func (l *lowerer) rekeyTuple(t *types.Tuple) *types.Tuple {
	vars := make([]*types.Var, t.Len())
	for i := range vars {
		vars[i] = types.NewParam(0, nil, "", l.rekey(t.At(i).Type()))
	}
	return types.NewTuple(vars...)
}

// mentionsOwn reports whether a type mentions a type made in cells, so that it needs a box to be recognised at run time.
func (l *lowerer) mentionsOwn(t types.Type) bool { return mentionsOwn(l.sub(t), l.u.pkg, 0) }

func mentionsOwn(t types.Type, own *types.Package, depth int) bool {
	if depth > 20 {
		return false
	}
	m := func(t types.Type) bool { return mentionsOwn(t, own, depth+1) }
	switch t := types.Unalias(t).(type) {
	case *types.Named:
		if t.Obj().Pkg() == own {
			return true
		}
		for a := range t.TypeArgs().Types() {
			if m(a) {
				return true
			}
		}
	case *types.Pointer:
		return m(t.Elem())
	case *types.Slice:
		return m(t.Elem())
	case *types.Array:
		return m(t.Elem())
	case *types.Map:
		return m(t.Key()) || m(t.Elem())
	case *types.Chan:
		return m(t.Elem())
	case *types.Signature:
		return m(t.Params()) || m(t.Results())
	case *types.Tuple:
		for v := range t.Variables() {
			if m(v.Type()) {
				return true
			}
		}
	case *types.Struct:
		for f := range t.Fields() {
			if !f.Exported() || m(f.Type()) {
				return true
			}
		}
	case *types.Interface:
		return t.NumMethods() > 0
	}
	return false
}
