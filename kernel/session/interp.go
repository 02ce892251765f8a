package session

import (
	"context"
	"errors"
	"fmt"
	"go/ast"
	"go/token"
	"reflect"
	"sync/atomic"
	"time"
	"unsafe"

	"github.com/traefik/yaegi/interp"
)

// machine is the interpreter with what the session needs of it beyond its public face.
type machine struct {
	in       *interp.Interpreter
	complain *complaints
	imported bool
	began    chan struct{} // closed when the running cell's first statement is reached
	finished chan struct{} // closed when its last frame is left
	tooDeep  atomic.Bool   // the running cell was stopped for the depth of its calls
}

// stopDeep ends the running evaluation because its calls go too deep. Unwinding so many frames by a panic would take minutes.
func (m *machine) stopDeep() {
	if m.tooDeep.CompareAndSwap(false, true) {
		atomic.AddUint64(m.cancelCount(), 1)
	}
}

func newMachine(host map[string]any) (*machine, error) {
	c := &complaints{}
	m := &machine{in: interp.New(interp.Options{Stderr: c, Stdout: c, Args: []string{"cell"}}), complain: c}
	table := map[string]reflect.Value{
		"Began":    reflect.ValueOf(func() { close(m.began) }),
		"Finished": reflect.ValueOf(func() { close(m.finished) }),
	}
	for n, f := range host {
		table[n] = reflect.ValueOf(f)
	}
	// The interpreter keys imports by file name. One file that holds every position gives all cells the same.
	m.in.FileSet().AddFile("cells", 1, 1<<40)
	return m, m.in.Use(interp.Exports{hostName + "/" + hostName: table})
}

// use makes a compiled value known under a name of the host package.
func (m *machine) use(name string, v reflect.Value) error {
	return m.in.Use(interp.Exports{hostName + "/" + hostName: {name: v}})
}

// compile turns lowered syntax into a program. The interpreter refuses a second import of the same package, so only the first file has it.
func (m *machine) compile(f *ast.File) (p *interp.Program, err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("the interpreter: %v", r)
		}
	}()
	if !m.imported {
		f.Decls = append([]ast.Decl{importHost()}, f.Decls...)
	}
	f.Package = 1
	anchor(f)
	p, err = m.in.CompileAST(f)
	if err == nil && p == nil {
		err = errors.New("the interpreter gave no program")
	}
	m.imported = m.imported || err == nil
	return p, err
}

// cancelCount is the interpreter's count of cancellations, its first field. Every frame compares its own copy with it before each
// step, so that adding to it stops all that runs. It is set back when the evaluation has ended, for otherwise functions that earlier
// cells made would refuse to run ever after and give zero values instead.
func (m *machine) cancelCount() *uint64 { return (*uint64)(unsafe.Pointer(m.in)) }

const (
	// grace is how long compiled code has, after its context is cancelled, to end by itself before the interpreter stops.
	grace = 100 * time.Millisecond
	// patience is how long an evaluation that was stopped may take to end before the session goes on without it.
	patience = 600 * time.Millisecond
)

// run executes a program. When ctx ends, the interpreter stops after the grace; run returns when the evaluation has ended, or with
// abandoned true when it sits in compiled code that cannot be stopped.
func (m *machine) run(ctx context.Context, p *interp.Program) (err error, abandoned bool) {
	inner, cancel := context.WithCancel(context.Background())
	defer cancel()
	m.began, m.finished = make(chan struct{}), make(chan struct{})
	finished := m.finished
	before := atomic.LoadUint64(m.cancelCount())
	ended := make(chan error, 1)
	m.tooDeep.Store(false)
	defer func() {
		if m.tooDeep.Load() {
			atomic.StoreUint64(m.cancelCount(), before)
		}
	}()
	go func() {
		_, err := m.in.ExecuteWithContext(inner, p)
		ended <- err
	}()
	select {
	case err = <-ended:
		return err, false
	case <-ctx.Done():
	}
	select {
	case err = <-ended:
		return err, false
	case <-time.After(grace):
	}
	select {
	case err = <-ended:
		return err, false
	case <-m.began:
	}
	cancel()
	if err = <-ended; err == nil {
		// Stopped before its end all the same: the interpreter does not always say so.
		err = context.Canceled
	}
	select {
	case <-finished:
	case <-time.After(patience):
		abandoned = true
	}
	atomic.StoreUint64(m.cancelCount(), before)
	return err, abandoned
}

// halt stops every goroutine that cells left running, for good.
func (m *machine) halt() { atomic.AddUint64(m.cancelCount(), 1) }

func importHost() ast.Decl {
	return &ast.GenDecl{Tok: token.IMPORT, Specs: []ast.Spec{&ast.ImportSpec{
		Path: &ast.BasicLit{Kind: token.STRING, Value: `"` + hostName + `"`}}}}
}
