package session

import (
	"fmt"
	"go/ast"
	"go/token"
	"go/types"
	"sort"
	"strconv"
	"strings"
)

// Lowering turns a checked unit into the subset of Go that the interpreter runs faithfully. What the checker knows is written out:
// constants are folded, conversions to interfaces are explicit, methods are functions with the receiver first, embedded fields are
// plain fields, generic code is instantiated. The interpreter sees no method and no interface but those of compiled packages.
//
// A value of a cell's own type that goes into an interface is boxed with its runtime type (type boxed), so that type switches, method
// calls, fmt and the display find what Go would find.

// An emitter collects the lowered declarations of one unit.
type emitter struct {
	u       *unit
	decls   []ast.Decl
	queue   []func()          // instances whose bodies are still to be lowered
	origins map[any]int       // *def or *source -> number in the session's table
	types   map[string]bool   // internal names of types emitted in this unit
	prolog  []ast.Stmt        // registrations that run before the cell
	regs    map[string]*rtype // runtime types made in this unit
	locals  map[types.Object]string
	serial  int

	registered   map[string]bool     // types whose methods were registered
	pendingTypes []*types.Named      // instances and local types met while lowering
	localNames   map[localKey]string // internal names of types declared within functions
}

// A lowerer lowers one function: its local names, its type arguments, its results.
type lowerer struct {
	*emitter
	subst   map[*types.TypeParam]types.Type
	names   map[types.Object]string
	used    map[string]int
	results []types.Type
	named   []*types.Var // named results
	clear   []ast.Stmt   // sets the named results to zero
	loops   int          // around the statement being lowered
	quiet   bool         // library source: no positions
}

// lowered is what the interpreter gets, and what the session has to remember.
type lowered struct {
	file *ast.File
	vars []*variable // bound by the cell
}

// bail carries an error out of the recursion of lowering.
type bail struct{ err *Error }

// lower lowers the unit.
func (u *unit) lower() (out *lowered, err *Error) {
	e := &emitter{u: u, origins: map[any]int{}, types: map[string]bool{}, regs: map[string]*rtype{}, locals: map[types.Object]string{},
		localNames: map[localKey]string{}, registered: map[string]bool{}}
	defer func() {
		switch r := recover().(type) {
		case nil:
		case bail:
			out, err = nil, r.err
		default:
			panic(r)
		}
	}()
	return e.unit(), nil
}

func (e *emitter) unit() *lowered {
	out := &lowered{}
	cell := e.function(nil)
	out.vars = e.bindVariables(cell)
	for _, d := range e.freshDefs() {
		if d.broken == nil && !d.generic {
			e.definition(d)
		}
	}
	body := cell.cellBody()
	for len(e.queue) > 0 {
		next := e.queue[0]
		e.queue = e.queue[1:]
		next()
	}
	e.registerMethods()
	for len(e.queue) > 0 {
		next := e.queue[0]
		e.queue = e.queue[1:]
		next()
	}
	list := append(e.prolog, body...)
	e.decls = append(e.decls, initFunc(list))
	out.file = &ast.File{Name: ast.NewIdent("main"), Decls: e.decls}
	return out
}

// freshDefs lists the new definitions in the order of their numbers, so that the same cell always gives the same code.
func (e *emitter) freshDefs() []*def {
	var out []*def
	for d := range e.u.fresh {
		out = append(out, d)
	}
	sort.Slice(out, func(i, j int) bool { return out[i].index < out[j].index })
	return out
}

// bindVariables gives the cell's variables their storage: that of before when the type is the same, new one otherwise.
func (e *emitter) bindVariables(cell *lowerer) []*variable {
	scope := e.u.info.Scopes[e.u.cellType()]
	var out []*variable
	for _, name := range scope.Names() {
		obj, ok := scope.Lookup(name).(*types.Var)
		if !ok || name == "_" {
			continue
		}
		nv := e.u.retyped[name]
		v := e.u.cur.vars[name]
		if v == nil || v.key != nv.key {
			v = &variable{name: name, index: e.u.s.nextIndex(), key: nv.key, expr: nv.expr, named: nv.named}
			e.global(v.internal(), cell.typ(obj.Type()))
			e.prolog = append(e.prolog, exprStmt(hostCall("Bind", strLit(v.internal()), &ast.UnaryExpr{Op: token.AND, X: ast.NewIdent(v.internal())})))
		} else {
			c := *v
			v = &c
		}
		v.cell = e.u.sp.src
		e.locals[obj] = v.internal()
		for o, w := range e.u.varObjs {
			if w.name == name {
				e.u.varObjs[o] = v
			}
		}
		out = append(out, v)
	}
	return out
}

func (e *emitter) global(name string, typ ast.Expr) {
	e.decls = append(e.decls, &ast.GenDecl{Tok: token.VAR, Specs: []ast.Spec{
		&ast.ValueSpec{Names: []*ast.Ident{ast.NewIdent(name)}, Type: typ}}})
}

// function starts the lowering of a function.
func (e *emitter) function(subst map[*types.TypeParam]types.Type) *lowerer {
	return &lowerer{emitter: e, subst: subst, names: map[types.Object]string{}, used: map[string]int{}}
}

// fail stops lowering with an error at a position.
func (e *emitter) fail(pos token.Pos, format string, args ...any) {
	panic(bail{e.u.s.errorAt(e.u.placeOf(pos), "TypeError", fmt.Sprintf(format, args...))})
}

// temp makes a name that nothing else has.
func (e *emitter) temp(prefix string) string {
	e.serial++
	return prefix + mark + "t" + strconv.Itoa(e.serial)
}

// definition lowers a definition that has code.
func (e *emitter) definition(d *def) {
	switch decl := e.u.decls[d].(type) {
	case *ast.FuncDecl:
		if d.kind == methodDef {
			if t := e.u.next.defs[d.recv]; t != nil && t.generic {
				return // lowered with its instances
			}
		}
		l := e.function(nil)
		l.quiet = d.prelude
		e.decls = append(e.decls, l.funcDecl(decl, d.internal()))
	case *ast.GenDecl:
		if d.kind == typeDef && d.recv == "" {
			if tn, ok := e.u.pkg.Scope().Lookup(d.names[0]).(*types.TypeName); ok && !tn.IsAlias() {
				e.function(nil).typ(tn.Type())
			}
		}
	}
}

// funcDecl lowers a function or method; a method's receiver becomes the first parameter.
func (l *lowerer) funcDecl(d *ast.FuncDecl, name string) *ast.FuncDecl {
	obj := l.u.info.Defs[d.Name].(*types.Func)
	sig := obj.Type().(*types.Signature)
	params := &ast.FieldList{}
	if sig.Recv() != nil {
		params.List = append(params.List, l.param(l.recvVar(d), sig.Recv().Type(), false))
	}
	ft := l.signature(sig, params, l.paramVars(d.Type.Params), l.paramVars(d.Type.Results))
	body := l.funcBody(d.Body, name)
	return &ast.FuncDecl{Name: ast.NewIdent(name), Type: ft, Body: body}
}

func (l *lowerer) recvVar(d *ast.FuncDecl) *types.Var {
	if len(d.Recv.List) == 0 || len(d.Recv.List[0].Names) == 0 {
		return nil
	}
	v, _ := l.u.info.Defs[d.Recv.List[0].Names[0]].(*types.Var)
	return v
}

// paramVars lists the variables that a field list declares, nil for those without a name.
func (l *lowerer) paramVars(fl *ast.FieldList) []*types.Var {
	if fl == nil {
		return nil
	}
	var out []*types.Var
	for _, f := range fl.List {
		if len(f.Names) == 0 {
			out = append(out, nil)
		}
		for _, n := range f.Names {
			v, _ := l.u.info.Defs[n].(*types.Var)
			out = append(out, v)
		}
	}
	return out
}

// signature writes a function's type with the names of its parameters and remembers its results.
func (l *lowerer) signature(sig *types.Signature, params *ast.FieldList, in, out []*types.Var) *ast.FuncType {
	for i := range sig.Params().Len() {
		var v *types.Var
		if i < len(in) {
			v = in[i]
		}
		params.List = append(params.List, l.param(v, sig.Params().At(i).Type(), sig.Variadic() && i == sig.Params().Len()-1))
	}
	results := &ast.FieldList{}
	l.results, l.named, l.clear = nil, nil, nil
	hasNames := false
	for _, v := range out {
		hasNames = hasNames || v != nil
	}
	for i := range sig.Results().Len() {
		t := l.sub(sig.Results().At(i).Type())
		l.results = append(l.results, t)
		f := &ast.Field{Type: l.typ(t)}
		if hasNames {
			name := l.temp("r")
			if out[i] != nil && out[i].Name() != "_" {
				name = l.declare(out[i])
			}
			l.named = append(l.named, out[i])
			l.clear = append(l.clear, varStmt(name+mark+"0", l.typ(t), nil), assign(ast.NewIdent(name), ast.NewIdent(name+mark+"0")))
			f.Names = []*ast.Ident{ast.NewIdent(name)}
		}
		results.List = append(results.List, f)
	}
	return &ast.FuncType{Params: params, Results: results}
}

func (l *lowerer) param(v *types.Var, t types.Type, variadic bool) *ast.Field {
	name := ""
	if v == nil || v.Name() == "_" || v.Name() == "" {
		name = l.temp("p")
	} else {
		name = l.declare(v)
	}
	var e ast.Expr
	if variadic {
		e = &ast.Ellipsis{Elt: l.typ(l.sub(t).Underlying().(*types.Slice).Elem())}
	} else {
		e = l.typ(t)
	}
	return &ast.Field{Names: []*ast.Ident{ast.NewIdent(name)}, Type: e}
}

// funcBody lowers the body of a function and guards its depth. Named results are cleared first: where the call stands in a loop, the
// interpreter hands the function the values of the last turn.
func (l *lowerer) funcBody(body *ast.BlockStmt, name string) *ast.BlockStmt {
	clear := l.clear
	b := l.block(body)
	b.List = append(clear, b.List...)
	if !l.quiet && l.callsBack(body) {
		b.List = append(depthGuard(), b.List...)
	}
	return b
}

// callsBack reports whether a body calls anything that could call it again.
func (l *lowerer) callsBack(body *ast.BlockStmt) bool {
	found := false
	ast.Inspect(body, func(n ast.Node) bool {
		c, ok := n.(*ast.CallExpr)
		found = found || ok && !l.harmless(c)
		return !found
	})
	return found
}

// depthGuard counts calls and looks at the depth of the stack every so often.
func depthGuard() []ast.Stmt {
	return []ast.Stmt{
		&ast.IncDecStmt{X: ast.NewIdent(callsVar), Tok: token.INC},
		&ast.IfStmt{Cond: &ast.BinaryExpr{X: ast.NewIdent(callsVar), Op: token.GTR, Y: intLit(depthStride)},
			Body: &ast.BlockStmt{List: []ast.Stmt{
				assign(ast.NewIdent(callsVar), intLit(0)),
				exprStmt(hostCall("Depth"))}}},
	}
}

const (
	callsVar    = "calls" + mark // counts calls of functions, for the depth guard
	posVar      = "pos" + mark   // the statement being run
	lineVar     = "line" + mark  // the statement of the cell being run
	depthStride = 2048
)

// declare gives a local variable its name in the lowered code.
func (l *lowerer) declare(obj types.Object) string {
	if n, ok := l.locals[obj]; ok {
		return n
	}
	if n, ok := l.names[obj]; ok {
		return n
	}
	name := obj.Name()
	if n := l.used[name]; n > 0 || types.Universe.Lookup(name) != nil || name == hostName || name == "init" || name == "main" {
		l.used[name]++
		name += mark + strconv.Itoa(n+1)
	} else {
		l.used[name] = 1
	}
	l.names[obj] = name
	return name
}

// at returns the statement that records where the code is, or nothing for library source.
func (l *lowerer) at(pos token.Pos) []ast.Stmt {
	n := l.position(pos)
	if n < 0 {
		return nil
	}
	return []ast.Stmt{assign(ast.NewIdent(posVar), intLit(n))}
}

// position is a position as a number: which definition or cell, and the offset in it. It is -1 where the cell has no text.
func (l *lowerer) position(pos token.Pos) int {
	if l.quiet {
		return -1
	}
	pl, owner, ok := l.u.pl.find(pos)
	if !ok {
		return -1
	}
	var origin any = pl.src
	offset := pl.offset
	if owner != nil {
		origin, offset = owner, pl.offset-owner.start
	}
	n, ok := l.origins[origin]
	if !ok {
		n = l.u.s.addOrigin(origin)
		l.origins[origin] = n
	}
	return n<<offsetBits | min(offset, 1<<offsetBits-1)
}

const offsetBits = 20

// ---- small builders of syntax ----

const hostName = "bl"

func host(name string) ast.Expr {
	return &ast.SelectorExpr{X: ast.NewIdent(hostName), Sel: ast.NewIdent(name)}
}

func hostCall(name string, args ...ast.Expr) *ast.CallExpr { return call(host(name), args...) }

func call(fun ast.Expr, args ...ast.Expr) *ast.CallExpr { return &ast.CallExpr{Fun: fun, Args: args} }

func exprStmt(x ast.Expr) ast.Stmt { return &ast.ExprStmt{X: x} }

func assign(l, r ast.Expr) ast.Stmt {
	return &ast.AssignStmt{Lhs: []ast.Expr{l}, Tok: token.ASSIGN, Rhs: []ast.Expr{r}}
}

func define(name string, r ast.Expr) ast.Stmt {
	return &ast.AssignStmt{Lhs: []ast.Expr{ast.NewIdent(name)}, Tok: token.DEFINE, Rhs: []ast.Expr{r}}
}

func varStmt(name string, typ, val ast.Expr) ast.Stmt {
	spec := &ast.ValueSpec{Names: []*ast.Ident{ast.NewIdent(name)}, Type: typ}
	if val != nil {
		spec.Values = []ast.Expr{val}
	}
	return &ast.DeclStmt{Decl: &ast.GenDecl{Tok: token.VAR, Specs: []ast.Spec{spec}}}
}

func intLit(n int) ast.Expr { return &ast.BasicLit{Kind: token.INT, Value: strconv.Itoa(n)} }

func strLit(s string) ast.Expr { return &ast.BasicLit{Kind: token.STRING, Value: strconv.Quote(s)} }

func paren(e ast.Expr) ast.Expr { return &ast.ParenExpr{X: e} }

// closure writes func() results { stmts }().
func closure(results []ast.Expr, stmts ...ast.Stmt) *ast.CallExpr {
	fl := &ast.FieldList{}
	for _, r := range results {
		fl.List = append(fl.List, &ast.Field{Type: r})
	}
	return call(&ast.FuncLit{Type: &ast.FuncType{Params: &ast.FieldList{}, Results: fl}, Body: &ast.BlockStmt{List: stmts}})
}

func isInternal(name string) bool { return strings.Contains(name, mark) }
