package display

import (
	"errors"
	"fmt"
	"reflect"

	"brinkline/continuation"
)

// An item is one thing that a figure draws: exactly one of its fields is set.
type item struct {
	branch  *continuation.Branch
	locus   *continuation.Locus
	motion  *continuation.Trajectory
	corner  *continuation.LocusSpecial
	point   *continuation.Point
	special continuation.Special
	margin  *continuation.Margin
	word    string // before the value in a point's label
	quiet   bool   // a point of a list: no label
}

// A Marked steady state has a word of the analyst's own in a figure; see [Mark].
type Marked struct {
	Point *continuation.Point
	Word  string
}

// Mark gives a steady state the word that stands before its value in a figure:
// Plot(path, Mark(start, "today")) says "today 300 K".
func Mark(p *continuation.Point, word string) Marked { return Marked{p, word} }

func (f *Figure) add(v any) error {
	switch v := v.(type) {
	case nil:
		return errors.New("there is nothing to draw (nil)")
	case error:
		return v
	case *continuation.Branch:
		return f.put(v != nil, "branch", item{branch: v})
	case *continuation.Point:
		return f.put(v != nil, "steady state", item{point: v, word: "steady state"})
	case Marked:
		return f.put(v.Point != nil, "steady state", item{point: v.Point, word: v.Word})
	case *continuation.Fold:
		return f.put(v != nil, "fold", item{special: v})
	case *continuation.BranchPoint:
		return f.put(v != nil, "simple stationary bifurcation", item{special: v})
	case *continuation.Hopf:
		return f.put(v != nil, "Hopf point", item{special: v})
	case *continuation.Multiple:
		return f.put(v != nil, "multiple bifurcation", item{special: v})
	case *continuation.Event:
		return f.put(v != nil, "event", item{special: v})
	case *continuation.Margin:
		return f.put(v != nil, "margin", item{margin: v})
	case *continuation.Margins:
		return f.addMargins(v)
	case *continuation.Trajectory:
		return f.addMotion(v, "")
	case *continuation.Relaxation:
		return f.addRelaxation(v)
	case *continuation.Diagram:
		return f.addDiagram(v)
	case *continuation.Family:
		return f.addFamily(v)
	case *continuation.Measured:
		return f.add(v.Points())
	case *continuation.Locus:
		return f.put(v != nil, "locus", item{locus: v})
	case *continuation.LocusSpecial:
		return f.put(v != nil, "special point of a locus", item{corner: v})
	case *continuation.LocusPoint:
		if v == nil {
			return f.put(false, "point of a locus", item{})
		}
		return f.put(true, "", item{point: v.Point, word: "point of a locus"})
	}
	return f.addOther(v)
}

func (f *Figure) put(ok bool, what string, it item) error {
	if !ok {
		return fmt.Errorf("there is no %s to draw (nil)", what)
	}
	f.items = append(f.items, it)
	return nil
}

// addMargins takes the branch that was followed and the margins on it.
func (f *Figure) addMargins(m *continuation.Margins) error {
	if m == nil {
		return f.put(false, "margin", item{})
	}
	f.items = append(f.items, item{branch: m.Branch})
	for _, one := range []*continuation.Margin{m.Above, m.Below} {
		if one != nil {
			f.items = append(f.items, item{margin: one})
		}
	}
	return nil
}

// brancher is what can give its branch, such as a walk.
type brancher interface{ Branch() *continuation.Branch }

// surveyed is what found steady states and can say how hard it looked.
type surveyed interface {
	Points() []*continuation.Point
	Statement() string
}

// addOther takes slices of what can be drawn, and what has a branch.
func (f *Figure) addOther(v any) error {
	if b, ok := v.(brancher); ok && !isNil(v) {
		return f.add(b.Branch())
	}
	if s, ok := v.(surveyed); ok && !isNil(v) {
		return f.addOther(s.Points())
	}
	list := reflect.ValueOf(v)
	if list.Kind() != reflect.Slice && list.Kind() != reflect.Array {
		return fmt.Errorf("a %T cannot be drawn; Plot takes branches, loci, trajectories, steady states, special points and margins", v)
	}
	for i := range list.Len() {
		if err := f.add(list.Index(i).Interface()); err != nil {
			return err
		}
		f.items[len(f.items)-1].quiet = true
	}
	return nil
}

func isNil(v any) bool {
	if v == nil {
		return true
	}
	switch r := reflect.ValueOf(v); r.Kind() {
	case reflect.Pointer, reflect.Map, reflect.Slice, reflect.Func, reflect.Interface, reflect.Chan:
		return r.IsNil()
	}
	return false
}

func (f *Figure) branches() []*continuation.Branch {
	var list []*continuation.Branch
	for _, it := range f.items {
		if it.branch != nil {
			list = append(list, it.branch)
		}
	}
	return list
}

// loci returns the loci in the order in which they were given.
func (f *Figure) loci() []*continuation.Locus {
	var list []*continuation.Locus
	for _, it := range f.items {
		if it.locus != nil {
			list = append(list, it.locus)
		}
	}
	return list
}

// lines returns what is drawn as a curve: branches, loci and trajectories, in order.
func (f *Figure) lines() []item {
	var list []item
	for _, it := range f.items {
		if it.branch != nil || it.locus != nil || it.motion != nil {
			list = append(list, it)
		}
	}
	return list
}

// specials returns the special points of all branches and those given alone,
// each once.
func (f *Figure) specials() []continuation.Special {
	var list []continuation.Special
	seen := map[*continuation.Point]bool{}
	put := func(s continuation.Special) {
		if !seen[s.Where()] {
			seen[s.Where()] = true
			list = append(list, s)
		}
	}
	for _, it := range f.items {
		switch {
		case it.branch != nil:
			for _, s := range it.branch.Specials() {
				put(s)
			}
		case it.special != nil:
			put(it.special)
		case it.margin != nil:
			put(it.margin.To)
		}
	}
	return list
}

// models returns the models of all items, each once, in order.
func (f *Figure) models() []*continuation.Model {
	var list []*continuation.Model
	put := func(m *continuation.Model) {
		for _, have := range list {
			if have == m {
				return
			}
		}
		list = append(list, m)
	}
	for _, it := range f.items {
		put(it.model())
	}
	return list
}

func (it item) model() *continuation.Model {
	switch {
	case it.branch != nil:
		return it.branch.Model()
	case it.locus != nil:
		return it.locus.Model()
	case it.corner != nil:
		return it.corner.Where.Model()
	case it.motion != nil:
		return it.motion.Model()
	case it.point != nil:
		return it.point.Model()
	case it.special != nil:
		return it.special.Where().Model()
	default:
		return it.margin.From.Model()
	}
}

// followed returns the parameter of the item, "" for a steady state alone.
func (it item) followed() string {
	switch {
	case it.branch != nil:
		return it.branch.Parameter().Name
	case it.locus != nil:
		return it.locus.First().Name
	case it.corner != nil:
		first, _ := it.corner.Where.Pair()
		return first.Name
	case it.motion != nil:
		return ""
	case it.point != nil:
		return it.point.Parameter
	case it.special != nil:
		return it.special.Where().Parameter
	default:
		return it.margin.Parameter.Name
	}
}
