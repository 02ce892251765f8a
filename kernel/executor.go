package kernel

import "context"

type Bundle struct {
	Data     map[string]any
	Metadata map[string]any
}
type Cell struct {
	ID     string
	Number int
	Source string
}
type Result struct {
	Value *Bundle
	Err   *Error
}
type Error struct {
	Name, Message string
	Line, Column  int
	Hint          string
	Traceback     []string
	Interrupted   bool
}
type Output interface {
	Stream(name, text string)
	Display(b Bundle, id string)
	Update(b Bundle, id string)
	Clear(wait bool)
}
type Completion struct {
	Matches    []string
	Start, End int
}

// Executor runs cells and knows the names in them. Run is called for one cell
// at a time; the other methods may be called while it runs.
type Executor interface {
	// Run runs a cell. When ctx is cancelled it ends the cell soon, with an
	// error that says so.
	Run(ctx context.Context, c Cell, out Output) Result

	// Complete returns what may stand around the cursor, counted in runes.
	Complete(source string, cursor int) Completion

	// IsComplete returns "complete", "incomplete" with the indent of the next
	// line, "invalid" or "unknown".
	IsComplete(source string) (status, indent string)

	// Inspect describes what is at the cursor, counted in runes.
	Inspect(source string, cursor int) (Bundle, bool)

	Close()
}
