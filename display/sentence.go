package display

import (
	"fmt"
	"math"
	"strings"

	"brinkline/continuation"
)

// sentence says what the figure shows: for the plain text, for the description in
// the SVG and for the alt text of the PNG.
func (f *Figure) sentence(s *scene) string {
	parts := []string{f.subject(s)}
	if text := f.findings(); text != "" {
		parts = append(parts, text)
	}
	for _, it := range f.items {
		if it.margin != nil {
			parts = append(parts, capital(it.margin.String())+".")
		}
	}
	for _, text := range []string{f.lineMeaning(s), f.locusMeaning(s), f.fanMeaning(s)} {
		if text != "" {
			parts = append(parts, text)
		}
	}
	return strings.Join(parts, " ")
}

// subject says what stands on the axes, of what, and over which range.
func (f *Figure) subject(s *scene) string {
	text := fmt.Sprintf("%s against %s", s.y.label, s.x.label)
	if b := f.branches(); len(b) > 0 {
		n := 0
		for _, one := range b {
			n += len(one.Points())
		}
		text += fmt.Sprintf(", %s with %s", count(len(b), "branch", "branches"), count(n, "point", "points"))
	}
	for _, l := range f.loci() {
		text += fmt.Sprintf(", locus of %ss with %s", l.Kind(), count(len(l.Points()), "point", "points"))
	}
	for _, it := range f.motions() {
		text += fmt.Sprintf(", trajectory with %s", count(it.motion.Steps, "step", "steps"))
	}
	xs, _ := s.values()
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range xs {
		low, high = min(low, v), max(high, v)
	}
	text += fmt.Sprintf(", model %s, %s from %s to %s", strings.Join(f.modelNames(), " and "), s.x.what(), significant(low, 6), significant(high, 6))
	return withUnit(text, s.x.variable.Unit) + "."
}

// findings lists the special points in full.
func (f *Figure) findings() string {
	const most = 12
	var list []string
	for _, sp := range f.specials() {
		list = append(list, f.finding(sp))
	}
	for _, c := range f.corners() {
		list = append(list, cornerText(c, cornerDigits))
	}
	if len(list) == 0 {
		if len(f.lines()) == len(f.motions()) {
			return ""
		}
		return "No special points."
	}
	if left := len(list) - most; left > 0 {
		list = append(list[:most], fmt.Sprintf("and %d more", left))
	}
	return capital(strings.Join(list, "; ")) + "."
}

// finding says one special point: where, and the value on the y axis there.
func (f *Figure) finding(s continuation.Special) string {
	v := variableOf(s.Where())
	text := fmt.Sprintf("%s at %s %s", s.Kind(), v.Name, withUnit(valueText(s, 8), v.Unit))
	if h, ok := s.(*continuation.Hopf); ok {
		text += ", period " + significant(h.Period, 4)
	}
	return text
}

// modelNames lists the names of the models, each once.
func (f *Figure) modelNames() []string {
	var names []string
	for _, m := range f.models() {
		if repeated(names, m.Name()) == 0 {
			names = append(names, m.Name())
		}
	}
	return names
}

// lineMeaning explains the kinds of lines that occur.
func (f *Figure) lineMeaning(s *scene) string {
	seen := map[lineKind]bool{}
	for _, c := range s.curves {
		for _, r := range c.runs {
			seen[r.line] = seen[r.line] || !(c.locus || c.motion)
		}
	}
	var list []string
	balance, rates := f.settings()
	if rates && seen[solid] {
		list = append(list, "solid: stable")
	}
	if rates && seen[dashed] {
		list = append(list, "dashed: unstable")
	}
	if seen[dotted] {
		list = append(list, "dotted: eigenvalues were not computed")
	}
	text := ""
	if len(list) > 0 {
		text = capital(strings.Join(list, ", ")) + "."
	}
	if balance && (seen[solid] || seen[dashed]) {
		text += fmt.Sprintf(" Of a balance nothing is called stable: its lines are solid where f_x has %s with positive real part, as at the start, and dashed where it has another number.",
			count(f.reference(), "eigenvalue", "eigenvalues"))
	}
	return strings.TrimSpace(text)
}

// settings reports whether there are branches of balances and of rate laws.
func (f *Figure) settings() (balance, rates bool) {
	for _, b := range f.branches() {
		if b.Model().Balance() {
			balance = true
		} else {
			rates = true
		}
	}
	return balance, rates
}

func capital(text string) string {
	if text == "" {
		return ""
	}
	r := []rune(text)
	return strings.ToUpper(string(r[0])) + string(r[1:])
}
