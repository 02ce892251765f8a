package display

import (
	"fmt"

	"brinkline/continuation"
)

// diagramBundle is how a diagram shows itself: all of its branches, and under them how
// hard they were looked for; in words when it cannot be drawn.
func diagramBundle(d *continuation.Diagram) Bundle {
	f := Plot(d)
	f.captioned = true
	if err := f.Err(); err != nil {
		return plainBundle(d.String() + " (no picture: " + err.Error() + ")")
	}
	return f.bundle()
}

// addDiagram puts all branches of a diagram on the axes, and under them how hard they
// were looked for in place of where each of them ends.
func (f *Figure) addDiagram(d *continuation.Diagram) error {
	if d == nil {
		return f.put(false, "diagram", item{})
	}
	for _, b := range d.Branches() {
		f.items = append(f.items, item{branch: b, quiet: true})
	}
	f.diagrams = append(f.diagrams, d)
	return nil
}

// inDiagram reports whether a branch came with a diagram.
func (f *Figure) inDiagram(b *continuation.Branch) bool {
	for _, d := range f.diagrams {
		for _, own := range d.Branches() {
			if own == b {
				return true
			}
		}
	}
	return false
}

// diagramNotes are the lines under a diagram.
func (f *Figure) diagramNotes() []string {
	var notes []string
	for _, d := range f.diagrams {
		notes = append(notes, sentenceCase(count(len(d.Branches()), "branch", "branches")+"; "+d.Statement()))
		for _, n := range d.Notes() {
			notes = append(notes, sentenceCase(n))
		}
	}
	return notes
}

// diagramTable has a row for each special point of all branches.
func diagramTable(d *continuation.Diagram) *Grid {
	g := specialsTable(d.Specials())
	g.caption = fmt.Sprintf("Special points of %s in %s on %s", d.Model().Name(), d.Parameter().Name, count(len(d.Branches()), "branch", "branches"))
	if len(d.Specials()) == 0 {
		g.columns = []column{{}}
		g.add("none")
	}
	g.note(sentenceCase(d.Statement()))
	for _, n := range d.Notes() {
		g.note(sentenceCase(n))
	}
	return g
}
