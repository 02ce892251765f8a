package session

import (
	"go/types"
	"sort"
)

// members lists the fields and methods that can follow a value of the type and a dot.
func members(t types.Type) []types.Object {
	seen := map[string]types.Object{}
	for i := range numMethods(t) {
		m := types.NewMethodSet(methodHolder(t)).At(i).Obj()
		seen[m.Name()] = m
	}
	addFields(t, seen, 0)
	names := make([]string, 0, len(seen))
	for n := range seen {
		names = append(names, n)
	}
	sort.Strings(names)
	out := make([]types.Object, len(names))
	for i, n := range names {
		out[i] = seen[n]
	}
	return out
}

// methodHolder is the type whose method set counts: the pointer, for values in variables can be addressed.
func methodHolder(t types.Type) types.Type {
	if _, ok := t.Underlying().(*types.Interface); ok {
		return t
	}
	if _, ok := t.(*types.Pointer); ok {
		return t
	}
	return types.NewPointer(t)
}

func numMethods(t types.Type) int { return types.NewMethodSet(methodHolder(t)).Len() }

func addFields(t types.Type, seen map[string]types.Object, depth int) {
	if p, ok := t.Underlying().(*types.Pointer); ok {
		t = p.Elem()
	}
	st, ok := t.Underlying().(*types.Struct)
	if !ok || depth > 4 {
		return
	}
	for f := range st.Fields() {
		if seen[f.Name()] == nil && (f.Exported() || f.Pkg() == nil || f.Pkg().Path() == "main") {
			seen[f.Name()] = f
		}
	}
	for f := range st.Fields() {
		if f.Embedded() {
			addFields(f.Type(), seen, depth+1)
		}
	}
}
