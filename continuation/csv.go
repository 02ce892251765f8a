package continuation

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
)

// Files of branches have one row for each point. Their columns are the followed parameter,
// the other parameters, the states, the number of unstable eigenvalues, the arclength, the
// tangent, and a remark that names the start and the special points. The header carries
// names and units: Coolant (K). Numbers are written so that they are read back to the last
// bit.

const (
	unstableColumn = "unstable eigenvalues"
	arcColumn      = "arclength"
	remarkColumn   = "remark"
	memberColumn   = "branch number"
	startRemark    = "start"
)

// WriteCSV writes the points of the branch with their special points. [Model.ReadBranch]
// reads them back.
func (b *Branch) WriteCSV(w io.Writer) error {
	return writeCSV(w, branchHeader(b.model, b.free), branchRows(b))
}

// WriteCSV writes all branches of the family, with the number of the branch in the first
// column. [Model.ReadFamily] reads them back.
func (f *Family) WriteCSV(w io.Writer) error {
	var rows [][]string
	for k, m := range f.members {
		if m.Branch == nil {
			continue
		}
		for _, row := range branchRows(m.Branch) {
			rows = append(rows, append([]string{strconv.Itoa(k + 1)}, row...))
		}
	}
	return writeCSV(w, append([]string{memberColumn}, branchHeader(f.model, f.first)...), rows)
}

// WriteCSV writes the points of the locus: both parameters, the states, and what belongs to
// its kind. [Model.ReadLocus] reads them back.
func (l *Locus) WriteCSV(w io.Writer) error {
	m := l.model
	header := []string{m.parameters[l.first].Label(), m.parameters[l.second].Label()}
	for _, v := range m.states {
		header = append(header, v.Label())
	}
	header = append(header, "quadratic coefficient", "frequency", "first Lyapunov coefficient", remarkColumn)
	rows := make([][]string, len(l.points))
	for i, p := range l.points {
		row := append([]float64{p.First, p.Second}, p.State[:len(m.states)]...)
		remark := ""
		for _, s := range l.specials {
			if s.index == i {
				remark = s.Kind
			}
		}
		rows[i] = append(numbers(append(row, p.Quadratic, p.Omega, p.Lyapunov)), remark)
	}
	return writeCSV(w, header, rows)
}

func writeCSV(w io.Writer, header []string, rows [][]string) error {
	out := csv.NewWriter(w)
	if err := out.Write(header); err != nil {
		return err
	}
	return out.WriteAll(rows)
}

func numbers(list []float64) []string {
	out := make([]string, len(list))
	for i, v := range list {
		out[i] = strconv.FormatFloat(v, 'g', -1, 64)
	}
	return out
}

// branchVariables returns the followed parameter, the others and the states.
func branchVariables(m *Model, free int) []Variable {
	vars := []Variable{m.parameters[free].Variable}
	for j, q := range m.parameters {
		if j != free {
			vars = append(vars, q.Variable)
		}
	}
	return append(vars, m.states...)
}

func branchHeader(m *Model, free int) []string {
	var header []string
	for _, v := range branchVariables(m, free) {
		header = append(header, v.Label())
	}
	header = append(header, unstableColumn, arcColumn)
	for _, v := range append(m.States(), m.parameters[free].Variable) {
		header = append(header, "tangent "+v.Name)
	}
	return append(header, remarkColumn)
}

func branchRows(b *Branch) [][]string {
	rows := make([][]string, len(b.points))
	for i, p := range b.points {
		values := []float64{p.Value()}
		for j, v := range p.Parameters {
			if j != b.free {
				values = append(values, v)
			}
		}
		values = append(values, p.State...)
		values = append(values, float64(p.Unstable), p.Arclength)
		rows[i] = append(numbers(append(values, p.Tangent...)), b.remark(i))
	}
	return rows
}

// remark names what a point is: start, fold, or both.
func (b *Branch) remark(i int) string {
	var words []string
	if i == b.start {
		words = append(words, startRemark)
	}
	for _, s := range b.specials {
		if s.Index() == i {
			words = append(words, s.Kind())
		}
	}
	return strings.Join(words, "; ")
}

// A sheet is a CSV file of numbers, with text in columns that are asked for as such.
type sheet struct {
	header []string
	rows   [][]string
}

func readSheet(r io.Reader) (*sheet, error) {
	in := csv.NewReader(r)
	in.TrimLeadingSpace = true
	all, err := in.ReadAll()
	var bad *csv.ParseError
	if errors.As(err, &bad) {
		return nil, fmt.Errorf("line %d: %w", bad.Line, bad.Err)
	}
	if err != nil {
		return nil, err
	}
	if len(all) < 2 {
		return nil, errors.New("there is no row under the header; the first line names the columns with their units, as in Coolant (K)")
	}
	all[0][0] = strings.TrimPrefix(all[0][0], "\ufeff")
	for i, h := range all[0] {
		all[0][i] = strings.TrimSpace(h)
		if slices.Contains(all[0][:i], all[0][i]) {
			return nil, fmt.Errorf("two columns are named %s", h)
		}
	}
	return &sheet{all[0], all[1:]}, nil
}

// heading takes a heading apart into name and unit.
func heading(text string) (name, unit string) {
	if i := strings.LastIndex(text, " ("); i > 0 && strings.HasSuffix(text, ")") {
		return text[:i], text[i+2 : len(text)-1]
	}
	return text, ""
}

// column returns the index of the column of a variable, -1 where there is none. The unit
// must be that of the model.
func (s *sheet) column(v Variable) (int, error) {
	for i, h := range s.header {
		name, unit := heading(h)
		if name != v.Name && h != v.Name {
			continue
		}
		if h != v.Name && unit != v.Unit {
			return -1, fmt.Errorf("column %d is %q, but %s of the model is in %s: convert the values and mend the header", i+1, h, v.Name, orNone(v.Unit))
		}
		if h == v.Name && v.Unit != "" {
			return -1, fmt.Errorf("column %d, %s, has no unit in its header; write %q", i+1, h, v.Label())
		}
		return i, nil
	}
	return -1, nil
}

func orNone(unit string) string {
	if unit == "" {
		return "no unit"
	}
	return unit
}

// need is column for one that must be there.
func (s *sheet) need(v Variable) (int, error) {
	i, err := s.column(v)
	if err == nil && i < 0 {
		err = fmt.Errorf("no column %q; the file has %s", v.Label(), strings.Join(s.header, ", "))
	}
	return i, err
}

// number returns a cell. Rows count from 1 under the header.
func (s *sheet) number(row, column int) (float64, error) {
	v, err := strconv.ParseFloat(strings.TrimSpace(s.rows[row][column]), 64)
	if err != nil {
		return 0, fmt.Errorf("row %d, column %s: %q is no number", row+1, s.header[column], s.rows[row][column])
	}
	return v, nil
}

// ReadBranch reads a branch that [Branch.WriteCSV] wrote. Every row must be a steady state
// of this model, and every special point is refined anew from its neighbours, so that a
// file of another model, or of this one before it was changed, is refused.
func (m *Model) ReadBranch(r io.Reader) (*Branch, error) {
	s, err := readSheet(r)
	if err != nil {
		return nil, fmt.Errorf("ReadBranch: %w", err)
	}
	b, err := m.branchFrom(s)
	if err != nil {
		return nil, fmt.Errorf("ReadBranch: %w", err)
	}
	return b, nil
}

// ReadFamily reads a family that [Family.WriteCSV] wrote, its members numbered by the order
// of their values in the file. second names the parameter whose values tell the branches
// apart.
func (m *Model) ReadFamily(r io.Reader, second string) (*Family, error) {
	f, err := m.readFamily(r, second)
	if err != nil {
		return nil, fmt.Errorf("ReadFamily: %w", err)
	}
	return f, nil
}

func (m *Model) readFamily(r io.Reader, second string) (*Family, error) {
	j, err := m.parameterIndex(second)
	if err != nil {
		return nil, err
	}
	s, err := readSheet(r)
	if err != nil {
		return nil, err
	}
	if s.header[0] != memberColumn {
		return nil, fmt.Errorf("the first column is %s, not %s: that is no file of a family", s.header[0], memberColumn)
	}
	f := &Family{model: m, second: j, finished: true}
	for from := 0; from < len(s.rows); {
		to := from
		for to < len(s.rows) && s.rows[to][0] == s.rows[from][0] {
			to++
		}
		part := &sheet{header: s.header[1:]}
		for _, row := range s.rows[from:to] {
			part.rows = append(part.rows, row[1:])
		}
		b, err := m.branchFrom(part)
		if err != nil {
			return nil, fmt.Errorf("branch number %s: %w", s.rows[from][0], err)
		}
		f.first = b.free
		f.members = append(f.members, &Member{Value: b.points[0].Parameters[j], Branch: b})
		from = to
	}
	return f, nil
}

// branchFrom makes a branch of a sheet.
func (m *Model) branchFrom(s *sheet) (*Branch, error) {
	name, _ := heading(s.header[0])
	free, err := m.parameterIndex(name)
	if err != nil {
		return nil, fmt.Errorf("the first column is that of the followed parameter: %w", err)
	}
	columns, err := m.branchColumns(s, free)
	if err != nil {
		return nil, err
	}
	b := &Branch{model: m, free: free, start: -1}
	for row := range s.rows {
		p, err := m.pointFrom(s, row, free, columns)
		if err != nil {
			return nil, err
		}
		b.points = append(b.points, p)
		if strings.HasPrefix(s.rows[row][columns[len(columns)-1]], startRemark) {
			b.start = row
		}
	}
	if b.start < 0 {
		return nil, errors.New("no row has the remark start")
	}
	if err := b.restore(s, columns[len(columns)-1]); err != nil {
		return nil, err
	}
	for i, p := range []*Point{b.points[0], b.points[len(b.points)-1]} {
		b.ends[i] = End{Reason: NotFollowed, Text: "was read from a file that ends there", Point: p}
	}
	return b, nil
}

// branchColumns returns the columns of all parameters in order, all states, unstable,
// arclength, the tangent and the remark.
func (m *Model) branchColumns(s *sheet, free int) ([]int, error) {
	wanted := append(m.parameterVariables(), m.states...)
	for _, name := range []string{unstableColumn, arcColumn} {
		wanted = append(wanted, Variable{Name: name})
	}
	for _, v := range append(m.States(), m.parameters[free].Variable) {
		wanted = append(wanted, Variable{Name: "tangent " + v.Name})
	}
	var columns []int
	for _, v := range append(wanted, Variable{Name: remarkColumn}) {
		i, err := s.need(v)
		if err != nil {
			return nil, err
		}
		columns = append(columns, i)
	}
	return columns, nil
}

func (m *Model) pointFrom(s *sheet, row, free int, columns []int) (*Point, error) {
	values := make([]float64, len(columns)-1)
	for k := range values {
		var err error
		if values[k], err = s.number(row, columns[k]); err != nil {
			return nil, err
		}
	}
	q, n := len(m.parameters), len(m.states)
	p := &Point{Parameters: values[:q:q], State: values[q : q+n : q+n], Unstable: int(values[q+n]), Arclength: values[q+n+1],
		Tangent: values[q+n+2:], Parameter: m.parameters[free].Name, model: m, free: free}
	return p, p.holds(row)
}

// holds checks that a point read is a steady state: what the equations leave is small
// against their terms.
func (p *Point) holds(row int) error {
	s := newSystem(p.model, p.State, p.Parameters, p.free)
	n := s.n
	f, jac := make([]float64, n), make([]float64, n*(n+1))
	if err := s.Eval(p.State, p.Parameters, f); err != nil {
		return fmt.Errorf("row %d: %w", row+1, err)
	}
	if err := s.diff.Jacobian(p.State, p.Parameters, p.free, jac); err != nil {
		return fmt.Errorf("row %d: %w", row+1, err)
	}
	for i, v := range f {
		terms := math.Abs(jac[i*(n+1)+n] * p.Value())
		for k, x := range p.State {
			terms += math.Abs(jac[i*(n+1)+k]) * math.Max(math.Abs(x), s.sx[k])
		}
		if math.Abs(v) > 1e-7*terms {
			return fmt.Errorf("row %d is no steady state of model %s (the equation of %s leaves %.3g): the file belongs to another model, or to this one before it was changed", row+1, p.model.name, p.model.states[i].Name, v)
		}
	}
	return nil
}
