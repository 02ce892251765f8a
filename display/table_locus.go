package display

import (
	"fmt"
	"math"
	"strconv"

	"brinkline/continuation"
)

// locusTable has a row for each special point of a locus.
func locusTable(l *continuation.Locus) *Grid {
	g := cornersTable(l.Specials())
	g.caption = fmt.Sprintf("Special points of the %ss of %s in %s and %s", l.Kind(), l.Model().Name(), l.First().Name, l.Second().Name)
	if len(l.Specials()) == 0 {
		g.columns = []column{{}}
		g.add("none")
	}
	g.note(sentenceCase(endsOfLocus(l)))
	for _, n := range l.Notes() {
		g.note(sentenceCase(n))
	}
	return g
}

// cornersTable has a row for each special point: what, both parameters, the state and
// its coefficients.
func cornersTable(list []*continuation.LocusSpecial) *Grid {
	g := &Grid{caption: "Special points of loci"}
	if len(list) == 0 {
		return g
	}
	put, fill := g.collect()
	what, coefficients := make([]string, len(list)), make([]string, len(list))
	where, points := make([]*continuation.LocusPoint, len(list)), make([]*continuation.Point, len(list))
	kinds := map[string]bool{}
	for i, c := range list {
		what[i], coefficients[i] = c.Kind, coefficientText(c)
		where[i], points[i] = c.Where, c.Where.Point
		kinds[c.Kind] = true
	}
	put("what", false, what)
	pairColumns(where, cornerDigits, put)
	g.note(states(points, put))
	put("coefficients", false, coefficients)
	fill()
	for _, kind := range []string{cuspKind, takensKind, foldHopfKind} {
		if kinds[kind] {
			g.note(shortNormalisation[kind])
		}
	}
	return g
}

var shortNormalisation = map[string]string{
	cuspKind:     "c = 1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h]) for |v| = 1 in the units shown, wᵀ v = 1.",
	takensKind:   "a2, b2: normal form of Bogdanov and Takens with |q0| = 1 in the units shown; the card of the point has the rest.",
	foldHopfKind: "ω in radians per unit of time.",
}

func coefficientText(c *continuation.LocusSpecial) string {
	switch c.Kind {
	case cuspKind:
		return "c = " + significant(c.Cubic, vectorDigits)
	case takensKind:
		return fmt.Sprintf("a2 = %s, b2 = %s", significant(c.A2, vectorDigits), significant(c.B2, vectorDigits))
	case hopfHopfKind:
		return fmt.Sprintf("ω = %s and %s", significant(c.Omega, stateDigits), significant(c.Omega2, stateDigits))
	case degenerateKind:
		return fmt.Sprintf("ω = %s, l1 = 0", significant(c.Omega, stateDigits))
	}
	return "ω = " + significant(c.Omega, stateDigits)
}

// locusPointsTable has a row for each point of a locus or of a slice of its points.
func locusPointsTable(list []*continuation.LocusPoint, l *continuation.Locus) *Grid {
	g := &Grid{caption: "Points of loci"}
	if len(list) == 0 {
		return g
	}
	put, fill := g.collect()
	index, points := make([]string, len(list)), make([]*continuation.Point, len(list))
	for i, p := range list {
		index[i], points[i] = strconv.Itoa(i), p.Point
	}
	put("point", true, index)
	pairColumns(list, stateDigits, put)
	g.note(states(points, put))
	if l != nil {
		g.caption = fmt.Sprintf("Locus of the %ss of %s in %s and %s", l.Kind(), l.Model().Name(), l.First().Name, l.Second().Name)
		g.note(coefficientColumns(l, put))
		put("", false, locusRemarks(l))
	}
	fill()
	return g
}

// coefficientColumns puts what is known along a locus and returns the normalisation.
func coefficientColumns(l *continuation.Locus, put putColumn) string {
	column := func(value func(*continuation.LocusPoint) float64) []string {
		cells := make([]string, len(l.Points()))
		for i, p := range l.Points() {
			if v := value(p); !math.IsNaN(v) {
				cells[i] = significant(v, vectorDigits)
			}
		}
		return cells
	}
	others := make([]string, len(l.Points()))
	for i, p := range l.Points() {
		others[i] = strconv.Itoa(p.Unstable)
	}
	put("others positive", true, others)
	note := "Others positive: eigenvalues with positive real part besides those that are critical."
	if l.Kind() == foldKind {
		return note
	}
	put("ω", true, column(func(p *continuation.LocusPoint) float64 { return p.Omega }))
	put("l1", true, column(func(p *continuation.LocusPoint) float64 { return p.Lyapunov }))
	return note + " ω in radians per unit of time; l1: first Lyapunov coefficient for |q| = 1 in the units shown, <p, q> = 1; neither is there on neutral saddles."
}

func locusRemarks(l *continuation.Locus) []string {
	cells := make([]string, len(l.Points()))
	cells[l.Start()] = "start"
	for _, c := range l.Specials() {
		cells[c.Index()] = c.Kind
	}
	return cells
}

// pairColumns puts the values of the two parameters, under their names where all
// points agree on them.
func pairColumns(list []*continuation.LocusPoint, digits int, put putColumn) {
	first, second := pairOf(list[0])
	same := true
	one, two := make([]float64, len(list)), make([]float64, len(list))
	where := make([]string, len(list))
	for i, p := range list {
		a, b := pairOf(p)
		same = same && a.Variable == first.Variable && b.Variable == second.Variable
		one[i], two[i] = a.Value, b.Value
		where[i] = labelled(a.Variable, a.Value, digits) + ", " + labelled(b.Variable, b.Value, digits)
	}
	if !same {
		put("where", false, where)
		return
	}
	put(first.Label(), true, aligned(one, digits))
	put(second.Label(), true, aligned(two, digits))
}

// collect returns a function that puts columns and one that makes rows of them.
func (g *Grid) collect() (put putColumn, fill func()) {
	var cols [][]string
	put = func(head string, numeric bool, cells []string) {
		g.columns = append(g.columns, column{head, numeric})
		cols = append(cols, cells)
	}
	return put, func() { g.fill(cols) }
}
