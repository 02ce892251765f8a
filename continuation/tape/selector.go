package tape

import (
	"go/ast"
	"go/types"
)

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
