package continuation

import (
	"fmt"
	"io"
	"math"
	"strings"
)

// Measured holds measured points: one row each, with a column for each state, parameter or
// quantity that was measured.
type Measured struct {
	Columns []Variable
	Rows    [][]float64 // values in the order of Columns, NaN where a cell is empty
	// Errors are standard deviations in the order of Rows and Columns, NaN where none is
	// given.
	Errors [][]float64

	model *Model
}

const errorPrefix = "error "

// ReadMeasured reads measured points from a CSV file. Its header names states, parameters
// and quantities of the model with their units, as in Temperature (K); a column error
// Temperature (K) holds standard deviations. Cells may be empty.
func (m *Model) ReadMeasured(r io.Reader) (*Measured, error) {
	d, err := m.readMeasured(r)
	if err != nil {
		return nil, fmt.Errorf("ReadMeasured: %w", err)
	}
	return d, nil
}

func (m *Model) readMeasured(r io.Reader) (*Measured, error) {
	s, err := readSheet(r)
	if err != nil {
		return nil, err
	}
	d := &Measured{model: m}
	var columns, errors []int
	for i, h := range s.header {
		if strings.HasPrefix(h, errorPrefix) {
			continue
		}
		name, _ := heading(h)
		v, err := m.Variable(name)
		if err != nil {
			return nil, fmt.Errorf("column %d: %w", i+1, err)
		}
		if _, err := s.need(v); err != nil {
			return nil, err
		}
		v.Name = errorPrefix + v.Name
		with, err := s.column(v)
		if err != nil {
			return nil, err
		}
		v.Name = name
		d.Columns, columns, errors = append(d.Columns, v), append(columns, i), append(errors, with)
	}
	if len(columns) == 0 {
		return nil, fmt.Errorf("no column holds a state, a parameter or a quantity of the model")
	}
	return d, d.fill(s, columns, errors)
}

func (d *Measured) fill(s *sheet, columns, errors []int) error {
	for row := range s.rows {
		values, deviations := make([]float64, len(columns)), make([]float64, len(columns))
		for k := range columns {
			var err error
			if values[k], err = s.optional(row, columns[k]); err != nil {
				return err
			}
			if deviations[k], err = s.optional(row, errors[k]); err != nil {
				return err
			}
			if deviations[k] <= 0 {
				return fmt.Errorf("row %d, column %s: a standard deviation must be positive", row+1, s.header[errors[k]])
			}
		}
		d.Rows, d.Errors = append(d.Rows, values), append(d.Errors, deviations)
	}
	return nil
}

// optional is number for a cell that may be empty, or a column that may be absent.
func (s *sheet) optional(row, column int) (float64, error) {
	if column < 0 || strings.TrimSpace(s.rows[row][column]) == "" {
		return math.NaN(), nil
	}
	return s.number(row, column)
}

// Column returns the values of a column.
func (d *Measured) Column(name string) ([]float64, error) {
	i := find(d.Columns, name)
	if i < 0 {
		return nil, unknown("column", name, d.Columns)
	}
	out := make([]float64, len(d.Rows))
	for k, row := range d.Rows {
		out[k] = row[i]
	}
	return out, nil
}

// Model returns the model whose variables were measured.
func (d *Measured) Model() *Model { return d.model }

// Points returns the measured points as points of the model, for pictures: what was not
// measured is NaN if it is a state, and as the model has it if it is a parameter. They are
// no steady states.
func (d *Measured) Points() []*Point {
	list := make([]*Point, len(d.Rows))
	for i, row := range d.Rows {
		p := &Point{State: make([]float64, len(d.model.states)), Parameters: d.model.values(), Unstable: -1, model: d.model, free: -1}
		for k := range p.State {
			p.State[k] = math.NaN()
		}
		for k, c := range d.Columns {
			if at := find(d.model.states, c.Name); at >= 0 {
				p.State[at] = row[k]
			} else if at := find(d.model.parameterVariables(), c.Name); at >= 0 && !math.IsNaN(row[k]) {
				p.Parameters[at] = row[k]
			}
		}
		list[i] = p
	}
	return list
}

// String says the data in one line.
func (d *Measured) String() string {
	var names []string
	for _, c := range d.Columns {
		names = append(names, c.Label())
	}
	return fmt.Sprintf("%d measured points of %s", len(d.Rows), strings.Join(names, ", "))
}
