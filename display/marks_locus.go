package display

import (
	"math"
	"slices"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"brinkline/continuation"
)

// cornerShapes are the local geometries of the special points of loci.
var cornerShapes = map[string]shape{
	cuspKind: wedgeShape, takensKind: restShape, foldHopfKind: throughShape,
	hopfHopfKind: twinShape, degenerateKind: halfShape,
}

const (
	cuspKind       = "cusp"
	takensKind     = "Bogdanov-Takens point"
	foldHopfKind   = "fold-Hopf point"
	hopfHopfKind   = "Hopf-Hopf point"
	degenerateKind = "degenerate Hopf point"
)

// addCorners puts the special points of loci into the scene.
func (f *Figure) addCorners(s *scene) error {
	seen := map[string]bool{} // a Bogdanov-Takens point lies on two loci
	put := func(m mark) {
		if !seen[m.label] {
			s.put(m)
		}
		seen[m.label] = true
	}
	for _, l := range f.loci() {
		places, err := s.locusPlaces(l)
		if err != nil {
			return err
		}
		for _, c := range l.Specials() {
			put(s.cornerMark(c, l, places))
		}
	}
	for _, it := range f.items {
		if it.corner == nil {
			continue
		}
		at, err := s.place(it.corner.Where.Point)
		if err != nil {
			return err
		}
		put(mark{place: at, shape: cornerShapes[it.corner.Kind], label: s.cornerLabel(it.corner)})
	}
	return nil
}

func (s *scene) cornerMark(c *continuation.LocusSpecial, l *continuation.Locus, places []place) mark {
	i := c.Index()
	m := mark{place: places[i], shape: cornerShapes[c.Kind], label: s.cornerLabel(c)}
	switch m.shape {
	case wedgeShape:
		m.edges[0] = slices.Clone(places[:i+1])
		slices.Reverse(m.edges[0])
		m.edges[1] = places[i:]
	case halfShape:
		if !hardAhead(l.Points(), i) {
			m.dx, m.dy = -m.dx, -m.dy
		}
	}
	return m
}

// hardAhead reports whether the first Lyapunov coefficient is positive on the part
// of a locus behind point i.
func hardAhead(points []*continuation.LocusPoint, i int) bool {
	if i+1 < len(points) && !math.IsNaN(points[i+1].Lyapunov) {
		return points[i+1].Lyapunov > 0
	}
	return i > 0 && points[i-1].Lyapunov < 0
}

// cornerLabel says the word and the values of both parameters, that of the x axis
// first; a parameter that stands on no axis is named.
func (s *scene) cornerLabel(c *continuation.LocusSpecial) string {
	first, second := pairOf(c.Where)
	pair := []continuation.Parameter{first, second}
	if pair[1].Name == s.x.variable.Name || pair[0].Name == s.y.variable.Name {
		pair[0], pair[1] = pair[1], pair[0]
	}
	text := c.Kind
	for i, q := range pair {
		if i > 0 {
			text += ","
		}
		if q.Name != s.x.variable.Name && q.Name != s.y.variable.Name {
			text += " " + q.Name
		}
		text += " " + withUnit(typeset(significant(q.Value, 5)), q.Unit)
	}
	return text
}

// pairOf returns the two parameters at a point of a locus; what rounding leaves of a
// 0 is 0, by the typical size of the parameter or its value in the model.
func pairOf(p *continuation.LocusPoint) (first, second continuation.Parameter) {
	first, second = p.Pair()
	for _, q := range []*continuation.Parameter{&first, &second} {
		size := q.Scale
		for _, own := range p.Model().Parameters() {
			if own.Name == q.Name {
				size = max(size, math.Abs(own.Value))
			}
		}
		if size == 0 {
			size = 1e-4
		}
		if math.Abs(q.Value) < 1e-10*size {
			q.Value = 0
		}
	}
	return first, second
}

// wedge thickens the two edges that meet in a cusp, which are the curve itself: they
// leave with one tangent.
func (s *sheet) wedge(sp *spot) {
	const reach = 15
	style := draw.LineStyle{Color: accent, Width: 2.4}
	var away vg.Point
	for _, edge := range sp.edges {
		line := s.first(edge, reach)
		if len(line) < 2 {
			continue
		}
		s.StrokeLines(style, line)
		for _, p := range line {
			s.block(p, style.Width/2)
		}
		end := line[len(line)-1]
		away.X, away.Y = away.X+sp.centre.X-end.X, away.Y+sp.centre.Y-end.Y
	}
	if sp.edges[0] == nil {
		s.bar(style, sp.centre, vg.Point{Y: 1}, 5)
	}
	sp.prefer, sp.reach = away, 3
}

// first returns the line through places as far as it goes from the first one.
func (s *sheet) first(places []place, reach vg.Length) []vg.Point {
	var line []vg.Point
	for _, p := range places {
		if !p.finite() {
			break
		}
		at := s.at(p)
		if n := len(line); n > 0 {
			if d := distance(line[0], at); d > reach {
				last := line[n-1]
				t := (reach - distance(line[0], last)) / (d - distance(line[0], last))
				return append(line, vg.Point{X: last.X + t*(at.X-last.X), Y: last.Y + t*(at.Y-last.Y)})
			}
		}
		line = append(line, at)
	}
	return line
}

// corner draws where loci meet or change: the fold as its bar, the Hopf point as
// its ring.
func (s *sheet) corner(sp *spot, u vg.Point) {
	const radius, half = 3.2, 8
	n := normal(u)
	if n.Y < -1e-3 || (n.Y < 1e-3 && n.X < 0) {
		n = vg.Point{X: -n.X, Y: -n.Y}
	}
	fold := draw.LineStyle{Color: accent, Width: barWidth}
	sp.prefer, sp.reach = n, 6
	switch sp.shape {
	case restShape:
		s.bar(fold, sp.centre, u, half)
		s.circle(along(sp.centre, n, radius+barWidth/2-0.4), radius, false)
	case throughShape:
		s.circle(sp.centre, radius+1.2, false)
		s.bar(fold, sp.centre, u, half)
	case twinShape:
		s.circle(along(sp.centre, u, 2), radius, false)
		s.circle(along(sp.centre, u, -2), radius, true)
	case halfShape:
		s.circle(sp.centre, radius, false)
		s.half(sp.centre, u, radius)
	}
}

// circle draws a ring on white, or on what is there.
func (s *sheet) circle(c vg.Point, radius vg.Length, clear bool) {
	var path vg.Path
	path.Move(vg.Point{X: c.X + radius, Y: c.Y})
	path.Arc(c, radius, 0, 2*math.Pi)
	path.Close()
	if !clear {
		s.SetColor(plate)
		s.Fill(path)
	}
	s.SetLineStyle(draw.LineStyle{Color: ink, Width: 1.2})
	s.Stroke(path)
	s.block(c, radius+1)
}

// half fills the half of a disc that lies in a direction.
func (s *sheet) half(c, u vg.Point, radius vg.Length) {
	from := math.Atan2(float64(u.Y), float64(u.X)) - math.Pi/2
	sin, cos := math.Sincos(from)
	var path vg.Path
	path.Move(vg.Point{X: c.X + radius*vg.Length(cos), Y: c.Y + radius*vg.Length(sin)})
	path.Arc(c, radius, from, math.Pi)
	path.Close()
	s.SetColor(ink)
	s.Fill(path)
}

// cross draws an eigenvalue.
func (s *sheet) cross(sp *spot) {
	const half = 3
	style := draw.LineStyle{Color: ink, Width: 1.2}
	for _, d := range []vg.Point{{X: half, Y: half}, {X: half, Y: -half}} {
		s.StrokeLines(style, []vg.Point{along(sp.centre, d, -1), along(sp.centre, d, 1)})
	}
	s.block(sp.centre, half)
}
