package display

import (
	"math"
	"slices"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"brinkline/display/internal/plane"
)

// A drawing puts a scene on the data area of a plot.
type drawing struct{ scene *scene }

// A sheet is a drawing on one canvas.
type sheet struct {
	draw.Canvas
	plot *plot.Plot
	room plane.Room
	hair []hairline // whose lines no curve's name may be taken for
}

// Plot draws the scene: lines first, then marks, then labels where room is left.
func (d *drawing) Plot(c draw.Canvas, p *plot.Plot) {
	frame := c.Rectangle
	frame.Min.X += 3
	frame.Min.Y += 3
	frame.Max.X += cropRight - 3
	frame.Max.Y += cropTop - 3
	s := &sheet{Canvas: c, plot: p, room: plane.Room{Frame: frame}, hair: d.scene.hair}
	for _, h := range d.scene.hair {
		s.hairline(h)
	}
	for _, cv := range d.scene.curves {
		s.curve(cv)
	}
	spots := s.marks(d.scene.marks)
	s.spans(d.scene.spans)
	s.curveLabels(d.scene.curves, s.markLabels(spots))
}

// at returns where a place lies on the canvas.
func (s *sheet) at(p place) vg.Point {
	return vg.Point{X: s.X(s.norm(&s.plot.X, p.x)), Y: s.Y(s.norm(&s.plot.Y, p.y))}
}

// norm is Axis.Norm for any value: the logarithm of nothing lies far outside.
func (s *sheet) norm(a *plot.Axis, v float64) float64 {
	if _, log := a.Scale.(plot.LogScale); log && v <= 0 {
		return math.Inf(-1)
	}
	return a.Norm(v)
}

// direction returns the tangent of a place on the canvas, NaN when unknown.
func (s *sheet) direction(p place, dx, dy float64) vg.Point {
	per := func(a *plot.Axis, v, d float64, length vg.Length) vg.Length {
		if _, log := a.Scale.(plot.LogScale); log {
			return vg.Length(d/v/math.Log(a.Max/a.Min)) * length
		}
		return vg.Length(d/(a.Max-a.Min)) * length
	}
	size := s.Size()
	return vg.Point{X: per(&s.plot.X, p.x, dx, size.X), Y: per(&s.plot.Y, p.y, dy, size.Y)}
}

// curve draws a branch and keeps labels off it.
func (s *sheet) curve(c curve) {
	for _, r := range c.runs {
		for _, line := range s.lines(r) {
			s.StrokeLines(r.style(c), line)
			s.room.BlockLine(line)
		}
	}
}

// hairline draws a thin line and keeps labels off it.
func (s *sheet) hairline(h hairline) {
	style := lineStyle(curve{ink: h.ink}, h.line)
	style.Width = hairWidth
	if h.line == dashed {
		style.Dashes = fineDashes
	}
	if h.across {
		a, b := s.at(h.places[0]), s.at(h.places[1])
		if a.X == b.X {
			a.Y, b.Y = s.Min.Y, s.Max.Y
		} else {
			a.X, b.X = s.Min.X, s.Max.X
		}
		if s.Contains(a) && s.Contains(b) {
			s.StrokeLines(style, []vg.Point{a, b})
			s.room.BlockLine([]vg.Point{a, b})
		}
		return
	}
	for _, line := range s.lines(run{places: h.places}) {
		s.StrokeLines(style, line)
		s.room.BlockLine(line)
	}
}

// lines returns what is seen of a run.
func (s *sheet) lines(r run) [][]vg.Point {
	knots := make([]plane.Knot, len(r.places))
	for i, p := range r.places {
		knots[i] = plane.Knot{At: s.at(p), Tangent: s.direction(p, p.dx, p.dy)}
	}
	var out [][]vg.Point
	for _, piece := range plane.Clip(plane.Smooth(knots), s.Rectangle) {
		out = append(out, plane.Thin(piece, 0.04))
	}
	return out
}

func (r run) style(c curve) draw.LineStyle {
	style := lineStyle(c, r.line)
	if r.fine {
		style.Width = fineWidth
	}
	return style
}

func lineStyle(c curve, kind lineKind) draw.LineStyle {
	style := draw.LineStyle{Color: c.ink, Width: lineWidth}
	switch kind {
	case dashed:
		style.Dashes = dashes
	case dotted:
		style.Dashes = dots
	case dashDotted:
		style.Dashes = dashesAndDots
	}
	return style
}

// A spot is a mark on the canvas.
type spot struct {
	mark
	centre vg.Point
	reach  vg.Length // of the drawn mark, for its label
	prefer vg.Point  // side of the label
}

// marks draws special points and steady states that lie in the frame.
func (s *sheet) marks(list []mark) []spot {
	var spots []spot
	order := slices.Clone(list) // the dots of a list of points go under all others
	slices.SortStableFunc(order, func(a, b mark) int { return rank(a) - rank(b) })
	for _, m := range order {
		sp := spot{mark: m, centre: s.at(m.place), reach: 4}
		if !s.Contains(sp.centre) {
			continue
		}
		u := unit(s.direction(m.place, m.dx, m.dy))
		switch m.shape {
		case foldShape:
			s.fold(&sp, u)
		case crossingShape:
			s.crossing(&sp, u)
		case ringShape:
			s.ring(&sp, u)
		case tickShape:
			s.tick(&sp, u)
		case wedgeShape:
			s.wedge(&sp)
		case restShape, throughShape, twinShape, halfShape:
			s.corner(&sp, u)
		case crossShape:
			s.cross(&sp)
		default:
			s.dot(&sp)
		}
		spots = append(spots, sp)
	}
	return spots
}

func rank(m mark) int {
	switch {
	case m.shape == dotShape && m.label == "":
		return 0
	case m.shape >= wedgeShape: // a fold on the branch may be one on a locus too
		return 2
	}
	return 1
}

// unit returns the direction of v, upright when v is unknown.
func unit(v vg.Point) vg.Point {
	n := vg.Length(math.Hypot(float64(v.X), float64(v.Y)))
	if !(n > 0) || math.IsInf(float64(n), 0) {
		return vg.Point{Y: 1}
	}
	return vg.Point{X: v.X / n, Y: v.Y / n}
}

func along(p, u vg.Point, by vg.Length) vg.Point { return vg.Point{X: p.X + by*u.X, Y: p.Y + by*u.Y} }

func normal(u vg.Point) vg.Point { return vg.Point{X: -u.Y, Y: u.X} }

// bar strokes a line through a point and keeps labels off it.
func (s *sheet) bar(style draw.LineStyle, c, u vg.Point, half vg.Length) {
	s.StrokeLines(style, []vg.Point{along(c, u, -half), along(c, u, half)})
	for d := -half; d <= half; d += 2 {
		s.block(along(c, u, d), style.Width/2+0.5)
	}
}

// block keeps labels off a square about a point.
func (s *sheet) block(c vg.Point, half vg.Length) {
	s.room.BlockMark(vg.Rectangle{
		Min: vg.Point{X: c.X - half, Y: c.Y - half},
		Max: vg.Point{X: c.X + half, Y: c.Y + half},
	})
}

// fold draws the bar along the tangent at the turn.
func (s *sheet) fold(sp *spot, u vg.Point) {
	const half = 7
	s.bar(draw.LineStyle{Color: accent, Width: barWidth}, sp.centre, u, half)
	sp.prefer = vg.Point{X: vg.Length(-sp.away)}
	if sp.away == 0 {
		sp.prefer = normal(u)
	}
}

// crossing draws the tangents of both branches. One that is not known, or that
// cannot be told from the other in this picture, gives way to the normal.
func (s *sheet) crossing(sp *spot, u vg.Point) {
	const half = 8
	v := normal(u)
	if a, b := s.tangent(sp, 0), s.tangent(sp, 1); a != (vg.Point{}) && b != (vg.Point{}) {
		u, v = a, b
	}
	if math.Abs(float64(u.X*v.Y-u.Y*v.X)) < 0.2 {
		v = normal(u)
	}
	style := draw.LineStyle{Color: ink, Width: 2.25}
	for _, d := range []vg.Point{u, v} {
		s.bar(style, sp.centre, d, half)
	}
	sp.prefer = along(unit(vg.Point{X: u.X + v.X, Y: u.Y + v.Y}), vg.Point{Y: 1}, 0.5)
}

// tangent returns the direction of one branch at a crossing on the canvas, zero
// when it is unknown or cannot be seen.
func (s *sheet) tangent(sp *spot, which int) vg.Point {
	t := sp.tangents[which]
	d := s.direction(sp.place, t.dx, t.dy)
	if n := math.Hypot(float64(d.X), float64(d.Y)); !(n > 1e-9) || math.IsInf(n, 0) {
		return vg.Point{}
	}
	return unit(d)
}

// tick draws a short line across the branch.
func (s *sheet) tick(sp *spot, u vg.Point) {
	s.bar(draw.LineStyle{Color: ink, Width: 1.2}, sp.centre, normal(u), 5)
	sp.prefer = along(vg.Point{}, normal(u), 1)
	if sp.prefer.Y < 0 {
		sp.prefer = along(vg.Point{}, normal(u), -1)
	}
}

// ring draws a small ring with a tick along the normal of the branch.
func (s *sheet) ring(sp *spot, u vg.Point) {
	const radius = 3.2
	n := normal(u)
	if n.Y < 0 {
		n = vg.Point{X: -n.X, Y: -n.Y}
	}
	var path vg.Path
	path.Move(vg.Point{X: sp.centre.X + radius, Y: sp.centre.Y})
	path.Arc(sp.centre, radius, 0, 2*math.Pi)
	path.Close()
	s.SetColor(plate)
	s.Fill(path)
	style := draw.LineStyle{Color: ink, Width: 1.2}
	s.SetLineStyle(style)
	s.Stroke(path)
	s.StrokeLines(style, []vg.Point{along(sp.centre, n, -radius), along(sp.centre, n, -radius-4)})
	s.block(sp.centre, radius+1)
	s.room.BlockLine([]vg.Point{sp.centre, along(sp.centre, n, -radius-4)})
	sp.prefer, sp.reach = n, 5
}

// dot draws a steady state, smaller when it is one of a list.
func (s *sheet) dot(sp *spot) {
	radius := vg.Length(2.6)
	if sp.label == "" {
		radius = 1.6
	}
	s.SetColor(ink)
	var path vg.Path
	path.Move(vg.Point{X: sp.centre.X + radius, Y: sp.centre.Y})
	path.Arc(sp.centre, radius, 0, 2*math.Pi)
	path.Close()
	s.Fill(path)
	s.block(sp.centre, radius+0.5)
}
