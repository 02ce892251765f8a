package session

import (
	"fmt"
	"io"
	"reflect"
	"sort"
	"strconv"
	"strings"
)

// printable prepares a value for package fmt: a box becomes a Formatter, an error of a cell an error.
func printable(x any) any {
	switch x := x.(type) {
	case box:
		if x.t.method("Error") != nil {
			return formattedError{formatted{x}, errorBox{b: x}}
		}
		return formatted{x}
	case errorBox:
		return formattedError{formatted(x), x}
	case interface{ CellValue() any }:
		return printable(x.CellValue())
	case *stop:
		return x.err
	case []any:
		return formatted{box{anySlice, x}}
	case map[string]any:
		return formatted{box{anyMap, x}}
	}
	return x
}

// Descriptions of the plain types that may hold boxes.
var (
	anyInterface = &rtype{name: "interface {}", kind: reflect.Interface, reflect: anyType}
	anySlice     = &rtype{name: "[]interface {}", kind: reflect.Slice, elem: anyInterface, own: true}
	stringType   = &rtype{name: "string", kind: reflect.String, reflect: reflect.TypeFor[string]()}
	anyMap       = &rtype{name: "map[string]interface {}", kind: reflect.Map, keyType: stringType, elem: anyInterface, own: true}
)

func printables(a []any) []any {
	out := make([]any, len(a))
	for i, x := range a {
		out[i] = printable(x)
	}
	return out
}

// formatted prints a boxed value as fmt prints the value in Go.
type formatted struct{ b box }

// formattedError is one that also is an error, for %w.
type formattedError struct {
	formatted
	err errorBox
}

func (f formattedError) Error() string { return f.err.Error() }
func (f formattedError) Unwrap() error { return f.err }

// Format implements fmt.Formatter.
func (f formatted) Format(st fmt.State, verb rune) {
	p := &valuePrinter{st: st, verb: verb, plus: st.Flag('+'), sharp: st.Flag('#')}
	p.value(reflect.ValueOf(f.b.v), f.b.t, 0, true)
}

// valuePrinter follows fmt's rules with the types that the checker knows.
type valuePrinter struct {
	st          fmt.State
	verb        rune
	plus, sharp bool
}

func (p *valuePrinter) write(s string) { _, _ = io.WriteString(p.st, s) }

// leaf prints a value of a plain type with the verb and flags as they are.
func (p *valuePrinter) leaf(x any) { fmt.Fprintf(p.st, fmt.FormatString(p.st, p.verb), x) }

func (p *valuePrinter) value(v reflect.Value, t *rtype, depth int, exported bool) {
	if !v.IsValid() {
		p.write("<nil>")
		return
	}
	if exported && p.byMethod(v, t) {
		return
	}
	if !t.own && t.kind != reflect.Interface && (exported || t.kind < reflect.Array) {
		p.leaf(v.Interface())
		return
	}
	switch t.kind {
	case reflect.Struct:
		p.structure(v, t, depth, exported)
	case reflect.Slice, reflect.Array:
		p.list(v, t, depth, exported)
	case reflect.Map:
		p.table(v, t, depth, exported)
	case reflect.Pointer:
		p.pointer(v, t, depth, exported)
	case reflect.Interface:
		p.dynamic(v, t, depth, exported)
	case reflect.Func, reflect.Chan:
		p.address(v, t)
	default:
		p.basic(v, t)
	}
}

// byMethod prints with the value's own Error or String method, where fmt would.
func (p *valuePrinter) byMethod(v reflect.Value, t *rtype) bool {
	if p.sharp || !strings.ContainsRune("vsxXq", p.verb) || !v.CanInterface() {
		return false
	}
	for _, name := range []string{"Error", "String"} {
		m := t.method(name)
		if m == nil || m.sig != "func() string" {
			continue
		}
		p.leafText(box{t, v.Interface()}, m)
		return true
	}
	return false
}

func (p *valuePrinter) leafText(b box, m *rmethod) {
	defer func() {
		if r := recover(); r != nil {
			if v := reflect.ValueOf(b.v); v.Kind() == reflect.Pointer && v.IsNil() {
				p.write("<nil>")
				return
			}
			panic(r)
		}
	}()
	p.leaf(b.bind(m).Call(nil)[0].String())
}

// basic prints a value whose underlying type is a basic one.
func (p *valuePrinter) basic(v reflect.Value, t *rtype) {
	if bt := basicReflect[v.Kind()]; bt != nil {
		p.leaf(v.Convert(bt).Interface())
		return
	}
	p.leaf(v.Interface())
}

func (p *valuePrinter) structure(v reflect.Value, t *rtype, depth int, exported bool) {
	if p.sharp {
		p.write(t.name)
	}
	p.write("{")
	for i, f := range t.fields {
		if i > 0 {
			p.write(p.separator())
		}
		if p.plus || p.sharp {
			p.write(f.name + ":")
		}
		p.value(v.Field(i), f.typ, depth+1, exported && f.exported)
	}
	p.write("}")
}

func (p *valuePrinter) separator() string {
	if p.sharp {
		return ", "
	}
	return " "
}

func (p *valuePrinter) list(v reflect.Value, t *rtype, depth int, exported bool) {
	open, end := "[", "]"
	if p.sharp {
		if t.kind == reflect.Slice && v.IsNil() {
			p.write(t.name + "(nil)")
			return
		}
		p.write(t.name)
		open, end = "{", "}"
	}
	p.write(open)
	for i := range v.Len() {
		if i > 0 {
			p.write(p.separator())
		}
		p.value(v.Index(i), t.elem, depth+1, exported)
	}
	p.write(end)
}

func (p *valuePrinter) table(v reflect.Value, t *rtype, depth int, exported bool) {
	open, end := "map[", "]"
	if p.sharp {
		if v.IsNil() {
			p.write(t.name + "(nil)")
			return
		}
		p.write(t.name)
		open, end = "{", "}"
	}
	p.write(open)
	for i, k := range sortedKeys(v) {
		if i > 0 {
			p.write(p.separator())
		}
		p.value(k, t.keyType, depth+1, exported)
		p.write(":")
		p.value(v.MapIndex(k), t.elem, depth+1, exported)
	}
	p.write(end)
}

// sortedKeys lists the keys of a map in fmt's order, as far as they have one.
func sortedKeys(m reflect.Value) []reflect.Value {
	keys := m.MapKeys()
	sort.SliceStable(keys, func(i, j int) bool { return lessKey(keys[i], keys[j]) })
	return keys
}

func lessKey(a, b reflect.Value) bool {
	if a.Kind() == reflect.Interface {
		a, b = reflect.ValueOf(plain(a.Interface())), reflect.ValueOf(plain(b.Interface()))
		if !a.IsValid() || !b.IsValid() || a.Kind() != b.Kind() {
			return a.IsValid() && b.IsValid() && a.Kind() < b.Kind() || !a.IsValid() && b.IsValid()
		}
	}
	switch {
	case a.CanInt():
		return a.Int() < b.Int()
	case a.CanUint():
		return a.Uint() < b.Uint()
	case a.CanFloat():
		return a.Float() < b.Float() || a.Float() != a.Float() && b.Float() == b.Float()
	case a.Kind() == reflect.String:
		return a.String() < b.String()
	case a.Kind() == reflect.Bool:
		return !a.Bool() && b.Bool()
	case a.Kind() == reflect.Struct:
		for i := range a.NumField() {
			if lessKey(a.Field(i), b.Field(i)) {
				return true
			}
			if lessKey(b.Field(i), a.Field(i)) {
				return false
			}
		}
	case a.Kind() == reflect.Array:
		for i := range a.Len() {
			if lessKey(a.Index(i), b.Index(i)) {
				return true
			}
			if lessKey(b.Index(i), a.Index(i)) {
				return false
			}
		}
	}
	return false
}

func (p *valuePrinter) pointer(v reflect.Value, t *rtype, depth int, exported bool) {
	if v.Kind() != reflect.Pointer || v.IsNil() {
		if p.sharp {
			p.write("(" + t.name + ")(nil)")
		} else {
			p.write("<nil>")
		}
		return
	}
	if depth == 0 {
		switch t.elem.kind {
		case reflect.Struct, reflect.Slice, reflect.Array, reflect.Map:
			p.write("&")
			p.value(v.Elem(), t.elem, depth+1, exported)
			return
		}
	}
	p.address(v, t)
}

func (p *valuePrinter) address(v reflect.Value, t *rtype) {
	at := "0x" + strconv.FormatUint(uint64(v.Pointer()), 16)
	if p.sharp {
		p.write("(" + t.name + ")(" + at + ")")
		return
	}
	p.write(at)
}

func (p *valuePrinter) dynamic(v reflect.Value, t *rtype, depth int, exported bool) {
	if v.Kind() != reflect.Interface {
		p.leaf(v.Interface())
		return
	}
	if v.IsNil() {
		if p.sharp {
			p.write(t.name + "(nil)")
		} else {
			p.write("<nil>")
		}
		return
	}
	x := open(v.Interface())
	switch x := x.(type) {
	case box:
		p.value(reflect.ValueOf(x.v), x.t, depth, exported)
	case []any, map[string]any:
		b := printable(x).(formatted).b
		p.value(reflect.ValueOf(b.v), b.t, depth, exported)
	default:
		p.leaf(x)
	}
}

// ---- package fmt as cells see it ----

// formatArgs prepares the arguments of a Printf. %T is answered here, for fmt would show what the interpreter makes of the type.
func formatArgs(format string, a []any) (string, []any) {
	args := printables(a)
	if !strings.Contains(format, "T") {
		return format, args
	}
	var b strings.Builder
	next := 0
	for i := 0; i < len(format); i++ {
		b.WriteByte(format[i])
		if format[i] != '%' {
			continue
		}
		j := i + 1
		for j < len(format) && strings.IndexByte("+-# 0123456789.*[]", format[j]) >= 0 {
			if format[j] == '[' {
				if k := strings.IndexByte(format[j:], ']'); k > 0 {
					if n, err := strconv.Atoi(format[j+1 : j+k]); err == nil {
						next = n - 1
					}
				}
			}
			if format[j] == '*' {
				next++
			}
			j++
		}
		if j >= len(format) {
			b.WriteString(format[i+1:])
			break
		}
		b.WriteString(format[i+1 : j])
		verb := format[j]
		if verb == 'T' && next >= 0 && next < len(a) {
			args[next] = typeName(a[next])
			verb = 's'
		}
		b.WriteByte(verb)
		if verb != '%' {
			next++
		}
		i = j
	}
	return b.String(), args
}

// sprint is fmt.Sprint: a space between operands when neither is a string.
func sprint(a []any) string {
	var b strings.Builder
	wasString := false
	for i, x := range a {
		isString := x != nil && reflect.ValueOf(plain(open(x))).Kind() == reflect.String
		if i > 0 && !isString && !wasString {
			b.WriteByte(' ')
		}
		fmt.Fprint(&b, printable(x))
		wasString = isString
	}
	return b.String()
}

// overrides replaces functions of compiled packages by ones that know boxes and the cell's output.
func (s *Session) fmtOverrides() map[string]any {
	sprintf := func(format string, a ...any) string {
		f, args := formatArgs(format, a)
		return fmt.Sprintf(f, args...)
	}
	sprintln := func(a ...any) string { return fmt.Sprintln(printables(a)...) }
	out := func(text string) (int, error) { s.stdout(text); return len(text), nil }
	return map[string]any{
		"fmt/fmt.Sprintf":  sprintf,
		"fmt/fmt.Sprint":   func(a ...any) string { return sprint(a) },
		"fmt/fmt.Sprintln": sprintln,
		"fmt/fmt.Printf":   func(format string, a ...any) (int, error) { return out(sprintf(format, a...)) },
		"fmt/fmt.Print":    func(a ...any) (int, error) { return out(sprint(a)) },
		"fmt/fmt.Println":  func(a ...any) (int, error) { return out(sprintln(a...)) },
		"fmt/fmt.Fprintf":  func(w io.Writer, format string, a ...any) (int, error) { return s.fprint(w, sprintf(format, a...)) },
		"fmt/fmt.Fprint":   func(w io.Writer, a ...any) (int, error) { return s.fprint(w, sprint(a)) },
		"fmt/fmt.Fprintln": func(w io.Writer, a ...any) (int, error) { return s.fprint(w, sprintln(a...)) },
		"fmt/fmt.Appendf":  func(b []byte, format string, a ...any) []byte { return append(b, sprintf(format, a...)...) },
		"fmt/fmt.Append":   func(b []byte, a ...any) []byte { return append(b, sprint(a)...) },
		"fmt/fmt.Appendln": func(b []byte, a ...any) []byte { return append(b, sprintln(a...)...) },
		"fmt/fmt.Errorf": func(format string, a ...any) error {
			f, args := formatArgs(format, a)
			return fmt.Errorf(f, args...)
		},
	}
}
