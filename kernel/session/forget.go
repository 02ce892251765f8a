package session

import (
	"reflect"
	"strings"
	"unsafe"
)

// The interpreter keeps all code that it ever compiled: in the list of its roots, in the tree of scopes and in the symbols of the
// package. A session that reruns a cell for days would fill the memory. What no live definition needs is removed here. Code that is
// still reachable from a value, such as the functions of an old model, stays as long as the value.

// hidden reaches a field of a struct of another package by name; the result is invalid when there is none.
func hidden(v reflect.Value, name string) reflect.Value {
	f := v.FieldByName(name)
	if !f.IsValid() || !f.CanAddr() {
		return reflect.Value{}
	}
	return reflect.NewAt(f.Type(), unsafe.Pointer(f.UnsafeAddr())).Elem()
}

// forget drops compiled code but that of the symbols to be kept.
func (m *machine) forget(keep map[string]bool) {
	in := reflect.ValueOf(m.in).Elem()
	if roots := hidden(in, "roots"); roots.IsValid() {
		roots.SetZero()
	}
	if u := hidden(in, "universe"); u.IsValid() && !u.IsNil() {
		dropChildren(u.Elem())
	}
	scopes := hidden(in, "scopes")
	if !scopes.IsValid() {
		return
	}
	for it := scopes.MapRange(); it.Next(); {
		sc := it.Value().Elem()
		dropChildren(sc)
		dropSymbols(sc, keep)
	}
}

func dropChildren(scope reflect.Value) {
	if c := hidden(scope, "child"); c.IsValid() {
		c.SetZero()
	}
}

func dropSymbols(scope reflect.Value, keep map[string]bool) {
	sym := hidden(scope, "sym")
	if !sym.IsValid() {
		return
	}
	for _, k := range sym.MapKeys() {
		if name := k.String(); strings.Contains(name, mark) && !keep[name] {
			sym.SetMapIndex(k, reflect.Value{})
		}
	}
}

// tidyEvery is how many cells run between two looks for what is no longer needed.
const tidyEvery = 8

// tidy forgets what no live definition, variable or superseded type needs.
func (s *Session) tidy() {
	if s.runs++; s.runs%tidyEvery != 0 {
		return
	}
	keep := map[string]bool{posVar: true, lineVar: true, callsVar: true}
	t := s.table()
	add := func(d *def) {
		keep[d.internal()] = true
		for _, n := range d.instances {
			keep[n] = true
		}
	}
	for _, d := range t.defs {
		add(d)
	}
	for _, d := range s.prelude {
		dropDead(d, t)
		add(d)
	}
	bound := map[string]reflect.Value{}
	for _, v := range t.vars {
		keep[v.internal()] = true
		bound[v.internal()] = s.bound[v.internal()]
		for _, d := range v.named {
			add(d)
		}
	}
	s.bound = bound
	s.old.retain(t, add)
	s.machine.forget(keep)
}

// dropDead removes the instances of a library function for types that are gone.
func dropDead(d *def, t *table) {
	for key := range d.instances {
		for _, m := range hiddenRE.FindAllString(key, -1) {
			name, _, _ := strings.Cut(m, mark)
			if live := t.defs[name]; live == nil || live.internal() != m {
				delete(d.instances, key)
				break
			}
		}
	}
}

// retain keeps only the superseded types that a variable still has, and calls add for each with its methods.
func (o *oldTypes) retain(t *table, add func(*def)) {
	o.mu.Lock()
	defer o.mu.Unlock()
	for name, d := range o.byName {
		used := false
		for _, v := range t.vars {
			used = used || v.named[name] == d
		}
		if !used {
			delete(o.byName, name)
			delete(o.methods, d)
			continue
		}
		add(d)
		for _, m := range o.methods[d] {
			add(m)
		}
	}
}
