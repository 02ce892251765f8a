package session

import (
	"fmt"
	"go/ast"
	"go/types"
	"slices"
)

// takeBack undoes what lowering recorded for a cell that will not run.
func (u *unit) takeBack() {
	for i := len(u.undo) - 1; i >= 0; i-- {
		u.undo[i]()
	}
}

// commit makes the definitions of a checked and compiled cell live. Its variables follow when they are assigned.
func (u *unit) commit(low *lowered) {
	for d, m := range u.moved {
		d.src, d.start, d.end = m.src, m.start, m.end
	}
	for d := range u.fresh {
		if d.broken == nil {
			u.recordUses(d)
		}
	}
	for d := range u.decls {
		if u.fresh[d] && d.kind == typeDef {
			u.keepOld(d)
		}
	}
	for name := range u.cur.vars {
		if u.next.vars[name] == nil {
			delete(u.next.vars, name)
		}
	}
	u.s.tab.Store(u.next)
}

// noteBroken tells the analyst which definitions of the cell, or of earlier ones that it changed, cannot be used as things are.
func (u *unit) noteBroken(r *run) {
	var list []*def
	for d := range u.fresh {
		old := u.cur.defs[d.key()]
		if d.broken != nil && (d.src == u.sp.src || old == nil || old.broken == nil) {
			list = append(list, d)
		}
	}
	slices.SortFunc(list, func(a, b *def) int { return a.index - b.index })
	for _, d := range list {
		r.out.Stream("stderr", fmt.Sprintf("note: %s cannot be used yet: %s (%s, line %d)\n", d.key(), d.broken.Message, d.src.label(), d.broken.Line))
	}
}

// recordUses notes which top-level names a definition refers to and which versions these are now.
func (u *unit) recordUses(d *def) {
	d.uses, d.env = map[string]bool{}, map[string]*def{}
	decl := u.decls[d]
	if decl == nil {
		return
	}
	ast.Inspect(decl, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.Ident:
			u.recordUse(d, n)
		case *ast.SelectorExpr:
			if sel := u.info.Selections[n]; sel != nil {
				if fn, ok := sel.Obj().(*types.Func); ok {
					if m := u.objs[fn.Origin()]; m != nil {
						d.uses[m.key()] = true
					}
				}
			}
		}
		return true
	})
}

func (u *unit) recordUse(d *def, id *ast.Ident) {
	obj := u.info.Uses[id]
	if obj == nil {
		return
	}
	if e := u.objs[obj]; e != nil && e != d && e.kind != methodDef {
		d.uses[id.Name], d.env[id.Name] = true, e
	}
	if v := u.varObjs[obj]; v != nil {
		d.uses[v.name] = true
	}
}

// keepOld remembers a superseded type, with its methods, as long as a variable has it.
func (u *unit) keepOld(d *def) {
	old := u.cur.defs[d.names[0]]
	if old == nil || old.kind != typeDef || old == d {
		return
	}
	for _, v := range u.cur.vars {
		if v.named[old.internal()] == old {
			u.s.old.add(old, u.cur.methods(old.names[0]))
			return
		}
	}
}
