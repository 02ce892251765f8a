package session

import (
	"go/ast"
	"go/token"
	"go/types"
	"slices"
	"sort"
	"strings"
	"unicode"
	"unicode/utf8"

	"brinkline/kernel/session/internal/export"
)

// A Completion is what may stand in a stretch of a cell, which is given in characters.
type Completion struct {
	Matches    []string
	Start, End int
}

// cursorName stands where the cursor is while the checker looks at an unfinished cell.
const cursorName = "cursor" + mark

// Complete returns what may stand around the cursor, counted in characters. It asks the checker, never the interpreter.
func (s *Session) Complete(source string, cursor int) Completion {
	runes := []rune(source)
	cursor = max(0, min(cursor, len(runes)))
	if c, ok := s.completeString(runes, cursor); ok {
		return c
	}
	start := cursor
	for start > 0 && isNameRune(runes[start-1]) {
		start--
	}
	end := cursor
	for end < len(runes) && isNameRune(runes[end]) {
		end++
	}
	prefix := string(runes[start:cursor])
	v := s.look(string(runes[:start]), string(runes[end:]))
	return Completion{Matches: matching(v.candidates(), prefix), Start: start, End: cursor}
}

func isNameRune(r rune) bool { return r == '_' || unicode.IsLetter(r) || unicode.IsDigit(r) }

// matching keeps the candidates that begin with the prefix; when there are none, those that do so in another case.
func matching(candidates []string, prefix string) []string {
	var exact, folded []string
	seen := map[string]bool{}
	for _, c := range candidates {
		if seen[c] || isInternal(c) {
			continue
		}
		seen[c] = true
		switch {
		case strings.HasPrefix(c, prefix):
			exact = append(exact, c)
		case len(c) >= len(prefix) && strings.EqualFold(c[:len(prefix)], prefix):
			folded = append(folded, c)
		}
	}
	if len(exact) == 0 {
		return folded
	}
	return exact
}

// view is what the checker sees of an unfinished cell, with the cursor's name in it.
type view struct {
	u    *unit
	at   *ast.Ident
	path []ast.Node // from the cursor's name outwards
}

// look checks a cell with the cursor's name between what stands before and after; what is open is closed when that helps.
func (s *Session) look(before, after string) *view {
	for _, text := range []string{
		before + cursorName + after,
		before + cursorName + closers(before) + "\n",
		before + cursorName + " {}" + closers(before) + "\n",
		beforeLine(before) + cursorName + closers(beforeLine(before)) + "\n",
	} {
		if v := s.lookAt(text); v != nil {
			return v
		}
	}
	return &view{u: newUnit(s, &split{src: newSource("", 0, "")})}
}

// beforeLine keeps the lines that parse on their own and the last, unfinished one.
func beforeLine(before string) string {
	i := strings.LastIndexByte(before, '\n') + 1
	return before[i:]
}

// closers are the brackets that close what a text leaves open.
func closers(text string) string {
	toks, _ := scan(text)
	var stack []string
	for _, t := range toks {
		switch t.tok {
		case token.LPAREN:
			stack = append(stack, ")")
		case token.LBRACK:
			stack = append(stack, "]")
		case token.LBRACE:
			stack = append(stack, "}")
		case token.RPAREN, token.RBRACK, token.RBRACE:
			if len(stack) > 0 {
				stack = stack[:len(stack)-1]
			}
		}
	}
	slices.Reverse(stack)
	return strings.Join(stack, "")
}

func (s *Session) lookAt(text string) (v *view) {
	defer func() {
		if recover() != nil {
			v = nil // an unfinished cell may be anything
		}
	}()
	sp, err := splitCell(newSource("", 0, text))
	if err != nil {
		return nil
	}
	u := newUnit(s, sp)
	if u.define() != nil || u.assemble(false, true) != nil {
		return nil
	}
	u.settle(true)
	v = &view{u: u}
	v.find(u.file)
	if v.at == nil {
		return nil
	}
	return v
}

// find looks for the cursor's name and keeps the way to it.
func (v *view) find(root ast.Node) {
	var stack []ast.Node
	ast.Inspect(root, func(n ast.Node) bool {
		if v.at != nil {
			return false
		}
		if n == nil {
			stack = stack[:len(stack)-1]
			return true
		}
		stack = append(stack, n)
		if id, ok := n.(*ast.Ident); ok && id.Name == cursorName {
			v.at = id
			v.path = slices.Clone(stack)
			slices.Reverse(v.path)
		}
		return true
	})
}

// candidates lists what could stand at the cursor.
func (v *view) candidates() []string {
	if len(v.path) > 1 {
		if sel, ok := v.path[1].(*ast.SelectorExpr); ok && sel.Sel == v.at {
			return v.afterDot(sel)
		}
	}
	return append(v.fieldNames(), v.names()...)
}

// afterDot lists the members of a package or of a value.
func (v *view) afterDot(sel *ast.SelectorExpr) []string {
	var out []string
	if id, ok := sel.X.(*ast.Ident); ok {
		if pkg, ok := v.u.info.Uses[id].(*types.PkgName); ok {
			scope := pkg.Imported().Scope()
			for _, n := range scope.Names() {
				if scope.Lookup(n).Exported() {
					out = append(out, n)
				}
			}
			return out
		}
	}
	tv, ok := v.u.info.Types[sel.X]
	if !ok || tv.Type == nil {
		return nil
	}
	t := tv.Type
	if tuple, ok := t.(*types.Tuple); ok && tuple.Len() > 0 {
		t = tuple.At(0).Type()
	}
	for _, m := range members(t) {
		if m.Exported() || m.Pkg() == nil || m.Pkg() == v.u.pkg {
			out = append(out, m.Name())
		}
	}
	return out
}

// fieldNames lists the fields that a struct literal around the cursor may name.
func (v *view) fieldNames() []string {
	for _, n := range v.path {
		switch n := n.(type) {
		case *ast.CompositeLit:
			tv := v.u.info.Types[n]
			if tv.Type == nil {
				return nil
			}
			t := tv.Type
			if p, ok := t.Underlying().(*types.Pointer); ok {
				t = p.Elem()
			}
			st, ok := t.Underlying().(*types.Struct)
			if !ok {
				return nil
			}
			return unusedFields(n, st)
		case *ast.CallExpr, *ast.FuncLit, *ast.BlockStmt:
			return nil
		case *ast.KeyValueExpr:
			if id, ok := n.Key.(*ast.Ident); !ok || id != v.at {
				return nil
			}
		}
	}
	return nil
}

func unusedFields(lit *ast.CompositeLit, st *types.Struct) []string {
	used := map[string]bool{}
	for _, e := range lit.Elts {
		if kv, ok := e.(*ast.KeyValueExpr); ok {
			if id, ok := kv.Key.(*ast.Ident); ok {
				used[id.Name] = true
			}
		}
	}
	var out []string
	for f := range st.Fields() {
		if !used[f.Name()] {
			out = append(out, f.Name())
		}
	}
	return out
}

var keywords = []string{"break", "case", "chan", "const", "continue", "default", "defer", "else", "fallthrough", "for", "func", "go",
	"goto", "if", "import", "interface", "map", "package", "range", "return", "select", "struct", "switch", "type", "var"}

// names lists the names in scope.
func (v *view) names() []string {
	seen := map[string]bool{}
	add := func(n string) { seen[n] = true }
	if v.at != nil && v.u.info != nil {
		for _, sc := range v.u.info.Scopes {
			if sc.Contains(v.at.Pos()) {
				for _, n := range sc.Names() {
					if obj := sc.Lookup(n); obj.Pos() < v.at.Pos() || obj.Parent() == v.u.pkg.Scope() {
						add(n)
					}
				}
			}
		}
	}
	for n := range v.u.next.vars {
		add(n)
	}
	for n := range v.u.next.defs {
		if !strings.Contains(n, ".") {
			add(n)
		}
	}
	for n := range v.u.next.imports {
		add(n)
	}
	for n := range export.Preloaded() {
		add(n)
	}
	delete(seen, "iter")
	delete(seen, "main")
	for _, n := range types.Universe.Names() {
		add(n)
	}
	for _, n := range keywords {
		add(n)
	}
	delete(seen, cursorName)
	out := make([]string, 0, len(seen))
	for n := range seen {
		out = append(out, n)
	}
	sort.Strings(out)
	return out
}

// completeString offers names of parameters and states within the string arguments of the toolkit.
func (s *Session) completeString(runes []rune, cursor int) (Completion, bool) {
	line := cursor
	for line > 0 && runes[line-1] != '\n' {
		line--
	}
	open := -1
	for i := line; i < cursor; i++ {
		switch {
		case runes[i] == '"' && open < 0:
			open = i
		case runes[i] == '"' && runes[i-1] != '\\':
			open = -1
		}
	}
	if open < 0 {
		return Completion{}, false
	}
	end := cursor
	for end < len(runes) && runes[end] != '"' && runes[end] != '\n' {
		end++
	}
	prefix := string(runes[open+1 : cursor])
	return Completion{Matches: matching(s.stringNames(string(runes[line:open])), prefix), Start: open + 1, End: end}, true
}

// stringNames lists what a string after the given text can name.
func (s *Session) stringNames(before string) []string {
	before = strings.TrimRight(before, " \t")
	name := ""
	for i := len(before); i > 0; {
		r, size := utf8.DecodeLastRuneInString(before[:i])
		if r == '(' {
			name = before[:i-size]
			break
		}
		i -= size
	}
	recv, method, ok := cutLast(name, ".")
	if !ok {
		return nil
	}
	recv = recv[strings.LastIndexFunc(recv, func(r rune) bool { return !isNameRune(r) })+1:]
	return s.modelNames(recv, method)
}

func cutLast(s, sep string) (before, after string, ok bool) {
	i := strings.LastIndex(s, sep)
	if i < 0 {
		return s, "", false
	}
	return s[:i], s[i+len(sep):], true
}
