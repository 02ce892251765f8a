package headless

import (
	"fmt"
	"io"
	"strings"
	"time"
	"unicode/utf8"

	"brinkline/kernel/notebook"
	"brinkline/kernel/session"
)

// progress tells a reader at a terminal what a run does, a line for each cell.
type progress struct {
	w     io.Writer
	began time.Time
}

// captionWidth keeps a cell's line, with its time, within 80 columns.
const captionWidth = 62

func (p *progress) step(s notebook.Step) {
	if !s.Done {
		p.began = time.Now()
		fmt.Fprintf(p.w, "%3d of %d  %s", s.Number, s.Of, shortened(s.Cell.Caption(), captionWidth))
		return
	}
	fmt.Fprintln(p.w, outcome(s, time.Since(p.began)))
	if s.Stops() {
		fmt.Fprint(p.w, place(s.Cell.Source(), s.Err))
	}
}

// outcome says how a cell ended, and how long it took where that is worth a
// word.
func outcome(s notebook.Step, took time.Duration) string {
	said := ""
	if took >= 100*time.Millisecond {
		said = fmt.Sprintf("  %.1f s", took.Seconds())
	}
	switch {
	case s.Err == nil:
		return said
	case s.Err.Interrupted:
		return said + "  interrupted"
	case s.Stops():
		return said + "  error"
	default:
		return said + "  error, as expected"
	}
}

// place shows the line of an error with a caret under its column, and what to
// do about it where that is known.
func place(source string, err *session.Error) string {
	shown := ""
	if lines := strings.Split(source, "\n"); err.Line >= 1 && err.Line <= len(lines) {
		label := fmt.Sprintf("      line %d: ", err.Line)
		line := strings.ReplaceAll(lines[err.Line-1], "\t", " ")
		shown = label + line + "\n"
		if err.Column >= 1 && err.Column <= utf8.RuneCountInString(line)+1 {
			shown += strings.Repeat(" ", len(label)+err.Column-1) + "^\n"
		}
	}
	if err.Hint != "" {
		shown += "      " + err.Hint + "\n"
	}
	return shown
}

func (p *progress) specials(found []string) {
	if len(found) == 0 {
		return
	}
	fmt.Fprintln(p.w, "special points found:")
	for _, line := range found {
		fmt.Fprintln(p.w, "  "+line)
	}
}

func (p *progress) wrote(path string, written bool) {
	if written {
		fmt.Fprintln(p.w, "wrote "+path)
	} else {
		fmt.Fprintln(p.w, path+" says the same already")
	}
}

// shortened cuts a line to a number of characters.
func shortened(s string, width int) string {
	if utf8.RuneCountInString(s) <= width {
		return s
	}
	return string([]rune(s)[:width-1]) + "…"
}
