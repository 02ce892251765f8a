// Package session runs the cells of a notebook: text -> split -> check -> lower -> interpret -> value. It knows no socket.
//
// A cell is checked by go/types as a whole before anything of it runs. What it defines replaces what had the same name, and what
// depends on that is lowered again. Lowered code runs in an interpreter; values come back as bundles that front ends can show.
package session

import (
	"context"
	"fmt"
	"go/ast"
	"reflect"
	"strings"
	"sync"
	"sync/atomic"
	"weak"

	"github.com/traefik/yaegi/interp"

	"brinkline/display"
	"brinkline/kernel/session/internal/export"
)

// Options are the settings of a session.
type Options struct {
	// Still leaves out the live displays of long work. Whether one appears depends on how fast the machine is, so a run that
	// nobody watches is still: its notebook has the same bytes everywhere.
	Still bool
	// MemoryLimit is the number of bytes of live values at which a cell is stopped; 0 means half of the machine's memory.
	MemoryLimit uint64
}

// An Output takes what a cell shows while it runs. It must be safe for concurrent use.
type Output interface {
	// Stream takes text of "stdout" or "stderr".
	Stream(name, text string)
	// Display shows a bundle; one with an id can be updated.
	Display(b display.Bundle, id string)
	// Update replaces what was displayed with the id.
	Update(b display.Bundle, id string)
	// Clear removes what the cell has shown, with wait only when something new comes.
	Clear(wait bool)
}

// A Cell is one piece of code to run.
type Cell struct {
	ID     string // the front end's name of it, "" when it has none
	Number int    // execution count
	Source string
}

// A Result is what a cell came to.
type Result struct {
	// Value is what the last expression shows; of several values the earlier ones went out by Output.Display.
	Value *display.Bundle
	// Err is nil when all went well.
	Err *Error
}

// A Session holds what cells have defined. Run takes one cell at a time; the other methods may be called while it runs.
type Session struct {
	still    bool // no live displays
	limit    uint64
	running  sync.Mutex
	tab      atomic.Pointer[table]
	importer *export.Importer
	machine  *machine
	rtypes   *rtypes
	prelude  map[string]*def
	override map[string]reflect.Value
	offered  map[string]bool

	old       oldTypes
	index     atomic.Int64
	origins   []origin
	runs      int
	bound     map[string]reflect.Value // storage of session variables, by internal name
	pos, line *int

	mu       sync.Mutex
	current  *run
	strays   map[int64]*run // goroutines that cells started
	known    []string       // special points seen, in order
	knownSet map[string]bool
	modelled map[string]modelled // names of the models behind variables
	shorts   map[string]string   // short forms of the values of variables
	closed   bool
}

// New starts a session.
func New(o Options) (*Session, error) {
	s := &Session{
		still:    o.Still,
		limit:    o.MemoryLimit,
		importer: export.NewImporter(), rtypes: newRtypes(), override: map[string]reflect.Value{}, offered: map[string]bool{},
		bound:  map[string]reflect.Value{},
		strays: map[int64]*run{}, knownSet: map[string]bool{}, modelled: map[string]modelled{}, shorts: map[string]string{},
	}
	if s.limit == 0 {
		s.limit = defaultMemoryLimit()
	}
	s.tab.Store(&table{defs: map[string]*def{}, vars: map[string]*variable{}, imports: map[string]string{}})
	for name, f := range s.overrides() {
		s.override[name] = reflect.ValueOf(f)
	}
	var err error
	if s.machine, err = newMachine(s.hostFuncs()); err != nil {
		return nil, fmt.Errorf("starting the interpreter: %w", err)
	}
	if s.prelude, err = loadPrelude(s); err != nil {
		return nil, err
	}
	return s, s.boot()
}

func (s *Session) table() *table { return s.tab.Load() }

func (s *Session) nextIndex() int { return int(s.index.Add(1)) }

// An origin is what a recorded position counts from: a definition or a cell. It does not keep either alive.
type origin struct {
	def weak.Pointer[def]
	src weak.Pointer[source]
}

func (s *Session) addOrigin(o any) int {
	switch o := o.(type) {
	case *def:
		s.origins = append(s.origins, origin{def: weak.Make(o)})
	case *source:
		s.origins = append(s.origins, origin{src: weak.Make(o)})
	}
	return len(s.origins) - 1
}

// placeOf finds the place that a recorded position stands for.
func (s *Session) placeOf(pos int) place {
	if pos < 0 || pos>>offsetBits >= len(s.origins) {
		return place{}
	}
	offset := pos & (1<<offsetBits - 1)
	o := s.origins[pos>>offsetBits]
	if d := o.def.Value(); d != nil {
		return place{d.src, d.start + offset}
	}
	if src := o.src.Value(); src != nil {
		return place{src, offset}
	}
	return place{}
}

func (s *Session) setPosition(pos int) {
	if pos >= 0 {
		*s.pos = pos
	}
}

func (s *Session) useSymbol(name string, v reflect.Value) error { return s.machine.use(name, v) }

// boot declares the variables in which lowered code records where it is.
func (s *Session) boot() error {
	e := &emitter{}
	for _, n := range []string{posVar, lineVar, callsVar} {
		e.global(n, ast.NewIdent("int"))
	}
	addr := func(n string) ast.Expr { return &ast.UnaryExpr{Op: 17, X: ast.NewIdent(n)} }
	body := []ast.Stmt{exprStmt(hostCall("Boot", addr(posVar), addr(lineVar)))}
	e.decls = append(e.decls, initFunc(body))
	p, err := s.machine.compile(&ast.File{Name: ast.NewIdent("main"), Decls: e.decls})
	if err != nil {
		return fmt.Errorf("starting the interpreter: %w", err)
	}
	err, _ = s.machine.run(context.Background(), p)
	return err
}

// Run runs a cell and returns when it has ended. Cancelling ctx interrupts it: the toolkit's context first, so that a partial branch
// is kept and assigned, the interpreter a little later.
func (s *Session) Run(ctx context.Context, c Cell, out Output) Result {
	s.running.Lock()
	defer s.running.Unlock()
	if s.closed {
		return Result{Err: &Error{Name: "SessionError", Message: "the session is closed"}}
	}
	src := newSource(c.ID, c.Number, c.Source)
	u, low, prog, err := s.prepare(src)
	if err != nil {
		return Result{Err: err}
	}
	r := s.begin(ctx, src, out)
	defer s.end(r)
	r.binds = low.vars
	u.noteBroken(r)
	res := s.execute(r, prog, u, low)
	s.tidy()
	return res
}

// prepare takes a cell to the point where it can run, and makes what it defines live. A fault of the session itself is an error of
// the cell; it changes nothing.
func (s *Session) prepare(src *source) (u *unit, low *lowered, prog *interp.Program, err *Error) {
	sp, perr := splitCell(src)
	if perr != nil {
		return nil, nil, nil, s.syntaxError(src, perr)
	}
	u = newUnit(s, sp)
	defer func() {
		if r := recover(); r != nil {
			err = s.errorAt(place{src, sp.lastStart}, "LoweringError", "this cell cannot be run: "+cleanInternal(fmt.Sprint(r)))
		}
		if err != nil {
			u.takeBack()
		}
	}()
	if err = u.check(); err != nil {
		return u, nil, nil, err
	}
	if low, err = u.lower(); err != nil {
		return u, nil, nil, err
	}
	prog, cerr := s.machine.compile(low.file)
	if cerr != nil {
		return u, nil, nil, s.errorAt(place{src, sp.lastStart}, "LoweringError", "this cell cannot be run: "+cleanInternal(cerr.Error()))
	}
	u.commit(low)
	return u, low, prog, nil
}

func cleanInternal(text string) string {
	text = hiddenRE.ReplaceAllString(text, "$1")
	return strings.ReplaceAll(text, mark, "")
}

func (s *Session) syntaxError(src *source, e *parseError) *Error {
	return s.errorAt(place{src, e.offset}, "SyntaxError", syntaxText(e.message))
}

// syntaxText removes what the parser says about code that the cell does not contain.
func syntaxText(msg string) string {
	if strings.Contains(msg, "found 'EOF'") {
		return strings.Replace(msg, "found 'EOF'", "found the end of the cell", 1)
	}
	return msg
}

// Close ends the session. Goroutines of cells are told to stop.
func (s *Session) Close() {
	s.running.Lock()
	defer s.running.Unlock()
	if s.closed {
		return
	}
	s.closed = true
	s.machine.halt()
}
