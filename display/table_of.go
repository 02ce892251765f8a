package display

import (
	"fmt"
	"math"
	"reflect"
	"sort"
	"strconv"
	"strings"

	"gonum.org/v1/gonum/mat"

	"brinkline/continuation"
)

// Table makes a table of a value: the special points of a branch or a locus (or of a
// slice of folds or other special points), one row each; the points of a slice;
// sensitivities; a slice of structs with a column for each field; a map, a slice
// or a matrix of numbers.
func Table(v any) *Grid {
	if isNil(v) {
		return &Grid{err: fmt.Errorf("there is nothing to make a table of (%s)", nothing(v))}
	}
	return tableOf(v).noticed(modelOf(v))
}

func tableOf(v any) *Grid {
	switch v := v.(type) {
	case *Grid:
		return v
	case *continuation.Branch:
		return branchTable(v)
	case *continuation.Locus:
		return locusTable(v)
	case *continuation.Relaxation:
		return relaxationTable(v)
	case *continuation.Diagram:
		return diagramTable(v)
	case brancher:
		return branchTable(v.Branch())
	case surveyed:
		return surveyTable(v)
	case []*continuation.Point:
		return pointsTable(v, nil)
	case mat.Matrix:
		return matrixTable(v)
	}
	if list, ok := specialsIn(v); ok {
		return specialsTable(list)
	}
	if g := card(v); g != nil {
		return g
	}
	return reflected(v)
}

// Points makes a table of all points of a branch or a locus, or of a slice of points.
func Points(v any) *Grid {
	if isNil(v) {
		return &Grid{err: fmt.Errorf("there are no points to make a table of (%s)", nothing(v))}
	}
	return pointsOf(v).noticed(modelOf(v))
}

func pointsOf(v any) *Grid {
	switch v := v.(type) {
	case *continuation.Branch:
		return pointsTable(v.Points(), v)
	case *continuation.Locus:
		return locusPointsTable(v.Points(), v)
	case []*continuation.LocusPoint:
		return locusPointsTable(v, nil)
	case brancher:
		return Points(v.Branch())
	case surveyed:
		return surveyTable(v)
	case []*continuation.Point:
		return pointsTable(v, nil)
	}
	return &Grid{err: fmt.Errorf("Points wants a branch, a locus or a slice of points, not a %T", v)}
}

// surveyTable shows the steady states that a survey found, and how hard it looked.
func surveyTable(s surveyed) *Grid {
	g := pointsTable(s.Points(), nil)
	g.caption = "Steady states found"
	if found, ok := s.(*continuation.Survey); ok {
		g.caption = fmt.Sprintf("Steady states of %s found for %s", found.Model().Name(), boxText(found))
		if n := len(found.Outside()); n > 0 {
			g.note(fmt.Sprintf("%s outside of the box, which were not looked for: Outside gives them.", count(n, "more was met", "more were met")))
		}
	}
	if len(s.Points()) == 0 {
		g.columns = []column{{}}
		g.add("none")
	}
	g.note(sentenceCase(s.Statement()))
	if n, ok := s.(interface{ Notes() []string }); ok {
		for _, text := range n.Notes() {
			g.note(sentenceCase(text))
		}
	}
	return g
}

// boxText says where a survey looked; of many states, where the first ones lay.
func boxText(s *continuation.Survey) string {
	const most = 4
	box, vars := s.Box(), s.Model().States()
	var parts []string
	for i, v := range vars {
		if i == most && len(vars) > most+1 {
			parts = append(parts, fmt.Sprintf("and %d more states", len(vars)-most))
			break
		}
		b := box[v.Name]
		parts = append(parts, withUnit(fmt.Sprintf("%s from %s to %s", v.Name, significant(b[0], 6), significant(b[1], 6)), v.Unit))
	}
	return strings.Join(parts, ", ")
}

// specialsIn returns the special points of a slice of any of their types.
func specialsIn(v any) ([]continuation.Special, bool) {
	switch v := v.(type) {
	case []continuation.Special:
		return v, true
	case []*continuation.Fold, []*continuation.BranchPoint, []*continuation.Hopf, []*continuation.Multiple, []*continuation.Event:
		r := reflect.ValueOf(v)
		list := make([]continuation.Special, r.Len())
		for i := range list {
			list[i] = r.Index(i).Interface().(continuation.Special)
		}
		return list, true
	}
	return nil, false
}

// reflected makes a table of slices of structs, maps and slices of numbers.
func reflected(v any) *Grid {
	r := reflect.ValueOf(v)
	switch r.Kind() {
	case reflect.Map:
		return mapTable(r)
	case reflect.Slice, reflect.Array:
		elem := r.Type().Elem()
		if elem.Kind() == reflect.Pointer {
			elem = elem.Elem()
		}
		switch elem.Kind() {
		case reflect.Struct:
			return structTable(r, elem)
		case reflect.Slice, reflect.Array:
			return rowsTable(r)
		default:
			return listTable(r)
		}
	}
	return &Grid{err: fmt.Errorf("there is no table of a %T; Table takes branches, loci, slices, maps and matrices", v)}
}

func structTable(list reflect.Value, elem reflect.Type) *Grid {
	g := &Grid{}
	var fields []int
	for i := range elem.NumField() {
		f := elem.Field(i)
		if !f.IsExported() {
			continue
		}
		head := continuation.Variable{Name: f.Name, Unit: f.Tag.Get("unit")}.Label()
		g.columns = append(g.columns, column{head, isNumber(f.Type.Kind())})
		fields = append(fields, i)
	}
	columns := make([][]string, len(fields))
	for k, at := range fields {
		columns[k] = fieldCells(list, at, elem.Field(at).Tag.Get("decimals"))
	}
	for i := range list.Len() {
		cells := make([]string, len(fields))
		for k := range fields {
			cells[k] = columns[k][i]
		}
		g.add(cells...)
	}
	return g
}

// fieldCells writes one field of all structs of a list; nil pointers leave a gap.
func fieldCells(list reflect.Value, at int, decimals string) []string {
	cells, values := make([]string, list.Len()), make([]float64, list.Len())
	fixed, err := strconv.Atoi(decimals)
	for i := range cells {
		values[i] = math.NaN()
		e := reflect.Indirect(list.Index(i))
		if !e.IsValid() {
			continue
		}
		f := e.Field(at)
		cells[i] = cellText(f)
		if !f.CanFloat() {
			continue
		}
		values[i] = f.Float()
		if err == nil && isFinite(values[i]) {
			cells[i] = rounded(values[i], min(max(fixed, 0), 15))
		}
	}
	if err == nil {
		return cells
	}
	return evened(cells, values)
}

// rounded writes a number with so many decimals, 0 without a sign.
func rounded(v float64, decimals int) string {
	text := strconv.FormatFloat(v, 'f', decimals, 64)
	if strings.Trim(text, "-0.") == "" {
		return strings.TrimPrefix(text, "-")
	}
	return text
}

func isNumber(k reflect.Kind) bool { return k >= reflect.Int && k <= reflect.Float64 }

func cellText(v reflect.Value) string {
	if v.Kind() == reflect.Float64 || v.Kind() == reflect.Float32 {
		return significant(v.Float(), stateDigits)
	}
	return fmt.Sprint(v)
}

func mapTable(m reflect.Value) *Grid {
	g := &Grid{columns: []column{{"", isNumber(m.Type().Key().Kind())}, {"", isNumber(m.Type().Elem().Kind())}}}
	keys := m.MapKeys()
	sort.Slice(keys, func(i, j int) bool { return lessKey(keys[i], keys[j]) })
	for _, k := range keys {
		g.add(cellText(k), cellText(m.MapIndex(k)))
	}
	return g
}

func lessKey(a, b reflect.Value) bool {
	switch {
	case a.CanInt():
		return a.Int() < b.Int()
	case a.CanFloat():
		return a.Float() < b.Float()
	}
	return fmt.Sprint(a) < fmt.Sprint(b)
}

func listTable(list reflect.Value) *Grid {
	g := &Grid{columns: []column{{"", true}, {"", isNumber(list.Type().Elem().Kind())}}}
	for i := range list.Len() {
		g.add(fmt.Sprint(i), cellText(list.Index(i)))
	}
	return g
}

func rowsTable(rows reflect.Value) *Grid {
	g := &Grid{}
	for i := range rows.Len() {
		r := rows.Index(i)
		cells := make([]string, r.Len())
		for j := range cells {
			cells[j] = cellText(r.Index(j))
			if j >= len(g.columns) {
				g.columns = append(g.columns, column{numeric: isNumber(r.Type().Elem().Kind())})
			}
		}
		g.add(cells...)
	}
	for i := range g.rows { // rows may differ in length
		for len(g.rows[i].cells) < len(g.columns) {
			g.rows[i].cells = append(g.rows[i].cells, "")
		}
	}
	return g
}

// matrixTable shows a matrix; a wide one loses columns in its middle.
func matrixTable(m mat.Matrix) *Grid {
	const wide, ends = 16, 6
	rows, cols := m.Dims()
	g := &Grid{caption: fmt.Sprintf("%d x %d matrix", rows, cols)}
	for j := range cols {
		if cols > wide && j >= ends && j < cols-ends {
			if j == ends {
				g.columns = append(g.columns, column{})
			}
			continue
		}
		g.columns = append(g.columns, column{numeric: true})
	}
	for i := range rows {
		var cells []string
		for j := range cols {
			switch {
			case cols <= wide || j < ends || j >= cols-ends:
				cells = append(cells, significant(m.At(i, j), 5))
			case j == ends:
				cells = append(cells, "...")
			}
		}
		g.add(cells...)
	}
	return g
}
