// Package symbols holds the values of the offered packages for the interpreter, in tables that are built when first asked for.
package symbols

import (
	"reflect"
	"sync"
)

// tables has one builder a package, keyed as the interpreter wants it: import path, slash, package name.
var tables = map[string]func() map[string]reflect.Value{}

var (
	mu    sync.Mutex
	built = map[string]map[string]reflect.Value{}
)

// Of returns the table of the package with the given key, or nil. Callers must not change it.
func Of(key string) map[string]reflect.Value {
	mu.Lock()
	defer mu.Unlock()
	if t, ok := built[key]; ok {
		return t
	}
	make, ok := tables[key]
	if !ok {
		return nil
	}
	t := make()
	built[key] = t
	return t
}
