package session

import (
	"fmt"
	"reflect"
	"sync"
)

// An rtype describes a type at run time. The interpreter keeps no names of types, so boxes carry these.
type rtype struct {
	id       int
	name     string // as %T shows it
	named    bool
	own      bool // mentions a type made in cells
	kind     reflect.Kind
	reflect  reflect.Type // of types that mention none
	elem     *rtype
	keyType  *rtype
	fields   []rfield
	wants    []rwant // of interfaces
	conv     string  // of compiled interfaces: the converter's name
	mu       sync.Mutex
	byMethod map[string]*rmethod
}

type rfield struct {
	name     string
	typ      *rtype
	exported bool
}

// rwant is a method that an interface wants.
type rwant struct {
	name, sig string
	fn        reflect.Type // where it mentions no cell's type
}

// rmethod is a method of a cell's type: a function with the receiver first.
type rmethod struct {
	sig     string
	pointer bool // the receiver is a pointer
	fn      reflect.Value
}

// rtypes is the session's table of runtime types.
type rtypes struct {
	mu   sync.RWMutex
	keys map[string]*rtype
	ids  map[int]*rtype
	next int
}

func newRtypes() *rtypes { return &rtypes{keys: map[string]*rtype{}, ids: map[int]*rtype{}} }

func (t *rtypes) byKey(key string) *rtype {
	t.mu.RLock()
	defer t.mu.RUnlock()
	return t.keys[key]
}

func (t *rtypes) byID(id int) *rtype {
	t.mu.RLock()
	defer t.mu.RUnlock()
	return t.ids[id]
}

func (t *rtypes) add(key, name string) *rtype {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.next++
	r := &rtype{id: t.next, name: name}
	t.keys[key], t.ids[r.id] = r, r
	return r
}

func (t *rtypes) remove(key string) {
	t.mu.Lock()
	defer t.mu.Unlock()
	if r := t.keys[key]; r != nil {
		delete(t.keys, key)
		delete(t.ids, r.id)
	}
}

// A box is a value of a type that cells make, in an interface.
type box struct {
	t *rtype
	v any
}

// method finds a method of a type; of a pointer, those of what it points to as well.
func (r *rtype) method(name string) *rmethod {
	t := r
	pointer := false
	if r.kind == reflect.Pointer && !r.named {
		t, pointer = r.elem, true
	}
	t.mu.Lock()
	m := t.byMethod[name]
	t.mu.Unlock()
	if m == nil || m.pointer && !pointer {
		return nil
	}
	return m
}

func (r *rtype) setMethod(name string, m *rmethod) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.byMethod == nil {
		r.byMethod = map[string]*rmethod{}
	}
	r.byMethod[name] = m
}

// bind makes the method of a boxed value a function of its own.
func (b box) bind(m *rmethod) reflect.Value {
	recv := reflect.ValueOf(b.v)
	ft := m.fn.Type()
	if !m.pointer && b.t.kind == reflect.Pointer {
		if recv.IsNil() {
			panic(nilDereference)
		}
		recv = recv.Elem()
	}
	recv = adapt(recv, ft.In(0))
	in := make([]reflect.Type, ft.NumIn()-1)
	for i := range in {
		in[i] = ft.In(i + 1)
	}
	out := make([]reflect.Type, ft.NumOut())
	for i := range out {
		out[i] = ft.Out(i)
	}
	return reflect.MakeFunc(reflect.FuncOf(in, out, ft.IsVariadic()), func(args []reflect.Value) []reflect.Value {
		all := append([]reflect.Value{recv}, args...)
		if ft.IsVariadic() {
			return m.fn.CallSlice(all)
		}
		return m.fn.Call(all)
	})
}

// typeName is what %T shows of a value.
func typeName(x any) string {
	switch x := x.(type) {
	case nil:
		return "<nil>"
	case box:
		return x.t.name
	case errorBox:
		return x.b.t.name
	case interface{ CellValue() any }:
		return typeName(x.CellValue())
	}
	return fmt.Sprintf("%T", x)
}

// is reports whether the dynamic type of a value is the type, or implements it.
func (r *rtype) is(x any) bool {
	if x == nil {
		return false
	}
	if r.kind == reflect.Interface {
		return r.missing(x) == ""
	}
	if b, ok := x.(box); ok {
		return b.t == r
	}
	return r.reflect != nil && reflect.TypeOf(x) == r.reflect
}

// missing names a method that a value lacks to implement an interface.
func (r *rtype) missing(x any) string {
	b, boxed := x.(box)
	if !boxed && r.reflect != nil && r.reflect.Kind() == reflect.Interface && r.reflect.NumMethod() > 0 {
		t := reflect.TypeOf(x)
		if t.Implements(r.reflect) {
			return ""
		}
	}
	for _, w := range r.wants {
		if boxed {
			if m := b.t.method(w.name); m == nil || m.sig != w.sig {
				return w.name
			}
			continue
		}
		m, ok := reflect.TypeOf(x).MethodByName(w.name)
		if !ok || !sameMethod(m.Type, w.fn) {
			return w.name
		}
	}
	return ""
}

// sameMethod compares a compiled method, receiver first, with a signature.
func sameMethod(m, want reflect.Type) bool {
	if want == nil || m.NumIn() != want.NumIn()+1 || m.NumOut() != want.NumOut() {
		return false
	}
	for i := range want.NumIn() {
		if m.In(i+1) != want.In(i) {
			return false
		}
	}
	for i := range want.NumOut() {
		if m.Out(i) != want.Out(i) {
			return false
		}
	}
	return true
}

// errorBox is a boxed value as an error. It can be compared, so errors.Is works as in Go.
type errorBox struct{ b box }

// Error calls the method that the cell wrote.
func (e errorBox) Error() string {
	m := e.b.t.method("Error")
	if m == nil {
		return fmt.Sprintf("%s without an Error method", e.b.t.name)
	}
	return e.b.bind(m).Call(nil)[0].String()
}

// Unwrap calls the cell's Unwrap, where there is one.
func (e errorBox) Unwrap() error {
	m := e.b.t.method("Unwrap")
	if m == nil || m.fn.Type().NumOut() != 1 || m.fn.Type().Out(0) != reflect.TypeFor[error]() {
		return nil
	}
	err, _ := e.b.bind(m).Call(nil)[0].Interface().(error)
	return err
}

// Is calls the cell's Is, where there is one.
func (e errorBox) Is(target error) bool {
	m := e.b.t.method("Is")
	if m == nil || m.fn.Type().NumIn() != 2 || m.fn.Type().NumOut() != 1 {
		return false
	}
	return e.b.bind(m).Call([]reflect.Value{reflect.ValueOf(&target).Elem()})[0].Bool()
}

// CellValue returns the boxed value.
func (e errorBox) CellValue() any { return e.b }

// open turns a wrapper of a compiled interface back into the value of the cell.
func open(x any) any {
	if w, ok := x.(interface{ CellValue() any }); ok {
		return w.CellValue()
	}
	return x
}

// plain removes the box, for compiled functions that look at values by reflection.
func plain(x any) any {
	switch x := x.(type) {
	case box:
		return x.v
	case []any:
		out := make([]any, len(x))
		for i, v := range x {
			out[i] = plain(v)
		}
		return out
	}
	return x
}
