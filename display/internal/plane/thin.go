// Package plane has the plane geometry of pictures: thinning and clipping of
// lines, smooth curves through points, and room for labels.
package plane

import (
	"math"

	"gonum.org/v1/plot/vg"
)

// Thin leaves out points of a line that can be left out without moving the line
// by more than tolerance (Douglas & Peucker, Cartographica 10 (1973) 112-122). Points
// that are not finite are dropped first. It never changes the ends.
func Thin(line []vg.Point, tolerance vg.Length) []vg.Point {
	line = radial(line, tolerance/2)
	if len(line) < 3 {
		return line
	}
	keep := make([]bool, len(line))
	keep[0], keep[len(line)-1] = true, true
	type span struct{ from, to int }
	work := []span{{0, len(line) - 1}}
	for len(work) > 0 {
		s := work[len(work)-1]
		work = work[:len(work)-1]
		far, at := vg.Length(0), -1
		for i := s.from + 1; i < s.to; i++ {
			if d := Distance(line[i], line[s.from], line[s.to]); d > far {
				far, at = d, i
			}
		}
		if far > tolerance {
			keep[at] = true
			work = append(work, span{s.from, at}, span{at, s.to})
		}
	}
	thin := make([]vg.Point, 0, len(line))
	for i, p := range line {
		if keep[i] {
			thin = append(thin, p)
		}
	}
	return thin
}

// radial drops points closer than r to the last one kept, but not the last.
func radial(line []vg.Point, r vg.Length) []vg.Point {
	out := make([]vg.Point, 0, len(line))
	for i, p := range line {
		if !finite(p) {
			continue
		}
		if n := len(out); n > 0 && i < len(line)-1 && length(sub(p, out[n-1])) < r {
			continue
		}
		out = append(out, p)
	}
	return out
}

// Uncovered cuts out of a line the parts that lie on cells of the given width
// which the line has already run through: a line that scribbles to and fro over
// the same place need not be written again.
func Uncovered(line []vg.Point, cell vg.Length) [][]vg.Point {
	seen := map[[2]int]bool{}
	var pieces [][]vg.Point
	open := false
	for i := 1; i < len(line); i++ {
		if !enter(seen, line[i-1], line[i], cell) {
			open = false
			continue
		}
		if !open {
			pieces = append(pieces, []vg.Point{line[i-1]})
			open = true
		}
		last := len(pieces) - 1
		pieces[last] = append(pieces[last], line[i])
	}
	return pieces
}

// enter marks the cells under a segment and reports whether one was new.
func enter(seen map[[2]int]bool, a, b vg.Point, cell vg.Length) bool {
	d := sub(b, a)
	n := int(math.Ceil(float64(length(d)/cell))) + 1
	fresh := false
	for i := range n + 1 {
		t := vg.Length(i) / vg.Length(n)
		key := [2]int{
			int(math.Floor(float64((a.X + t*d.X) / cell))),
			int(math.Floor(float64((a.Y + t*d.Y) / cell))),
		}
		if !seen[key] {
			seen[key] = true
			fresh = true
		}
	}
	return fresh
}

// Distance returns how far p is from the segment a b.
func Distance(p, a, b vg.Point) vg.Length {
	d := sub(b, a)
	t := vg.Length(0)
	if n := dot(d, d); n > 0 {
		t = min(max(dot(sub(p, a), d)/n, 0), 1)
	}
	return length(sub(p, vg.Point{X: a.X + t*d.X, Y: a.Y + t*d.Y}))
}

func sub(a, b vg.Point) vg.Point  { return vg.Point{X: a.X - b.X, Y: a.Y - b.Y} }
func dot(a, b vg.Point) vg.Length { return a.X*b.X + a.Y*b.Y }
func length(a vg.Point) vg.Length { return vg.Length(math.Hypot(float64(a.X), float64(a.Y))) }
func finite(p vg.Point) bool      { return isFinite(p.X) && isFinite(p.Y) }
func isFinite(v vg.Length) bool   { return !math.IsNaN(float64(v)) && !math.IsInf(float64(v), 0) }
