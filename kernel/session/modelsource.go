package session

import (
	"bytes"
	"crypto/sha256"
	"fmt"
	"go/printer"
	"go/token"
	"go/types"
	"maps"
	"reflect"
	"slices"
	"strings"

	"brinkline/continuation"
	"brinkline/continuation/tape"
)

// A modelSource is the text of a model's function and of all definitions that it
// needs, with the session's variables that it reads.
type modelSource struct {
	name   string
	text   strings.Builder
	pieces []textPiece
	vars   map[string]*variable
	defs   map[*def]bool
}

// A textPiece is where a stretch of the text comes from.
type textPiece struct {
	start int // in the text, of what follows the prefix
	d     *def
}

// sourceOptions gives a model made in a cell its source, so that its derivatives are
// exact, and the means to say when that source has changed.
func (s *Session) sourceOptions(name string) []continuation.Option {
	src, reason := s.modelSource(name)
	if src == nil {
		return []continuation.Option{continuation.Unrecorded(reason)}
	}
	options := []continuation.Option{continuation.WithNotice(s.notice(src))}
	parsed, err := tape.Parse(name, src.text.String())
	if err != nil {
		return append(options, continuation.Unrecorded(err.Error()))
	}
	parsed.Place = func(pos token.Pos) string {
		return src.place(parsed.Fset.Position(pos).Offset - src.shift(parsed.Fset, pos))
	}
	parsed.Variable = func(v *types.Var) (reflect.Value, error) { return s.variableValue(src, v.Name()) }
	return append(options, continuation.WithSyntax(parsed))
}

// modelSource collects the text behind a function's name. The reason says why there
// is none.
func (s *Session) modelSource(name string) (*modelSource, string) {
	t := s.table()
	if r := s.runningRun(); r != nil && len(r.binds) > 0 {
		// What the running cell binds enters the table when it has ended.
		t = t.clone()
		for _, v := range r.binds {
			if t.defs[v.name] == nil {
				t.vars[v.name] = v
			}
		}
	}
	d := t.byName(name)
	if name == "" || d == nil || d.kind != funcDef {
		return nil, "the model is a function value; a function declared by name in a cell has a source"
	}
	if d.broken != nil {
		return nil, "its definition does not compile now"
	}
	src := &modelSource{name: name, vars: map[string]*variable{}, defs: map[*def]bool{}}
	src.collect(t, d)
	src.declareVariables(t)
	return src, ""
}

// collect adds a definition and all that it uses, as it was when it was checked.
func (m *modelSource) collect(t *table, d *def) {
	if m.defs[d] || d.prelude {
		return
	}
	m.defs[d] = true
	m.text.WriteString(d.prefix)
	m.pieces = append(m.pieces, textPiece{m.text.Len(), d})
	m.text.WriteString(d.text + "\n")
	for _, n := range slices.Sorted(maps.Keys(d.uses)) {
		switch {
		case d.env[n] != nil:
			m.collect(t, d.env[n])
		case t.defs[n] != nil:
			m.collect(t, t.defs[n])
		case t.vars[n] != nil:
			m.vars[n] = t.vars[n]
		}
	}
}

// declareVariables adds the declarations of the variables that are read.
func (m *modelSource) declareVariables(t *table) {
	for _, n := range slices.Sorted(maps.Keys(m.vars)) {
		v := m.vars[n]
		var b bytes.Buffer
		if printer.Fprint(&b, token.NewFileSet(), v.expr) != nil {
			continue
		}
		text := b.String()
		for internal, d := range v.named {
			text = strings.ReplaceAll(text, internal, d.names[0])
			m.collect(t, d)
		}
		if strings.Contains(text, mark) {
			continue // a type of a package: refused where it is needed, with its name
		}
		fmt.Fprintf(&m.text, "var %s %s\n", n, text)
	}
}

// hash tells one state of the source from another.
func (m *modelSource) hash() string {
	return fmt.Sprintf("%x", sha256.Sum256([]byte(m.text.String())))[:12]
}

// changed names what differs from an earlier state of the source, and where the new
// definition stands.
func (m *modelSource) changed(was *modelSource) string {
	before := map[string]string{}
	for d := range was.defs {
		before[d.key()] = d.text
	}
	var names []string
	for d := range m.defs {
		if before[d.key()] != d.text {
			names = append(names, fmt.Sprintf("%s (%s)", d.key(), d.src.label()))
		}
	}
	if len(names) == 0 {
		return m.name + " or of what it needs"
	}
	slices.Sort(names)
	return strings.Join(names, ", ")
}

// shift is how far the parser's offsets lie behind those of the text: it puts a
// package clause before it.
func (m *modelSource) shift(fset *token.FileSet, pos token.Pos) int {
	return fset.File(pos).Size() - m.text.Len()
}

// place writes a position of the text as one of a cell.
func (m *modelSource) place(offset int) string {
	for _, p := range slices.Backward(m.pieces) {
		if offset < p.start {
			continue
		}
		line, _ := p.d.src.position(p.d.start + offset - p.start)
		return fmt.Sprintf("%s, line %d", p.d.src.label(), line)
	}
	return ""
}

// variableValue returns a variable of the session, as it is stored.
func (s *Session) variableValue(m *modelSource, name string) (reflect.Value, error) {
	v := m.vars[name]
	if v == nil {
		return reflect.Value{}, fmt.Errorf("the variable %s is not one of the session", name)
	}
	at, ok := s.bound[v.internal()]
	if !ok || at.Kind() != reflect.Pointer || at.IsNil() {
		return reflect.Value{}, fmt.Errorf("the variable %s has no value yet", name)
	}
	return at.Elem(), nil
}

// notice returns what is to be said under the results of a model whose source has
// changed since a cell made it.
func (s *Session) notice(made *modelSource) func() string {
	was, in := made.hash(), ""
	if r := s.runningRun(); r != nil {
		in = r.src.label()
	}
	var seen *table
	text := ""
	return func() string {
		if t := s.table(); t != seen {
			seen, text = t, ""
			now, reason := s.modelSource(made.name)
			switch {
			case now == nil:
				text = fmt.Sprintf("out of date: the definition of %s is gone (%s)", made.name, reason)
			case now.hash() != was:
				text = "out of date: computed with an earlier definition of " + now.changed(made)
			}
			if text != "" && in != "" {
				text += "; rerun " + in + " and what follows from it"
			}
		}
		return text
	}
}
