package tape

import (
	"go/ast"
	"go/types"
)

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
