package display

import (
	"image/color"
	"math"
	"slices"
	"sort"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"brinkline/display/internal/plane"
)

// textSize returns the room that a label takes.
func textSize(text string, size vg.Length) vg.Point {
	f := face(size)
	e := f.Extents()
	return vg.Point{X: f.Width(text), Y: e.Ascent + e.Descent}
}

// write puts text into the box that was found for it.
func (s *sheet) write(text string, box vg.Rectangle, size vg.Length, clr color.Color) {
	f := face(size)
	s.SetColor(clr)
	s.FillString(f, vg.Point{X: box.Min.X, Y: box.Min.Y + f.Extents().Descent}, text)
}

// markLabels puts the labels beside their marks and returns how many found no
// room. The greedy choice depends on the order, so the better of two is taken.
func (s *sheet) markLabels(spots []spot) (left int) {
	spots = merged(spots)
	forward := s.arrange(spots, func(a, b spot) bool { return a.centre.X < b.centre.X })
	backward := s.arrange(spots, func(a, b spot) bool { return a.centre.Y > b.centre.Y })
	best := forward
	if backward.better(forward) {
		best = backward
	}
	if best.left > 0 { // those that came last may go where they come first
		for _, before := range []func(a, b spot) bool{
			func(a, b spot) bool { return a.centre.X > b.centre.X },
			func(a, b spot) bool { return a.centre.Y < b.centre.Y },
			func(a, b spot) bool { return len(a.label) > len(b.label) },
		} {
			if other := s.arrange(spots, before); other.better(best) {
				best = other
			}
		}
	}
	for _, l := range best.labels {
		s.room.Take(l.place)
		if l.place.Leader != nil {
			s.StrokeLines(draw.LineStyle{Color: faint, Width: 0.5}, l.place.Leader)
		}
		s.write(l.text, l.place.Box, labelSize, ink)
	}
	return best.left
}

// merged gives the labels of marks that lie on each other and say the same to the
// first of them.
func merged(spots []spot) []spot {
	var list []spot
	for _, sp := range spots {
		sp.label = spell(sp.label)
		twin := false
		for _, have := range list {
			near := math.Hypot(float64(have.centre.X-sp.centre.X), float64(have.centre.Y-sp.centre.Y)) < 3
			twin = twin || (near && have.label == sp.label)
		}
		if sp.label != "" && !twin {
			list = append(list, sp)
		}
	}
	return list
}

// An arrangement is one way to place labels.
type arrangement struct {
	labels []placed
	left   int
	cost   float64
}

type placed struct {
	text  string
	place plane.Place
	spot  spot
}

func (a arrangement) better(b arrangement) bool {
	if a.left != b.left {
		return a.left < b.left
	}
	return a.cost < b.cost-1e-9
}

// arrange places labels one after the other.
func (s *sheet) arrange(spots []spot, before func(a, b spot) bool) arrangement {
	order := append([]spot(nil), spots...)
	sort.SliceStable(order, func(i, j int) bool { return before(order[i], order[j]) })
	room := s.room.Copy()
	var a arrangement
	for _, sp := range order {
		p, ok := room.Near(sp.request())
		if !ok {
			a.left++
			continue
		}
		room.Take(p)
		a.cost += p.Cost
		a.labels = append(a.labels, placed{sp.label, p, sp})
	}
	s.improve(&a)
	return a
}

// improve takes up one label after the other, and two that are neighbours, and
// puts them where they lie better now that the others are known.
func (s *sheet) improve(a *arrangement) {
	const near, rounds, most = 110, 3, 40
	for range rounds {
		changed := false
		for i := range a.labels {
			changed = s.again(a, i) || changed
			for j := 0; j < i && len(a.labels) <= most; j++ {
				if distance(a.labels[i].spot.centre, a.labels[j].spot.centre) < near {
					changed = s.again(a, i, j) || s.again(a, j, i) || changed
				}
			}
		}
		if !changed {
			return
		}
	}
}

// again places some labels anew, in the order given, if that is better.
func (s *sheet) again(a *arrangement, which ...int) bool {
	room := s.room.Copy()
	before, after := 0.0, 0.0
	for k, l := range a.labels {
		if slices.Contains(which, k) {
			before += l.place.Cost
		} else {
			room.Take(l.place)
		}
	}
	places := make([]plane.Place, len(which))
	for n, k := range which {
		p, ok := room.Near(a.labels[k].spot.request())
		after += p.Cost
		if !ok || after >= before-1e-9 {
			return false
		}
		room.Take(p)
		places[n] = p
	}
	for n, k := range which {
		a.labels[k].place = places[n]
	}
	a.cost += after - before
	return true
}

func (sp spot) request() plane.Request {
	return plane.Request{Anchor: sp.centre, Size: textSize(sp.label, labelSize), Prefer: sp.prefer, Reach: sp.reach}
}

// curveLabels names the branches beside their lines or, when there is no room, in
// a legend in the emptiest corner. left is how many labels of marks found no room:
// the figure says so.
func (s *sheet) curveLabels(curves []curve, left int) {
	places, ok := s.besideAll(curves)
	if !ok {
		left += s.legend(curves)
	}
	for i, p := range places {
		s.room.Take(p)
		if p.Leader != nil {
			s.StrokeLines(draw.LineStyle{Color: curves[i].ink, Width: 0.5}, p.Leader)
		}
		if curves[i].label != "" {
			s.write(spell(curves[i].label), p.Box, labelSize, darker(curves[i].ink))
		}
	}
	if left > 0 {
		text := count(left, "label", "labels") + " without room: see the text or the table"
		if box, ok := s.room.Spot(textSize(text, noteSize)); ok {
			s.SetColor(plate)
			s.Fill(box.Path())
			s.write(text, box, noteSize, faint)
		}
	}
}

// besideAll finds places for the names of all curves, or none.
func (s *sheet) besideAll(curves []curve) ([]plane.Place, bool) {
	places := make([]plane.Place, len(curves))
	room := s.room.Copy()
	for i, c := range curves {
		if c.label == "" {
			continue
		}
		p, ok := s.beside(room, c, curves)
		if !ok {
			return nil, false
		}
		room.Take(p)
		places[i] = p
	}
	return places, true
}

// beside finds the best place for the name of a curve along its line, nearer to
// it than to any other.
func (s *sheet) beside(room *plane.Room, c curve, all []curve) (plane.Place, bool) {
	best, found := plane.Place{Cost: math.Inf(1)}, false
	size := textSize(spell(c.label), labelSize)
	for _, at := range s.samples(c) {
		p, ok := room.Near(plane.Request{Anchor: at, Size: size, Reach: 2, Prefer: vg.Point{}})
		if !ok {
			continue
		}
		p.Cost += s.rivals(p, c, all)
		if p.Cost < best.Cost {
			best, found = p, true
		}
	}
	return best, found && best.Cost < 90
}

// samples returns points along a curve where its name may stand.
func (s *sheet) samples(c curve) []vg.Point {
	var line []vg.Point
	for _, r := range c.runs {
		for _, part := range s.lines(r) {
			line = append(line, part...)
		}
	}
	if len(line) == 0 {
		return nil
	}
	const n = 24
	total := vg.Length(0)
	for i := 1; i < len(line); i++ {
		total += distance(line[i-1], line[i])
	}
	var out []vg.Point
	passed, next := vg.Length(0), vg.Length(0.5)
	for i := 1; i < len(line); i++ {
		step := distance(line[i-1], line[i])
		for step > 0 && passed+step >= next*total/n && len(out) < n {
			t := (next*total/n - passed) / step
			out = append(out, vg.Point{X: line[i-1].X + t*(line[i].X-line[i-1].X), Y: line[i-1].Y + t*(line[i].Y-line[i-1].Y)})
			next++
		}
		passed += step
	}
	return out
}

func distance(a, b vg.Point) vg.Length {
	return vg.Length(math.Hypot(float64(a.X-b.X), float64(a.Y-b.Y)))
}

// rivals is the cost of other curves that lie near a label: it could be taken for
// theirs, less so when a leader shows where it belongs.
func (s *sheet) rivals(p plane.Place, own curve, all []curve) float64 {
	cost, reach := 0.0, 60.0
	if p.Leader != nil {
		reach = 24
	}
	for _, h := range s.hair {
		for _, line := range s.lines(run{places: h.places}) {
			for i := 1; i < len(line) && !h.across; i++ {
				cost = max(cost, reach-3*float64(plane.ToSegment(line[i-1], line[i], p.Box)))
			}
		}
	}
	for _, c := range all {
		if c.ink == own.ink && c.label == own.label {
			continue
		}
		for _, r := range c.runs {
			for _, q := range r.places {
				d := plane.ToBox(s.at(q), p.Box)
				cost = max(cost, reach-3*float64(d))
			}
		}
	}
	return cost
}

// usual is the line by which a legend shows a curve.
func (c curve) usual() lineKind {
	if c.locus && len(c.runs) > 0 {
		return c.runs[0].line
	}
	return solid
}

// legend lists the branches in the emptiest corner, and returns how many names
// found no room.
func (s *sheet) legend(curves []curve) (left int) {
	const swatch, gap, pitch = 22, 5, 12
	width, rows := vg.Length(0), 0
	for _, c := range curves {
		if c.label != "" {
			width = max(width, textSize(spell(c.label), labelSize).X)
			rows++
		}
	}
	box, ok := s.room.Spot(vg.Point{X: swatch + gap + width + 2, Y: pitch*vg.Length(rows) + 2})
	if !ok {
		return rows
	}
	s.SetColor(plate)
	s.Fill(box.Path())
	y := box.Max.Y - 1
	for _, c := range curves {
		if c.label == "" {
			continue
		}
		y -= pitch
		s.StrokeLines(lineStyle(c, c.usual()), []vg.Point{{X: box.Min.X, Y: y + pitch/2}, {X: box.Min.X + swatch, Y: y + pitch/2}})
		at := vg.Rectangle{Min: vg.Point{X: box.Min.X + swatch + gap, Y: y + 1.5}}
		s.write(spell(c.label), at, labelSize, ink)
	}
	s.room.Block(box)
	return 0
}
