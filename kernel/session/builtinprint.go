package session

import (
	"fmt"
	"reflect"
	"strconv"
	"strings"
)

// builtinPrint writes values as the predeclared print and println do.
func builtinPrint(a []any, sep string) string {
	parts := make([]string, len(a))
	for i, x := range a {
		parts[i] = builtinText(x)
	}
	return strings.Join(parts, sep)
}

func builtinText(x any) string {
	if x == nil {
		return "nil"
	}
	v := reflect.ValueOf(plain(open(x)))
	switch v.Kind() {
	case reflect.Float32, reflect.Float64:
		return builtinFloat(v.Float())
	case reflect.Complex64, reflect.Complex128:
		c := v.Complex()
		im := builtinFloat(imag(c))
		if im[0] != '-' && im[0] != '+' {
			im = "+" + im
		}
		return "(" + builtinFloat(real(c)) + im + "i)"
	case reflect.Slice:
		return fmt.Sprintf("[%d/%d]0x%x", v.Len(), v.Cap(), v.Pointer())
	case reflect.Pointer, reflect.Map, reflect.Chan, reflect.Func, reflect.UnsafePointer:
		return "0x" + strconv.FormatUint(uint64(v.Pointer()), 16)
	case reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64:
		return strconv.FormatInt(v.Int(), 10)
	case reflect.Uint, reflect.Uint8, reflect.Uint16, reflect.Uint32, reflect.Uint64, reflect.Uintptr:
		return strconv.FormatUint(v.Uint(), 10)
	case reflect.Bool:
		return strconv.FormatBool(v.Bool())
	case reflect.String:
		return v.String()
	}
	return fmt.Sprint(printable(x))
}

// builtinFloat writes the shortest form.
func builtinFloat(f float64) string { return strconv.FormatFloat(f, 'g', -1, 64) }
