package session

import (
	"go/ast"
	"go/types"
	"strconv"
)

// instance names the instance of a generic function and sees to it that it exists.
func (l *lowerer) instance(fn *types.Func, args *types.TypeList) ast.Expr {
	d := l.genericDef(fn)
	if d == nil {
		l.fail(fn.Pos(), "the generic function %s cannot be used in cells", fn.FullName())
	}
	list := make([]types.Type, args.Len())
	for i := range list {
		list[i] = l.sub(args.At(i))
	}
	key := ""
	for _, t := range list {
		key += l.typeKey(t) + ";"
	}
	if n := d.instances[key]; n != "" {
		return ast.NewIdent(n)
	}
	name := d.internal() + mark + "i" + strconv.Itoa(l.u.s.nextIndex())
	l.newInstance(d, key, name)
	decl := l.u.decls[d].(*ast.FuncDecl)
	subst := bindParams(l.u.info.Defs[decl.Name].(*types.Func).Type().(*types.Signature).TypeParams(), list)
	l.queue = append(l.queue, func() {
		in := l.function(subst)
		in.quiet = d.prelude
		l.decls = append(l.decls, in.funcDecl(decl, name))
	})
	return ast.NewIdent(name)
}

// newInstance records an instance; it is taken back when the unit does not come to run.
func (l *lowerer) newInstance(d *def, key, name string) {
	d.instances[key] = name
	l.u.undo = append(l.u.undo, func() { delete(d.instances, key) })
}

func bindParams(params *types.TypeParamList, args []types.Type) map[*types.TypeParam]types.Type {
	m := map[*types.TypeParam]types.Type{}
	for i := range params.Len() {
		m[params.At(i)] = args[i]
	}
	return m
}

// genericDef finds the source of a generic function: a cell's, or the session's own for the library's.
func (l *lowerer) genericDef(fn *types.Func) *def {
	if fn.Pkg() == l.u.pkg {
		return l.u.objs[fn.Origin()]
	}
	return l.u.s.prelude[fn.Pkg().Path()+"."+fn.Name()]
}

// methodInstance names a method of an instance of a generic type.
func (l *lowerer) methodInstance(d *def, origin *types.Func, recv *types.Named) string {
	key := l.argsKey(recv.TypeArgs())
	if n := d.instances[key]; n != "" {
		return n
	}
	name := d.internal() + mark + "i" + strconv.Itoa(l.u.s.nextIndex())
	l.newInstance(d, key, name)
	decl := l.u.decls[d].(*ast.FuncDecl)
	var list []types.Type
	for a := range recv.TypeArgs().Types() {
		list = append(list, l.sub(a))
	}
	subst := bindParams(l.u.info.Defs[decl.Name].(*types.Func).Type().(*types.Signature).RecvTypeParams(), list)
	l.queue = append(l.queue, func() {
		in := l.function(subst)
		l.decls = append(l.decls, in.funcDecl(decl, name))
	})
	return name
}
