package session

import (
	"cmp"
	"errors"
	"fmt"
	"reflect"
	"runtime"
	"strings"
	"unicode/utf8"

	"brinkline/kernel/session/internal/symbols"
)

// hostFuncs are what lowered code calls, under the package name bl.
func (s *Session) hostFuncs() map[string]any {
	return map[string]any{
		"Box":        func(id int, v any) any { return box{s.rtypes.byID(id), v} },
		"Any":        func(v any) any { return v },
		"Open":       open,
		"Plain":      plain,
		"Error":      asError,
		"Is":         func(id int, x any) bool { return s.rtypes.byID(id).is(x) },
		"Assert":     func(id int, x any) any { return assertType(s.rtypes.byID(id), x) },
		"TryAssert":  func(id int, x any) (any, bool) { return tryAssert(s.rtypes.byID(id), x) },
		"Method":     boundMethod,
		"Register":   s.registerMethod,
		"Equal":      func(a, b any) bool { return equal(a, b) },
		"Same":       func(a, b any) bool { return equal(a, b) },
		"IsNil":      func(x any) bool { return x == nil },
		"NilFunc":    isNilFunc,
		"Unpack":     unpack,
		"Rune":       func(s string, i int) (rune, int) { return utf8.DecodeRuneInString(s[i:]) },
		"Complex":    func(re, im float64) complex128 { return complex(re, im) },
		"Clear":      clearValue,
		"Panic":      func(v any, pos int) { s.setPosition(pos); panic(cellPanic(v)) },
		"Recovered":  recovered,
		"NeedLength": needLength,
		"MinFloat":   func(a ...float64) float64 { return fold(a, func(x, y float64) float64 { return min(x, y) }) },
		"MaxFloat":   func(a ...float64) float64 { return fold(a, func(x, y float64) float64 { return max(x, y) }) },
		"MinInt":     func(a ...int64) int64 { return fold(a, least[int64]) },
		"MaxInt":     func(a ...int64) int64 { return fold(a, most[int64]) },
		"MinUint":    func(a ...uint64) uint64 { return fold(a, least[uint64]) },
		"MaxUint":    func(a ...uint64) uint64 { return fold(a, most[uint64]) },
		"MinString":  func(a ...string) string { return fold(a, least[string]) },
		"MaxString":  func(a ...string) string { return fold(a, most[string]) },
		"Print":      func(a ...any) { s.stderr(builtinPrint(a, "")) },
		"Println":    func(a ...any) { s.stderr(builtinPrint(a, " ") + "\n") },
		"ErrorsAs":   s.errorsAs,
		"NeedRoom":   s.needRoom,
		"SameChan":   func(a, b any) bool { return reflect.ValueOf(a).Pointer() == reflect.ValueOf(b).Pointer() },
		"Depth":      s.checkDepth,
		"Go":         s.goroutine,
		"Check":      s.checkError,
		"Show":       func(values ...any) { s.show(nil, values) },
		"ShowTaken":  func(err error, values ...any) { s.show(err, values) },
		"Bind":       s.bindVariable,
		"Assign":     s.assign,
		"Boot":       func(pos, line *int) { s.pos, s.line = pos, line },
		"NewModel":   s.newModel,
	}
}

func least[T cmp.Ordered](a, b T) T { return min(a, b) }
func most[T cmp.Ordered](a, b T) T  { return max(a, b) }

func fold[T any](a []T, f func(x, y T) T) T {
	r := a[0]
	for _, x := range a[1:] {
		r = f(r, x)
	}
	return r
}

// asError makes any value of a cell an error.
func asError(x any) error {
	switch x := x.(type) {
	case nil:
		return nil
	case box:
		return errorBox{x}
	case error:
		return x
	}
	panic(&runtimeError{fmt.Sprintf("interface conversion: %s is not error", typeName(x))})
}

// asInterface makes a value one of a compiled interface, wrapped when its methods are made in cells.
func (s *Session) asInterface(x any, want reflect.Type) any {
	b, ok := x.(box)
	if !ok {
		return x
	}
	if want == reflect.TypeFor[error]() {
		return errorBox{b}
	}
	wrap, ok := symbols.Of(want.PkgPath() + "/" + lastElement(want.String()))["_"+want.Name()]
	if !ok {
		panic(&runtimeError{fmt.Sprintf("%s cannot be passed as %s", b.t.name, want)})
	}
	w := reflect.New(wrap.Type().Elem()).Elem()
	w.Field(0).Set(reflect.ValueOf(b))
	for i := 1; i < w.NumField(); i++ {
		name := w.Type().Field(i).Name[1:]
		m := b.t.method(name)
		if m == nil {
			panic(&runtimeError{fmt.Sprintf("interface conversion: %s has no method %s", b.t.name, name)})
		}
		f := b.bind(m)
		if f.Type() != w.Field(i).Type() && f.CanConvert(w.Field(i).Type()) {
			f = f.Convert(w.Field(i).Type())
		}
		w.Field(i).Set(f)
	}
	return w.Interface()
}

// lastElement is the package name in a qualified type name.
func lastElement(qualified string) string {
	name, _, _ := strings.Cut(qualified, ".")
	return name
}

func assertType(r *rtype, x any) any {
	v, ok := tryAssert(r, x)
	if ok {
		return v
	}
	if x == nil {
		panic(&runtimeError{fmt.Sprintf("interface conversion: interface is nil, not %s", r.name)})
	}
	if r.kind == reflect.Interface {
		panic(&runtimeError{fmt.Sprintf("interface conversion: %s is not %s: missing method %s", typeName(x), r.name, r.missing(x))})
	}
	panic(&runtimeError{fmt.Sprintf("interface conversion: interface {} is %s, not %s", typeName(x), r.name)})
}

// tryAssert gives the value that has the type: the plain one, or the dynamic form for an interface.
func tryAssert(r *rtype, x any) (any, bool) {
	if !r.is(x) {
		return nil, false
	}
	if b, ok := x.(box); ok && r.kind != reflect.Interface {
		return b.v, true
	}
	return x, true
}

// boundMethod finds a method by name on the dynamic value of an interface.
func boundMethod(x any, name string) any {
	switch v := x.(type) {
	case nil:
		panic(nilDereference)
	case box:
		if m := v.t.method(name); m != nil {
			return v.bind(m).Interface()
		}
		panic(&runtimeError{fmt.Sprintf("%s has no method %s", v.t.name, name)})
	}
	m := reflect.ValueOf(x).MethodByName(name)
	if !m.IsValid() {
		panic(&runtimeError{fmt.Sprintf("%s has no method %s", typeName(x), name)})
	}
	return m.Interface()
}

func (s *Session) registerMethod(id int, name, sig string, pointer bool, fn any) {
	if r := s.rtypes.byID(id); r != nil {
		r.setMethod(name, &rmethod{sig: sig, pointer: pointer, fn: reflect.ValueOf(fn)})
	}
}

// equal compares as Go's == does for interfaces.
func equal(a, b any) bool {
	if x, ok := a.(box); ok {
		y, ok := b.(box)
		return ok && x.t == y.t && equal(x.v, y.v)
	}
	if a != nil && b != nil {
		if t := reflect.TypeOf(a); t == reflect.TypeOf(b) && !t.Comparable() {
			panic(&runtimeError{"comparing uncomparable type " + typeName(a)})
		}
	}
	return a == b
}

// isNilFunc reports whether a function value is nil.
func isNilFunc(x any) bool {
	if x == nil {
		return true
	}
	if v := reflect.ValueOf(x); v.Kind() == reflect.Func {
		return v.IsNil()
	}
	return false
}

// unpack stores a value where ptr points.
func unpack(x, ptr any) {
	dst := reflect.ValueOf(ptr).Elem()
	if x == nil {
		dst.SetZero()
		return
	}
	dst.Set(adapt(reflect.ValueOf(x), dst.Type()))
}

// adapt makes a value one of a type with the same memory. The interpreter builds several reflect types for one recursive type.
func adapt(v reflect.Value, t reflect.Type) reflect.Value {
	switch {
	case v.Type().AssignableTo(t):
		return v
	case v.Kind() == reflect.Pointer && t.Kind() == reflect.Pointer:
		return reflect.NewAt(t.Elem(), v.UnsafePointer()).Convert(t)
	case v.CanConvert(t):
		return v.Convert(t)
	case v.Kind() == reflect.Struct && t.Kind() == reflect.Struct && v.Type().Size() == t.Size():
		p := reflect.New(v.Type())
		p.Elem().Set(v)
		return reflect.NewAt(t, p.UnsafePointer()).Elem()
	}
	return v
}

func clearValue(x any) { reflect.ValueOf(x).Clear() }

func needLength(have, want int) {
	if have < want {
		panic(&runtimeError{fmt.Sprintf("cannot convert slice with length %d to array or pointer to array with length %d", have, want)})
	}
}

// errorsAs is errors.As for a target whose type may be made in a cell.
func (s *Session) errorsAs(err error, id int, target any) bool {
	r := s.rtypes.byID(id)
	dst := reflect.ValueOf(target).Elem()
	for err != nil {
		x := open(err)
		if v, ok := tryAssert(r, x); ok {
			if r.kind == reflect.Interface && dst.Type() != anyType {
				v = s.asInterface(x, dst.Type())
			}
			dst.Set(reflect.ValueOf(v))
			return true
		}
		switch u := err.(type) {
		case interface{ Unwrap() error }:
			err = u.Unwrap()
		case interface{ Unwrap() []error }:
			for _, e := range u.Unwrap() {
				if s.errorsAs(e, id, target) {
					return true
				}
			}
			return false
		default:
			return false
		}
	}
	return false
}

// maxDepth bounds the stack of interpreted calls, in frames of the process; a call takes about four. Go's own limit, past which the
// process ends, is far beyond.
const maxDepth = 300_000

var errTooDeep = errors.New("the calls go too deep: a function calls itself without end")

// checkDepth stops the cell when the stack is deeper than any program needs.
func (s *Session) checkDepth() {
	var pc [1]uintptr
	if runtime.Callers(maxDepth, pc[:]) > 0 {
		s.machine.stopDeep()
	}
}
