package display

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"gonum.org/v1/plot/vg"

	"brinkline/continuation"
)

// eigenvalues is what a figure of them draws: those along a branch, or those of one
// steady state.
type eigenvalues struct {
	branch *continuation.Branch
	point  *continuation.Point
	spread [][]complex128 // a list for each point of the branch, or one
	shown  int            // how many of the greatest real part are in the picture
}

// Eigenvalues makes a figure of the eigenvalues of f_x. Of a branch it shows the real
// parts against the parameter with the zero line that they cross at special points;
// [Figure.X] puts something else on the x axis. Of a steady state it shows them in
// the complex plane. The eigenvalues are those that the branch holds, see
// [continuation.WithEigenvalues], or are computed now.
//
// A real eigenvalue is a solid line, a complex pair one dash-dotted line. Eigenvalues
// that lie far below the others are left out, and the text of the figure says how
// many.
func Eigenvalues(v any) *Figure {
	f := &Figure{width: usualWidth * vg.Centimeter, height: usualHeight * vg.Centimeter, eigen: &eigenvalues{}}
	if isNil(v) {
		return f.fail(fmt.Errorf("Eigenvalues wants a branch or a steady state; there is nothing (nil)"))
	}
	var err error
	switch v := v.(type) {
	case *continuation.Branch:
		err = f.eigenBranch(v)
	case brancher:
		err = f.eigenBranch(v.Branch())
	case *continuation.Point:
		err = f.eigenPoint(v)
	case Marked:
		err = f.eigenPoint(v.Point)
	case *continuation.LocusPoint:
		err = f.eigenPoint(v.Point)
	case continuation.Special:
		err = f.eigenPoint(v.Where())
	default:
		err = fmt.Errorf("Eigenvalues wants a branch or a steady state, not a %T", v)
	}
	if err != nil {
		f.fail(err)
	}
	return f
}

func (f *Figure) eigenBranch(b *continuation.Branch) error {
	f.items = []item{{branch: b}}
	f.eigen.branch = b
	for _, p := range b.Points() {
		values, err := p.Spectrum()
		if err != nil {
			return err
		}
		f.eigen.spread = append(f.eigen.spread, values)
	}
	return nil
}

func (f *Figure) eigenPoint(p *continuation.Point) error {
	if p == nil {
		return fmt.Errorf("Eigenvalues wants a branch or a steady state; there is nothing (nil)")
	}
	f.items = []item{{point: p}}
	f.eigen.point = p
	values, err := p.Spectrum()
	f.eigen.spread = [][]complex128{values}
	return err
}

// buildEigenvalues makes the picture.
func (f *Figure) buildEigenvalues() (*picture, error) {
	s, err := f.eigenScene()
	if err != nil {
		return nil, err
	}
	return f.describe(s, f.eigenSentence(s))
}

func (f *Figure) eigenScene() (*scene, error) {
	if f.eigen.point != nil {
		return f.complexPlane()
	}
	return f.realParts()
}

// realParts is the scene of the real parts along a branch.
func (f *Figure) realParts() (*scene, error) {
	e, b := f.eigen, f.eigen.branch
	x, err := f.named(f.xName())
	if err != nil {
		return nil, err
	}
	x.log, x.shown = f.logX, f.rangeX
	s := &scene{x: x, y: side{label: "Real part of eigenvalue", log: f.logY, shown: f.rangeY}}
	xs, along := make([]float64, len(b.Points())), make([]place, len(b.Points()))
	for i, p := range b.Points() {
		if xs[i], err = x.value(p); err != nil {
			return nil, err
		}
		along[i] = place{x: xs[i], dx: x.slope(p), dy: math.NaN()}
	}
	e.shown = e.enough()
	for k := range e.shown {
		s.curves = append(s.curves, curve{ink: ink, runs: e.line(k, along)})
	}
	specials := b.Specials()
	labels := f.specialLabels(specials)
	for i, sp := range specials {
		s.put(eigenMark(sp, place{x: xs[sp.Index()], dx: math.NaN(), dy: math.NaN()}, labels[i]))
	}
	s.zeroLine(slices.Min(xs), slices.Max(xs))
	return s, nil
}

// enough returns how many eigenvalues are shown, counted from the greatest real part:
// as many as do not press those before them against the zero line.
func (e *eigenvalues) enough() int {
	const most, ratio = 12, 6
	n := len(e.spread[0])
	low, high := 0.0, 0.0
	for k := range n {
		least := 0.0
		for _, values := range e.spread {
			least, high = min(least, real(values[k])), max(high, real(values[k]))
		}
		if k == most || (k > 1 && high-low > 0 && high-least > ratio*(high-low)) {
			return k
		}
		low = min(low, least)
	}
	return n
}

// line is the eigenvalue of one rank along the branch; a pair is drawn once.
func (e *eigenvalues) line(k int, along []place) []run {
	var runs []run
	places := e.places(k, along)
	for i := 1; i < len(places); i++ {
		a, b := e.spread[i-1], e.spread[i]
		r := run{places: places[i-1 : i+1 : i+1]}
		if paired(a, k) && paired(b, k) {
			r.line = dashDotted
			if second(a, k) && second(b, k) {
				continue
			}
		}
		if r.places[0].finite() && r.places[1].finite() {
			runs = append(runs, r)
		}
	}
	return joined(runs)
}

// places are those of the eigenvalue of one rank. It has a tangent where it stays
// real, or one of a pair, on both sides: that of the parabola through three points.
func (e *eigenvalues) places(k int, along []place) []place {
	places := make([]place, len(along))
	points := e.branch.Points()
	for i, p := range along {
		p.y = real(e.spread[i][k])
		if i > 0 && i+1 < len(along) && paired(e.spread[i-1], k) == paired(e.spread[i+1], k) && paired(e.spread[i], k) == paired(e.spread[i-1], k) {
			p.dy = parabola(real(e.spread[i-1][k]), p.y, real(e.spread[i+1][k]), points[i].Arclength-points[i-1].Arclength, points[i+1].Arclength-points[i].Arclength)
		}
		places[i] = p
	}
	return places
}

func at(x, y float64) place { return place{x, y, math.NaN(), math.NaN()} }

func paired(values []complex128, k int) bool { return imag(values[k]) != 0 }

// second reports whether eigenvalue k is the later one of a pair.
func second(values []complex128, k int) bool {
	return k > 0 && paired(values, k) && cmplx.Abs(values[k-1]-cmplx.Conj(values[k])) <= 1e-9*cmplx.Abs(values[k])
}

// eigenMark is a special point on the zero line: a fold with the tangent with which
// its eigenvalue passes through 0, a crossing with both.
func eigenMark(sp continuation.Special, p place, label string) mark {
	m := mark{place: p, shape: tickShape, label: label, tangents: [2]place{unknownTangent, unknownTangent}}
	switch sp.(type) {
	case *continuation.Fold:
		m.shape, m.dx, m.dy = foldShape, 0, 1
	case *continuation.BranchPoint, *continuation.Multiple:
		m.shape = crossingShape
	case *continuation.Hopf:
		m.shape, m.dx, m.dy = ringShape, 1, 0
	default:
		m.dx, m.dy = 1, 0
	}
	return m
}

func (s *scene) zeroLine(low, high float64) {
	if s.x.shown.set {
		low, high = s.x.shown.low, s.x.shown.high
	}
	s.hair = append(s.hair, hairline{places: []place{at(low, 0), at(high, 0)}, ink: faint, counts: true, across: true})
}

// complexPlane is the scene of the eigenvalues of one steady state.
func (f *Figure) complexPlane() (*scene, error) {
	values := f.eigen.spread[0]
	f.eigen.shown = len(values)
	if f.x != "" {
		return nil, fmt.Errorf("the axes of the complex plane are fixed; X cannot change them")
	}
	s := &scene{
		x: side{label: "Real part of eigenvalue", log: f.logX, shown: f.rangeX},
		y: side{label: "Imaginary part", log: f.logY, shown: f.rangeY},
	}
	left, right, top := 0.0, 0.0, 0.0
	for k, v := range values {
		m := mark{place: at(real(v), imag(v)), shape: crossShape}
		if k < 2 && !(k == 1 && second(values, k)) {
			m.label = typeset(eigenvalueText(values[k:min(k+2, len(values))][:pairLength(values, k)]))
		}
		s.put(m)
		left, right, top = min(left, real(v)), max(right, real(v)), max(top, math.Abs(imag(v)))
	}
	if room := 0.08 * (right - left); right < room { // the half plane that is lost is seen
		right = room
	}
	if top == 0 {
		top = (right - left) / 4
	}
	for _, line := range [][]place{{at(left, 0), at(right, 0)}, {at(0, -top), at(0, top)}} {
		s.hair = append(s.hair, hairline{places: line, ink: faint, counts: true, across: true})
	}
	return s, nil
}

// pairLength is 2 for the first one of a pair and 1 for a real eigenvalue.
func pairLength(values []complex128, k int) int {
	if k+1 < len(values) && second(values, k+1) {
		return 2
	}
	return 1
}

// eigenSentence says what the figure shows.
func (f *Figure) eigenSentence(s *scene) string {
	if p := f.eigen.point; p != nil {
		return fmt.Sprintf("Eigenvalues of f_x in the complex plane, %s: %s. %s. The lines are the real and the imaginary axis.",
			p, eigenvalueText(f.eigen.spread[0]), capital(stabilitySentence(p)))
	}
	b, n := f.eigen.branch, len(f.eigen.spread[0])
	text := fmt.Sprintf("Real parts of the eigenvalues of f_x against %s, model %s, %s. ", s.x.label, b.Model().Name(), count(len(b.Points()), "point", "points"))
	if f.eigen.shown < n {
		text += fmt.Sprintf("Shown are the %d of %d with the greatest real part; the others lie far below. ", f.eigen.shown, n)
	}
	text += f.findings() + " Solid: real eigenvalues, dash-dotted: complex pairs; the thin line is zero."
	if !b.Model().Balance() {
		text += " A steady state is stable where all lie below it."
	}
	return text
}
