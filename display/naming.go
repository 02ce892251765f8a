package display

import (
	"fmt"
	"slices"
	"strings"

	"brinkline/continuation"
)

// names returns the labels of the curves: the analyst's, else what tells them
// apart.
func (f *Figure) names() []string {
	names := make([]string, len(f.lines()))
	copy(names, f.labels)
	if len(f.labels) > 0 {
		return names
	}
	branches, loci := f.branchNames(), f.locusNames()
	for i, it := range f.lines() {
		switch {
		case it.branch != nil:
			names[i], branches = branches[0], branches[1:]
		case it.motion != nil && len(f.lines()) > 1:
			names[i] = fmt.Sprintf("trajectory %d", i+1)
		case it.locus != nil:
			names[i], loci = loci[0], loci[1:]
		}
	}
	return names
}

// branchNames says what tells branches apart. A branch alone needs no name.
func (f *Figure) branchNames() []string {
	branches := f.branches()
	names := make([]string, len(branches))
	if len(branches) < 2 {
		return names
	}
	for i, b := range branches {
		names[i] = distinction(branches, b)
	}
	for i, name := range names {
		if name == "" || repeated(names, name) > 1 {
			names[i] = strings.TrimSpace(fmt.Sprintf("branch %d", i+1))
		}
	}
	return names
}

// locusNames says what loci are made of; of several of a kind, where they began.
func (f *Figure) locusNames() []string {
	loci := f.loci()
	kinds := make([]string, len(loci))
	for i, l := range loci {
		kinds[i] = l.Kind() + "s"
	}
	names := make([]string, len(loci))
	for i, l := range loci {
		names[i] = kinds[i]
		if repeated(kinds, kinds[i]) > 1 {
			p := l.Points()[l.Start()]
			names[i] += " from " + withUnit(typeset(significant(p.First, 5)), l.First().Unit)
		}
	}
	given := slices.Clone(names)
	for i := range names {
		if repeated(given, given[i]) > 1 {
			names[i] = fmt.Sprintf("%s %d", kinds[i], i+1)
		}
	}
	return names
}

func repeated(names []string, name string) int {
	n := 0
	for _, other := range names {
		if other == name {
			n++
		}
	}
	return n
}

// distinction says how a branch differs from the others: the name of its model,
// or the values of the parameters that are held and are not the same on all.
func distinction(all []*continuation.Branch, b *continuation.Branch) string {
	for _, other := range all {
		if other.Model().Name() != b.Model().Name() {
			return b.Model().Name()
		}
	}
	var parts []string
	for j, q := range b.Model().Parameters() {
		if q.Name != b.Parameter().Name && differs(all, q.Name, held(b, j)) {
			parts = append(parts, labelled(q.Variable, held(b, j), 5))
		}
	}
	if len(parts) > 2 {
		return ""
	}
	return strings.Join(parts, ", ")
}

func held(b *continuation.Branch, j int) float64 { return b.Points()[b.Start()].Parameters[j] }

func differs(all []*continuation.Branch, name string, value float64) bool {
	for _, b := range all {
		v, err := b.Points()[b.Start()].At(name)
		if err != nil || (v != value && b.Parameter().Name != name) {
			return true
		}
	}
	return false
}
