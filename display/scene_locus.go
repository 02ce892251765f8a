package display

import (
	"math"

	"brinkline/continuation"
)

// plane reports whether both axes are parameters: then points of a branch lie on a
// line and say nothing, but its special points do.
func (s *scene) plane() bool { return s.x.parameter && s.y.parameter }

// locusRuns cuts a locus where its kind of line changes: a Hopf locus runs on into
// neutral saddles, and a part at which no stable steady state is lost is thinner.
func (s *scene) locusRuns(l *continuation.Locus) ([]run, error) {
	places, err := s.locusPlaces(l)
	if err != nil {
		return nil, err
	}
	var runs []run
	points := l.Points()
	for i := 1; i < len(places); i++ {
		r := locusLine(l, points[i-1], points[i])
		r.places = places[i-1 : i+1 : i+1]
		if r.places[0].finite() && r.places[1].finite() {
			runs = append(runs, r)
		}
	}
	if len(points) == 1 {
		runs = []run{{places: places}}
	}
	return joined(runs), nil
}

// locusLine returns the line between two neighbours on a locus.
func locusLine(l *continuation.Locus, a, b *continuation.LocusPoint) run {
	var r run
	switch {
	case l.Kind() == foldKind:
	case math.IsNaN(a.Omega) || math.IsNaN(b.Omega):
		r.line = dotted
	default:
		r.line = dashDotted
	}
	r.fine = !l.Model().Balance() && min(a.Unstable, b.Unstable) > 0
	return r
}

const foldKind = "fold"

// locusPlaces reads the points of a locus off both axes. Their tangents are the
// derivatives by the arclength of the walker of the parabola through three
// neighbours.
func (s *scene) locusPlaces(l *continuation.Locus) ([]place, error) {
	places := make([]place, len(l.Points()))
	for i, p := range l.Points() {
		var err error
		if places[i], err = s.place(p.Point); err != nil {
			return nil, err
		}
	}
	for i, p := range l.Points() {
		if i == 0 || i == len(places)-1 {
			continue
		}
		before, after := p.Arclength-l.Points()[i-1].Arclength, l.Points()[i+1].Arclength-p.Arclength
		places[i].dx = parabola(places[i-1].x, places[i].x, places[i+1].x, before, after)
		places[i].dy = parabola(places[i-1].y, places[i].y, places[i+1].y, before, after)
	}
	return places, nil
}

// parabola returns the derivative in the middle of three values at the distances
// before and after, NaN unless both are positive.
func parabola(a, b, c, before, after float64) float64 {
	if !(before > 0 && after > 0) {
		return math.NaN()
	}
	return ((b-a)/before*after + (c-b)/after*before) / (before + after)
}

// addPath puts the thin line into a plane of parameters along which a branch was
// followed.
func (s *scene) addPath(b *continuation.Branch, counts bool) error {
	var least, greatest *continuation.Point
	for _, p := range b.Points() {
		if least == nil || p.Value() < least.Value() {
			least = p
		}
		if greatest == nil || p.Value() > greatest.Value() {
			greatest = p
		}
	}
	h := hairline{ink: faint, counts: counts}
	for _, p := range []*continuation.Point{least, greatest} {
		at, err := s.place(p)
		if err != nil {
			return err
		}
		at.dx, at.dy = math.NaN(), math.NaN()
		h.places = append(h.places, at)
	}
	s.hair = append(s.hair, h)
	return nil
}

// edge returns the direction in which a limit moves in the plane: by its sensitivity
// to the parameter on the other axis.
func (s *scene) edge(limit interface {
	Sensitivities() (*continuation.Sensitivities, error)
	Parameter() continuation.Parameter
}) (dx, dy float64) {
	list, err := limit.Sensitivities()
	if err != nil {
		return math.NaN(), math.NaN()
	}
	name := limit.Parameter().Name
	for _, one := range list.List {
		switch {
		case s.x.variable.Name == name && s.y.variable.Name == one.Name:
			return one.Slope, 1
		case s.y.variable.Name == name && s.x.variable.Name == one.Name:
			return 1, one.Slope
		}
	}
	return math.NaN(), math.NaN()
}

// addNow marks the values that the model was made with in a plane of parameters,
// unless the figure has a steady state of the analyst's own, or they lie far off.
func (f *Figure) addNow(s *scene) {
	f.nowDrawn = false
	if !s.plane() || len(f.loci()) == 0 {
		return
	}
	for _, it := range f.items {
		if it.point != nil || it.margin != nil {
			return
		}
	}
	now, ok := f.now(s)
	if !ok {
		return
	}
	xs, ys := s.values()
	if near(xs, now.x) && near(ys, now.y) {
		s.put(mark{place: now, label: s.pointLabel("now", now)})
		f.nowDrawn = true
	}
}

// now returns the place of the values that the model was made with; ok is false
// where a locus was followed at other values of its remaining parameters.
func (f *Figure) now(s *scene) (place, bool) {
	at := place{dx: math.NaN(), dy: math.NaN()}
	for _, l := range f.loci() {
		p := l.Points()[l.Start()]
		for i, q := range l.Model().Parameters() {
			switch q.Name {
			case s.x.variable.Name:
				at.x = q.Value
			case s.y.variable.Name:
				at.y = q.Value
			default:
				if q.Value != p.Parameters[i] {
					return at, false
				}
			}
		}
	}
	return at, true
}

// near reports whether a value lies among others or no further off than they reach.
func near(values []float64, v float64) bool {
	low, high := math.Inf(1), math.Inf(-1)
	for _, one := range values {
		low, high = min(low, one), max(high, one)
	}
	reach := high - low
	return v >= low-reach && v <= high+reach
}
