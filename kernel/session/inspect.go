package session

import (
	"fmt"
	"go/ast"
	"go/types"
	"html"
	"strings"

	"brinkline/display"
	"brinkline/kernel/session/internal/export"
)

// Inspect describes the name at the cursor, counted in characters: what it is, its type or signature and its documentation.
func (s *Session) Inspect(source string, cursor int) (display.Bundle, bool) {
	runes := []rune(source)
	cursor = max(0, min(cursor, len(runes)))
	start, end := cursor, cursor
	for start > 0 && isNameRune(runes[start-1]) {
		start--
	}
	for end < len(runes) && isNameRune(runes[end]) {
		end++
	}
	if start == end && start > 0 && runes[start-1] == '(' { // just behind an opening parenthesis: what is called
		return s.Inspect(source, start-1)
	}
	name := string(runes[start:end])
	if name == "" {
		return display.Bundle{}, false
	}
	v := s.look(string(runes[:start]), string(runes[end:]))
	obj, recv := v.object(name)
	if obj == nil {
		return display.Bundle{}, false
	}
	return describeBundle(s.title(v.u, obj), s.short(obj), s.doc(v.u, obj, recv)), true
}

// object finds what a name at the cursor would mean, and the type of the value whose member it is.
func (v *view) object(name string) (types.Object, types.Type) {
	if v.at == nil || v.u.info == nil {
		return nil, nil
	}
	if sel, ok := v.path[1].(*ast.SelectorExpr); ok && sel.Sel == v.at {
		if id, ok := sel.X.(*ast.Ident); ok {
			if pkg, ok := v.u.info.Uses[id].(*types.PkgName); ok {
				return pkg.Imported().Scope().Lookup(name), nil
			}
		}
		t := v.u.info.Types[sel.X].Type
		if t == nil {
			return nil, nil
		}
		obj, _, _ := types.LookupFieldOrMethod(t, true, v.u.pkg, name)
		return obj, t
	}
	for _, sc := range v.u.info.Scopes {
		if sc.Contains(v.at.Pos()) && sc.Parent() != v.u.pkg.Scope() {
			if _, obj := sc.LookupParent(name, v.at.Pos()); obj != nil {
				return obj, nil
			}
		}
	}
	return v.global(name), nil
}

// global finds a name of the session, which the unfinished cell may not have needed.
func (v *view) global(name string) types.Object {
	w := v.u.s.lookAt(name + "; " + cursorName)
	if w != nil {
		if obj := w.u.pkg.Scope().Lookup(name); obj != nil {
			v.u = w.u
			return obj
		}
		for id, obj := range w.u.info.Uses {
			if id.Name == name {
				v.u = w.u
				return obj
			}
		}
	}
	return types.Universe.Lookup(name)
}

// title is the declaration of an object in one line, or a few for a type.
func (s *Session) title(u *unit, obj types.Object) string {
	if pkg, ok := obj.(*types.PkgName); ok {
		return fmt.Sprintf("package %s // import %q", pkg.Imported().Name(), pkg.Imported().Path())
	}
	text := types.ObjectString(obj, func(p *types.Package) string {
		if p == u.pkg {
			return ""
		}
		return p.Name()
	})
	return u.cleanMessage(text)
}

// short is the short form of a session variable's value, recorded when the cell that bound it had ended.
func (s *Session) short(obj types.Object) string {
	if _, ok := obj.(*types.Var); !ok {
		return ""
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.shorts[obj.Name()]
}

// doc finds the documentation of an object.
func (s *Session) doc(u *unit, obj types.Object, recv types.Type) string {
	if pkg, ok := obj.(*types.PkgName); ok {
		return export.Doc(pkg.Imported().Path())
	}
	if d := u.objs[obj]; d != nil {
		return d.comment()
	}
	if obj.Pkg() == nil || obj.Pkg() == u.pkg {
		return ""
	}
	key := obj.Pkg().Path() + "."
	if fn, ok := obj.(*types.Func); ok {
		if r := fn.Type().(*types.Signature).Recv(); r != nil {
			key += typeNameOf(r.Type()) + "."
		}
	} else if recv != nil {
		key += typeNameOf(recv) + "."
	}
	return export.Doc(key + obj.Name())
}

func typeNameOf(t types.Type) string {
	if p, ok := t.(*types.Pointer); ok {
		t = p.Elem()
	}
	if n, ok := types.Unalias(t).(*types.Named); ok {
		return n.Obj().Name()
	}
	return ""
}

// comment is the comment that stands directly above a definition.
func (d *def) comment() string {
	line, _ := d.src.position(d.start)
	var lines []string
	for l := line - 1; l >= 1; l-- {
		text := strings.TrimSpace(d.src.line(l))
		if !strings.HasPrefix(text, "//") {
			break
		}
		lines = append([]string{strings.TrimPrefix(strings.TrimPrefix(text, "//"), " ")}, lines...)
	}
	return strings.Join(lines, "\n")
}

func describeBundle(title, short, doc string) display.Bundle {
	parts := []string{title}
	page := "<pre>" + html.EscapeString(title) + "</pre>"
	for _, p := range []string{short, strings.TrimSpace(doc)} {
		if p != "" {
			parts = append(parts, p)
			page += "<p style=\"white-space: pre-wrap\">" + html.EscapeString(p) + "</p>"
		}
	}
	b := plainText(strings.Join(parts, "\n\n"))
	b.Data[display.MIMEHTML] = page
	return b
}
