package display

import (
	"fmt"
	"math"
	"strconv"

	"brinkline/continuation"
)

// mostStates is how many states a table of points shows.
const mostStates = 6

// branchTable is the table of the special points of a branch.
func branchTable(b *continuation.Branch) *Grid {
	g := specialsTable(b.Specials())
	q := b.Parameter()
	g.caption = fmt.Sprintf("Special points of %s in %s", b.Model().Name(), q.Name)
	if len(b.Specials()) == 0 {
		g.columns = []column{{}}
		g.add("none")
	}
	g.note(sentenceCase(endsOf(b)))
	for _, n := range b.Notes() {
		g.note(sentenceCase(n))
	}
	return g
}

// specialsTable has a row for each special point: what, where, the state there,
// how many eigenvalues are unstable before and after, and how sure it is.
func specialsTable(list []continuation.Special) *Grid {
	g := &Grid{caption: "Special points"}
	if len(list) == 0 {
		return g
	}
	g.columns = append(g.columns, column{head: "what"})
	cols := [][]string{make([]string, len(list))}
	for i, s := range list {
		cols[0][i] = s.Kind()
		if w := nature(s); w != "" {
			cols[0][i] += " (" + w + ")"
		}
	}
	put := func(head string, numeric bool, cells []string) {
		g.columns = append(g.columns, column{head, numeric})
		cols = append(cols, cells)
	}
	where(list, put)
	points := make([]*continuation.Point, len(list))
	for i, s := range list {
		points[i] = s.Where()
	}
	g.note(states(points, put))
	beforeAfter(list, put)
	periods(list, put)
	digits := make([]string, len(list))
	for i, s := range list {
		digits[i] = strconv.Itoa(s.Digits())
	}
	put("digits", true, digits)
	g.fill(cols)
	for _, s := range list {
		if _, ok := s.(*continuation.Hopf); ok {
			g.note("Soft: a small stable oscillation grows from the steady state; hard: an unstable one shrinks onto it.")
			break
		}
	}
	if parenthesised(cols) {
		g.note("In parentheses: eigenvalues with positive real part.")
	}
	return g
}

// nature says in a word or two what a special point does, where that is known.
func nature(s continuation.Special) string {
	switch s := s.(type) {
	case *continuation.BranchPoint:
		return s.Name()
	case *continuation.Multiple:
		return fmt.Sprintf("%d null vectors", s.Dimension)
	case *continuation.Hopf:
		switch {
		case math.IsNaN(s.Lyapunov) || min(s.UnstableBefore, s.UnstableAfter) > 0:
			return ""
		case s.Soft():
			return "soft"
		default:
			return "hard"
		}
	}
	return ""
}

// periods puts a column for the periods of Hopf points, if there are any.
func periods(list []continuation.Special, put putColumn) {
	cells, any := make([]string, len(list)), false
	for i, s := range list {
		if h, ok := s.(*continuation.Hopf); ok {
			cells[i], any = significant(h.Period, stateDigits), true
		}
	}
	if any {
		put("period", true, cells)
	}
}

func (g *Grid) fill(cols [][]string) {
	for i := range cols[0] {
		cells := make([]string, len(cols))
		for j := range cols {
			cells[j] = cols[j][i]
		}
		g.add(cells...)
	}
}

func parenthesised(cols [][]string) bool {
	for _, c := range cols {
		for _, text := range c {
			if text == "unstable (1)" || (len(text) > 10 && text[:10] == "unstable (") {
				return true
			}
		}
	}
	return false
}

type putColumn func(head string, numeric bool, cells []string)

// where puts the values of the followed parameter into one column, with its unit
// in the header when it is the same for all.
func where(list []continuation.Special, put putColumn) {
	v := variableOf(list[0].Where())
	values, digits := make([]float64, len(list)), make([]int, len(list))
	same := true
	for i, s := range list {
		values[i], digits[i] = s.Where().Value(), s.Digits()
		if isZero(s) {
			values[i] = 0
		}
		same = same && variableOf(s.Where()) == v
	}
	if same {
		put(v.Label(), true, alignedTo(values, digits))
		return
	}
	cells := make([]string, len(list))
	for i, s := range list {
		v := variableOf(s.Where())
		cells[i] = v.Name + " " + withUnit(reliable(values[i], digits[i]), v.Unit)
	}
	put("where", false, cells)
}

// isZero reports whether the value cannot be told from 0.
func isZero(s continuation.Special) bool { return s.ValueText(3) == "0" }

// variableOf returns the followed parameter's name and unit.
func variableOf(p *continuation.Point) continuation.Variable {
	v, err := p.Model().Variable(p.Parameter)
	if err != nil {
		return continuation.Variable{Name: p.Parameter}
	}
	v.Scale = 0
	return v
}

// states puts a column for each state, and says so when there are too many.
func states(points []*continuation.Point, put putColumn) (note string) {
	m := points[0].Model()
	for _, p := range points {
		if p.Model() != m {
			return ""
		}
	}
	vars := m.States()
	for i, v := range vars {
		if i == mostStates {
			return fmt.Sprintf("%d of %d states; At gives the others by name.", mostStates, len(vars))
		}
		values := make([]float64, len(points))
		for k, p := range points {
			values[k] = p.State[i]
		}
		put(v.Label(), true, aligned(values, stateDigits))
	}
	return ""
}

// beforeAfter puts the stability on both sides in words, or for balances the
// numbers of eigenvalues.
func beforeAfter(list []continuation.Special, put putColumn) {
	before, after := make([]string, len(list)), make([]string, len(list))
	balance := false
	for i, s := range list {
		b, a := around(s)
		m := s.Where().Model()
		balance = balance || m.Balance()
		before[i], after[i] = stabilityWord(m, b), stabilityWord(m, a)
	}
	if balance {
		put("positive eigenvalues before", true, before)
		put("after", true, after)
		return
	}
	put("before", false, before)
	put("after", false, after)
}

// around returns the numbers of unstable eigenvalues before and after.
func around(s continuation.Special) (before, after int) {
	switch s := s.(type) {
	case *continuation.Fold:
		return s.UnstableBefore, s.UnstableAfter
	case *continuation.BranchPoint:
		return s.UnstableBefore, s.UnstableAfter
	case *continuation.Hopf:
		return s.UnstableBefore, s.UnstableAfter
	case *continuation.Multiple:
		return s.UnstableBefore, s.UnstableAfter
	case *continuation.Event:
		return s.UnstableBefore, s.UnstableAfter
	}
	return -1, -1
}

func stabilityWord(m *continuation.Model, unstable int) string {
	switch {
	case unstable < 0:
		return "not computed"
	case m.Balance():
		return strconv.Itoa(unstable)
	case unstable == 0:
		return "stable"
	default:
		return fmt.Sprintf("unstable (%d)", unstable)
	}
}

// pointsTable has a row for each point of a branch or of a slice.
func pointsTable(points []*continuation.Point, b *continuation.Branch) *Grid {
	g := &Grid{caption: "Points"}
	if len(points) == 0 {
		return g
	}
	g.columns = append(g.columns, column{"point", true})
	cols := [][]string{make([]string, len(points))}
	for i := range points {
		cols[0][i] = strconv.Itoa(i)
	}
	put := func(head string, numeric bool, cells []string) {
		g.columns = append(g.columns, column{head, numeric})
		cols = append(cols, cells)
	}
	if name := points[0].Parameter; name != "" {
		values := make([]float64, len(points))
		for i, p := range points {
			values[i] = p.Value()
		}
		put(variableOf(points[0]).Label(), true, aligned(values, stateDigits))
	}
	g.note(states(points, put))
	stabilityColumn(points, put)
	if b != nil {
		steps(points, put)
		g.caption = fmt.Sprintf("Points of %s in %s", b.Model().Name(), b.Parameter().Name)
		put("", false, remarks(b))
	}
	g.fill(cols)
	return g
}

func stabilityColumn(points []*continuation.Point, put putColumn) {
	cells := make([]string, len(points))
	balance := false
	for i, p := range points {
		balance = balance || p.Model().Balance()
		cells[i] = stabilityWord(p.Model(), p.Unstable)
	}
	if balance {
		put("positive eigenvalues", true, cells)
		return
	}
	put("stability", false, cells)
}

func steps(points []*continuation.Point, put putColumn) {
	lengths, iterations := make([]string, len(points)), make([]string, len(points))
	for i, p := range points {
		lengths[i], iterations[i] = significant(p.StepLength, 3), strconv.Itoa(p.Iterations)
	}
	put("step length", true, lengths)
	put("iterations", true, iterations)
}

// remarks names the start and the special points.
func remarks(b *continuation.Branch) []string {
	cells := make([]string, len(b.Points()))
	cells[b.Start()] = "start"
	for _, s := range b.Specials() {
		cells[s.Index()] = s.Kind()
	}
	return cells
}

// sensitivitiesTable ranks the other parameters by how much the limit moves with
// a percent of each.
func sensitivitiesTable(s *continuation.Sensitivities) *Grid {
	q := s.Limit.Parameter()
	g := &Grid{
		caption: fmt.Sprintf("How the %s moves with the other parameters, to first order", briefly(s.Limit)),
		columns: []column{{"parameter", false}, {"now", true}, {"shift of " + q.Name + " per unit", true}, {"", false}, {"percent per percent", true}},
	}
	for _, one := range s.Ranked() {
		per := ratioUnit(q.Unit, one.Unit)
		g.add(one.Name, withUnit(significant(one.Value, stateDigits), one.Unit), significant(one.Slope, vectorDigits), per, significant(one.Elasticity, vectorDigits))
	}
	g.note(fmt.Sprintf("Shift per unit: dλ*/dp = -(wᵀ f_p)/(wᵀ f_λ) with λ = %s; percent per percent: (p/λ*) dλ*/dp.", q.Name))
	return g
}

func ratioUnit(over, under string) string {
	switch {
	case over == "" && under == "":
		return ""
	case under == "":
		return over
	case over == "":
		return "per " + under
	default:
		return over + " per " + under
	}
}
