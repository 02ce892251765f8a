package display

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/plot/vg"

	"brinkline/continuation"
)

// A Figure is a picture of branches, loci, trajectories, steady states, special points and
// margins, or of eigenvalues.
// Its methods change it and return it, so that calls can be chained; the first
// error of a chain is kept, see [Figure.Err].
type Figure struct {
	items         []item
	x, y          string
	yLabel        string
	yFunc         func(*continuation.Point) float64
	title         string
	width, height vg.Length
	labels        []string
	logX, logY    bool
	rangeX        interval
	rangeY        interval
	diagrams      []*continuation.Diagram
	captioned     bool // write under the plot where the branches end
	eigen         *eigenvalues
	noticed       string // what the models had to say when it was drawn
	nowDrawn      bool   // the values that the model was made with are in the picture

	err   error
	built *picture
}

// An interval of an axis, when set.
type interval struct {
	low, high float64
	set       bool
}

// Plot makes a figure of branches, loci, trajectories, steady states, special points and
// margins, and of slices of them. The followed parameter of the first branch is on
// the x axis and its first state on the y axis unless [Figure.X] and [Figure.Y] say
// otherwise; with a locus, its two parameters are. In such a plane of two
// parameters a branch is a thin line with its special points.
// Trajectories alone stand over time.
//
// A steady state is a small dot with the value of the x axis beside it; Mark gives
// it another word. A margin is an arrow from the steady state to the limit.
func Plot(items ...any) *Figure {
	f := &Figure{width: usualWidth * vg.Centimeter, height: usualHeight * vg.Centimeter}
	if len(items) == 0 {
		return f.fail(errors.New("Plot has nothing to draw; give it a branch"))
	}
	for i, v := range items {
		if err := f.add(v); err != nil {
			f.fail(fmt.Errorf("Plot, value %d: %w", i+1, err))
		}
	}
	return f
}

// X puts a parameter, a state or a quantity of the model on the x axis.
func (f *Figure) X(name string) *Figure {
	f.x = name
	return f.check(name)
}

// Y puts a state, a parameter or a quantity of the model on the y axis.
func (f *Figure) Y(name string) *Figure {
	if f.eigen != nil {
		return f.fail(errors.New("the y axis of a figure of eigenvalues is theirs; Y cannot change it"))
	}
	f.y, f.yFunc = name, nil
	return f.check(name)
}

// YFunc puts a function of the point on the y axis, under a label that should name
// its unit: YFunc("Yield (kg/h)", ...).
func (f *Figure) YFunc(label string, y func(*continuation.Point) float64) *Figure {
	f.built = nil
	if f.eigen != nil {
		return f.fail(errors.New("the y axis of a figure of eigenvalues is theirs; YFunc cannot change it"))
	}
	if y == nil {
		return f.fail(fmt.Errorf("YFunc(%q) wants a function of a point", label))
	}
	f.yLabel, f.yFunc = label, y
	return f
}

// Title writes a title over the figure.
func (f *Figure) Title(text string) *Figure {
	f.built = nil
	f.title = text
	return f
}

// Size sets the width and height in centimetres (default 14 by 9).
func (f *Figure) Size(width, height float64) *Figure {
	f.built = nil
	for _, v := range []float64{width, height} {
		if !(v >= 4 && v <= 100) {
			return f.fail(fmt.Errorf("Size(%g, %g): width and height are in centimetres, between 4 and 100", width, height))
		}
	}
	f.width, f.height = vg.Length(width)*vg.Centimeter, vg.Length(height)*vg.Centimeter
	return f
}

// Label names the branches and loci in the order in which they were given. Without
// it branches carry what tells them apart: the values of other parameters, or the
// names of their models; loci say what they are made of.
func (f *Figure) Label(texts ...string) *Figure {
	f.built = nil
	if n := len(f.lines()); len(texts) > n {
		return f.fail(fmt.Errorf("Label has %d texts for %s", len(texts), count(n, "curve", "curves")))
	}
	f.labels = texts
	return f
}

// LogX makes the x axis logarithmic; all values on it must be positive.
func (f *Figure) LogX() *Figure {
	f.built = nil
	f.logX = true
	return f
}

// LogY makes the y axis logarithmic; all values on it must be positive.
func (f *Figure) LogY() *Figure {
	f.built = nil
	f.logY = true
	return f
}

// RangeX shows the x axis from low to high only.
func (f *Figure) RangeX(low, high float64) *Figure {
	return f.setRange("RangeX", &f.rangeX, low, high)
}

// RangeY shows the y axis from low to high only.
func (f *Figure) RangeY(low, high float64) *Figure {
	return f.setRange("RangeY", &f.rangeY, low, high)
}

func (f *Figure) setRange(method string, r *interval, low, high float64) *Figure {
	f.built = nil
	if !(low < high) || math.IsInf(low, 0) || math.IsInf(high, 0) {
		return f.fail(fmt.Errorf("%s(%g, %g) is no range: the first value must be the smaller", method, low, high))
	}
	*r = interval{low, high, true}
	return f
}

// Err returns the first error of the calls that made the figure, or of drawing
// it: an unknown name, a value that cannot be drawn, a logarithmic axis with a
// value that is not positive. A figure with an error is not drawn.
func (f *Figure) Err() error {
	if f == nil {
		return errors.New("there is no figure (nil)")
	}
	if f.err == nil && (f.built == nil || f.noticed != f.notice()) {
		f.draw()
	}
	return f.err
}

// String says in a sentence or two what the figure shows.
func (f *Figure) String() string {
	if err := f.Err(); err != nil {
		return "figure: " + err.Error()
	}
	return f.built.text
}

// draw builds the picture; a function of the analyst's own that panics is an
// error of the figure.
func (f *Figure) draw() {
	defer func() {
		if r := recover(); r != nil {
			f.fail(fmt.Errorf("drawing failed: %v", r))
		}
	}()
	p, err := f.build()
	if err != nil {
		f.fail(err)
		return
	}
	f.built = p
}

func (f *Figure) fail(err error) *Figure {
	if f.err == nil {
		f.err = err
	}
	return f
}

// check looks a name up in the models of all items.
func (f *Figure) check(name string) *Figure {
	f.built = nil
	for _, m := range f.models() {
		if _, err := m.Variable(name); err != nil {
			return f.fail(err)
		}
	}
	return f
}

func count(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}
