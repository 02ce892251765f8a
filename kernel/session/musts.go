package session

import (
	"go/ast"
	"go/types"
	"strconv"
	"strings"

	"golang.org/x/tools/go/ast/astutil"
)

const mustName = "must" + mark

var errorType = types.Universe.Lookup("error").Type()

// takeErrors wraps calls whose last result is an error, where one value fewer is wanted, in calls that stop the cell. It reports
// whether it changed anything; the checker then has to look again, for the wrapped call may be part of another such call.
func (u *unit) takeErrors(bodies bool) bool {
	changed := u.takeErrorsIn(u.body, nil)
	if bodies {
		for d, decl := range u.decls {
			if fd, ok := decl.(*ast.FuncDecl); ok && u.fresh[d] {
				changed = u.takeErrorsIn(fd, nil) || changed
			}
		}
	}
	return changed
}

func (u *unit) takeErrorsIn(root ast.Node, results []int) bool {
	changed := false
	pre := func(c *astutil.Cursor) bool {
		switch n := c.Node().(type) {
		case *ast.FuncDecl:
			results = append(results, n.Type.Results.NumFields())
		case *ast.FuncLit:
			results = append(results, n.Type.Results.NumFields())
		}
		return true
	}
	post := func(c *astutil.Cursor) bool {
		switch n := c.Node().(type) {
		case *ast.FuncDecl, *ast.FuncLit:
			results = results[:len(results)-1]
		case *ast.CallExpr:
			want := -1
			if len(results) > 0 {
				want = results[len(results)-1]
			}
			if u.untaken(n, c, want) {
				c.Replace(wrapCall(n, u.resultCount(n)-1))
				changed = true
			}
		}
		return true
	}
	astutil.Apply(root, pre, post)
	return changed
}

func wrapCall(call *ast.CallExpr, values int) *ast.CallExpr {
	fun := &ast.Ident{NamePos: call.Pos(), Name: mustName + strconv.Itoa(values)}
	return &ast.CallExpr{Fun: fun, Lparen: call.Pos(), Args: []ast.Expr{call}, Rparen: call.End() - 1}
}

// mustCall returns the call inside a wrapper and the number of its values.
func mustCall(e ast.Expr) (inner *ast.CallExpr, values int, ok bool) {
	call, ok := e.(*ast.CallExpr)
	if !ok {
		return nil, 0, false
	}
	id, ok := call.Fun.(*ast.Ident)
	if !ok || !strings.HasPrefix(id.Name, mustName) {
		return nil, 0, false
	}
	values, _ = strconv.Atoi(id.Name[len(mustName):])
	return call.Args[0].(*ast.CallExpr), values, true
}

// resultCount is the number of results of a real call, 0 for conversions, builtins and what did not check.
func (u *unit) resultCount(call *ast.CallExpr) int {
	if tv := u.info.Types[call.Fun]; tv.IsType() || tv.IsBuiltin() {
		return 0
	}
	switch t := u.info.Types[call].Type.(type) {
	case nil:
		return 0
	case *types.Tuple:
		return t.Len()
	default:
		if t == types.Typ[types.Invalid] {
			return 0
		}
		return 1
	}
}

// endsInError reports whether the last result of a call is an error.
func (u *unit) endsInError(call *ast.CallExpr) bool {
	t := u.info.Types[call].Type
	if tuple, ok := t.(*types.Tuple); ok {
		if tuple.Len() == 0 {
			return false
		}
		t = tuple.At(tuple.Len() - 1).Type()
	}
	return t != nil && types.Identical(t, errorType)
}

// untaken reports whether a call gives an error that its context does not take. want is the number of results of the function around.
func (u *unit) untaken(call *ast.CallExpr, c *astutil.Cursor, want int) bool {
	n := u.resultCount(call)
	if n == 0 || n > 5 || !u.endsInError(call) {
		return false
	}
	if _, _, wrapped := mustCall(call); wrapped {
		return false
	}
	switch p := c.Parent().(type) {
	case *ast.ExprStmt:
		return !u.isPrint(call)
	case *ast.GoStmt, *ast.DeferStmt:
		return false
	case *ast.AssignStmt:
		if c.Name() == "Lhs" {
			return n == 2
		}
		return oneFewer(n, len(p.Lhs), len(p.Rhs))
	case *ast.ValueSpec:
		return oneFewer(n, len(p.Names), len(p.Values))
	case *ast.ReturnStmt:
		return oneFewer(n, want, len(p.Results))
	case *ast.CallExpr:
		if c.Name() == "Fun" {
			return n == 2
		}
		return u.untakenArgument(p, n)
	}
	return n == 2
}

// oneFewer reports whether n results on the right, the only one or one of several, are one too many.
func oneFewer(n, left, right int) bool {
	if right == 1 {
		return n >= 2 && left == n-1
	}
	return n == 2
}

func (u *unit) untakenArgument(p *ast.CallExpr, n int) bool {
	if id, ok := p.Fun.(*ast.Ident); ok && strings.HasPrefix(id.Name, mustName) {
		return false
	}
	if len(p.Args) != 1 || n < 2 {
		return n == 2
	}
	tv := u.info.Types[p.Fun]
	if tv.IsType() || tv.IsBuiltin() {
		return n == 2
	}
	sig, ok := tv.Type.(*types.Signature)
	if !ok {
		return false // not known yet; the next round may tell
	}
	return sig.Variadic() || sig.Params().Len() == n-1
}

// isPrint reports whether a call prints to the cell's output; its error tells nothing.
func (u *unit) isPrint(call *ast.CallExpr) bool {
	switch u.fmtFunc(call) {
	case "Print", "Println", "Printf":
		return true
	}
	return false
}

// isFprint reports whether a call prints to a writer; how many bytes it wrote is nothing to show.
func (u *unit) isFprint(call *ast.CallExpr) bool {
	switch u.fmtFunc(call) {
	case "Fprint", "Fprintln", "Fprintf":
		return true
	}
	return false
}

// fmtFunc names the function of package fmt that is called, if one is.
func (u *unit) fmtFunc(call *ast.CallExpr) string {
	sel, ok := call.Fun.(*ast.SelectorExpr)
	if !ok {
		return ""
	}
	f, ok := u.info.Uses[sel.Sel].(*types.Func)
	if !ok || f.Pkg() == nil || f.Pkg().Path() != "fmt" {
		return ""
	}
	return f.Name()
}
