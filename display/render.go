package display

import (
	"errors"
	"fmt"
	"reflect"
	"strings"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"

	"brinkline/continuation"
)

// Render returns a value in all forms in which it can be shown. Values of
// package continuation, figures and tables, gonum's matrices and plots have
// renderers of their own; everything else is plain text, by its String or Error
// method if it has one. Render always returns plain text and never panics.
func Render(v any) (b Bundle) {
	defer func() {
		if r := recover(); r != nil {
			b = plainBundle(fmt.Sprintf("a %T that cannot be shown: %v", v, r))
		}
	}()
	if isNil(v) {
		return plainBundle(nothing(v))
	}
	if own, ok := renderOwn(v); ok {
		return own
	}
	return renderOther(v)
}

// nothing names what is nil.
func nothing(v any) string {
	if v == nil {
		return "nil"
	}
	return fmt.Sprintf("nil %T", v)
}

// renderOwn shows what this module computes.
func renderOwn(v any) (Bundle, bool) {
	switch v := v.(type) {
	case Bundle:
		return v, true
	case Group:
		return v.bundle(), true
	case *Figure:
		return v.bundle(), true
	case *Grid:
		return v.bundle(), true
	case *continuation.Branch:
		return branchBundle(v), true
	case *continuation.Locus:
		return locusBundle(v), true
	case *continuation.Trajectory:
		return motionBundle(v, v.String()), true
	case *continuation.Diagram:
		return diagramBundle(v), true
	case *continuation.Family:
		return familyBundle(v), true
	case *continuation.MarginScatter:
		return scatterBundle(v), true
	case *continuation.Relaxation:
		return motionBundle(v, v.String()), true
	case continuation.Progress:
		return progressBundle(v), true
	case brancher:
		return branchBundle(v.Branch()), true
	}
	if g := card(v); g != nil {
		return g.noticed(modelOf(v)).bundle(), true
	}
	return Bundle{}, false
}

// card returns the card or table of a value of package continuation, or nil.
func card(v any) *Grid {
	switch v := v.(type) {
	case *continuation.Model:
		return modelCard(v)
	case *continuation.Point:
		return pointCard(v)
	case Marked:
		return pointCard(v.Point)
	case *continuation.Fold:
		return foldCard(v)
	case *continuation.BranchPoint:
		return branchPointCard(v)
	case *continuation.Hopf:
		return hopfCard(v)
	case *continuation.Margin:
		return marginCard(v)
	case *continuation.NearestLimit:
		return nearestCard(v)
	case *continuation.Chance:
		return chanceCard(v)
	case *continuation.SecondOrder:
		return secondOrderTable(v)
	case *continuation.Family:
		return familyTable(v)
	case *continuation.Fit:
		return fitTable(v)
	case *continuation.Measured:
		return measuredTable(v)
	case *continuation.Margins:
		return marginsCard(v)
	case *continuation.DirectionMargin:
		return directionCard(v)
	case *continuation.Sensitivities:
		return sensitivitiesTable(v)
	case *continuation.Multiple:
		return multipleCard(v)
	case *continuation.Event:
		return eventCard(v)
	case surveyed:
		return surveyTable(v)
	case *continuation.LocusSpecial:
		return cornerCard(v)
	case *continuation.LocusPoint:
		return locusPointCard(v)
	case []*continuation.LocusSpecial:
		return cornersTable(v)
	case []*continuation.LocusPoint:
		return locusPointsTable(v, nil)
	case []*continuation.Point:
		return Table(v)
	}
	if list, ok := specialsIn(v); ok {
		return specialsTable(list)
	}
	return nil
}

// renderOther shows everything else.
func renderOther(v any) Bundle {
	switch v := v.(type) {
	case *plot.Plot:
		return pictureBundle(userPicture(v))
	case mat.Matrix:
		return matrixTable(v).bundle()
	case error:
		return plainBundle(v.Error())
	case fmt.Stringer:
		return plainBundle(v.String())
	}
	return plainBundle(plainText(v))
}

func (f *Figure) bundle() Bundle {
	if err := f.Err(); err != nil {
		return plainBundle(err.Error())
	}
	return pictureBundle(f.built)
}

// branchFigure is how a branch shows itself: with why it ends under the plot.
func branchFigure(b *continuation.Branch) *Figure {
	f := Plot(b)
	f.captioned = true
	return f
}

// branchBundle says a branch in words when it cannot be drawn.
func branchBundle(b *continuation.Branch) Bundle {
	f := branchFigure(b)
	if err := f.Err(); err != nil {
		return plainBundle(b.String() + " (no picture: " + err.Error() + ")")
	}
	return f.bundle()
}

// locusBundle is how a locus shows itself, in words when it cannot be drawn.
func locusBundle(l *continuation.Locus) Bundle {
	f := Plot(l)
	f.captioned = true
	if err := f.Err(); err != nil {
		return plainBundle(l.String() + " (no picture: " + err.Error() + ")")
	}
	return f.bundle()
}

// userPicture shows a plot that the analyst made with gonum in its own style.
func userPicture(p *plot.Plot) *picture {
	title := p.Title.Text
	if title == "" {
		title = "Plot"
	}
	text := title
	if p.X.Label.Text != "" || p.Y.Label.Text != "" {
		text += ": " + p.Y.Label.Text + " against " + p.X.Label.Text
	}
	return &picture{
		plot: p, width: usualWidth * vg.Centimeter, height: usualHeight * vg.Centimeter,
		title: title, description: text, text: text,
	}
}

// plainText is %v, with the fields of structs named and long slices cut.
func plainText(v any) string {
	const most, ends = 1000, 20
	switch r := reflect.ValueOf(v); r.Kind() {
	case reflect.Slice, reflect.Array:
		if r.Len() <= most {
			break
		}
		var parts []string
		for i := range r.Len() {
			switch {
			case i < ends || i >= r.Len()-ends:
				parts = append(parts, fmt.Sprint(r.Index(i)))
			case i == ends:
				parts = append(parts, "...")
			}
		}
		return fmt.Sprintf("[%s] (%d values)", strings.Join(parts, " "), r.Len())
	case reflect.Struct:
		return fmt.Sprintf("%+v", v)
	case reflect.Pointer:
		if r.Elem().Kind() == reflect.Struct {
			return fmt.Sprintf("%+v", v)
		}
	}
	return fmt.Sprint(v)
}

// firstError returns the error that a value carries, or is.
func firstError(v any) error {
	if isNil(v) {
		return nil
	}
	switch v := v.(type) {
	case error:
		return v
	case Group:
		return v.Err()
	case interface{ Err() error }:
		return v.Err()
	}
	return nil
}

var errNothing = errors.New("Show has nothing to show")
