package display

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"

	"brinkline/continuation"
)

// A side is what stands on one axis of a figure: how to read it from a point, and
// how it changes along the branch there.
type side struct {
	variable  continuation.Variable
	label     string
	value     func(*continuation.Point) (float64, error)
	log       bool
	parameter bool // a parameter of the model, in its own right
	shown     interval
}

// sides chooses what stands on the axes.
func (f *Figure) sides() (x, y side, err error) {
	if f.timed() {
		x = timeSide()
	} else if x, err = f.named(f.xName()); err != nil {
		return x, y, err
	}
	x.log, x.shown = f.logX, f.rangeX
	if f.yFunc != nil {
		fn := f.yFunc
		y = side{label: f.yLabel, value: func(p *continuation.Point) (float64, error) { return fn(p), nil }}
	} else if y, err = f.named(f.yName()); err != nil {
		return x, y, err
	}
	y.log, y.shown = f.logY, f.rangeY
	return x, y, nil
}

// xName is the first followed parameter unless something else was asked for.
func (f *Figure) xName() string {
	if f.x != "" {
		return f.x
	}
	if first, second, ok := f.pair(); ok {
		return other(first, second, f.y)
	}
	for _, it := range f.items {
		if name := it.followed(); name != "" {
			return name
		}
	}
	return f.items[0].model().Parameters()[0].Name
}

// pair returns the two parameters of the first locus.
func (f *Figure) pair() (first, second string, ok bool) {
	for _, l := range f.loci() {
		return l.First().Name, l.Second().Name, true
	}
	return "", "", false
}

// other returns the first name, or the second where the first is taken.
func other(name, instead, taken string) string {
	if name == taken {
		return instead
	}
	return name
}

func (f *Figure) yName() string {
	if f.y != "" {
		return f.y
	}
	if first, second, ok := f.pair(); ok {
		return other(second, first, f.x)
	}
	return f.items[0].model().States()[0].Name
}

// named looks a name up in all models; they must agree on its unit.
func (f *Figure) named(name string) (side, error) {
	var s side
	for i, m := range f.models() {
		v, err := m.Variable(name)
		if err != nil {
			return s, err
		}
		if i > 0 && v.Unit != s.variable.Unit {
			return s, fmt.Errorf("%s is in %q in one model and in %q in another: they cannot share an axis", name, s.variable.Unit, v.Unit)
		}
		if i == 0 {
			s.variable = v
		}
	}
	s.label = s.variable.Label()
	s.parameter = f.isParameter(name)
	s.value = func(p *continuation.Point) (float64, error) { return p.At(name) }
	return s, nil
}

// isParameter reports whether a name is a parameter in all models.
func (f *Figure) isParameter(name string) bool {
	for _, m := range f.models() {
		is := func(q continuation.Parameter) bool { return q.Name == name }
		if !slices.ContainsFunc(m.Parameters(), is) {
			return false
		}
	}
	return true
}

// slope returns the derivative of what stands on the axis by the arclength of
// the branch, NaN where only differences would give it.
func (s side) slope(p *continuation.Point) float64 { return s.entry(p, p.Tangent) }

// entry returns the component of a direction (states, then the followed parameter)
// that belongs to the axis: 0 for a parameter that is held, NaN for a function.
func (s side) entry(p *continuation.Point, direction []float64) float64 {
	name, n := s.variable.Name, len(p.State)
	if name == "" || len(direction) != n+1 {
		return math.NaN()
	}
	if name == p.Parameter {
		return direction[n]
	}
	for i, v := range p.Model().States() {
		if v.Name == name {
			return direction[i]
		}
	}
	for _, q := range p.Model().Parameters() {
		if q.Name == name {
			return 0
		}
	}
	return math.NaN()
}

// fit sets the range and the ticks of an axis so that all values are seen.
func (s side) fit(a *plot.Axis, values []float64, length vg.Length, vertical bool) error {
	a.Label.Text = spell(s.label)
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range values {
		if s.log && v <= 0 && !s.shown.set {
			return fmt.Errorf("a logarithmic axis needs positive values; %s is %s somewhere", s.what(), significant(v, 4))
		}
		low, high = min(low, v), max(high, v)
	}
	if s.shown.set {
		low, high = s.shown.low, s.shown.high
		if s.log && low <= 0 {
			return fmt.Errorf("a logarithmic axis needs positive values; its range begins at %g", low)
		}
	} else {
		low, high = s.widen(low, high)
	}
	a.Min, a.Max = low, high
	t := ticker{length, vertical}
	a.Tick.Marker = t
	if s.log {
		a.Tick.Marker = decadeTicker{t}
		a.Scale = plot.LogScale{}
	}
	return nil
}

func (s side) what() string {
	if s.variable.Name != "" {
		return s.variable.Name
	}
	return s.label
}

// widen leaves a little room at both ends, and a range to values that are all the
// same up to rounding.
func (s side) widen(low, high float64) (float64, float64) {
	const room = 0.06
	size := math.Max(math.Abs(low), math.Abs(high))
	if s.log {
		ratio := math.Pow(high/low, room)
		if high/low < 1+1e-9 {
			ratio = 2
		}
		return low / ratio, high * ratio
	}
	negligible := 1e-13
	if s.variable.Scale > 0 {
		negligible = 1e-9 * s.variable.Scale
	}
	switch {
	case size <= negligible:
		around := math.Max(s.variable.Scale, 0)
		if around == 0 {
			around = 1
		}
		return -around, around
	case high-low <= 1e-11*size:
		return low - 0.1*size, high + 0.1*size
	}
	return low - room*(high-low), high + room*(high-low)
}

// roomForFolds widens an x axis that was not set where the label of a fold would
// find no room on the empty side of its turn, by at most a fifth.
func (s *scene) roomForFolds(a *plot.Axis, length vg.Length) {
	if s.x.shown.set || s.x.log {
		return
	}
	low, high := a.Min, a.Max
	for _, m := range s.marks {
		if m.away == 0 {
			continue
		}
		need := float64((textSize(spell(m.label), labelSize).X + 12) / length)
		if m.away < 0 {
			high = max(high, (m.x-need*a.Min)/(1-need))
		} else {
			low = min(low, (m.x-need*a.Max)/(1-need))
		}
	}
	if xs, _ := s.values(); slices.Min(xs) >= 0 {
		low = a.Min // what cannot be negative gets no negative axis
	}
	const most = 0.2
	span := a.Max - a.Min
	a.Min, a.Max = max(low, a.Min-most*span), min(high, a.Max+most*span)
}
