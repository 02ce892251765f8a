package plane

import (
	"math"

	"gonum.org/v1/plot/vg"
)

// A Knot is a point of a curve with the direction in which the curve passes. The
// lengths of the tangents of neighbouring knots must have one common factor to
// the derivative by the curve's parameter; a zero or infinite tangent is unknown.
type Knot struct {
	At, Tangent vg.Point
}

// Smooth returns a line that runs through the knots and has their tangents (cubic
// Hermite pieces), within a hundredth of a point of the curve. A piece goes
// straight where a tangent is unknown or does not fit the knots.
func Smooth(knots []Knot) []vg.Point {
	if len(knots) == 0 {
		return nil
	}
	line := []vg.Point{knots[0].At}
	for i := 1; i < len(knots); i++ {
		line = append(line, piece(knots[i-1], knots[i])...)
	}
	return line
}

// piece returns the points of one Hermite piece behind its first.
func piece(a, b Knot) []vg.Point {
	chord := sub(b.At, a.At)
	ma, mb, ok := derivatives(a, b, chord)
	if !ok {
		return []vg.Point{b.At}
	}
	// The error of a chord is an eighth of the second derivative, which the
	// differences of the end derivatives to the chord bound.
	bend := length(sub(ma, chord)) + length(sub(mb, chord))
	n := max(1, min(64, int(math.Ceil(math.Sqrt(float64(bend)/0.02)))))
	out := make([]vg.Point, 0, n)
	for i := 1; i < n; i++ {
		t := vg.Length(i) / vg.Length(n)
		h01 := t * t * (3 - 2*t)
		h10, h11 := t*(1-t)*(1-t), t*t*(t-1)
		out = append(out, vg.Point{
			X: a.At.X + h01*chord.X + h10*ma.X + h11*mb.X,
			Y: a.At.Y + h01*chord.Y + h10*ma.Y + h11*mb.Y,
		})
	}
	return append(out, b.At)
}

// derivatives scales both tangents by the step of the parameter between them,
// found from the chord: it is their mean times the step, nearly.
func derivatives(a, b Knot, chord vg.Point) (ma, mb vg.Point, ok bool) {
	sum := vg.Point{X: a.Tangent.X + b.Tangent.X, Y: a.Tangent.Y + b.Tangent.Y}
	if !finite(sum) || !finite(chord) {
		return ma, mb, false
	}
	norm := dot(sum, sum)
	if norm == 0 {
		return ma, mb, false
	}
	step := 2 * dot(chord, sum) / norm
	ma = vg.Point{X: step * a.Tangent.X, Y: step * a.Tangent.Y}
	mb = vg.Point{X: step * b.Tangent.X, Y: step * b.Tangent.Y}
	limit := 3 * length(chord)
	return ma, mb, step > 0 && length(ma) > 0 && length(mb) > 0 && length(ma) <= limit && length(mb) <= limit
}

// Clip returns the parts of a line that lie in a rectangle.
func Clip(line []vg.Point, in vg.Rectangle) [][]vg.Point {
	var pieces [][]vg.Point
	open := false
	for i := 1; i < len(line); i++ {
		a, b, ok := ClipSegment(line[i-1], line[i], in)
		if !ok {
			open = false
			continue
		}
		if !open || a != line[i-1] {
			pieces = append(pieces, []vg.Point{a})
		}
		last := len(pieces) - 1
		pieces[last] = append(pieces[last], b)
		open = b == line[i]
	}
	return pieces
}

// ClipSegment returns the part of a segment in a rectangle, if there is one
// (Liang & Barsky, ACM Transactions on Graphics 3 (1984) 1-22).
func ClipSegment(a, b vg.Point, in vg.Rectangle) (from, to vg.Point, ok bool) {
	if !finite(a) || !finite(b) {
		return a, b, false
	}
	d := sub(b, a)
	t0, t1 := vg.Length(0), vg.Length(1)
	for _, side := range [4][2]vg.Length{
		{-d.X, a.X - in.Min.X}, {d.X, in.Max.X - a.X},
		{-d.Y, a.Y - in.Min.Y}, {d.Y, in.Max.Y - a.Y},
	} {
		p, q := side[0], side[1]
		switch {
		case p == 0 && q < 0:
			return a, b, false
		case p < 0:
			t0 = max(t0, q/p)
		case p > 0:
			t1 = min(t1, q/p)
		}
	}
	if t0 > t1 {
		return a, b, false
	}
	from, to = a, b
	if t0 > 0 {
		from = vg.Point{X: a.X + t0*d.X, Y: a.Y + t0*d.Y}
	}
	if t1 < 1 {
		to = vg.Point{X: a.X + t1*d.X, Y: a.Y + t1*d.Y}
	}
	return from, to, true
}
