package tape

import (
	"errors"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"go/types"
	"reflect"
	"strings"
)

// A Source is the type-checked syntax of a model and of all that it calls.
type Source struct {
	Fset  *token.FileSet
	Files []*ast.File
	// Info needs Types, Defs, Uses, Selections and Implicits.
	Info *types.Info
	// Func is the model: a function or method declared in Files, or nil when
	// Lit is given.
	Func *types.Func
	Lit  *ast.FuncLit
	// Receiver is the value of the receiver when Func is a method.
	Receiver reflect.Value
	// Variable returns the value of a variable that is declared outside of the
	// model: of a package, of a session, or of the function around Lit. An
	// addressable value (or element of a slice) is read anew at every
	// evaluation; others are taken as they are. Nil: there are none.
	Variable func(*types.Var) (reflect.Value, error)
	// Place writes a position for a reader; nil writes "line 7".
	Place func(token.Pos) string

	faults []types.Error
	decls  map[*types.Func]*ast.FuncDecl
}

// A Refusal says why a model cannot be recorded, and where.
type Refusal struct {
	Pos    token.Pos
	Place  string // "line 7"
	Reason string // "the loop runs until a float condition holds"
}

func (e *Refusal) Error() string {
	if e.Place == "" {
		return e.Reason
	}
	return e.Place + ": " + e.Reason
}

// Parse parses and checks Go text that declares the function of that name
// ("tank", or "Plant.tank" for a method) and all that it calls. The text may lack
// its package clause and the import of math. Several texts are files of one
// package. What the text takes from packages other than math is only a fault
// where the model needs it.
func Parse(name string, texts ...string) (*Source, error) {
	s := &Source{Fset: token.NewFileSet()}
	for i, text := range texts {
		file, err := s.parse(fmt.Sprintf("source%d.go", i+1), text)
		if err != nil {
			return nil, err
		}
		s.Files = append(s.Files, file)
	}
	pkg := s.check()
	f, err := lookup(pkg, name)
	if err != nil {
		return nil, err
	}
	s.Func = f
	return s, nil
}

func (s *Source) parse(name, text string) (*ast.File, error) {
	if !hasPackage(text) {
		text = prefix(text) + text
	}
	file, err := parser.ParseFile(s.Fset, name, text, parser.SkipObjectResolution)
	if err != nil {
		return nil, fmt.Errorf("the source does not parse: %w", err)
	}
	return file, nil
}

func hasPackage(text string) bool {
	_, err := parser.ParseFile(token.NewFileSet(), "", text, parser.PackageClauseOnly)
	return err == nil
}

// prefix makes a file of text without package clause. It stands on the first
// line, so that line numbers stay.
func prefix(text string) string {
	if strings.Contains(text, `"math"`) {
		return "package model; "
	}
	return `package model; import "math"; `
}

func (s *Source) check() *types.Package {
	s.Info = NewInfo()
	conf := types.Config{
		Importer: onlyMath{},
		Error: func(err error) {
			var fault types.Error
			if errors.As(err, &fault) && !fault.Soft {
				s.faults = append(s.faults, fault)
			}
		},
	}
	pkg, _ := conf.Check("model", s.Fset, s.Files, s.Info) // errors went to conf.Error
	return pkg
}

// NewInfo returns the tables that the recorder needs a type checker to fill.
func NewInfo() *types.Info {
	return &types.Info{
		Types:      map[ast.Expr]types.TypeAndValue{},
		Defs:       map[*ast.Ident]types.Object{},
		Uses:       map[*ast.Ident]types.Object{},
		Selections: map[*ast.SelectorExpr]*types.Selection{},
		Implicits:  map[ast.Node]types.Object{},
		Instances:  map[*ast.Ident]types.Instance{},
	}
}

func lookup(pkg *types.Package, name string) (*types.Func, error) {
	recv, method, isMethod := strings.Cut(strings.TrimPrefix(name, "*"), ".")
	obj := pkg.Scope().Lookup(recv)
	if isMethod && obj != nil {
		obj, _, _ = types.LookupFieldOrMethod(types.NewPointer(obj.Type()), true, pkg, method)
	}
	if f, ok := obj.(*types.Func); ok {
		return f, nil
	}
	return nil, fmt.Errorf("the source declares no function %s", name)
}

// declarations finds the syntax of every function of the source.
func (s *Source) declarations() {
	s.decls = map[*types.Func]*ast.FuncDecl{}
	for _, file := range s.Files {
		for _, d := range file.Decls {
			if d, ok := d.(*ast.FuncDecl); ok {
				if f, ok := s.Info.Defs[d.Name].(*types.Func); ok {
					s.decls[f] = d
				}
			}
		}
	}
}

func (s *Source) place(pos token.Pos) string {
	if !pos.IsValid() {
		return ""
	}
	if s.Place != nil {
		return s.Place(pos)
	}
	p := s.Fset.Position(pos)
	if len(s.Files) > 1 {
		return fmt.Sprintf("%s, line %d", p.Filename, p.Line)
	}
	return fmt.Sprintf("line %d", p.Line)
}

// fault returns what the checker said about a place inside of node.
func (s *Source) fault(n ast.Node) string {
	for _, f := range s.faults {
		if n.Pos() <= f.Pos && f.Pos < n.End() {
			return f.Msg
		}
	}
	return ""
}

// onlyMath imports package math and gives empty packages for all others.
type onlyMath struct{}

func (onlyMath) Import(path string) (*types.Package, error) {
	if path == "math" {
		return mathPackage()
	}
	name := path[strings.LastIndex(path, "/")+1:]
	pkg := types.NewPackage(path, name)
	pkg.MarkComplete()
	return pkg, nil
}
