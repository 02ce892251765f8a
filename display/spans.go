package display

import (
	"math"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"brinkline/display/internal/plane"
)

// spans draws margins as on an engineering drawing: thin lines down (or up) from
// both ends, and between them an arrow that points to the limit, at the height
// where the picture is emptiest.
func (s *sheet) spans(list []span) {
	for _, sp := range list {
		a, b := s.at(sp.from), s.at(sp.to)
		if !s.Contains(a) || !s.Contains(b) {
			continue
		}
		if math.Abs(float64(a.Y-b.Y)) < 1 { // in a plane of parameters
			s.arrow(a, b)
			s.spanLabel(sp.label, a, b, a.Y)
			continue
		}
		y := s.level(a, b)
		thin := draw.LineStyle{Color: faint, Width: 0.5, Dashes: []vg.Length{1.5, 1.5}}
		for _, end := range []vg.Point{a, b} {
			line := []vg.Point{end, {X: end.X, Y: y}}
			s.StrokeLines(thin, line)
			s.room.BlockLine(line)
		}
		s.arrow(vg.Point{X: a.X, Y: y}, vg.Point{X: b.X, Y: y})
		s.spanLabel(sp.label, a, b, y)
	}
}

// level returns the height at which an arrow between two points lies on least.
func (s *sheet) level(a, b vg.Point) vg.Length {
	size := s.Size()
	best, least := s.Min.Y, 1<<30
	for _, part := range []vg.Length{0.06, 0.92, 0.12, 0.86, 0.18, 0.8, 0.25, 0.73, 0.35, 0.65, 0.5} {
		y := s.Min.Y + part*size.Y
		band := vg.Rectangle{
			Min: vg.Point{X: min(a.X, b.X) - 2, Y: y - 4},
			Max: vg.Point{X: max(a.X, b.X) + 2, Y: y + 14},
		}
		n := s.room.Count(band)
		if n < least {
			best, least = y, n
		}
	}
	return best
}

// arrow draws a line with a filled head at its end.
func (s *sheet) arrow(from, to vg.Point) {
	const head, half = 5, 1.9
	u := unit(vg.Point{X: to.X - from.X, Y: to.Y - from.Y})
	length := distance(from, to)
	if length < 1 {
		return
	}
	back := along(to, u, -min(head, length))
	s.StrokeLines(draw.LineStyle{Color: ink, Width: 0.75}, []vg.Point{from, back})
	var path vg.Path
	path.Move(to)
	path.Line(along(back, normal(u), half))
	path.Line(along(back, normal(u), -half))
	path.Close()
	s.SetColor(ink)
	s.Fill(path)
	s.room.BlockLine([]vg.Point{from, to})
}

// spanLabel writes over the arrow, or beside it where it is short.
func (s *sheet) spanLabel(label string, a, b vg.Point, y vg.Length) {
	text := spell(label)
	size := textSize(text, labelSize)
	middle := (a.X + b.X) / 2
	for _, at := range []vg.Point{
		{X: middle - size.X/2, Y: y + 2.5},
		{X: middle - size.X/2, Y: y - 2.5 - size.Y},
		{X: min(a.X, b.X) - 5 - size.X, Y: y - size.Y/2},
		{X: max(a.X, b.X) + 5, Y: y - size.Y/2},
		{X: min(a.X, b.X) - 5 - size.X, Y: y + 2.5},
		{X: max(a.X, b.X) + 5, Y: y + 2.5},
	} {
		box := vg.Rectangle{Min: at, Max: vg.Point{X: at.X + size.X, Y: at.Y + size.Y}}
		if s.room.Free(box) {
			s.write(text, box, labelSize, ink)
			s.room.Block(box)
			return
		}
	}
	at := vg.Point{X: middle, Y: y}
	if p, ok := s.room.Near(plane.Request{Anchor: at, Size: size, Reach: 2, Prefer: vg.Point{Y: 1}}); ok {
		s.room.Take(p)
		if p.Leader != nil {
			s.StrokeLines(draw.LineStyle{Color: faint, Width: 0.5}, p.Leader)
		}
		s.write(text, p.Box, labelSize, ink)
	}
}
