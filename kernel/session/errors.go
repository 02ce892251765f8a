package session

import (
	"fmt"
	"go/types"
	"regexp"
	"sort"
	"strings"

	"brinkline/kernel/session/internal/export"
)

// An Error is what stopped a cell.
type Error struct {
	Name        string // the kind in one word, "SyntaxError"
	Message     string // one line: what
	Line        int    // of the cell, from 1; 0 when unknown
	Column      int    // in characters, from 1
	Hint        string // one line: what to do, where that is known
	Traceback   []string
	Interrupted bool
	Err         error // the error value that the cell did not take, if that is what stopped it
}

// Error returns what and where in one line.
func (e *Error) Error() string {
	if e.Line == 0 {
		return e.Message
	}
	return fmt.Sprintf("%s (line %d, column %d)", e.Message, e.Line, e.Column)
}

// Unwrap returns the error value that the cell did not take.
func (e *Error) Unwrap() error { return e.Err }

// errorAt makes an error that points at a place of a cell.
func (s *Session) errorAt(at place, name, message string) *Error {
	e := &Error{Name: name, Message: message}
	if at.src != nil {
		e.Line, e.Column = at.src.position(at.offset)
	}
	e.Traceback = e.lines(at)
	return e
}

// withHint adds a hint to the error and to what is shown of it.
func (e *Error) withHint(hint string) *Error {
	if hint != "" {
		e.Hint = hint
		e.Traceback = append(e.Traceback, hint)
	}
	return e
}

// lines writes the error as it is shown: what, where with the line and a caret.
func (e *Error) lines(at place) []string {
	out := []string{e.Name + ": " + e.Message}
	if at.src == nil {
		return out
	}
	return append(out, pointAt(at)...)
}

// pointAt shows a place: the cell, the line, the source line and a caret under the column.
func pointAt(at place) []string {
	line, column := at.src.position(at.offset)
	text := at.src.line(line)
	pad := []rune(text)
	if column-1 < len(pad) {
		pad = pad[:column-1]
	}
	for i, r := range pad {
		if r != '\t' {
			pad[i] = ' '
		}
	}
	return []string{
		fmt.Sprintf("%s, line %d, column %d", at.src.label(), line, column),
		"    " + text,
		"    " + string(pad) + "^",
	}
}

// describe turns a fault of the checker into an error in the cell's own words.
func (u *unit) describe(fault *types.Error, owner *def) *Error {
	at := u.placeOf(fault.Pos)
	msg := u.cleanMessage(fault.Msg)
	name := "TypeError"
	if strings.HasPrefix(fault.Msg, "undefined: ") {
		name = "NameError"
		missing := strings.TrimPrefix(fault.Msg, "undefined: ")
		if d := u.next.byName(missing); d != nil && d.broken != nil {
			return u.brokenUse(d, at)
		}
		return u.s.errorAt(at, name, msg).withHint(u.nearestName(missing, fault))
	}
	return u.s.errorAt(at, name, msg).withHint(u.memberHint(fault.Msg))
}

// brokenUse says why a definition that stands in the table cannot be used.
func (u *unit) brokenUse(d *def, at place) *Error {
	e := u.s.errorAt(at, "NameError", fmt.Sprintf("%s (%s, line %d) does not compile now: %s", d.names[0], d.src.label(), d.broken.Line, d.broken.Message))
	return e.withHint(d.broken.Hint)
}

var (
	mustRE     = regexp.MustCompile(mustName + `\d\(`)
	hiddenRE   = regexp.MustCompile(`([\pL_][\pL\d_]*?)` + mark + `(\d+)`)
	declaredRE = regexp.MustCompile(` \(declared at [^)]*\)`)
	pkgRE      = regexp.MustCompile(hiddenPackage + `([\pL\d_]+)`)
)

// cleanMessage removes what a cell does not contain from a message of the checker.
func (u *unit) cleanMessage(msg string) string {
	for {
		at := mustRE.FindStringIndex(msg)
		if at == nil {
			break
		}
		msg = msg[:at[0]] + dropClosing(msg[at[1]:])
	}
	msg = hiddenRE.ReplaceAllStringFunc(msg, func(m string) string {
		if d := u.s.old.named(m); d != nil {
			return fmt.Sprintf("%s (as it was in %s)", d.names[0], d.src.label())
		}
		return hiddenRE.FindStringSubmatch(m)[1]
	})
	msg = pkgRE.ReplaceAllStringFunc(msg, func(m string) string {
		p := pathOfHidden(m)
		return p[strings.LastIndexByte(p, '/')+1:]
	})
	msg = declaredRE.ReplaceAllString(msg, "")
	if i := strings.Index(msg, "\n"); i >= 0 {
		msg = strings.ReplaceAll(msg, "\n\t", "; ")
		msg = strings.ReplaceAll(msg, "\n", "; ")
	}
	return msg
}

// dropClosing removes the parenthesis that closes one opened before the text.
func dropClosing(s string) string {
	depth := 0
	for i, r := range s {
		switch r {
		case '(':
			depth++
		case ')':
			if depth == 0 {
				return s[:i] + s[i+1:]
			}
			depth--
		}
	}
	return s
}

// nearestName looks for the name that was meant among all that are in scope.
func (u *unit) nearestName(missing string, fault *types.Error) string {
	if pkg, member, ok := strings.Cut(missing, "."); ok {
		return u.nearestMember(pkg, member)
	}
	var names []string
	for n := range u.next.defs {
		if !strings.Contains(n, ".") {
			names = append(names, n)
		}
	}
	for n := range u.next.vars {
		names = append(names, n)
	}
	for n := range export.Preloaded() {
		names = append(names, n)
	}
	for n := range u.next.imports {
		names = append(names, n)
	}
	names = append(names, types.Universe.Names()...)
	for _, sc := range u.info.Scopes {
		if sc.Contains(fault.Pos) {
			for _, n := range sc.Names() {
				if _, isPkg := sc.Lookup(n).(*types.PkgName); !isPkg {
					names = append(names, n)
				}
			}
		}
	}
	if n := nearest(missing, names); n != "" {
		return "did you mean " + n + "?"
	}
	for _, p := range export.Paths() {
		if p[strings.LastIndexByte(p, '/')+1:] == missing {
			return fmt.Sprintf("import %q offers it", p)
		}
	}
	return ""
}

// nearestMember looks for the member of a package that was meant.
func (u *unit) nearestMember(pkg, member string) string {
	path := u.next.imports[pkg]
	if path == "" {
		path = export.Preloaded()[pkg]
	}
	p, err := u.s.importer.Import(path)
	if path == "" || err != nil {
		return ""
	}
	var names []string
	for _, n := range p.Scope().Names() {
		if p.Scope().Lookup(n).Exported() {
			names = append(names, n)
		}
	}
	if n := nearest(member, names); n != "" {
		return "did you mean " + pkg + "." + n + "?"
	}
	return ""
}

var memberRE = regexp.MustCompile(`^(.*)\.([\pL_][\pL\d_]*) undefined \(type (.*) has no field or method`)

// memberHint looks for the field or method that was meant.
func (u *unit) memberHint(msg string) string {
	m := memberRE.FindStringSubmatch(msg)
	if m == nil || strings.Contains(msg, "but does have") {
		return ""
	}
	for e, tv := range u.info.Types {
		if tv.Type == nil || types.ExprString(e) != m[1] {
			continue
		}
		var names []string
		for _, mb := range members(tv.Type) {
			names = append(names, mb.Name())
		}
		if n := nearest(m[2], names); n != "" {
			return "did you mean " + n + "?"
		}
		return ""
	}
	return ""
}

// nearest returns the candidate closest to a word, if one is close enough to be meant.
func nearest(word string, candidates []string) string {
	sort.Strings(candidates)
	best, at := "", 0
	limit := max(1, len(word)/3)
	for _, c := range candidates {
		if c == word {
			continue
		}
		d := distance(strings.ToLower(word), strings.ToLower(c))
		if d <= limit && d < len(word) && (best == "" || d < at) {
			best, at = c, d
		}
	}
	return best
}

// distance counts the insertions, deletions, replacements and swaps of neighbours between two words.
func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	prev2, prev, cur := make([]int, len(y)+1), make([]int, len(y)+1), make([]int, len(y)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := 1; i <= len(x); i++ {
		cur[0] = i
		for j := 1; j <= len(y); j++ {
			cost := 1
			if x[i-1] == y[j-1] {
				cost = 0
			}
			cur[j] = min(prev[j]+1, cur[j-1]+1, prev[j-1]+cost)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				cur[j] = min(cur[j], prev2[j-2]+1)
			}
		}
		prev2, prev, cur = prev, cur, prev2
	}
	return prev[len(y)]
}
