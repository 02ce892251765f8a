package continuation

import (
	"fmt"
	"math"
	"reflect"
	"strconv"
	"strings"
	"unsafe"
)

// A Variable is a state or a parameter of a model, as it is named on axes and
// in tables.
type Variable struct {
	Name  string  // as in the model's struct; elements of arrays are Load[3]
	Unit  string  // from the tag `unit`, empty when dimensionless
	Scale float64 // typical size from the tag `scale`, 0 when not given
}

// Label returns the name with its unit in parentheses: Coolant (K).
func (v Variable) Label() string {
	if v.Unit == "" {
		return v.Name
	}
	return v.Name + " (" + v.Unit + ")"
}

// A Parameter is a parameter of a model with its value.
type Parameter struct {
	Variable
	Value float64
}

// A layout maps a struct (or any nest of structs and arrays) of float64 to a
// flat list of numbers and back. It works on one value that it owns, so that
// reading and writing are plain loads and stores.
type layout struct {
	value reflect.Value // addressable, of the user's type
	vars  []Variable
	cells []*float64 // the float64s inside value, in the order of vars
}

// newLayout lists the float64s of a copy of v. What else may stand in v depends
// on strict: a State may hold float64s only, Params may also keep ints, bools
// and strings, which cannot be followed.
func newLayout(v reflect.Value, strict bool) (*layout, error) {
	own := reflect.New(v.Type()).Elem()
	own.Set(v)
	l := &layout{value: own}
	if err := l.walk(own, Variable{}, strict); err != nil {
		return nil, err
	}
	return l, nil
}

func (l *layout) walk(v reflect.Value, at Variable, strict bool) error {
	switch v.Kind() {
	case reflect.Float64:
		l.vars = append(l.vars, at)
		l.cells = append(l.cells, (*float64)(unsafe.Pointer(v.UnsafeAddr())))
		return nil
	case reflect.Struct:
		return l.walkStruct(v, at, strict)
	case reflect.Array:
		return l.walkElements(v, at, strict)
	case reflect.Slice:
		if strict {
			break
		}
		// The model keeps its own elements: what the analyst does to the
		// slice afterwards must not move a branch.
		own := reflect.MakeSlice(v.Type(), v.Len(), v.Len())
		reflect.Copy(own, v)
		settable(v).Set(own)
		return l.walkElements(v, at, strict)
	default:
		if !strict {
			return nil
		}
	}
	return fmt.Errorf("%s is a %s; states are float64, or structs and arrays of float64", at.Name, v.Type())
}

func (l *layout) walkStruct(v reflect.Value, at Variable, strict bool) error {
	t := v.Type()
	for i := range t.NumField() {
		field := t.Field(i)
		if field.Name == "_" {
			continue
		}
		next := Variable{Name: field.Name, Unit: at.Unit, Scale: at.Scale}
		switch {
		case field.Anonymous:
			next.Name = at.Name
		case at.Name != "":
			next.Name = at.Name + "." + field.Name
		}
		if unit, ok := field.Tag.Lookup("unit"); ok {
			next.Unit = unit
		}
		if text, ok := field.Tag.Lookup("scale"); ok {
			scale, err := strconv.ParseFloat(text, 64)
			if err != nil || !(scale > 0) || math.IsInf(scale, 0) {
				return fmt.Errorf("the scale %q of %s is not a positive number", text, next.Name)
			}
			next.Scale = scale
		}
		if err := l.walk(v.Field(i), next, strict); err != nil {
			return err
		}
	}
	return nil
}

func (l *layout) walkElements(v reflect.Value, at Variable, strict bool) error {
	for i := range v.Len() {
		next := at
		next.Name = fmt.Sprintf("%s[%d]", at.Name, i)
		if err := l.walk(v.Index(i), next, strict); err != nil {
			return err
		}
	}
	return nil
}

// own returns the same layout over a value of its own.
func (l *layout) own() *layout {
	// The value was laid out before, so it can be laid out again.
	other := &layout{value: reflect.New(l.value.Type()).Elem()}
	other.value.Set(l.value)
	if err := other.walk(other.value, Variable{}, false); err != nil {
		panic(err)
	}
	return other
}

// settable returns v without the mark that keeps unexported fields read-only:
// v lies in a value of the layout's own.
func settable(v reflect.Value) reflect.Value {
	return reflect.NewAt(v.Type(), unsafe.Pointer(v.UnsafeAddr())).Elem()
}

// put writes x into the value and get reads it.
func (l *layout) put(x []float64) {
	for i, c := range l.cells {
		*c = x[i]
	}
}

func (l *layout) get(x []float64) {
	for i, c := range l.cells {
		x[i] = *c
	}
}

// find returns the index of the variable with that name.
func find(vars []Variable, name string) int {
	for i, v := range vars {
		if v.Name == name {
			return i
		}
	}
	return -1
}

// unknown says that there is no variable of that name, which there are, and
// which one may have been meant.
func unknown(kind, name string, vars []Variable) error {
	names := make([]string, len(vars))
	for i, v := range vars {
		names[i] = v.Name
	}
	list := strings.Join(names, ", ")
	if len(names) > 12 {
		list = strings.Join(names[:10], ", ") + fmt.Sprintf(", ... (%d in all)", len(names))
	}
	if len(names) == 0 {
		list = "none"
	}
	text := fmt.Sprintf("no %s %q; the model has %s", kind, name, list)
	if near := nearest(name, names); near != "" {
		text += fmt.Sprintf(" (did you mean %s?)", near)
	}
	return fmt.Errorf("%s", text)
}

// nearest returns the name within a third of its length in edits, or nothing.
func nearest(name string, names []string) string {
	best, least := "", math.MaxInt
	for _, n := range names {
		d := edits(strings.ToLower(name), strings.ToLower(n))
		if d < least && 3*d <= max(len(name), len(n)) {
			best, least = n, d
		}
	}
	return best
}

// edits is how many letters must be put in, taken out, changed or swapped with
// their neighbour to get from a to b (Damerau's distance, restricted).
func edits(a, b string) int {
	before, last := make([]int, len(b)+1), make([]int, len(b)+1)
	for j := range last {
		last[j] = j
	}
	for i := 1; i <= len(a); i++ {
		row := make([]int, len(b)+1)
		row[0] = i
		for j := 1; j <= len(b); j++ {
			change := last[j-1]
			if a[i-1] != b[j-1] {
				change++
			}
			row[j] = min(change, row[j-1]+1, last[j]+1)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				row[j] = min(row[j], before[j-2]+1)
			}
		}
		before, last = last, row
	}
	return last[len(b)]
}
