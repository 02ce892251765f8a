package session

import (
	"go/ast"
	"go/token"
	"go/types"
	"strconv"
	"strings"
)

func quote(s string) string { return strconv.Quote(s) }

// Hidden package names carry the import path, so that no name of a cell can stand in their way.
const hiddenPackage = "pkg" + mark

func pathOfHidden(name string) string {
	p := strings.TrimPrefix(name, hiddenPackage)
	return strings.NewReplacer(mark+"s", "/", mark+"d", ".", mark+"h", "-").Replace(p)
}

func hiddenOfPath(path string) string {
	return hiddenPackage + strings.NewReplacer("/", mark+"s", ".", mark+"d", "-", mark+"h").Replace(path)
}

// typeExpr writes a type of this unit as an expression with the internal names of cell types, and lists these types.
func (u *unit) typeExpr(t types.Type) (ast.Expr, map[string]*def) {
	w := &typeWriter{unit: u, named: map[string]*def{}}
	return w.expr(t), w.named
}

type typeWriter struct {
	*unit
	named map[string]*def
}

func (w *typeWriter) expr(t types.Type) ast.Expr {
	switch t := t.(type) {
	case *types.Alias:
		return w.expr(types.Unalias(t))
	case *types.Basic:
		return ast.NewIdent(types.Default(t).String())
	case *types.Named:
		return w.namedExpr(t)
	case *types.Pointer:
		return &ast.StarExpr{X: w.expr(t.Elem())}
	case *types.Slice:
		return &ast.ArrayType{Elt: w.expr(t.Elem())}
	case *types.Array:
		return &ast.ArrayType{Len: &ast.BasicLit{Kind: token.INT, Value: strconv.FormatInt(t.Len(), 10)}, Elt: w.expr(t.Elem())}
	case *types.Map:
		return &ast.MapType{Key: w.expr(t.Key()), Value: w.expr(t.Elem())}
	case *types.Chan:
		dir := ast.SEND | ast.RECV
		switch t.Dir() {
		case types.SendOnly:
			dir = ast.SEND
		case types.RecvOnly:
			dir = ast.RECV
		}
		return &ast.ChanType{Dir: dir, Value: w.expr(t.Elem())}
	case *types.Signature:
		return w.signature(t)
	case *types.Struct:
		return w.structExpr(t)
	case *types.Interface:
		return w.interfaceExpr(t)
	}
	return ast.NewIdent("any")
}

func (w *typeWriter) namedExpr(t *types.Named) ast.Expr {
	obj := t.Obj()
	var e ast.Expr
	switch {
	case obj.Pkg() == nil:
		e = ast.NewIdent(obj.Name())
	case w.objs[obj] != nil:
		d := w.objs[obj]
		w.named[d.internal()] = d
		e = ast.NewIdent(d.internal())
	case obj.Pkg() == w.pkg:
		return w.expr(t.Underlying()) // a type within a function: only its form is left
	default:
		e = &ast.SelectorExpr{X: ast.NewIdent(hiddenOfPath(obj.Pkg().Path())), Sel: ast.NewIdent(obj.Name())}
	}
	if args := t.TypeArgs(); args.Len() > 0 {
		list := make([]ast.Expr, args.Len())
		for i := range list {
			list[i] = w.expr(args.At(i))
		}
		return &ast.IndexListExpr{X: e, Indices: list}
	}
	return e
}

func (w *typeWriter) fields(t *types.Tuple, variadic bool) *ast.FieldList {
	fl := &ast.FieldList{}
	for i := range t.Len() {
		var e ast.Expr
		if variadic && i == t.Len()-1 {
			e = &ast.Ellipsis{Elt: w.expr(t.At(i).Type().(*types.Slice).Elem())}
		} else {
			e = w.expr(t.At(i).Type())
		}
		fl.List = append(fl.List, &ast.Field{Type: e})
	}
	return fl
}

func (w *typeWriter) signature(t *types.Signature) *ast.FuncType {
	return &ast.FuncType{Params: w.fields(t.Params(), t.Variadic()), Results: w.fields(t.Results(), false)}
}

func (w *typeWriter) structExpr(t *types.Struct) ast.Expr {
	fl := &ast.FieldList{}
	for i := range t.NumFields() {
		f := t.Field(i)
		field := &ast.Field{Type: w.expr(f.Type())}
		if !f.Embedded() {
			field.Names = []*ast.Ident{ast.NewIdent(f.Name())}
		}
		if tag := t.Tag(i); tag != "" {
			field.Tag = &ast.BasicLit{Kind: token.STRING, Value: quote(tag)}
		}
		fl.List = append(fl.List, field)
	}
	return &ast.StructType{Fields: fl}
}

func (w *typeWriter) interfaceExpr(t *types.Interface) ast.Expr {
	fl := &ast.FieldList{}
	for m := range t.Methods() {
		fl.List = append(fl.List, &ast.Field{Names: []*ast.Ident{ast.NewIdent(m.Name())}, Type: w.signature(m.Type().(*types.Signature))})
	}
	return &ast.InterfaceType{Methods: fl}
}

// currentNames copies a type expression and turns internal names of live types back into the plain ones.
func (u *unit) currentNames(e ast.Expr, named map[string]*def) ast.Expr {
	c := func(e ast.Expr) ast.Expr { return u.currentNames(e, named) }
	list := func(fl *ast.FieldList) *ast.FieldList {
		if fl == nil {
			return nil
		}
		out := &ast.FieldList{}
		for _, f := range fl.List {
			out.List = append(out.List, &ast.Field{Names: f.Names, Type: c(f.Type), Tag: f.Tag})
		}
		return out
	}
	switch e := e.(type) {
	case *ast.Ident:
		if d := named[e.Name]; d != nil {
			if u.next.defs[d.names[0]] == d {
				return ast.NewIdent(d.names[0])
			}
			u.s.old.add(d, nil)
		}
		return ast.NewIdent(e.Name)
	case *ast.StarExpr:
		return &ast.StarExpr{X: c(e.X)}
	case *ast.Ellipsis:
		return &ast.Ellipsis{Elt: c(e.Elt)}
	case *ast.ArrayType:
		return &ast.ArrayType{Len: e.Len, Elt: c(e.Elt)}
	case *ast.MapType:
		return &ast.MapType{Key: c(e.Key), Value: c(e.Value)}
	case *ast.ChanType:
		return &ast.ChanType{Dir: e.Dir, Value: c(e.Value)}
	case *ast.FuncType:
		return &ast.FuncType{Params: list(e.Params), Results: list(e.Results)}
	case *ast.StructType:
		return &ast.StructType{Fields: list(e.Fields)}
	case *ast.InterfaceType:
		return &ast.InterfaceType{Methods: list(e.Methods)}
	case *ast.IndexListExpr:
		out := &ast.IndexListExpr{X: c(e.X)}
		for _, a := range e.Indices {
			out.Indices = append(out.Indices, c(a))
		}
		return out
	}
	return e
}
