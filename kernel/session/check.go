package session

import (
	"errors"
	"go/ast"
	"go/token"
	"go/types"
	"slices"
	"strings"

	"brinkline/kernel/session/internal/export"
)

// check checks the cell to the end. Where a function that the cell defines or changes mentions a variable that the cell binds, the
// statements are checked first, which fixes the types of the variables, and everything again with these. Definitions of earlier cells
// that no longer fit are set aside as broken.
func (u *unit) check() *Error {
	if err := u.define(); err != nil {
		return err
	}
	mixed := u.mentionsCellNames()
	if err := u.phase(false, !mixed); err != nil {
		return err
	}
	if err := u.bind(); err != nil {
		return err
	}
	before := len(u.fresh)
	u.spread()
	if !mixed && len(u.fresh) == before {
		return nil
	}
	return u.phase(true, true)
}

// mentionsCellNames reports whether a new or changed definition mentions a name that the statements of the cell may bind.
func (u *unit) mentionsCellNames() bool {
	if len(u.fresh) == 0 || !u.sp.hasBody {
		return false
	}
	bound := u.statementNames()
	for n := range bound {
		if u.next.defs[n] != nil && u.cur.vars[n] == nil {
			delete(bound, n)
		}
	}
	for d := range u.fresh {
		toks, _ := scan(d.text)
		for i, t := range toks {
			if t.tok == token.IDENT && bound[t.lit] && (i == 0 || toks[i-1].tok != token.PERIOD) && !u.isLibraryName(t.lit) {
				return true
			}
		}
	}
	return false
}

// statementNames lists the names in the statements of the cell: more than they bind, which only costs time.
func (u *unit) statementNames() map[string]bool {
	toks, _ := scan(u.sp.statements)
	out := map[string]bool{}
	for _, t := range toks {
		if t.tok == token.IDENT {
			out[t.lit] = true
		}
	}
	return out
}

// isLibraryName reports whether a name is a package or predeclared, and not bound by any cell.
func (u *unit) isLibraryName(name string) bool {
	if u.cur.vars[name] != nil {
		return false
	}
	return u.next.imports[name] != "" || export.Preloaded()[name] != "" || types.Universe.Lookup(name) != nil
}

// phase assembles and checks until no definition has to be set aside.
func (u *unit) phase(vars, bodies bool) *Error {
	for {
		if err := u.assemble(vars, bodies); err != nil {
			return u.s.syntaxError(u.sp.src, err)
		}
		u.settle(bodies)
		fault, owner := u.firstFault()
		if fault == nil {
			return nil
		}
		if owner == nil || !u.setAside(owner, fault) {
			return u.describe(fault, owner)
		}
	}
}

// settle checks and rewrites calls whose error nobody takes, until there is nothing left to rewrite.
func (u *unit) settle(bodies bool) {
	for {
		u.typecheck()
		if !u.takeErrors(bodies) {
			return
		}
	}
}

// typecheck runs go/types over the assembled file.
func (u *unit) typecheck() {
	u.faults = nil
	u.info = &types.Info{
		Types:      map[ast.Expr]types.TypeAndValue{},
		Defs:       map[*ast.Ident]types.Object{},
		Uses:       map[*ast.Ident]types.Object{},
		Selections: map[*ast.SelectorExpr]*types.Selection{},
		Instances:  map[*ast.Ident]types.Instance{},
		Implicits:  map[ast.Node]types.Object{},
		Scopes:     map[ast.Node]*types.Scope{},
	}
	conf := types.Config{
		Importer: u.s.importer,
		Error: func(err error) {
			var te types.Error
			if errors.As(err, &te) && !tolerated(te) {
				u.faults = append(u.faults, te)
			}
		},
	}
	u.pkg = types.NewPackage("main", "main")
	c := types.NewChecker(&conf, u.pl.fset, u.pkg, u.info)
	_ = c.Files([]*ast.File{u.file}) // every error went to conf.Error
	u.pkg.SetName("")
	u.nameObjects()
}

// tolerated reports whether a cell may have this fault: what is not used is no mistake in a notebook.
func tolerated(e types.Error) bool {
	m := e.Msg
	return e.Soft && strings.Contains(m, "not used") || strings.HasSuffix(m, " is not used") ||
		strings.Contains(m, "imported and not used") || strings.Contains(m, "initialization cycle")
}

// nameObjects finds the definition or variable behind each object at the top level.
func (u *unit) nameObjects() {
	u.objs, u.varObjs = map[types.Object]*def{}, map[types.Object]*variable{}
	scope := u.pkg.Scope()
	for name, d := range u.emitted {
		recv, method, isMethod := strings.Cut(name, ".")
		if !isMethod {
			if obj := scope.Lookup(name); obj != nil {
				u.objs[obj] = d
			}
			continue
		}
		tn, ok := scope.Lookup(recv).(*types.TypeName)
		if !ok {
			continue
		}
		if named, ok := types.Unalias(tn.Type()).(*types.Named); ok {
			for m := range named.Methods() {
				if m.Name() == method {
					u.objs[m] = d
				}
			}
		}
	}
	for name, v := range u.varDecl {
		if obj := scope.Lookup(name); obj != nil {
			u.varObjs[obj] = v
		}
	}
}

// firstFault returns the fault that stands first in the cell itself, or else in what else was checked.
func (u *unit) firstFault() (*types.Error, *def) {
	slices.SortStableFunc(u.faults, func(a, b types.Error) int { return int(a.Pos) - int(b.Pos) })
	var other *types.Error
	var owner *def
	for i := range u.faults {
		f := &u.faults[i]
		pl, d, ok := u.pl.find(f.Pos)
		if ok && d == nil && pl.src == u.sp.src {
			return f, nil
		}
		if other == nil || owner == nil {
			other, owner = f, d
		}
	}
	return other, owner
}

// setAside marks a definition as broken where that is allowed: one of an earlier cell that no longer fits, or one of this cell that
// refers to what is not defined yet. It reports whether it did.
func (u *unit) setAside(d *def, fault *types.Error) bool {
	if d.broken != nil || d.prelude {
		return false
	}
	if d.src == u.sp.src {
		for i := range u.faults {
			_, o, _ := u.pl.find(u.faults[i].Pos)
			if o == d && !u.mayCome(&u.faults[i]) {
				return false
			}
		}
	}
	broken := *d
	broken.broken = u.describe(fault, d)
	broken.uses = map[string]bool{}
	if decl := u.decls[d]; decl != nil {
		eachName(decl, func(id *ast.Ident) { broken.uses[id.Name] = true })
	}
	for _, n := range d.names {
		delete(broken.uses, n)
	}
	delete(u.fresh, d)
	u.fresh[&broken] = true
	u.next.put(&broken)
	return true
}

// mayCome reports whether a later cell can mend a fault: it can define a name or a method. What is near a name that exists is taken
// for a slip, which is better told at once.
func (u *unit) mayCome(f *types.Error) bool {
	if missing, ok := strings.CutPrefix(f.Msg, "undefined: "); ok {
		d := u.next.byName(missing)
		near, found := strings.CutPrefix(strings.TrimSuffix(u.nearestName(missing, f), "?"), "did you mean ")
		return d != nil && d.broken != nil || !found || !looksLikeSlip(missing, near)
	}
	for _, part := range []string{"missing method ", "has no field or method ", "impossible type switch case", "undefined array length"} {
		if strings.Contains(f.Msg, part) {
			return u.memberHint(f.Msg) == "" && !strings.Contains(f.Msg, "but does have")
		}
	}
	return false
}

// looksLikeSlip reports whether a word is another one mistyped, rather than a name of its own such as f2 beside f1.
func looksLikeSlip(word, near string) bool {
	digits := func(r rune) rune {
		if r >= '0' && r <= '9' {
			return -1
		}
		return r
	}
	if strings.Map(digits, word) == strings.Map(digits, near) || strings.EqualFold(word, near) {
		return false
	}
	n := len([]rune(word))
	return n >= 4 && distance(word, near) <= 1+n/8
}

// bind finds the variables that the cell binds at its top level and how that changes the table.
func (u *unit) bind() *Error {
	scope := u.info.Scopes[u.cellType()]
	if scope == nil {
		return nil
	}
	for _, name := range scope.Names() {
		v, ok := scope.Lookup(name).(*types.Var)
		if !ok || name == "_" {
			continue
		}
		nv := &newVar{name: name, typ: v.Type(), obj: v}
		nv.expr, nv.named = u.typeExpr(v.Type())
		nv.key = types.ExprString(nv.expr)
		u.retyped[name] = nv
		old := u.cur.vars[name]
		if old == nil || old.key != nv.key {
			u.changed[name] = true
		}
		if u.next.defs[name] != nil {
			if u.fresh[u.next.defs[name]] {
				return u.s.errorAt(u.placeOf(v.Pos()), "NameError", name+" is declared twice in this cell")
			}
			delete(u.next.defs, name)
			u.changed[name] = true
		}
	}
	return nil
}

func (u *unit) placeOf(pos token.Pos) place {
	pl, _, _ := u.pl.find(pos)
	return pl
}

// cellType is the type expression of the cell's function, to which its scope belongs.
func (u *unit) cellType() *ast.FuncType {
	for _, d := range u.file.Decls {
		if fd, ok := d.(*ast.FuncDecl); ok && fd.Name.Name == cellFunc {
			return fd.Type
		}
	}
	return nil
}
