package kernel

import (
	"context"

	"brinkline/display"
	"brinkline/kernel/session"
)

// Executor runs cells and knows the names in them. Run is called for one cell
// at a time; the other methods may be called while it runs.
type Executor interface {
	// Run runs a cell. When ctx is done it ends the cell soon, with an error
	// that says so.
	Run(ctx context.Context, c session.Cell, out session.Output) session.Result

	// Complete returns what may stand around the cursor, counted in runes.
	Complete(source string, cursor int) session.Completion

	// IsComplete returns "complete", "incomplete" with the indent of the next
	// line, "invalid" or "unknown".
	IsComplete(source string) (status, indent string)

	// Inspect describes what is at the cursor, counted in runes.
	Inspect(source string, cursor int) (display.Bundle, bool)

	Close()
}

// newSession starts the executor of real cells.
func newSession() (Executor, error) { return session.New(session.Options{}) }
