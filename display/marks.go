package display

import (
	"fmt"
	"math"
	"slices"

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
	if err := f.addCorners(s); err != nil {
		return err
	}
	for _, it := range f.items {
		if err := f.addPoint(s, it); err != nil {
			return err
		}
	}
	f.addNow(s)
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
	m := mark{place: p, shape: tickShape}
	switch special := special.(type) {
	case *continuation.Fold:
		m.shape, m.away = foldShape, s.turn(special)
		if s.plane() {
			m.away = 0
			m.dx, m.dy = s.edge(special)
		}
	case *continuation.BranchPoint:
		m.shape, m.tangents = crossingShape, s.tangents(special)
	case *continuation.Multiple:
		m.shape, m.tangents = crossingShape, [2]place{unknownTangent, unknownTangent}
	case *continuation.Hopf:
		m.shape = ringShape
		if s.plane() {
			m.dx, m.dy = s.edge(special)
		}
	}
	return m, err
}

var unknownTangent = place{dx: math.NaN(), dy: math.NaN()}

// tangents projects the tangents of both branches at a crossing. Where they could
// not be computed they are the branch's own and the null vector of f_x.
func (s *scene) tangents(b *continuation.BranchPoint) [2]place {
	var out [2]place
	for i, t := range b.Tangents {
		out[i] = unknownTangent
		if len(t) > 0 {
			out[i] = place{dx: s.x.entry(b.Where(), t), dy: s.y.entry(b.Where(), t)}
		}
	}
	if b.Tangents[0] == nil {
		null := append(slices.Clone(b.Right), 0)
		out[0] = place{dx: s.x.slope(b.Where()), dy: s.y.slope(b.Where())}
		out[1] = place{dx: s.x.entry(b.Where(), null), dy: s.y.entry(b.Where(), null)}
	}
	return out
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
		if digits == 0 { // one point on several branches
			continue
		}
		for _, i := range group {
			s := specials[i]
			labels[i] = f.specialLabel(s, reliable(s.Where().Value(), min(digits, s.Digits())))
		}
	}
	return labels
}

// apart returns how many digits tell the values of special points apart, as far as
// that can be; 0 when all are the same.
func apart(specials []continuation.Special, group []int) int {
	const most = 10
	different := func(digits int) int {
		seen := map[string]bool{}
		for _, i := range group {
			s := specials[i]
			seen[reliable(s.Where().Value(), min(digits, s.Digits()))] = true
		}
		return len(seen)
	}
	all := different(most)
	if all == 1 {
		return 0
	}
	for digits := 6; ; digits++ {
		if different(digits) == all {
			return min(digits+1, most)
		}
	}
}

func (f *Figure) specialLabel(s continuation.Special, number string) string {
	v := variableOf(s.Where())
	number = typeset(number)
	if v.Name != f.xName() {
		number = "at " + v.Name + " " + number
	}
	return term(s) + " " + withUnit(number, v.Unit)
}

// term names a special point in a picture, as closely as it is known.
func term(s continuation.Special) string {
	if b, ok := s.(*continuation.BranchPoint); ok && b.Name() != "" {
		return b.Name()
	}
	return s.Kind()
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
	if s.plane() {
		value += ", " + withUnit(typeset(significant(p.y, 5)), s.y.variable.Unit)
	}
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
