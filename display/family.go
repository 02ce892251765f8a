package display

import (
	"fmt"

	"brinkline/continuation"
)

// familyBundle is how a family shows itself: all of its branches in one picture, and under
// them what is missing.
func familyBundle(v *continuation.Family) Bundle {
	f := Plot(v)
	if err := f.Err(); err != nil {
		return familyTable(v).bundle()
	}
	return f.bundle()
}

// addFamily puts all branches of a family on the axes.
func (f *Figure) addFamily(v *continuation.Family) error {
	if v == nil {
		return f.put(false, "family", item{})
	}
	if len(v.Branches()) == 0 {
		return fmt.Errorf("the family has no branch to draw: %s", v.Missing()[0].Reason)
	}
	for _, b := range v.Branches() {
		f.items = append(f.items, item{branch: b, quiet: true})
	}
	return nil
}

// familyTable has a row for each special point of each member.
func familyTable(v *continuation.Family) *Grid {
	q, second := v.Parameter(), v.Second()
	g := &Grid{
		caption: fmt.Sprintf("Special points of %s in %s for %s of %s", v.Model().Name(), q.Name, count(len(v.Members()), "value", "values"), second.Name),
		columns: []column{{second.Label(), true}, {"what", false}, {q.Label(), true}, {"digits", true}},
	}
	for _, m := range v.Members() {
		value := significant(m.Value, stateDigits)
		if m.Branch == nil {
			g.add(value, m.Reason, "", "")
			continue
		}
		if len(m.Branch.Specials()) == 0 {
			g.add(value, "none", "", "")
		}
		for _, s := range m.Branch.Specials() {
			g.add(value, s.Kind(), valueText(s, 8), fmt.Sprint(s.Digits()))
		}
	}
	if v.Interrupted() {
		g.note("Interrupted: the branches that are there are kept, and the same call goes on from them.")
	}
	if n := v.Resumed(); n > 0 {
		g.note(fmt.Sprintf("%s taken over from an interrupted sweep.", capital(count(n, "branch was", "branches were"))))
	}
	g.note(caution)
	return g
}
