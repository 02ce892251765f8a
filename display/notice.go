package display

import (
	"reflect"
	"slices"
	"strings"

	"brinkline/continuation"
)

// modelOf returns the model that a value of package continuation was computed from, nil
// when there is none.
func modelOf(v any) *continuation.Model {
	if isNil(v) {
		return nil
	}
	switch v := v.(type) {
	case *continuation.Model:
		return v
	case Marked:
		return modelOf(v.Point)
	case *continuation.Margin:
		return modelOf(v.From)
	case *continuation.Margins:
		return modelOf(v.From)
	case *continuation.DirectionMargin:
		return modelOf(v.From)
	case *continuation.NearestLimit:
		return modelOf(v.From)
	case *continuation.Chance:
		return modelOf(v.From)
	case *continuation.SecondOrder:
		return modelOf(v.Limit)
	case *continuation.Sensitivities:
		return modelOf(v.Limit)
	case *continuation.LocusSpecial:
		return modelOf(v.Where)
	case continuation.Special:
		return modelOf(v.Where())
	case interface{ Model() *continuation.Model }:
		return v.Model()
	case brancher:
		return modelOf(v.Branch())
	}
	if list := reflect.ValueOf(v); list.Kind() == reflect.Slice && list.Len() > 0 {
		return modelOf(list.Index(0).Interface())
	}
	return nil
}

// noticed puts what a model has to say under a table of what was computed from it,
// before other notes: a caution stays last.
func (g *Grid) noticed(m *continuation.Model) *Grid {
	if g == nil || m == nil {
		return g
	}
	if text := m.Notice(); text != "" && !slices.Contains(g.notes, sentenceCase(text)) {
		g.notes = append([]string{sentenceCase(text)}, g.notes...)
	}
	return g
}

// notice is what the models of a figure have to say, one line each.
func (f *Figure) notice() string {
	var lines []string
	for _, m := range f.models() {
		if text := m.Notice(); text != "" && !slices.Contains(lines, sentenceCase(text)) {
			lines = append(lines, sentenceCase(text))
		}
	}
	return strings.Join(lines, "\n")
}
