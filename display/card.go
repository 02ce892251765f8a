package display

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"strings"

	"brinkline/continuation"
)

// caution ends the cards of limits that somebody may run a plant, a grid or a
// structure by.
const caution = "This limit is a property of the model, not a safety limit; local codes and licensed practice decide."

// newCard returns a table whose first column names what stands in the others.
func newCard(caption string, heads ...string) *Grid {
	g := &Grid{caption: caption, card: true, columns: []column{{}}}
	for _, h := range heads {
		g.columns = append(g.columns, column{h, true})
	}
	return g
}

// modelCard shows what a model is made of.
func modelCard(m *continuation.Model) *Grid {
	heads := []string{"value"}
	if scaled(m) {
		heads = append(heads, "typical size")
	}
	g := newCard(fmt.Sprintf("Model %s: %s, %s", m.Name(), count(len(m.States()), "state", "states"), count(len(m.Parameters()), "parameter", "parameters")),
		heads...)
	g.heading("states")
	n := len(m.States())
	for i, v := range m.States() {
		if g.skip(i, n) {
			continue
		}
		g.add([]string{v.Label(), "", sizeText(v.Scale)}[:len(g.columns)]...)
	}
	g.heading("parameters")
	n = len(m.Parameters())
	for i, q := range m.Parameters() {
		if g.skip(i, n) {
			continue
		}
		g.add([]string{q.Label(), significant(q.Value, 10), sizeText(q.Scale)}[:len(g.columns)]...)
	}
	if names := m.Quantities(); len(names) > 0 {
		g.heading("quantities")
		for _, v := range names {
			g.add([]string{v.Label(), "", ""}[:len(g.columns)]...)
		}
	}
	g.heading("setting")
	g.say("equations", settingText(m))
	g.say("derivatives", m.DerivativesNote())
	return g
}

// scaled reports whether the model gives a typical size of anything.
func scaled(m *continuation.Model) bool {
	for _, v := range m.States() {
		if v.Scale > 0 {
			return true
		}
	}
	for _, q := range m.Parameters() {
		if q.Scale > 0 {
			return true
		}
	}
	return false
}

func sizeText(scale float64) string {
	if scale == 0 {
		return ""
	}
	return significant(scale, 6)
}

func settingText(m *continuation.Model) string {
	if m.Balance() {
		return "a balance f(x, p) = 0 without time: nothing is called stable, eigenvalues of f_x are counted"
	}
	return "rates of change dx/dt = f(x, p): stable where all eigenvalues of f_x have negative real part"
}

// pointCard shows a steady state.
func pointCard(p *continuation.Point) *Grid {
	m := p.Model()
	caption := "Steady state of " + m.Name()
	if p.Parameter != "" {
		caption += " at " + labelled(variableOf(p), p.Value(), stateDigits)
	}
	g := newCard(caption, "value")
	g.heading("states")
	g.list(m.States(), p.State, stateDigits)
	g.heading("parameters")
	vars := make([]continuation.Variable, len(m.Parameters()))
	for i, q := range m.Parameters() {
		vars[i] = q.Variable
	}
	g.list(vars, p.Parameters, 10)
	for i, v := range m.Quantities() {
		if i == 0 {
			g.heading("quantities")
		}
		if value, err := p.At(v.Name); err == nil {
			g.add(v.Label(), significant(value, stateDigits))
		}
	}
	g.heading("stability")
	g.say(inWords, stabilitySentence(p))
	if len(p.Eigenvalues) > 0 {
		g.say("eigenvalues of f_x", eigenvalueText(p.Eigenvalues))
	}
	return g
}

const inWords = "in words"

// list adds a row for each variable, leaving out the middle of many.
func (g *Grid) list(vars []continuation.Variable, values []float64, digits int) {
	for i, v := range vars {
		if g.skip(i, len(vars)) {
			continue
		}
		g.add(v.Label(), significant(values[i], digits))
	}
}

// skip reports whether row i of n stays out of a card, and says once how many do.
func (g *Grid) skip(i, n int) bool {
	const most, ends = 16, 6
	if n <= most || i < ends || i >= n-ends {
		return false
	}
	if i == ends {
		g.say("...", fmt.Sprintf("%d more", n-2*ends))
	}
	return true
}

// stabilitySentence says in words what the eigenvalues mean.
func stabilitySentence(p *continuation.Point) string {
	n := len(p.State)
	switch {
	case p.Unstable < 0:
		return "not known: the eigenvalues were not computed"
	case p.Model().Balance():
		return fmt.Sprintf("a balance without time is not called stable or unstable; f_x has %s with positive real part (of %d)", count(p.Unstable, "eigenvalue", "eigenvalues"), n)
	case p.Unstable > 0:
		return fmt.Sprintf("unstable: %s with positive real part (of %d)", count(p.Unstable, "eigenvalue", "eigenvalues"), n)
	case n == 1:
		return "stable: the eigenvalue is negative"
	case n == 2:
		return "stable: both eigenvalues have negative real part"
	default:
		return fmt.Sprintf("stable: all %d eigenvalues have negative real part", n)
	}
}

// eigenvalueText lists eigenvalues by falling real part, pairs as one.
func eigenvalueText(list []complex128) string {
	const most = 8
	var parts []string
	for i := 0; i < len(list); i++ {
		if len(parts) == most {
			return strings.Join(parts, ", ") + fmt.Sprintf(", and %d with smaller real part", len(list)-i)
		}
		z := list[i]
		if imag(z) == 0 {
			parts = append(parts, significant(real(z), vectorDigits))
			continue
		}
		if i+1 < len(list) && cmplx.Abs(list[i+1]-cmplx.Conj(z)) <= 1e-9*cmplx.Abs(z) {
			parts = append(parts, fmt.Sprintf("%s ± %s i", significant(real(z), vectorDigits), significant(math.Abs(imag(z)), vectorDigits)))
			i++
			continue
		}
		parts = append(parts, fmt.Sprintf("%s %s %s i", significant(real(z), vectorDigits), sign(imag(z)), significant(math.Abs(imag(z)), vectorDigits)))
	}
	return strings.Join(parts, ", ")
}

func sign(v float64) string {
	if v < 0 {
		return "-"
	}
	return "+"
}

// A vector has an entry for each state, beside which it stands in a card, and perhaps
// one for the followed parameter.
type vector struct {
	name    string
	entries []float64
}

// beyond is the entry of the followed parameter, empty where there is none.
func (v vector) beyond(n int) string {
	if len(v.entries) <= n {
		return ""
	}
	return reliable(v.entries[n], vectorDigits)
}

// vectors adds a row for each state with its value and the entries of vectors; of
// many states those with the largest entries of the first vector.
func (g *Grid) vectors(p *continuation.Point, list []vector) {
	if len(list) == 0 {
		g.list(p.Model().States(), p.State, stateDigits)
		return
	}
	const most = 12
	vars := p.Model().States()
	order := make([]int, len(vars))
	for i := range order {
		order[i] = i
	}
	if len(vars) > most {
		lead := list[0].entries
		sort.SliceStable(order, func(a, b int) bool { return math.Abs(lead[order[a]]) > math.Abs(lead[order[b]]) })
		order = order[:most]
		sort.Ints(order)
	}
	for _, i := range order {
		cells := []string{vars[i].Label(), significant(p.State[i], stateDigits)}
		for _, v := range list {
			cells = append(cells, reliable(v.entries[i], vectorDigits))
		}
		g.add(cells...)
	}
	if len(vars) > most {
		g.say("...", fmt.Sprintf("%d of %d states, those with the largest entries of %s", most, len(vars), list[0].name))
	}
}
