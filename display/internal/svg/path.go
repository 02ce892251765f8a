package svg

import (
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/plot/vg"

	"brinkline/display/internal/plane"
)

// A matrix maps (x, y) to (a x + c y + e, b x + d y + f).
type matrix struct{ a, b, c, d, e, f float64 }

var identity = matrix{a: 1, d: 1}

// after returns the map that does n first and then m.
func (m matrix) after(n matrix) matrix {
	return matrix{
		m.a*n.a + m.c*n.b, m.b*n.a + m.d*n.b,
		m.a*n.c + m.c*n.d, m.b*n.c + m.d*n.d,
		m.a*n.e + m.c*n.f + m.e, m.b*n.e + m.d*n.f + m.f,
	}
}

func (m matrix) apply(x, y float64) (float64, float64) {
	return m.a*x + m.c*y + m.e, m.b*x + m.d*y + m.f
}

// scale returns by how much lengths grow (their geometric mean).
func (m matrix) scale() float64 { return math.Sqrt(math.Abs(m.a*m.d - m.b*m.c)) }

func (m matrix) angle() float64 { return math.Atan2(m.b, m.a) }

// pathData writes a path as the attribute d. Runs of straight lines are thinned
// to what can be seen; where they may be, they are also rid of what lies on ink
// that is already there (inked).
func (c *Canvas) pathData(path vg.Path, inked bool) string {
	w := writer{c: c, inked: inked}
	for _, p := range path {
		switch p.Type {
		case vg.MoveComp:
			w.flush()
			w.run = append(w.run, w.point(p.Pos))
		case vg.LineComp:
			w.run = append(w.run, w.point(p.Pos))
		case vg.ArcComp:
			w.arc(p)
		case vg.CurveComp:
			w.curve(p)
		case vg.CloseComp:
			w.close()
		}
	}
	w.flush()
	return w.out.String()
}

// A writer collects the straight runs of a path until a curve or a new start.
type writer struct {
	c     *Canvas
	inked bool
	out   strings.Builder
	run   []vg.Point // the present point and the lines from it
	drawn bool       // the first point of the run is already in out
}

// point maps a point into the file.
func (w *writer) point(p vg.Point) vg.Point {
	x, y := w.c.pen.matrix.apply(p.X.Points(), p.Y.Points())
	return vg.Point{X: vg.Length(x), Y: w.c.height - vg.Length(y)}
}

func (w *writer) flush() {
	pieces := [][]vg.Point{plane.Thin(w.run, 0.05)}
	if w.inked && len(pieces[0]) > 4000 && !w.drawn {
		pieces = plane.Uncovered(pieces[0], 0.5)
	}
	for _, piece := range pieces {
		w.lines(piece)
		w.drawn = false
	}
	w.run = w.run[:0]
}

func (w *writer) lines(run []vg.Point) {
	if len(run) == 0 || (len(run) == 1 && w.drawn) {
		return
	}
	if !w.drawn {
		w.command('M', run[0])
	}
	for i, p := range run[1:] {
		if i == 0 {
			w.command('L', p)
			continue
		}
		w.separate(p.X)
		w.separate(p.Y)
	}
}

// curve goes on with a quadratic or cubic Bézier curve.
func (w *writer) curve(p vg.PathComp) {
	end := w.point(p.Pos)
	w.before()
	letter := byte('Q')
	if len(p.Control) == 2 {
		letter = 'C'
	}
	points := make([]vg.Point, 0, 3)
	for _, q := range p.Control {
		points = append(points, w.point(q))
	}
	w.command(letter, append(points, end)...)
	w.run, w.drawn = append(w.run[:0], end), true
}

// arc goes on with a circular arc, as cubic curves of at most a quarter turn:
// they stay right under any map.
func (w *writer) arc(p vg.PathComp) {
	on := func(angle float64) vg.Point {
		sin, cos := math.Sincos(angle)
		return vg.Point{X: p.Pos.X + p.Radius*vg.Length(cos), Y: p.Pos.Y + p.Radius*vg.Length(sin)}
	}
	w.run = append(w.run, w.point(on(p.Start)))
	n := max(1, int(math.Ceil(math.Abs(p.Angle)/(math.Pi/2)-1e-9)))
	step := p.Angle / float64(n)
	reach := p.Radius * vg.Length(4.0/3*math.Tan(step/4))
	along := func(q vg.Point, angle float64, by vg.Length) vg.Point {
		sin, cos := math.Sincos(angle)
		return vg.Point{X: q.X - by*vg.Length(sin), Y: q.Y + by*vg.Length(cos)}
	}
	for i := range n {
		from, to := p.Start+float64(i)*step, p.Start+float64(i+1)*step
		w.curve(vg.PathComp{Pos: on(to), Control: []vg.Point{along(on(from), from, reach), along(on(to), to, -reach)}})
	}
}

// before writes the run that leads to a curve.
func (w *writer) before() {
	if len(w.run) == 0 {
		return
	}
	w.lines(plane.Thin(w.run, 0.05))
	w.drawn = true
}

func (w *writer) close() {
	first := vg.Point{}
	if len(w.run) > 0 {
		first = w.run[0]
	}
	w.inked = false // a closed outline must stay whole
	w.flush()
	if w.out.Len() > 0 {
		w.out.WriteByte('Z')
	}
	w.run, w.drawn = append(w.run, first), false
	w.run = w.run[:0]
}

func (w *writer) command(letter byte, points ...vg.Point) {
	w.out.WriteByte(letter)
	for i, p := range points {
		if i == 0 {
			w.out.WriteString(number(p.X))
		} else {
			w.separate(p.X)
		}
		w.separate(p.Y)
	}
}

// separate writes one more number.
func (w *writer) separate(v vg.Length) {
	text := number(v)
	if text[0] != '-' {
		w.out.WriteByte(' ')
	}
	w.out.WriteString(text)
}

// number writes a length in points with at most two decimals.
func number(v vg.Length) string { return float(v.Points()) }

func float(v float64) string {
	v = math.Round(v*100) / 100
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return "0"
	}
	return strconv.FormatFloat(v, 'f', -1, 64)
}

func numbers(list []vg.Length, scale vg.Length) string {
	text := make([]string, len(list))
	for i, v := range list {
		text[i] = number(v * scale)
	}
	return strings.Join(text, " ")
}
