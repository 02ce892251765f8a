package session

import (
	"context"
	"errors"
	"fmt"
	"go/ast"
	"io"
	"reflect"
	"runtime"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"
	"time"

	"github.com/traefik/yaegi/interp"

	"brinkline/continuation"
	"brinkline/display"
)

// A run is the evaluation of one cell.
type run struct {
	ctx      context.Context
	cancel   context.CancelFunc
	src      *source
	out      Output
	mu       sync.Mutex
	values   []any           // of the last expression
	assigned map[string]bool // variables that the cell has bound so far
	binds    []*variable     // variables that the cell binds
	progress progressMeter
	full     atomic.Bool   // stopped for its memory
	ended    chan struct{} // closed when the cell has ended; goroutines of it may go on
}

func (s *Session) begin(ctx context.Context, src *source, out Output) *run {
	r := &run{src: src, out: out, assigned: map[string]bool{}, ended: make(chan struct{})}
	r.ctx, r.cancel = context.WithCancel(ctx)
	r.progress.run = r
	s.mu.Lock()
	s.current = r
	s.mu.Unlock()
	s.machine.complain.take()
	go s.watchMemory(r)
	return r
}

// end closes a run. Its context stays: goroutines of the cell may outlive it.
func (s *Session) end(r *run) {
	close(r.ended)
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.current == r {
		s.current = nil
	}
}

// execute runs a compiled cell, keeps what it assigned and makes its result.
func (s *Session) execute(r *run, prog *interp.Program, u *unit, low *lowered) Result {
	err, abandoned := s.machine.run(r.ctx, prog)
	r.progress.finish()
	s.keepVariables(r, u, low)
	res := Result{Err: s.outcome(r, err, abandoned)}
	if verr := s.deliver(r, &res); verr != nil && res.Err == nil {
		res.Err = s.stopError(&stop{verr, *s.line})
	}
	s.noteVariables(low)
	return res
}

// outcome turns the end of an evaluation into an error, or nil.
func (s *Session) outcome(r *run, err error, abandoned bool) *Error {
	frames := s.machine.complain.take()
	if s.machine.tooDeep.Load() {
		return s.errorAt(s.placeOf(*s.pos), "Panic", errTooDeep.Error()).withCaller(s, nil)
	}
	if r.full.Load() {
		return s.memoryError()
	}
	if abandoned {
		e := s.interruptedError()
		return e.withHint("something in the cell cannot be stopped and goes on in the background")
	}
	if err == nil {
		return nil
	}
	var p interp.Panic
	if !errors.As(err, &p) {
		if r.ctx.Err() != nil {
			return s.interruptedError()
		}
		return s.errorAt(s.placeOf(*s.line), "LoweringError", "this cell cannot be run: "+cleanInternal(err.Error()))
	}
	return s.panicError(unwrapPanic(p.Value), frames)
}

func (s *Session) interruptedError() *Error {
	e := s.errorAt(s.placeOf(*s.line), "Interrupted", "the cell was interrupted; what it had assigned is kept")
	e.Interrupted = true
	return e
}

// panicError words what a panic left.
func (s *Session) panicError(v any, frames []string) *Error {
	switch v := v.(type) {
	case quietEnd:
		return nil
	case *stop:
		return s.stopError(v)
	case interruption:
		return s.interruptedError()
	case string:
		at := s.placeOf(*s.pos)
		return s.errorAt(at, "Panic", oneLine(goError(errors.New(v)).Error())).withCaller(s, frames).inCell(s, at)
	case error:
		var st *stop
		if errors.As(v, &st) {
			return s.stopError(st)
		}
	}
	at := s.placeOf(*s.pos)
	return s.errorAt(at, "Panic", oneLine(panicText(v))).withCaller(s, frames).inCell(s, at)
}

func oneLine(text string) string { return strings.ReplaceAll(strings.TrimSpace(text), "\n", "; ") }

func (s *Session) stopError(st *stop) *Error {
	at := s.placeOf(st.pos)
	if at.src == nil {
		at = s.placeOf(*s.line)
	}
	e := s.errorAt(at, "Error", oneLine(panicText(st.err)))
	e.Err = st.err
	return e.withCaller(s, nil).inCell(s, at)
}

// inCell makes the error point into the running cell. What happened in a function of another cell says so in the message.
func (e *Error) inCell(s *Session, at place) *Error {
	here := s.placeOf(*s.line)
	if at.src == nil || here.src == nil || at.src == here.src {
		return e
	}
	line, _ := at.src.position(at.offset)
	e.Message += fmt.Sprintf(" (%s, line %d)", at.src.label(), line)
	e.Line, e.Column = here.src.position(here.offset)
	return e
}

// withCaller adds the functions that the error went through and the statement of the cell that led there.
func (e *Error) withCaller(s *Session, frames []string) *Error {
	for _, f := range frames {
		e.Traceback = append(e.Traceback, "in "+f)
	}
	at := s.placeOf(*s.line)
	if at.src == nil {
		return e
	}
	line, _ := at.src.position(at.offset)
	if strings.HasPrefix(at.src.label(), "cell") && (line != e.Line || len(frames) > 0) {
		if where := fmt.Sprintf("called from %s, line %d", at.src.label(), line); line != e.Line {
			e.Traceback = append(e.Traceback, where, "    "+at.src.line(line))
		}
	}
	return e
}

// keepVariables makes the variables live that the cell has assigned; of the others, the earlier ones stay.
func (s *Session) keepVariables(r *run, u *unit, low *lowered) {
	next := s.table().clone()
	for _, v := range low.vars {
		old := u.cur.vars[v.name]
		if r.assigned[v.name] || old != nil && old.index == v.index {
			next.vars[v.name] = v
			delete(next.defs, v.name)
		}
	}
	s.tab.Store(next)
}

// deliver shows the values of the last expression.
func (s *Session) deliver(r *run, res *Result) error {
	var shown []any
	for _, v := range r.values {
		if !showsNothing(v) {
			shown = append(shown, v)
		}
	}
	for i, v := range shown {
		if err := carriedError(v); err != nil {
			return err
		}
		b := s.render(v)
		if i == len(shown)-1 {
			res.Value = &b
			break
		}
		r.out.Display(b, "")
	}
	return nil
}

// showsNothing reports whether a value is nil.
func showsNothing(v any) bool {
	v = plain(open(v))
	if v == nil {
		return true
	}
	switch rv := reflect.ValueOf(v); rv.Kind() {
	case reflect.Pointer, reflect.Map, reflect.Slice, reflect.Func, reflect.Chan, reflect.Interface:
		return rv.IsNil()
	}
	return false
}

// carriedError is the error that a figure or another value keeps until it is shown.
func carriedError(v any) error {
	if _, isErr := v.(error); isErr {
		return nil
	}
	if c, ok := v.(interface{ Err() error }); ok {
		return c.Err()
	}
	return nil
}

// render shows a value; one of a cell's own type by its own methods.
func (s *Session) render(v any) display.Bundle {
	s.note(v)
	switch x := v.(type) {
	case box:
		if x.t.kind == reflect.Func {
			return plainText(x.t.name)
		}
		return plainText(fmt.Sprintf("%+v", printable(x)))
	case errorBox, []any, map[string]any:
		return plainText(fmt.Sprintf("%+v", printable(x)))
	case string, bool, int, float64, complex128:
		return display.Render(v)
	}
	if w, ok := v.(interface{ CellValue() any }); ok {
		return s.render(w.CellValue())
	}
	if t := reflect.TypeOf(v); t.Kind() == reflect.Func {
		return plainText(t.String())
	}
	return display.Render(v)
}

func plainText(text string) display.Bundle {
	return display.Bundle{Data: map[string]any{display.MIMEPlain: text}, Metadata: map[string]any{}}
}

// ---- what lowered code calls ----

// running returns the run that the calling goroutine belongs to.
func (s *Session) runningRun() *run {
	s.mu.Lock()
	defer s.mu.Unlock()
	if len(s.strays) > 0 {
		if r := s.strays[goroutineID()]; r != nil {
			return r
		}
	}
	return s.current
}

func (s *Session) stdout(text string) { s.stream("stdout", text) }
func (s *Session) stderr(text string) { s.stream("stderr", text) }

func (s *Session) stream(name, text string) {
	if r := s.runningRun(); r != nil && text != "" {
		r.out.Stream(name, text)
	}
}

// fprint writes to a writer of a cell; standard output and error are the cell's.
func (s *Session) fprint(w io.Writer, text string) (int, error) {
	if name := s.isStandard(w); name != "" {
		s.stream(name, text)
		return len(text), nil
	}
	return io.WriteString(w, text)
}

// checkError stops the cell on an error that nobody takes, or when it has been interrupted.
func (s *Session) checkError(err error, pos int) {
	if r := s.runningRun(); r != nil && r.ctx.Err() != nil {
		panic(errInterrupted)
	}
	if err != nil {
		panic(&stop{err, pos})
	}
}

// show keeps the values of the last expression. An error shows nothing, unless the cell was interrupted and kept something.
func (s *Session) show(err error, values []any) {
	r := s.runningRun()
	if r == nil || err != nil && r.ctx.Err() == nil {
		return
	}
	r.values = values
}

func (s *Session) assign(name string) {
	if r := s.runningRun(); r != nil {
		r.mu.Lock()
		r.assigned[name] = true
		r.mu.Unlock()
	}
}

func (s *Session) bindVariable(name string, ptr any) { s.bound[name] = reflect.ValueOf(ptr) }

// goroutine starts a goroutine of a cell: its panics are reported, its output goes to the cell that started it.
func (s *Session) goroutine(f func(), pos int) {
	r := s.runningRun()
	go func() {
		id := goroutineID()
		s.mu.Lock()
		s.strays[id] = r
		s.mu.Unlock()
		defer func() {
			s.reportPanic(recover(), r, pos)
			s.mu.Lock()
			delete(s.strays, id)
			s.mu.Unlock()
		}()
		f()
	}()
}

// reportPanic tells the cell that a goroutine of it panicked; the process lives on.
func (s *Session) reportPanic(v any, r *run, pos int) {
	if v == nil || r == nil {
		return
	}
	v = unwrapPanic(v)
	if _, ok := v.(interruption); ok {
		return
	}
	if text, ok := v.(string); ok {
		v = goError(errors.New(text))
	}
	where := "a goroutine"
	if at := s.placeOf(pos); at.src != nil {
		line, _ := at.src.position(at.offset)
		where = fmt.Sprintf("the goroutine started in %s, line %d,", at.src.label(), line)
	}
	s.machine.complain.take()
	r.out.Stream("stderr", where+" panicked: "+oneLine(panicText(v))+"\n")
}

func goroutineID() int64 {
	var buf [64]byte
	n := runtime.Stack(buf[:], false)
	fields := strings.Fields(string(buf[:n]))
	id, _ := strconv.ParseInt(fields[1], 10, 64)
	return id
}

// overrides are the functions of compiled packages that cells get in another form.
func (s *Session) overrides() map[string]any {
	m := s.fmtOverrides()
	m["brinkline/display/display.Show"] = s.displayShow
	m["time/time.Sleep"] = s.sleep
	m["os/os.Exit"] = func(code int) {
		if code == 0 {
			panic(quietEnd{})
		}
		panic(&userPanic{fmt.Errorf("os.Exit(%d) would end the session; a cell cannot do that", code)})
	}
	return m
}

// displayShow is display.Show in a cell: the values go to the front end.
func (s *Session) displayShow(values ...any) error {
	r := s.runningRun()
	if r == nil {
		return errors.New("no cell is running")
	}
	for _, v := range values {
		if err, ok := v.(error); ok && err != nil {
			if _, own := v.(errorBox); !own {
				return err
			}
		}
		if err := carriedError(v); err != nil {
			return err
		}
		if showsNothing(v) {
			continue
		}
		r.out.Display(s.render(v), "")
	}
	return nil
}

// sleep is time.Sleep that an interrupt ends.
func (s *Session) sleep(d time.Duration) {
	r := s.runningRun()
	if r == nil {
		time.Sleep(d)
		return
	}
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-t.C:
	case <-r.ctx.Done():
		panic(errInterrupted)
	}
}

// newModel is continuation.NewModel in a cell: the model works under the running cell's context, reports its progress to it and has
// the name of its function.
func (s *Session) newModel(name string, f any, params any, opts ...continuation.Option) (*continuation.Model, error) {
	var all []continuation.Option
	if name != "" {
		all = append(all, continuation.Named(name))
	}
	all = append(all, s.sourceOptions(name)...)
	all = append(all, opts...)
	all = append(all, continuation.WithContext(s.context), continuation.WithObserver(s),
		continuation.Sequential()) // the interpreter serves one call at a time
	return continuation.NewModel(f, params, all...)
}

// context is the context of the running cell.
func (s *Session) context() context.Context {
	if r := s.runningRun(); r != nil {
		return r.ctx
	}
	return context.Background()
}

func initFunc(body []ast.Stmt) ast.Decl {
	body = append([]ast.Stmt{
		&ast.DeferStmt{Call: hostCall("Finished")},
		exprStmt(hostCall("Began")),
	}, body...)
	return &ast.FuncDecl{Name: ast.NewIdent("init"), Type: &ast.FuncType{Params: &ast.FieldList{}}, Body: &ast.BlockStmt{List: body}}
}
