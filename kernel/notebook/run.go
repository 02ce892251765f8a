package notebook

import (
	"context"
	"fmt"
	"maps"
	"reflect"
	"strings"
	"unicode/utf8"

	"brinkline/display"
	"brinkline/kernel/internal/help"
	"brinkline/kernel/session"
)

// An Executor runs cells; *session.Session is one.
type Executor interface {
	Run(ctx context.Context, c session.Cell, out session.Output) session.Result
}

// A Step is one code cell on its way through a run.
type Step struct {
	Cell   *Cell
	Number int            // the execution count the cell gets, from 1
	Of     int            // how many cells the run executes
	Done   bool           // false before the cell runs, true after
	Err    *session.Error // what stopped the cell, or nil
}

// Stops reports whether the cell's error ends the run: an interrupt does, and
// any other error unless the cell is tagged raises-exception.
func (s Step) Stops() bool {
	return s.Err != nil && (s.Err.Interrupted || !s.Cell.Tagged("raises-exception"))
}

// A CellError says which cell stopped a run, and why.
type CellError struct {
	Number int    // the cell's execution count
	ID     string // its id, "" before nbformat 4.5
	Source string
	Err    *session.Error
}

// Error names the cell, by number and id, and the line.
func (e *CellError) Error() string {
	where := fmt.Sprintf("cell %d", e.Number)
	if e.ID != "" {
		where += fmt.Sprintf(" (id %s)", e.ID)
	}
	if e.Err.Line > 0 {
		where += fmt.Sprintf(", line %d", e.Err.Line)
	}
	return where + ": " + e.Err.Message
}

// Unwrap returns the error of the session.
func (e *CellError) Unwrap() error { return e.Err }

var interrupted = &session.Error{Name: "Interrupted", Message: "interrupted before it began", Interrupted: true}

// Run executes the code cells of a notebook in order and puts their outputs and
// numbers into it. progress, when not nil, is called before and after each cell.
//
// Cells that hold nothing or carry the tag skip-execution stay as they are. An
// error stops the run unless the cell carries the tag raises-exception: Run
// returns a *CellError, the outputs so far are in the notebook and the cells
// after it are untouched. Cancelling ctx interrupts the cell that runs. Times
// are not recorded, so that the same run gives the same bytes.
func Run(ctx context.Context, nb *Notebook, ex Executor, progress func(Step)) error {
	if progress == nil {
		progress = func(Step) {}
	}
	cells := nb.executable()
	record := newRecord()
	ran := map[*Cell]*cellOutput{}
	defer func() {
		record.close()
		for cell, out := range ran {
			cell.setOutputs(out.snapshot())
		}
	}()
	for i, cell := range cells {
		if ctx.Err() != nil {
			return &CellError{i + 1, cell.ID(), cell.Source(), interrupted}
		}
		step := Step{Cell: cell, Number: i + 1, Of: len(cells)}
		progress(step)
		out := &cellOutput{record: record}
		ran[cell] = out
		step.Err = runCell(ctx, cell, step.Number, ex, out)
		step.Done = true
		progress(step)
		if step.Stops() {
			return &CellError{step.Number, cell.ID(), cell.Source(), step.Err}
		}
	}
	return nil
}

func runCell(ctx context.Context, cell *Cell, number int, ex Executor, out *cellOutput) *session.Error {
	result := contained(ctx, ex, session.Cell{ID: cell.ID(), Number: number, Source: cell.Source()}, out)
	out.end(result, number)
	cell.setNumber(number)
	return result.Err
}

// contained runs a cell. Should the executor itself break, that is the error of
// the cell, and what exists is kept.
func contained(ctx context.Context, ex Executor, c session.Cell, out *cellOutput) (r session.Result) {
	defer func() {
		if cause := recover(); cause != nil {
			r = session.Result{Err: &session.Error{Name: "InternalError", Message: fmt.Sprintf("the kernel failed: %v", cause)}}
		}
	}()
	if name, ok := help.On(c.Source); ok {
		return askedFor(name, ex)
	}
	return ex.Run(ctx, c, out)
}

// askedFor answers a cell that asks for help on a name. There is no reader to
// show it to; only a name of which nothing is known is an error, as with a front
// end.
func askedFor(name string, ex Executor) (r session.Result) {
	inspector, ok := ex.(interface {
		Inspect(source string, cursor int) (display.Bundle, bool)
	})
	if !ok {
		return r
	}
	if _, found := inspector.Inspect(name, utf8.RuneCountInString(name)); !found {
		r.Err = &session.Error{Name: "NameError", Message: "nothing is known of " + name}
	}
	return r
}

// executable returns the cells that a run executes.
func (nb *Notebook) executable() []*Cell {
	var cells []*Cell
	for _, c := range nb.Cells {
		if c.Type() == "code" && strings.TrimSpace(c.Source()) != "" && !c.Tagged("skip-execution") {
			cells = append(cells, c)
		}
	}
	return cells
}

func (c *Cell) setNumber(number int) {
	if c.Number() != number {
		c.tree["execution_count"] = count(number)
	}
}

// setOutputs replaces the outputs of the cell. An output that says the same as
// the one it replaces stays in the form in which it was found.
func (c *Cell) setOutputs(fresh []any) {
	old, _ := c.tree["outputs"].([]any)
	for i := range fresh {
		if i < len(old) && sameOutput(old[i], fresh[i]) {
			fresh[i] = old[i]
		}
	}
	c.tree["outputs"] = fresh
}

func sameOutput(a, b any) bool {
	return reflect.DeepEqual(comparableOutput(a), comparableOutput(b))
}

// comparableOutput returns an output with its texts joined.
func comparableOutput(v any) any {
	out, ok := v.(map[string]any)
	if !ok {
		return v
	}
	out = maps.Clone(out)
	if _, ok := out["text"]; ok {
		out["text"] = joined(out["text"])
	}
	if data, ok := out["data"].(map[string]any); ok {
		data = maps.Clone(data)
		for mime := range data {
			if !isJSON(mime) {
				data[mime] = joined(data[mime])
			}
		}
		out["data"] = data
	}
	return out
}

// SetLanguage records the language of the kernel that ran the notebook; nothing
// else in the notebook's metadata is touched.
func (nb *Notebook) SetLanguage(info map[string]any) {
	metadata := nb.Metadata()
	if metadata == nil {
		metadata = map[string]any{}
		nb.tree["metadata"] = metadata
	}
	metadata["language_info"] = plain(info)
}
