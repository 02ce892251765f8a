package display

import (
	"fmt"
	"math"

	"brinkline/continuation"
)

// addMarks puts special points, steady states and margins into the scene.
func (f *Figure) addMarks(s *scene) error {
	specials := f.specials()
	labels := f.specialLabels(specials)
	for i, special := range specials {
		m, err := s.specialMark(special)
		if err != nil {
			return err
		}
		m.label = labels[i]
		s.put(m)
	}
	for _, it := range f.items {
		if err := f.addPoint(s, it); err != nil {
			return err
		}
	}
	return nil
}

// put adds a mark, one label for several of one text.
func (s *scene) put(m mark) {
	if m.finite() {
		s.marks = append(s.marks, m)
	}
}

func (s *scene) specialMark(special continuation.Special) (mark, error) {
	p, err := s.place(special.Where())
	m := mark{place: p, kind: special.Kind(), vx: math.NaN(), vy: math.NaN()}
	switch special := special.(type) {
	case *continuation.Fold:
		m.away = s.turn(special)
	case *continuation.BranchPoint:
		model := special.Where().Model()
		m.vx, m.vy = s.x.component(model, special.Right), s.y.component(model, special.Right)
	}
	return m, err
}

// turn says to which side of a fold the branch bends when the followed parameter
// stands on the x axis.
func (s *scene) turn(fold *continuation.Fold) float64 {
	if fold.Where().Parameter != s.x.variable.Name {
		return 0
	}
	if fold.Greatest() {
		return -1
	}
	return +1
}

// specialLabels writes the word and the value of special points with at most five
// digits. Those that say the same then get as many more as tell them apart and can
// be relied on, and one besides.
func (f *Figure) specialLabels(specials []continuation.Special) []string {
	labels := make([]string, len(specials))
	groups := map[string][]int{}
	for i, s := range specials {
		labels[i] = f.specialLabel(s, valueText(s, 5))
		groups[labels[i]] = append(groups[labels[i]], i)
	}
	for _, group := range groups {
		if len(group) < 2 {
			continue
		}
		digits := apart(specials, group)
		for _, i := range group {
			s := specials[i]
			labels[i] = f.specialLabel(s, reliable(s.Where().Value(), min(digits, s.Digits())))
		}
	}
	return labels
}

// apart returns how many digits tell the values of special points apart.
func apart(specials []continuation.Special, group []int) int {
	const most = 10
	for digits := 6; digits < most; digits++ {
		seen := map[string]bool{}
		for _, i := range group {
			seen[reliable(specials[i].Where().Value(), digits)] = true
		}
		if len(seen) == len(group) {
			return digits + 1
		}
	}
	return most
}

func (f *Figure) specialLabel(s continuation.Special, number string) string {
	v := variableOf(s.Where())
	number = typeset(number)
	if v.Name != f.xName() {
		number = "at " + v.Name + " " + number
	}
	return s.Kind() + " " + withUnit(number, v.Unit)
}

// addPoint adds the dot of a steady state, or of the two ends of a margin.
func (f *Figure) addPoint(s *scene, it item) error {
	switch {
	case it.point != nil:
		p, err := s.place(it.point)
		if err != nil {
			return err
		}
		m := mark{place: p}
		if !it.quiet {
			m.label = s.pointLabel(it.word, p)
		}
		s.put(m)
	case it.margin != nil:
		return s.addMargin(it.margin)
	}
	return nil
}

func (s *scene) pointLabel(word string, p place) string {
	value := withUnit(typeset(significant(p.x, 5)), s.x.variable.Unit)
	if word == "" {
		return value
	}
	return word + " " + value
}

func (s *scene) addMargin(m *continuation.Margin) error {
	from, err := s.place(m.From)
	if err != nil {
		return err
	}
	to, err := s.place(m.To.Where())
	if err != nil {
		return err
	}
	s.put(mark{place: from, label: s.pointLabel("now", from)})
	s.spans = append(s.spans, span{from, to, marginLabel(m)})
	return nil
}

func marginLabel(m *continuation.Margin) string {
	number := typeset(significant(math.Abs(m.Absolute), min(4, max(m.Digits(), 1))))
	text := "margin " + withUnit(number, m.Parameter.Unit)
	if !math.IsNaN(m.Percent) {
		text += fmt.Sprintf(" (%s %%)", typeset(significant(math.Abs(m.Percent), 3)))
	}
	return text
}
