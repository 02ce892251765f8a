package session

import (
	"go/ast"
	"maps"
	"slices"
	"strconv"
)

type defKind int

const (
	funcDef defKind = iota
	methodDef
	typeDef
	constDef
)

// A def is one version of a definition at the top level of a cell. A changed definition is a new def with a new internal name, so
// that values made from the old one go on calling what they were made with.
type def struct {
	kind       defKind
	names      []string // one, but for a group of constants
	recv       string   // the receiver's type of a method
	generic    bool
	src        *source
	start, end int
	prefix     string // what the text lacks to be a declaration
	text       string

	index     int               // number of this version, part of its internal name
	uses      map[string]bool   // names at the top level that it refers to
	env       map[string]*def   // the definitions behind them when it was last checked
	instances map[string]string // internal names of instances, by type arguments
	broken    *Error            // why it cannot be used at present
	prelude   bool
}

// key identifies the definition in the table of live ones.
func (d *def) key() string {
	if d.kind == methodDef {
		return d.recv + "." + d.names[0]
	}
	return d.names[0]
}

func (d *def) finish() *def {
	d.text = d.src.text[d.start:d.end]
	d.instances = map[string]string{}
	return d
}

// internal is the name of this version in lowered code.
func (d *def) internal() string {
	if d.kind == methodDef {
		return d.recv + mark + d.names[0] + mark + strconv.Itoa(d.index)
	}
	return d.names[0] + mark + strconv.Itoa(d.index)
}

// hidden is the name under which a superseded type appears to the checker.
func (d *def) hidden() string { return d.internal() }

// parse returns the declaration of the definition.
func (d *def) parse(pl *places) (ast.Decl, *parseError) {
	f, err := parsePiece(pl, piece{src: d.src, owner: d}, declPrefix+d.prefix, d.text, "", d.start)
	if err != nil {
		return nil, err
	}
	return f.Decls[0], nil
}

// A variable is a name bound by a statement at the top level of a cell.
type variable struct {
	name  string
	index int
	key   string          // canonical form of the type
	expr  ast.Expr        // the type, with internal names of cell types
	named map[string]*def // the cell types that the type mentions, by internal name
	cell  *source         // where it was bound last
}

func (v *variable) internal() string { return v.name + mark + "v" + strconv.Itoa(v.index) }

// table is what is defined at the top level of the session. Tables are replaced, not changed, so completion reads one while a cell runs.
type table struct {
	defs    map[string]*def
	vars    map[string]*variable
	imports map[string]string // name -> path
	dots    []string          // paths imported into the top level itself
}

func (t *table) clone() *table {
	return &table{defs: maps.Clone(t.defs), vars: maps.Clone(t.vars), imports: maps.Clone(t.imports), dots: slices.Clone(t.dots)}
}

// byName finds the definition that declares a top-level name.
func (t *table) byName(name string) *def { return t.defs[name] }

// put makes a definition live under all its names, and a variable of the same name dead.
func (t *table) put(d *def) {
	if d.kind == methodDef {
		t.defs[d.key()] = d
		return
	}
	for _, n := range d.names {
		if n == "_" {
			continue
		}
		t.defs[n] = d
		delete(t.vars, n)
	}
}

// methods lists the live methods of a type in the order of their names.
func (t *table) methods(typeName string) []*def {
	var out []*def
	for k, d := range t.defs {
		if d.kind == methodDef && d.recv == typeName && k == d.key() {
			out = append(out, d)
		}
	}
	slices.SortFunc(out, func(a, b *def) int {
		if a.names[0] < b.names[0] {
			return -1
		}
		return 1
	})
	return out
}
