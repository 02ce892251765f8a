package session

import (
	"go/ast"
	"go/token"
	"go/types"
	"strings"

	"brinkline/kernel/session/internal/export"
)

// A unit is one cell on its way through check and lowering, with every definition that it needs or changes.
type unit struct {
	s    *Session
	sp   *split
	cur  *table // as it is
	next *table // as it will be

	fresh   map[*def]bool      // definitions to be checked with their bodies and lowered
	moved   map[*def]*def      // unchanged definitions of the cell, and where they stand now
	changed map[string]bool    // keys and names whose meaning changes
	retyped map[string]*newVar // variables of the cell, known after the first phase

	pl      *places
	body    *ast.BlockStmt
	decls   map[*def]ast.Decl
	emitted map[string]*def // name to the checker -> definition
	varDecl map[string]*variable
	file    *ast.File
	pkg     *types.Package
	info    *types.Info
	faults  []types.Error

	undo    []func() // takes back what lowering recorded, when the cell does not come to run
	objs    map[types.Object]*def
	varObjs map[types.Object]*variable
}

// newVar is a variable that the cell binds.
type newVar struct {
	name  string
	typ   types.Type
	obj   *types.Var
	expr  ast.Expr
	named map[string]*def
	key   string
}

func newUnit(s *Session, sp *split) *unit {
	cur := s.table()
	u := &unit{s: s, sp: sp, cur: cur, next: cur.clone(), fresh: map[*def]bool{}, moved: map[*def]*def{},
		changed: map[string]bool{}, retyped: map[string]*newVar{}}
	return u
}

// define enters the cell's imports and definitions into the next table and finds what they change.
func (u *unit) define() *Error {
	for _, im := range u.sp.imports {
		if err := u.addImport(im); err != nil {
			return err
		}
	}
	seen := map[string]bool{}
	for _, d := range u.sp.defs {
		if d.key() != "init" && d.key() != "_" && seen[d.key()] {
			return u.s.errorAt(place{d.src, d.start}, "NameError", d.names[0]+" is declared twice in this cell")
		}
		seen[d.key()] = true
		if strings.Contains(d.key(), mark) {
			return u.s.errorAt(place{d.src, d.start}, "NameError", "names must not contain "+mark)
		}
		old := u.cur.defs[d.key()]
		if old != nil && old.kind == d.kind && old.text == d.text && old.broken == nil {
			u.moved[old] = d
			continue
		}
		u.enter(d)
	}
	u.retryBroken()
	u.spread()
	return nil
}

// retryBroken gives broken definitions another try that mention a name which the cell may bind.
func (u *unit) retryBroken() {
	bound := u.statementNames()
	var again []*def
	for _, d := range u.next.defs {
		if d.broken == nil || u.fresh[d] {
			continue
		}
		for n := range d.uses {
			if bound[n] {
				again = append(again, d)
				break
			}
		}
	}
	for _, d := range again {
		u.renew(d)
	}
}

// renew enters a new version of a live definition.
func (u *unit) renew(d *def) {
	c := *d
	c.instances, c.env, c.broken = map[string]string{}, nil, nil
	if m := u.moved[d]; m != nil {
		c.src, c.start, c.end = m.src, m.start, m.end
		delete(u.moved, d)
	}
	u.enter(&c)
}

func (u *unit) addImport(im importLine) *Error {
	pkg, err := u.s.importer.Import(im.path)
	if err != nil {
		return u.s.errorAt(place{u.sp.src, im.offset}, "ImportError", err.Error())
	}
	switch im.name {
	case "_":
	case ".":
		u.next.dots = append(u.next.dots, im.path)
	case "":
		u.next.imports[pkg.Name()] = im.path
	default:
		u.next.imports[im.name] = im.path
	}
	return nil
}

// enter puts a new version of a definition into the next table.
func (u *unit) enter(d *def) {
	d.index = u.s.nextIndex()
	u.fresh[d] = true
	u.next.put(d)
	u.changed[d.key()] = true
	if t := u.next.defs[d.recv]; d.kind == methodDef && t != nil && t.generic {
		u.changed[d.recv] = true // instances get their methods where they are used
	}
	for _, n := range d.names {
		if d.kind != methodDef {
			u.changed[n] = true
		}
	}
}

// spread gives every live definition that depends on a changed one a new version too.
func (u *unit) spread() {
	for again := true; again; {
		again = false
		for _, d := range u.next.defs {
			if u.fresh[d] || !u.touched(d) {
				continue
			}
			u.renew(d)
			again = true
			break
		}
	}
}

func (u *unit) touched(d *def) bool {
	if d.broken != nil && len(u.changed) > 0 {
		return true // any new name or method may be what it waits for
	}
	for n := range d.uses {
		if u.changed[n] {
			return true
		}
	}
	return false
}

// assemble builds the program that the checker sees: the cell, what it defines and changes with bodies, what these need without.
// With vars, the variables that the cell binds stand at the top level with their new types.
func (u *unit) assemble(vars, bodies bool) *parseError {
	u.pl = newPlaces()
	u.decls, u.emitted, u.varDecl = map[*def]ast.Decl{}, map[string]*def{}, map[string]*variable{}
	u.file = &ast.File{Name: ast.NewIdent("main")}
	var err *parseError
	if u.body, err = u.sp.parseBody(u.pl); err != nil {
		return err
	}
	a := &assembler{unit: u, vars: vars, bodies: bodies, imports: map[string]string{}}
	for d := range u.fresh {
		if d.broken == nil {
			if err := a.definition(d, d.names[0]); err != nil {
				return err
			}
		}
	}
	if err := a.need(u.body, nil); err != nil {
		return err
	}
	return a.finish()
}

// assembler collects the declarations of a unit.
type assembler struct {
	*unit
	vars, bodies bool
	imports      map[string]string
	list         []ast.Decl
}

// definition adds a definition under the given name, and what it needs.
func (a *assembler) definition(d *def, name string) *parseError {
	if _, ok := a.decls[d]; ok {
		return nil
	}
	decl, err := d.parse(a.pl)
	if err != nil {
		return err
	}
	a.decls[d] = decl
	if d.kind != methodDef {
		if d.kind != constDef {
			a.emitted[name] = d
		} else {
			for _, n := range d.names {
				a.emitted[n] = d
			}
		}
	} else {
		a.emitted[d.recv+"."+d.names[0]] = d
	}
	if fd, ok := decl.(*ast.FuncDecl); ok && !d.generic && (!a.bodies || !a.fresh[d]) && !d.prelude && !a.genericRecv(d) {
		strip(fd)
	}
	a.list = append(a.list, decl)
	if old := a.superseded(d); old {
		a.rename(d, decl)
	}
	var env map[string]*def
	if !a.fresh[d] {
		env = d.env
	}
	if err := a.need(decl, env); err != nil {
		return err
	}
	if d.kind == typeDef && !a.superseded(d) {
		for _, m := range a.next.methods(d.names[0]) {
			if m.broken == nil {
				if err := a.definition(m, m.names[0]); err != nil {
					return err
				}
			}
		}
	}
	if d.kind == typeDef && a.superseded(d) {
		for _, m := range a.s.old.methodsOf(d) {
			if err := a.definition(m, m.names[0]); err != nil {
				return err
			}
			a.emitted[d.hidden()+"."+m.names[0]] = m
		}
	}
	return nil
}

// genericRecv reports whether a method belongs to a generic type, so that its body is needed for instances.
func (a *assembler) genericRecv(d *def) bool {
	if d.kind != methodDef {
		return false
	}
	t := a.next.defs[d.recv]
	return t != nil && t.generic
}

// strip leaves a function its signature only.
func strip(fd *ast.FuncDecl) {
	fd.Body = &ast.BlockStmt{List: []ast.Stmt{&ast.ExprStmt{X: &ast.CallExpr{
		Fun: ast.NewIdent("panic"), Args: []ast.Expr{&ast.BasicLit{Kind: token.INT, Value: "0"}}}}}}
}

// superseded reports whether a definition is no longer the live one of its name.
func (u *unit) superseded(d *def) bool {
	if d.prelude {
		return false
	}
	if d.kind == methodDef {
		t := u.s.old.ownerOf(d)
		return t != nil && u.next.defs[t.names[0]] != t && u.next.defs[d.key()] != d
	}
	return u.next.defs[d.names[0]] != d
}

// rename gives a superseded declaration, and the superseded names in it, their hidden names.
func (a *assembler) rename(d *def, decl ast.Decl) {
	hide := func(id *ast.Ident) {
		if id.Name == d.names[0] && d.kind == typeDef {
			id.Name = d.hidden()
		} else if e := d.env[id.Name]; e != nil && a.superseded(e) {
			id.Name = e.hidden()
		}
	}
	eachName(decl, hide)
	if d.kind == typeDef {
		a.emitted[d.hidden()] = d
		delete(a.emitted, d.names[0])
		if live := a.next.defs[d.names[0]]; live != nil && a.decls[live] != nil {
			a.emitted[d.names[0]] = live
		}
	}
}

// eachName calls f for every identifier that can refer to a top-level name.
func eachName(n ast.Node, f func(*ast.Ident)) {
	ast.Inspect(n, func(n ast.Node) bool {
		switch n := n.(type) {
		case *ast.SelectorExpr:
			eachName(n.X, f)
			return false
		case *ast.Field:
			eachName(n.Type, f)
			return false
		case *ast.FuncDecl:
			if n.Recv != nil {
				eachName(n.Recv, f)
			}
			eachName(n.Type, f)
			if n.Body != nil {
				eachName(n.Body, f)
			}
			return false
		case *ast.Ident:
			f(n)
		}
		return true
	})
}

// need adds what the names in a tree refer to. env, of a definition checked before, says which versions it means.
func (a *assembler) need(n ast.Node, env map[string]*def) *parseError {
	var err *parseError
	eachName(n, func(id *ast.Ident) {
		if err == nil {
			err = a.needName(id.Name, env)
		}
	})
	ast.Inspect(n, func(n ast.Node) bool {
		if sel, ok := n.(*ast.SelectorExpr); ok && err == nil {
			if x, ok := sel.X.(*ast.Ident); ok {
				err = a.needPrelude(x.Name, sel.Sel.Name)
			}
		}
		return err == nil
	})
	return err
}

// needPrelude adds the source of a generic library function, which has no compiled form.
func (a *assembler) needPrelude(pkg, name string) *parseError {
	path := a.packagePath(pkg)
	d := a.s.prelude[path+"."+name]
	if d == nil {
		return nil
	}
	return a.definition(d, d.names[0])
}

// packagePath is the import path behind a package name.
func (a *assembler) packagePath(name string) string {
	if p, ok := a.next.imports[name]; ok {
		return p
	}
	return export.Preloaded()[name]
}

func (a *assembler) needName(name string, env map[string]*def) *parseError {
	if e := env[name]; e != nil {
		return a.definition(e, name)
	}
	if d := a.s.prelude[name]; d != nil {
		return a.definition(d, name)
	}
	if d := a.s.old.named(name); d != nil {
		return a.definition(d, name)
	}
	if d := a.next.defs[name]; d != nil {
		if d.broken != nil {
			return nil
		}
		return a.definition(d, name)
	}
	if a.vars && a.retyped[name] != nil {
		nv := a.retyped[name]
		return a.variable(&variable{name: name, expr: nv.expr, named: nv.named, key: nv.key})
	}
	if v := a.next.vars[name]; v != nil {
		return a.variable(v)
	}
	if strings.HasPrefix(name, hiddenPackage) {
		a.imports[name] = pathOfHidden(name)
		return nil
	}
	if p := a.packagePath(name); p != "" {
		a.imports[name] = p
	}
	return nil
}

// variable adds the declaration of a session variable.
func (a *assembler) variable(v *variable) *parseError {
	if a.varDecl[v.name] != nil {
		return nil
	}
	a.varDecl[v.name] = v
	expr := a.currentNames(v.expr, v.named)
	a.list = append(a.list, &ast.GenDecl{Tok: token.VAR, Specs: []ast.Spec{
		&ast.ValueSpec{Names: []*ast.Ident{ast.NewIdent(v.name)}, Type: expr}}})
	var err *parseError
	ast.Inspect(expr, func(n ast.Node) bool {
		if sel, ok := n.(*ast.SelectorExpr); ok {
			x := sel.X.(*ast.Ident).Name
			a.imports[x] = pathOfHidden(x)
			return false
		}
		if f, ok := n.(*ast.Field); ok && err == nil {
			err = a.need(f.Type, v.named)
			return true
		}
		if id, ok := n.(*ast.Ident); ok && err == nil && !isFieldName(expr, id) {
			err = a.needName(id.Name, nil)
		}
		return err == nil
	})
	return err
}

// isFieldName reports whether an identifier only names a field or parameter in a type expression.
func isFieldName(expr ast.Expr, id *ast.Ident) bool {
	found := false
	ast.Inspect(expr, func(n ast.Node) bool {
		if f, ok := n.(*ast.Field); ok {
			for _, name := range f.Names {
				found = found || name == id
			}
		}
		return !found
	})
	return found
}

// finish adds the imports, the helpers and the cell itself.
func (a *assembler) finish() *parseError {
	var specs []ast.Spec
	for name, p := range a.imports {
		if a.emitted[name] != nil || a.varDecl[name] != nil {
			continue
		}
		specs = append(specs, &ast.ImportSpec{Name: ast.NewIdent(name), Path: &ast.BasicLit{Kind: token.STRING, Value: quote(p)}})
	}
	for _, p := range a.next.dots {
		specs = append(specs, &ast.ImportSpec{Name: ast.NewIdent("."), Path: &ast.BasicLit{Kind: token.STRING, Value: quote(p)}})
	}
	var decls []ast.Decl
	if len(specs) > 0 {
		decls = append(decls, &ast.GenDecl{Tok: token.IMPORT, Specs: specs})
	}
	for _, s := range specs {
		a.file.Imports = append(a.file.Imports, s.(*ast.ImportSpec))
	}
	decls = append(decls, a.list...)
	musts, err := parsePiece(a.pl, piece{}, "", mustSource, "", 0)
	if err != nil {
		return err
	}
	decls = append(decls, musts.Decls...)
	decls = append(decls, &ast.FuncDecl{Name: ast.NewIdent(cellFunc), Type: &ast.FuncType{Params: &ast.FieldList{}}, Body: a.body})
	a.file.Decls = decls
	a.file.FileStart, a.file.FileEnd = 1, token.Pos(a.pl.fset.Base())
	return nil
}

const cellFunc = "cell" + mark

// mustSource declares, for the checker, the calls that stand for "an error that is not taken stops the cell".
const mustSource = `package p
func mustˑ0(error) {}
func mustˑ1[A any](a A, _ error) A { panic(0) }
func mustˑ2[A, B any](a A, b B, _ error) (A, B) { panic(0) }
func mustˑ3[A, B, C any](a A, b B, c C, _ error) (A, B, C) { panic(0) }
func mustˑ4[A, B, C, D any](a A, b B, c C, d D, _ error) (A, B, C, D) { panic(0) }
`
