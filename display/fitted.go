package display

import (
	"fmt"
	"math"

	"brinkline/continuation"
)

// fitTable shows the fitted parameters with their standard errors.
func fitTable(f *continuation.Fit) *Grid {
	g := &Grid{
		caption: "Parameters of " + f.Point.Model().Name() + " fitted to measured points",
		columns: []column{{"parameter", false}, {"before", true}, {"fitted", true}, {"standard error", true}},
	}
	for _, q := range f.Parameters {
		g.add(q.Label(), significant(q.Before, stateDigits), continuation.FormatUncertain(q.Value, q.Error/20, 10), significant(q.Error, 2))
	}
	g.note(fmt.Sprintf("χ² = %s with %s of freedom, from %s.", significant(f.ChiSquared, vectorDigits), count(f.Freedom, "degree", "degrees"), count(len(f.Nearest), "measured point", "measured points")))
	if f.Scaled {
		g.note("Standard deviations of the measurements were assumed; the standard errors are scaled by what is left of the data.")
	}
	return g
}

// measuredTable shows measured points.
func measuredTable(d *continuation.Measured) *Grid {
	g := &Grid{caption: "Measured points"}
	columns := make([][]string, len(d.Columns))
	for k, c := range d.Columns {
		g.columns = append(g.columns, column{c.Label(), true})
		values := make([]float64, len(d.Rows))
		for i, row := range d.Rows {
			values[i] = row[k]
		}
		columns[k] = aligned(values, stateDigits)
	}
	for i := range d.Rows {
		cells := make([]string, len(columns))
		for k := range columns {
			if !math.IsNaN(d.Rows[i][k]) {
				cells[k] = columns[k][i]
			}
		}
		g.add(cells...)
	}
	return g
}
