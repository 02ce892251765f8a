package tape

import (
	"go/ast"
	"go/types"
	"math"
	"reflect"
	"slices"
)

// A hidden parameter is a float64 outside of the model that the model reads.
type hidden struct {
	name string
	at   *float64
}

// A watch notices that something outside of the model, which the tape took as
// it stood, has changed.
type watch struct {
	name    string
	changed func() bool
}

// outside finds the cell of a variable that is declared outside of what is being
// recorded.
func (r *recorder) outside(at ast.Node, v *types.Var) *cell {
	if c := r.outer[v]; c != nil {
		return c
	}
	if r.src.Variable == nil {
		r.refuse(at, "the variable %s is not part of the model; pass it as a parameter or make it a constant", v.Name())
	}
	rv, err := r.src.Variable(v)
	if err != nil {
		r.refuse(at, "%s", err)
	}
	c := &cell{v: r.imported(v.Type(), rv, v.Name(), 0)}
	seal(c)
	r.outer[v] = c
	return c
}

// seal marks what belongs to the session.
func seal(c *cell) {
	if c.outside {
		return
	}
	c.outside = true
	switch ref := c.v.ref.(type) {
	case *group:
		for i := range ref.cells {
			seal(&ref.cells[i])
		}
	case *slice:
		for i := range ref.base.cells {
			seal(&ref.base.cells[i])
		}
	case *cell:
		seal(ref)
	}
}

// imported turns a Go value into one of the recorder. What has no counterpart is
// kNone, which is refused when it is used.
func (r *recorder) imported(t types.Type, v reflect.Value, name string, depth int) value {
	if !v.IsValid() || depth > 16 {
		return value{}
	}
	switch u := t.Underlying().(type) {
	case *types.Basic:
		return r.importedBasic(u, v, name)
	case *types.Struct:
		if v.Kind() != reflect.Struct || v.NumField() != u.NumFields() {
			return value{}
		}
		g := &group{cells: make([]cell, u.NumFields())}
		for i := range g.cells {
			g.cells[i].v = r.imported(u.Field(i).Type(), v.Field(i), name+"."+u.Field(i).Name(), depth+1)
		}
		return value{kind: kGroup, ref: g}
	case *types.Array:
		if v.Kind() != reflect.Array {
			return value{}
		}
		return value{kind: kGroup, ref: r.importedElements(u.Elem(), v, name, depth)}
	case *types.Slice:
		return r.importedSlice(u, v, name, depth)
	case *types.Pointer:
		if v.Kind() != reflect.Pointer {
			return value{}
		}
		was := v.Pointer()
		r.watch(name, v, func(now reflect.Value) bool { return now.Pointer() != was })
		if v.IsNil() {
			return value{kind: kNil}
		}
		return value{kind: kPointer, ref: &cell{v: r.imported(u.Elem(), v.Elem(), name, depth+1)}}
	}
	return value{}
}

func (r *recorder) importedBasic(u *types.Basic, v reflect.Value, name string) value {
	if isFloat(u) && v.Kind() == reflect.Float64 && v.CanAddr() {
		at := (*float64)(v.Addr().UnsafePointer())
		r.p.hidden = append(r.p.hidden, hidden{name, at})
		return float(r.g.intern(kindNode(opHidden, len(r.p.hidden)-1)))
	}
	x := r.snapshot(u, v)
	if x.kind != kNone {
		was := bits(v)
		r.watch(name, v, func(now reflect.Value) bool { return bits(now) != was })
	}
	return x
}

// bits returns a comparable copy of a basic value.
func bits(v reflect.Value) any {
	switch {
	case v.CanInt():
		return v.Int()
	case v.CanUint():
		return v.Uint()
	case v.CanFloat():
		return math.Float64bits(v.Float())
	case v.Kind() == reflect.Bool:
		return v.Bool()
	}
	return v.String()
}

// watch looks at v before every evaluation, if v can change at all.
func (r *recorder) watch(name string, v reflect.Value, changed func(now reflect.Value) bool) {
	if v.CanAddr() {
		r.p.watches = append(r.p.watches, watch{name, func() bool { return changed(v) }})
	}
}

func (r *recorder) importedSlice(u *types.Slice, v reflect.Value, name string, depth int) value {
	if v.Kind() != reflect.Slice {
		return value{}
	}
	data, length := v.Pointer(), v.Len()
	r.watch(name, v, func(now reflect.Value) bool { return now.Len() != length || now.Pointer() != data })
	if v.IsNil() {
		return value{kind: kNil}
	}
	return sliceOf(r.importedElements(u.Elem(), v, name, depth))
}

// importedElements takes floats in lists as they stand: a long table is no list
// of hidden parameters. The list is compared as a whole.
func (r *recorder) importedElements(elem types.Type, v reflect.Value, name string, depth int) *group {
	g := &group{cells: make([]cell, v.Len())}
	r.work(nil, v.Len())
	if isFloat(elem) && v.Type().Elem().Kind() == reflect.Float64 {
		now := floatsOf(v)
		was := slices.Clone(now)
		for i, x := range was {
			g.cells[i].v = float(r.g.constant(x))
		}
		if v.Len() > 0 && v.Index(0).CanAddr() {
			r.p.watches = append(r.p.watches, watch{name, func() bool { return !slices.EqualFunc(was, now, sameBits) }})
		}
		return g
	}
	for i := range g.cells {
		g.cells[i].v = r.imported(elem, v.Index(i), name, depth+1)
	}
	return g
}

func sameBits(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }

// floatsOf returns the elements of an array or slice, as they are in memory where
// that can be had.
func floatsOf(v reflect.Value) []float64 {
	if v.Len() > 0 && v.Index(0).CanAddr() {
		return unsafeFloats(v.Index(0).Addr().UnsafePointer(), v.Len())
	}
	out := make([]float64, v.Len())
	for i := range out {
		out[i] = v.Index(i).Float()
	}
	return out
}

// snapshot takes a value that is no symbol as it stands.
func (r *recorder) snapshot(t types.Type, v reflect.Value) value {
	u, ok := t.Underlying().(*types.Basic)
	if !ok || !v.IsValid() {
		return value{}
	}
	info := u.Info()
	switch {
	case isFloat(u) && v.Kind() == reflect.Float64:
		return float(r.g.constant(v.Float()))
	case info&types.IsInteger != 0 && v.CanInt():
		return integer(v.Int())
	case info&types.IsInteger != 0 && v.CanUint():
		return integer(int64(v.Uint()))
	case info&types.IsBoolean != 0 && v.Kind() == reflect.Bool:
		return boolean(v.Bool())
	case info&types.IsString != 0 && v.Kind() == reflect.String:
		return value{kind: kString, ref: v.String()}
	}
	return value{}
}

// receiver returns the receiver of a model that is a method.
func (r *recorder) receiver(at ast.Node, t types.Type) value {
	v := r.src.Receiver
	pointer, isPointer := t.Underlying().(*types.Pointer)
	if isPointer {
		if v.Kind() == reflect.Pointer {
			v = v.Elem()
		}
		c := &cell{v: r.imported(pointer.Elem(), v, "receiver", 0)}
		seal(c)
		return value{kind: kPointer, ref: c}
	}
	if !v.IsValid() {
		r.refuse(at, "the model is a method; its receiver is not known")
	}
	return r.imported(t, v, "receiver", 0)
}
