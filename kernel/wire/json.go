package wire

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"reflect"
)

// Marshal encodes v as the protocol's clients want it: no HTML escapes, invalid
// UTF-8 replaced, and null in the place of NaN and the infinities, which JSON
// lacks. Floats are looked for in maps, slices, arrays, pointers and interfaces,
// not in structs.
func Marshal(v any) ([]byte, error) {
	text, err := encode(v)
	var unsupported *json.UnsupportedValueError
	if errors.As(err, &unsupported) {
		return encode(finite(reflect.ValueOf(v)))
	}
	return text, err
}

func encode(v any) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(v); err != nil {
		return nil, err
	}
	return bytes.TrimSuffix(b.Bytes(), []byte("\n")), nil
}

// finite returns a copy of v in which floats that are not finite are nil.
func finite(v reflect.Value) any {
	switch v.Kind() {
	case reflect.Float32, reflect.Float64:
		if f := v.Float(); math.IsNaN(f) || math.IsInf(f, 0) {
			return nil
		}
	case reflect.Interface, reflect.Pointer:
		if v.IsNil() {
			return nil
		}
		return finite(v.Elem())
	case reflect.Map:
		return finiteMap(v)
	case reflect.Slice, reflect.Array:
		return finiteSlice(v)
	}
	if !v.IsValid() {
		return nil
	}
	return v.Interface()
}

func finiteMap(v reflect.Value) any {
	if v.IsNil() || v.Type().Key().Kind() != reflect.String {
		return v.Interface()
	}
	m := make(map[string]any, v.Len())
	for it := v.MapRange(); it.Next(); {
		m[it.Key().String()] = finite(it.Value())
	}
	return m
}

func finiteSlice(v reflect.Value) any {
	if v.Type().Elem().Kind() == reflect.Uint8 || v.Kind() == reflect.Slice && v.IsNil() {
		return v.Interface() // bytes, or raw JSON
	}
	s := make([]any, v.Len())
	for i := range s {
		s[i] = finite(v.Index(i))
	}
	return s
}
