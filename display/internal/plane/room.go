package plane

import (
	"math"
	"slices"

	"gonum.org/v1/plot/vg"
)

// Room is the place on a picture and what already stands there.
type Room struct {
	Frame vg.Rectangle
	boxes []vg.Rectangle
	marks []vg.Rectangle
	lines [][]vg.Point
}

// Block keeps labels and leaders off a rectangle.
func (r *Room) Block(box vg.Rectangle) { r.boxes = append(r.boxes, box) }

// BlockMark keeps labels off a rectangle; leaders avoid it where they can.
func (r *Room) BlockMark(box vg.Rectangle) { r.marks = append(r.marks, box) }

// BlockLine keeps labels off a line.
func (r *Room) BlockLine(line []vg.Point) {
	if len(line) > 1 {
		r.lines = append(r.lines, line)
	}
}

// Free reports whether a rectangle lies in the frame and on nothing.
func (r *Room) Free(box vg.Rectangle) bool {
	return inside(box, r.Frame) && !r.taken(box) && r.crossings(box) == 0
}

func (r *Room) taken(box vg.Rectangle) bool {
	overlaps := func(b vg.Rectangle) bool { return Overlap(b, box) }
	return slices.ContainsFunc(r.boxes, overlaps) || slices.ContainsFunc(r.marks, overlaps)
}

// crossings counts the segments of lines that run through a rectangle.
func (r *Room) crossings(box vg.Rectangle) int {
	n := 0
	for _, line := range r.lines {
		for i := 1; i < len(line); i++ {
			if touches(line[i-1], line[i], box) {
				n++
			}
		}
	}
	return n
}

func touches(a, b vg.Point, box vg.Rectangle) bool {
	if max(a.X, b.X) < box.Min.X || min(a.X, b.X) > box.Max.X || max(a.Y, b.Y) < box.Min.Y || min(a.Y, b.Y) > box.Max.Y {
		return false
	}
	_, _, ok := ClipSegment(a, b, box)
	return ok
}

// A Place is where a label goes.
type Place struct {
	Box    vg.Rectangle // of the text
	Leader []vg.Point   // the line from the mark, nil when the label stands beside it
	Cost   float64
}

// A Request asks for the place of a label of a given size about a mark.
type Request struct {
	Anchor vg.Point
	Size   vg.Point
	Prefer vg.Point  // direction away from the mark on which the label looks best
	Reach  vg.Length // half the size of the mark
}

// margin is kept free about a label.
const margin = vg.Length(1.5)

var distances = []vg.Length{2, 6, 12, 20, 30, 44, 62, 84, 110}

// Near finds a place for a label, as near to its mark and as far on the wanted
// side as can be had. Farther labels get a leader. It reports false when there
// is no room.
func (r *Room) Near(q Request) (Place, bool) {
	best, found := Place{Cost: math.Inf(1)}, false
	for _, d := range distances {
		for k := range 24 {
			p := q.candidate(float64(k)*math.Pi/12, d)
			if p.Cost >= best.Cost || !r.Free(grow(p.Box, margin)) {
				continue
			}
			if p.Leader != nil {
				n, ok := r.leaderCrossings(p.Leader, q)
				p.Cost += 25 * float64(n)
				if !ok || p.Cost >= best.Cost {
					continue
				}
			}
			best, found = p, true
		}
	}
	return best, found
}

// Take blocks what a placed label covers.
func (r *Room) Take(p Place) {
	r.Block(p.Box)
	r.BlockLine(p.Leader)
}

// candidate puts the label in a direction from the mark: its near side, or its
// near corner where the direction is slanting, at a distance.
func (q Request) candidate(angle float64, d vg.Length) Place {
	sin, cos := math.Sincos(angle)
	u := vg.Point{X: vg.Length(cos), Y: vg.Length(sin)}
	side := func(v vg.Length) vg.Length { return min(max(2.2*v, -1), 1) }
	c := vg.Point{
		X: q.Anchor.X + (q.Reach+d)*u.X + side(u.X)*q.Size.X/2,
		Y: q.Anchor.Y + (q.Reach+d)*u.Y + side(u.Y)*q.Size.Y/2,
	}
	p := Place{Box: vg.Rectangle{
		Min: vg.Point{X: c.X - q.Size.X/2, Y: c.Y - q.Size.Y/2},
		Max: vg.Point{X: c.X + q.Size.X/2, Y: c.Y + q.Size.Y/2},
	}}
	p.Cost = float64(d)
	if n := length(q.Prefer); n > 0 {
		p.Cost += 9 * (1 - float64(dot(q.Prefer, u)/n))
	}
	if d > 10 {
		p.Cost += 8
		p.Leader = q.leader(p.Box)
	}
	return p
}

// leader runs from the rim of the mark to the nearest point of the label.
func (q Request) leader(box vg.Rectangle) []vg.Point {
	to := vg.Point{
		X: min(max(q.Anchor.X, box.Min.X+2), box.Max.X-2),
		Y: min(max(q.Anchor.Y, box.Min.Y+1), box.Max.Y-1),
	}
	if to.Y > box.Min.Y+1 && to.Y < box.Max.Y-1 { // level with the text: to its side
		to.X = min(max(q.Anchor.X, box.Min.X-1), box.Max.X+1)
	}
	d := sub(to, q.Anchor)
	u := vg.Point{X: d.X / length(d), Y: d.Y / length(d)}
	return []vg.Point{
		{X: q.Anchor.X + (q.Reach+1)*u.X, Y: q.Anchor.Y + (q.Reach+1)*u.Y},
		to,
	}
}

// leaderCrossings counts the lines and the marks that a leader crosses, its own
// mark aside, and reports false when it runs over a label.
func (r *Room) leaderCrossings(leader []vg.Point, q Request) (int, bool) {
	a, b := leader[0], leader[1]
	for _, box := range r.boxes {
		if touches(a, b, box) {
			return 0, false
		}
	}
	n := 0
	for _, box := range r.marks {
		if touches(a, b, box) && ToBox(q.Anchor, box) > 8 {
			n++
		}
	}
	for _, line := range r.lines {
		for i := 1; i < len(line); i++ {
			if meet(a, b, line[i-1], line[i]) {
				n++
			}
		}
	}
	return n, true
}

// meet reports whether two segments cross.
func meet(a, b, c, d vg.Point) bool {
	side := func(p, q, r vg.Point) vg.Length {
		return (q.X-p.X)*(r.Y-p.Y) - (q.Y-p.Y)*(r.X-p.X)
	}
	return side(a, b, c)*side(a, b, d) < 0 && side(c, d, a)*side(c, d, b) < 0
}

// Overlap reports whether two rectangles have more than an edge in common.
func Overlap(a, b vg.Rectangle) bool {
	return a.Min.X < b.Max.X && b.Min.X < a.Max.X && a.Min.Y < b.Max.Y && b.Min.Y < a.Max.Y
}

func inside(a, b vg.Rectangle) bool {
	return a.Min.X >= b.Min.X && a.Max.X <= b.Max.X && a.Min.Y >= b.Min.Y && a.Max.Y <= b.Max.Y
}

func contains(box vg.Rectangle, p vg.Point) bool {
	return p.X >= box.Min.X && p.X <= box.Max.X && p.Y >= box.Min.Y && p.Y <= box.Max.Y
}

func grow(box vg.Rectangle, by vg.Length) vg.Rectangle {
	return vg.Rectangle{
		Min: vg.Point{X: box.Min.X - by, Y: box.Min.Y - by},
		Max: vg.Point{X: box.Max.X + by, Y: box.Max.Y + by},
	}
}

// Spot returns a rectangle of that size on which no label lies and as few lines as
// can be: the emptiest corner, or where no corner is free of labels the emptiest
// other place. It reports false where labels are everywhere.
func (r *Room) Spot(size vg.Point) (vg.Rectangle, bool) {
	best, least := vg.Rectangle{}, math.MaxInt
	try := func(box vg.Rectangle) {
		if !inside(box, r.Frame) || r.taken(grow(box, margin)) {
			return
		}
		if n := r.crossings(box); n < least {
			best, least = box, n
		}
	}
	for _, right := range []bool{true, false} {
		for _, top := range []bool{true, false} {
			try(r.corner(size, right, top))
		}
	}
	if least < math.MaxInt {
		return best, true
	}
	const steps = 24
	free := vg.Point{X: r.Frame.Max.X - r.Frame.Min.X - size.X, Y: r.Frame.Max.Y - r.Frame.Min.Y - size.Y}
	for i := range steps + 1 {
		for j := range steps + 1 {
			at := vg.Point{X: r.Frame.Min.X + free.X*vg.Length(j)/steps, Y: r.Frame.Min.Y + free.Y*vg.Length(i)/steps}
			try(vg.Rectangle{Min: at, Max: vg.Point{X: at.X + size.X, Y: at.Y + size.Y}})
		}
	}
	return best, least < math.MaxInt
}

func (r *Room) corner(size vg.Point, right, top bool) vg.Rectangle {
	const inset = 4
	at := vg.Point{X: r.Frame.Min.X + inset, Y: r.Frame.Min.Y + inset}
	if right {
		at.X = r.Frame.Max.X - inset - size.X
	}
	if top {
		at.Y = r.Frame.Max.Y - inset - size.Y
	}
	return vg.Rectangle{Min: at, Max: vg.Point{X: at.X + size.X, Y: at.Y + size.Y}}
}

// Copy returns a room that can be filled on trial.
func (r *Room) Copy() *Room {
	return &Room{
		Frame: r.Frame,
		boxes: slices.Clone(r.boxes),
		marks: slices.Clone(r.marks),
		lines: slices.Clone(r.lines),
	}
}

// Count returns how much lies on a rectangle: segments of lines, labels and marks.
func (r *Room) Count(box vg.Rectangle) int {
	n := r.crossings(box)
	for _, list := range [][]vg.Rectangle{r.boxes, r.marks} {
		for _, b := range list {
			if Overlap(b, box) {
				n += 3
			}
		}
	}
	return n
}

// ToBox returns how far a point is from a rectangle, 0 in it.
func ToBox(p vg.Point, box vg.Rectangle) vg.Length {
	dx := max(box.Min.X-p.X, 0, p.X-box.Max.X)
	dy := max(box.Min.Y-p.Y, 0, p.Y-box.Max.Y)
	return length(vg.Point{X: dx, Y: dy})
}

// ToSegment returns the distance of a rectangle from the line between two points.
func ToSegment(a, b vg.Point, box vg.Rectangle) vg.Length {
	if touches(a, b, box) {
		return 0
	}
	d := min(ToBox(a, box), ToBox(b, box))
	for _, corner := range []vg.Point{box.Min, box.Max, {X: box.Min.X, Y: box.Max.Y}, {X: box.Max.X, Y: box.Min.Y}} {
		d = min(d, Distance(corner, a, b))
	}
	return d
}
