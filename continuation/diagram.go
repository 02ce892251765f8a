package continuation

import (
	"cmp"
	"fmt"
	"slices"
)

// A Diagram is all branches that were found in a region of states and one parameter.
type Diagram struct {
	model       *Model
	free        int
	frame       *frame
	branches    []*Branch
	notes       []string
	effort      TriedStarts
	barren      int
	interrupted bool
}

func (a *atlas) diagram() *Diagram {
	return &Diagram{
		model: a.m, free: a.j, frame: a.frame, branches: a.branches, notes: a.notes,
		effort: a.effort, barren: a.random.Barren, interrupted: a.stopped != nil,
	}
}

// Model returns the model.
func (d *Diagram) Model() *Model { return d.model }

// Parameter returns the parameter that was followed.
func (d *Diagram) Parameter() Parameter { return d.model.parameters[d.free] }

// Branches returns the branches in the order in which they were found, each once.
// Branches that cross share the branch point.
func (d *Diagram) Branches() []*Branch { return d.branches }

// Specials returns the special points of all branches by rising parameter, those that
// several branches share once.
func (d *Diagram) Specials() []Special {
	var list []Special
	a := &atlas{m: d.model, j: d.free, frame: d.frame}
	for _, b := range d.branches {
		for _, s := range b.Specials() {
			z := a.scaled(s.Where())
			if !slices.ContainsFunc(list, func(o Special) bool { return away(a.scaled(o.Where()), z) < 1e-6 }) {
				list = append(list, s)
			}
		}
	}
	slices.SortStableFunc(list, func(s, o Special) int { return cmp.Compare(s.Where().Value(), o.Where().Value()) })
	return list
}

// Folds returns the folds of all branches by rising parameter.
func (d *Diagram) Folds() []*Fold { return only[*Fold](d.Specials()) }

// Notes holds what could not be followed or explained, one line each.
func (d *Diagram) Notes() []string {
	notes := slices.Clone(d.notes)
	for _, b := range d.branches {
		notes = append(notes, b.Notes()...)
	}
	return notes
}

// Tried returns how much was tried in looking for starts; the steps along the branches
// are not in it. Barren counts the last starts in state and parameter together that
// came to nothing new.
func (d *Diagram) Tried() TriedStarts {
	t := d.effort
	t.Barren = d.barren
	return t
}

// Interrupted reports whether the work was interrupted; what was found is there.
func (d *Diagram) Interrupted() bool { return d.interrupted }

// Statement says how much was tried. It is no proof that there are no other branches.
func (d *Diagram) Statement() string {
	text := fmt.Sprintf("%s; the last %d starts in state and parameter came to nothing new", d.effort, d.barren)
	if d.interrupted {
		text += "; interrupted"
	}
	return text
}

// String says the diagram in one line.
func (d *Diagram) String() string {
	q := d.Parameter()
	n := len(d.model.states)
	low := d.frame.low[n]
	word := "branches"
	if len(d.branches) == 1 {
		word = "branch"
	}
	return fmt.Sprintf("%d %s of %s in %s from %s to %s; %s", len(d.branches), word, d.model.name, q.Name,
		withUnit(low, q.Unit), withUnit(low+d.frame.width[n], q.Unit), d.Statement())
}
