package tape

import (
	"go/ast"
	"go/types"
)

// A kind says what a value of the recorder is.
type kind uint8

const (
	kNone    kind = iota
	kFloat        // n is a node
	kInt          // n is the value, of any integer type
	kBool         // n is 0 or 1
	kTruth        // n is a node: a condition on floats
	kString       // ref is a string
	kGroup        // ref is a *group: a struct or an array
	kSlice        // ref is a *slice
	kPointer      // ref is a *cell
	kFunc         // ref is a *closure
	kFace         // ref is a *face: an interface that is not nil
	kNil          // of any type that has it
	kTuple        // ref is a []value: several results
)

// A value is what an expression has: a symbol for floats, the thing itself for
// the rest.
type value struct {
	kind kind
	n    int64
	ref  any
}

func float(id int32) value  { return value{kind: kFloat, n: int64(id)} }
func integer(n int64) value { return value{kind: kInt, n: n} }
func (v value) id() int32   { return int32(v.n) }

func boolean(b bool) value {
	if b {
		return value{kind: kBool, n: 1}
	}
	return value{kind: kBool}
}

// A cell is a variable, or a part of one. Structs and arrays have a cell for
// each part, and keep their group for life: assignment goes part by part.
type cell struct {
	v       value
	stamp   int32 // journal that knows the old value
	outside bool  // belongs to the session: not to be written
}

type group struct{ cells []cell }

type slice struct {
	base          *group
	off, len, cap int
}

func (s *slice) at(i int) *cell { return &s.base.cells[s.off+i] }

// A closure is a function value.
type closure struct {
	decl *ast.FuncDecl
	lit  *ast.FuncLit
	env  map[types.Object]*cell // what lit sees of its surroundings
	math string                 // a function of package math
	recv *value                 // bound receiver of a method value
	expr bool                   // T.method: the receiver is the first argument
	sig  *types.Signature
}

// A face is the content of an interface.
type face struct {
	typ types.Type
	v   value
}

// copyOf returns a value that shares no cells with v.
func (r *recorder) copyOf(v value) value {
	switch v.kind {
	case kGroup:
		from := v.ref.(*group)
		to := r.newGroup(len(from.cells))
		for i := range from.cells {
			to.cells[i].v = r.copyOf(from.cells[i].v)
		}
		return value{kind: kGroup, ref: to}
	case kTuple:
		from := v.ref.([]value)
		to := make([]value, len(from))
		for i := range from {
			to[i] = r.copyOf(from[i])
		}
		return value{kind: kTuple, ref: to}
	}
	return v
}

func (r *recorder) newGroup(n int) *group {
	g := &group{cells: make([]cell, n)}
	if s := r.serial(); s != 0 {
		for i := range g.cells {
			g.cells[i].stamp = s
		}
	}
	return g
}

func (r *recorder) newCell(v value) *cell { return &cell{v: v, stamp: r.serial()} }

// assign stores v in c, part by part for structs and arrays.
func (r *recorder) assign(at ast.Node, c *cell, v value) {
	if v.kind == kGroup && c.v.kind == kGroup {
		from, to := v.ref.(*group), c.v.ref.(*group)
		if from == to {
			return
		}
		for i := range to.cells {
			r.assign(at, &to.cells[i], from.cells[i].v)
		}
		return
	}
	if c.outside {
		r.refuse(at, "the model writes to a variable outside of it")
	}
	r.set(c, v)
}

// zero returns the zero value of a type.
func (r *recorder) zero(at ast.Node, t types.Type) value {
	switch u := t.Underlying().(type) {
	case *types.Basic:
		return r.zeroBasic(at, u)
	case *types.Struct:
		g := r.newGroup(u.NumFields())
		for i := range g.cells {
			if u.Field(i).Name() != "_" {
				g.cells[i].v = r.zero(at, u.Field(i).Type())
			}
		}
		return value{kind: kGroup, ref: g}
	case *types.Array:
		return value{kind: kGroup, ref: r.zeros(at, u.Elem(), int(u.Len()))}
	case *types.Slice, *types.Pointer, *types.Signature, *types.Interface, *types.Map, *types.Chan:
		return value{kind: kNil}
	}
	r.refuse(at, "a value of type %s cannot be recorded", r.typeName(t))
	return value{}
}

func (r *recorder) zeros(at ast.Node, elem types.Type, n int) *group {
	r.work(at, n)
	g := r.newGroup(n)
	if _, basic := elem.Underlying().(*types.Basic); basic && n > 0 {
		v := r.zero(at, elem)
		for i := range g.cells {
			g.cells[i].v = v
		}
		return g
	}
	for i := range g.cells {
		g.cells[i].v = r.zero(at, elem)
	}
	return g
}

func (r *recorder) zeroBasic(at ast.Node, u *types.Basic) value {
	info := u.Info()
	switch {
	case u.Kind() == types.Float64 || u.Kind() == types.UntypedFloat:
		return float(r.g.constant(0))
	case info&types.IsInteger != 0:
		return integer(0)
	case info&types.IsBoolean != 0:
		return boolean(false)
	case info&types.IsString != 0:
		return value{kind: kString, ref: ""}
	case u.Kind() == types.UntypedNil:
		return value{kind: kNil}
	}
	r.refuse(at, "%s", unsupported(u))
	return value{}
}

// unsupported says why a basic type has no symbols.
func unsupported(u *types.Basic) string {
	switch {
	case u.Kind() == types.Float32:
		return "arithmetic in float32 cannot be recorded; use float64"
	case u.Info()&types.IsComplex != 0:
		return "complex numbers cannot be recorded"
	}
	return "a value of type " + u.Name() + " cannot be recorded"
}

func (r *recorder) typeName(t types.Type) string {
	return types.TypeString(t, func(p *types.Package) string {
		if p.Path() == "model" || p.Path() == "main" {
			return ""
		}
		return p.Name()
	})
}
