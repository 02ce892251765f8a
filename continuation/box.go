package continuation

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"
)

// A Box says between which values each state (and, for [Model.FollowAll], the
// parameter) is looked at:
//
//	continuation.Box{"Conversion": {0, 1}, "Temperature": {250, 450}}
//
// Every state needs an interval. A name without an index stands for all elements of
// an array: "Load" for Load[0], Load[1] and so on; see also [Model.Box].
type Box map[string][2]float64

// Box returns the box in which every state lies between low and high. Intervals of
// single states can be changed in it afterwards.
func (m *Model) Box(low, high float64) Box {
	b := make(Box, len(m.states))
	for _, v := range m.states {
		b[v.Name] = [2]float64{low, high}
	}
	return b
}

// A frame is a box as a survey works with it: intervals of the states in order, and
// with j >= 0 of parameter j behind them.
type frame struct {
	low, width []float64
}

// frame looks at a box for the states and, with j >= 0, one parameter.
func (m *Model) frame(box Box, j int) (*frame, error) {
	vars := m.States()
	if j >= 0 {
		vars = append(vars, m.parameters[j].Variable)
	}
	if err := m.checkNames(box, vars); err != nil {
		return nil, err
	}
	f := &frame{make([]float64, len(vars)), make([]float64, len(vars))}
	var missing []string
	for i, v := range vars {
		interval, ok := box.of(v.Name)
		if !ok {
			missing = append(missing, v.Name)
			continue
		}
		if err := checkInterval(v, interval); err != nil {
			return nil, err
		}
		f.low[i], f.width[i] = interval[0], interval[1]-interval[0]
	}
	if len(missing) > 0 {
		return nil, fmt.Errorf("the box has no interval for %s: give every one, such as %q: {0, 1}", someOf(missing), missing[0])
	}
	return f, nil
}

// of returns the interval of a variable: under its own name, or under that of the
// array that it is an element of.
func (b Box) of(name string) ([2]float64, bool) {
	if interval, ok := b[name]; ok {
		return interval, true
	}
	array, _, element := strings.Cut(name, "[")
	interval, ok := b[array]
	return interval, ok && element
}

// checkNames refuses names that are none of vars, and says what they may be.
func (m *Model) checkNames(box Box, vars []Variable) error {
	names := make([]string, 0, len(box))
	for name := range box {
		names = append(names, name)
	}
	slices.Sort(names) // the same complaint each time
	for _, name := range names {
		if find(vars, name) >= 0 || slices.ContainsFunc(vars, func(v Variable) bool { return strings.HasPrefix(v.Name, name+"[") }) {
			continue
		}
		if find(m.parameterVariables(), name) >= 0 {
			return fmt.Errorf("%s is a parameter, which the box of a survey has no interval for: it keeps its value; to look at all of its values use FollowAll(%q, ...)", name, name)
		}
		return fmt.Errorf("the box: %w", unknown("state", name, vars))
	}
	return nil
}

func checkInterval(v Variable, interval [2]float64) error {
	low, high := interval[0], interval[1]
	switch width := high - low; {
	case math.IsNaN(low) || math.IsNaN(high) || math.IsInf(width, 0):
		return fmt.Errorf("the box has %s from %g to %g: two finite numbers are wanted", v.Name, low, high)
	case low > high:
		return fmt.Errorf("the box is upside down: %s from %g to %g; the first value must be the smaller", v.Name, low, high)
	case !(low+width/2 > low):
		return fmt.Errorf("the box has no volume: %s from %g to %g", v.Name, low, high)
	}
	return nil
}

func someOf(names []string) string {
	if len(names) > 6 {
		return strings.Join(names[:4], ", ") + fmt.Sprintf(" and %d more", len(names)-4)
	}
	return strings.Join(names, ", ")
}

// at stores the place with coordinates u, each between 0 and 1, in x.
func (f *frame) at(u, x []float64) {
	for i := range x {
		x[i] = f.low[i] + u[i]*f.width[i]
	}
}

// beyond returns by how many widths the place lies outside the box at most, 0 inside.
func (f *frame) beyond(x []float64) float64 {
	worst := 0.0
	for i, v := range x {
		u := (v - f.low[i]) / f.width[i]
		if math.IsNaN(u) {
			return math.Inf(1)
		}
		worst = math.Max(worst, math.Max(-u, u-1))
	}
	return worst
}

// onEdge is by how many widths a steady state may lie outside and still count as one on
// the edge, which rounding has moved.
const onEdge = 1e-9

func (f *frame) holds(x []float64) bool { return f.beyond(x) <= onEdge }

// compare orders places by their first coordinate that differs by more than
// rounding.
func (f *frame) compare(a, b []float64) int {
	for i := range a {
		alike := double*math.Max(math.Abs(a[i]), math.Abs(b[i])) + 1e-13*f.width[i]
		if math.Abs(a[i]-b[i]) > alike {
			return cmp.Compare(a[i], b[i])
		}
	}
	return 0
}
