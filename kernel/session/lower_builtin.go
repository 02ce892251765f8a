package session

import (
	"go/ast"
	"go/token"
	"go/types"
)

// builtin lowers a call of a predeclared function.
func (l *lowerer) builtin(e *ast.CallExpr, fun ast.Expr) ast.Expr {
	name := ""
	switch f := fun.(type) {
	case *ast.Ident:
		name = f.Name
	case *ast.SelectorExpr:
		name = f.Sel.Name
	}
	if len(e.Args) == 1 {
		if tuple, ok := l.typeOf(e.Args[0]).(*types.Tuple); ok {
			return l.spreadBuiltin(name, e, tuple)
		}
	}
	switch name {
	case "append":
		return l.appendCall(e)
	case "make":
		return l.makeCall(e)
	case "new":
		return l.newCall(e)
	case "min", "max":
		return l.minMax(name, e)
	case "clear":
		return hostCall("Clear", l.expr(e.Args[0]))
	case "panic":
		return hostCall("Panic", l.exprTo(e.Args[0], types.NewInterfaceType(nil, nil)), intLit(l.position(e.Pos())))
	case "recover":
		return hostCall("Recovered", call(ast.NewIdent("recover")))
	case "print", "println":
		return hostCall(map[string]string{"print": "Print", "println": "Println"}[name], l.anyArgs(e.Args)...)
	case "delete":
		m := l.typeOf(e.Args[0]).Underlying().(*types.Map)
		return call(ast.NewIdent("delete"), l.expr(e.Args[0]), l.exprTo(e.Args[1], m.Key()))
	case "complex":
		return l.complexCall(e)
	case "len", "cap":
		return l.lenCall(name, e)
	case "copy":
		if b, ok := l.typeOf(e.Args[1]).Underlying().(*types.Basic); ok && b.Info()&types.IsString != 0 {
			bytes := call(&ast.ArrayType{Elt: ast.NewIdent("byte")}, l.expr(e.Args[1]))
			return call(ast.NewIdent("copy"), l.expr(e.Args[0]), bytes)
		}
	case "real", "imag":
		return call(ast.NewIdent(name), l.expr(e.Args[0]))
	}
	var args []ast.Expr
	for _, a := range e.Args {
		args = append(args, l.expr(a))
	}
	return call(ast.NewIdent(name), args...)
}

// spreadBuiltin lowers a predeclared function whose arguments are the results of one call.
func (l *lowerer) spreadBuiltin(name string, e *ast.CallExpr, tuple *types.Tuple) ast.Expr {
	names, stmt := l.spreadInto(e.Args[0], tuple)
	anyT := types.NewInterfaceType(nil, nil)
	var args []ast.Expr
	for i, n := range names {
		x := ast.Expr(ast.NewIdent(n))
		switch name {
		case "print", "println":
			x = l.convert(x, tuple.At(i).Type(), anyT)
		case "complex":
			x = call(ast.NewIdent("float64"), x)
		case "append":
			if i > 0 {
				x = l.convert(x, tuple.At(i).Type(), tuple.At(0).Type().Underlying().(*types.Slice).Elem())
			}
		}
		args = append(args, x)
	}
	fun := map[string]ast.Expr{"print": host("Print"), "println": host("Println"), "complex": host("Complex")}[name]
	if fun == nil {
		fun = ast.NewIdent(name)
	}
	if name == "print" || name == "println" {
		return closure(nil, stmt, exprStmt(call(fun, args...)))
	}
	t := l.typeOf(e)
	return closure([]ast.Expr{l.typ(t)}, stmt, &ast.ReturnStmt{Results: []ast.Expr{call(l.conversionFun(t), call(fun, args...))}})
}

func (l *lowerer) anyArgs(args []ast.Expr) []ast.Expr {
	var out []ast.Expr
	for _, a := range args {
		out = append(out, l.exprTo(a, types.NewInterfaceType(nil, nil)))
	}
	return out
}

func (l *lowerer) appendCall(e *ast.CallExpr) ast.Expr {
	t := l.typeOf(e)
	elem := t.Underlying().(*types.Slice).Elem()
	args := []ast.Expr{l.exprTo(e.Args[0], t)}
	if isNil(l.typeOf(e.Args[0])) {
		args[0] = l.zero(t)
	}
	if len(e.Args) > 2 {
		// The interpreter would evaluate later values after storing earlier ones.
		list := &ast.CompositeLit{Type: &ast.ArrayType{Elt: l.typ(elem)}}
		for _, a := range e.Args[1:] {
			list.Elts = append(list.Elts, l.exprTo(a, elem))
		}
		return spread(call(ast.NewIdent("append"), args[0], list), true)
	}
	for _, a := range e.Args[1:] {
		switch {
		case !e.Ellipsis.IsValid():
			args = append(args, l.exprTo(a, elem))
		case isNil(l.typeOf(a)):
			return args[0]
		default:
			x := l.expr(a)
			if b, ok := l.typeOf(a).Underlying().(*types.Basic); ok && b.Info()&types.IsString != 0 {
				x = call(&ast.ArrayType{Elt: ast.NewIdent("byte")}, x)
			}
			args = append(args, x)
		}
	}
	return spread(call(ast.NewIdent("append"), args...), e.Ellipsis.IsValid())
}

func (l *lowerer) makeCall(e *ast.CallExpr) ast.Expr {
	args := []ast.Expr{l.typ(l.typeOf(e))}
	if ch, ok := l.typeOf(e).Underlying().(*types.Chan); ok && ch.Dir() != types.SendRecv {
		args[0] = l.typ(types.NewChan(types.SendRecv, ch.Elem()))
	}
	for _, a := range e.Args[1:] {
		x := l.expr(a)
		if l.u.info.Types[a].Value != nil {
			x = l.constant(l.u.info.Types[a].Value, types.Typ[types.Int], false)
		} else if !types.Identical(l.typeOf(a), types.Typ[types.Int]) {
			x = call(ast.NewIdent("int"), x)
		}
		if s, ok := l.typeOf(e).Underlying().(*types.Slice); ok {
			x = hostCall("NeedRoom", x, intLit(int(sizes.Sizeof(s.Elem()))))
		}
		args = append(args, x)
	}
	return call(ast.NewIdent("make"), args...)
}

var sizes = types.SizesFor("gc", "amd64")

// newCall lowers new(T) and new(value).
func (l *lowerer) newCall(e *ast.CallExpr) ast.Expr {
	if l.u.info.Types[e.Args[0]].IsType() {
		return call(ast.NewIdent("new"), l.typ(l.typeOf(e.Args[0])))
	}
	p := l.typeOf(e).(*types.Pointer)
	v := l.temp("n")
	return closure([]ast.Expr{l.typ(p)}, varStmt(v, l.typ(p.Elem()), l.exprTo(e.Args[0], p.Elem())),
		&ast.ReturnStmt{Results: []ast.Expr{&ast.UnaryExpr{Op: token.AND, X: ast.NewIdent(v)}}})
}

// minMax lowers min and max by way of the widest type of the same kind.
func (l *lowerer) minMax(name string, e *ast.CallExpr) ast.Expr {
	t := l.typeOf(e)
	b := t.Underlying().(*types.Basic)
	wide, suffix := "string", "String"
	switch info := b.Info(); {
	case info&types.IsFloat != 0:
		wide, suffix = "float64", "Float"
	case info&types.IsUnsigned != 0:
		wide, suffix = "uint64", "Uint"
	case info&types.IsInteger != 0:
		wide, suffix = "int64", "Int"
	}
	var args []ast.Expr
	for _, a := range e.Args {
		args = append(args, call(ast.NewIdent(wide), l.exprTo(a, t)))
	}
	host := map[string]string{"min": "Min", "max": "Max"}[name] + suffix
	return call(l.conversionFun(t), hostCall(host, args...))
}

func (l *lowerer) complexCall(e *ast.CallExpr) ast.Expr {
	t := l.typeOf(e)
	part := types.Typ[types.Float64]
	c := hostCall("Complex", call(ast.NewIdent("float64"), l.exprTo(e.Args[0], part)), call(ast.NewIdent("float64"), l.exprTo(e.Args[1], part)))
	if b := t.Underlying().(*types.Basic); b.Kind() == types.Complex128 && types.Unalias(t) == b {
		return c
	}
	return call(l.conversionFun(t), c)
}

// lenCall lowers len and cap; of a pointer to an array they are the array's.
func (l *lowerer) lenCall(name string, e *ast.CallExpr) ast.Expr {
	if p, ok := l.typeOf(e.Args[0]).Underlying().(*types.Pointer); ok {
		return intLit(int(p.Elem().Underlying().(*types.Array).Len()))
	}
	return call(ast.NewIdent(name), l.expr(e.Args[0]))
}
