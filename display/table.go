package display

import (
	"errors"
	"fmt"
)

// A Grid is a table of text: a caption, a header and rows. It is shown as html
// and as plain text; more than 60 rows show head and tail.
type Grid struct {
	caption string
	columns []column
	rows    []row
	notes   []string // sentences under the table
	card    bool     // the first column names what stands in the others
	err     error
}

// A column has a head and says how its cells are aligned.
type column struct {
	head    string
	numeric bool
}

// A row has a cell for each column, or is a heading over the rows that follow.
type row struct {
	cells   []string
	heading string
	text    bool // the cells are words even in a numeric column
}

// Head and tail of a long table.
const (
	mostRows = 60
	headRows = 20
	tailRows = 20
)

// Caption sets the caption.
func (g *Grid) Caption(text string) *Grid {
	g.caption = text
	return g
}

// Rows returns the number of rows, Columns that of columns.
func (g *Grid) Rows() int {
	n := 0
	for _, r := range g.rows {
		if r.heading == "" {
			n++
		}
	}
	return n
}

// Columns returns the number of columns.
func (g *Grid) Columns() int { return len(g.columns) }

// Err returns why there is no table, if that is so.
func (g *Grid) Err() error {
	if g == nil {
		return errors.New("there is no table (nil)")
	}
	return g.err
}

// String returns the table as plain text.
func (g *Grid) String() string {
	if err := g.Err(); err != nil {
		return "table: " + err.Error()
	}
	return g.plain()
}

func (g *Grid) add(cells ...string) { g.rows = append(g.rows, row{cells: cells}) }

// say adds a row of words to a card.
func (g *Grid) say(name, text string) {
	g.rows = append(g.rows, row{cells: []string{name, text}, text: true})
}

func (g *Grid) heading(text string) { g.rows = append(g.rows, row{heading: text}) }

func (g *Grid) note(text string) {
	if text != "" {
		g.notes = append(g.notes, text)
	}
}

// shown returns the rows that are shown and how many are left out behind the
// first headRows of them.
func (g *Grid) shown() (rows []row, omitted int) {
	if len(g.rows) <= mostRows {
		return g.rows, 0
	}
	omitted = len(g.rows) - headRows - tailRows
	rows = append(rows, g.rows[:headRows]...)
	return append(rows, g.rows[len(g.rows)-tailRows:]...), omitted
}

// size says how large the table is when not all of it is shown.
func (g *Grid) size() string {
	if len(g.rows) <= mostRows {
		return ""
	}
	return fmt.Sprintf("%d rows x %d columns", len(g.rows), len(g.columns))
}

// wordy reports whether a row of words spans numeric columns: a column without
// content then takes its width, so that the numbers stay together.
func (g *Grid) wordy() bool {
	for _, r := range g.rows {
		if r.text {
			return true
		}
	}
	return false
}

// headed reports whether any column has a head.
func (g *Grid) headed() bool {
	for _, c := range g.columns {
		if c.head != "" {
			return true
		}
	}
	return false
}

func (g *Grid) bundle() Bundle {
	if err := g.Err(); err != nil {
		return plainBundle(err.Error())
	}
	b := plainBundle(g.plain())
	b.Data[MIMEHTML] = g.html()
	b.Data[MIMELaTeX] = g.latex()
	return b
}
