package display

import (
	"errors"
	"fmt"
	"image/color"
	"math"
	"slices"

	"brinkline/continuation"
)

// A scene is what a figure draws, in the values that stand on its axes.
type scene struct {
	curves []curve
	marks  []mark
	spans  []span
	hair   []hairline
	x, y   side
}

// A curve is a branch, a locus, a trajectory or an eigenvalue.
type curve struct {
	runs   []run
	ink    color.Color
	label  string
	locus  bool
	motion bool // a trajectory
}

// A run is a part of a curve drawn with one kind of line.
type run struct {
	places []place
	line   lineKind
	fine   bool // a limit at which no stable steady state is lost
}

// A hairline is a thin line that is no curve of steady states: an axis, the path of
// a branch, a local estimate.
type hairline struct {
	places []place
	line   lineKind
	ink    color.Color
	counts bool // for the ranges of the axes
	fan    bool // the oscillation at a Hopf point
	across bool // runs on, level or upright, to the edges of the picture
}

type lineKind int

const (
	solid lineKind = iota
	dashed
	dotted // stability was not computed; neutral saddles of a locus
	dashDotted
)

// A place is a point of the figure with the tangent of its branch there, NaN
// where it is unknown.
type place struct{ x, y, dx, dy float64 }

func (p place) finite() bool {
	return !math.IsNaN(p.x) && !math.IsInf(p.x, 0) && !math.IsNaN(p.y) && !math.IsInf(p.y, 0)
}

// A mark is a special point or a steady state.
type mark struct {
	place
	shape    shape
	tangents [2]place   // dx, dy of both branches at a crossing, NaN where unknown
	edges    [2][]place // the curve on both sides of a cusp, outwards
	away     float64    // -1 where the curve turns to smaller x, +1 to greater, 0 else
	label    string
}

// A shape is what a mark looks like: the local geometry it stands for.
type shape int

const (
	dotShape      shape = iota // a steady state
	foldShape                  // a bar along the tangent at the turn
	crossingShape              // two tangents
	ringShape                  // a ring with a tick: a Hopf point
	tickShape                  // a tick across the branch: an event
	wedgeShape                 // the two edges that meet: a cusp
	restShape                  // a ring that rests on a bar: Bogdanov-Takens
	throughShape               // a ring with a bar through it: fold-Hopf
	twinShape                  // two rings: Hopf-Hopf
	halfShape                  // a ring whose hard side is filled: degenerate Hopf
	crossShape                 // an eigenvalue
)

// A span is a margin: an arrow from a steady state to a limit.
type span struct {
	from, to place
	label    string
}

// place reads a point of a branch off both axes.
func (s *scene) place(p *continuation.Point) (place, error) {
	x, err := s.x.value(p)
	if err != nil {
		return place{}, err
	}
	y, err := s.y.value(p)
	if err != nil {
		return place{}, err
	}
	return place{x, y, s.x.slope(p), s.y.slope(p)}, nil
}

// scene turns the items of a figure into what is drawn.
func (f *Figure) scene() (*scene, error) {
	if len(f.items) == 0 {
		return nil, errors.New("Plot has nothing to draw; give it a branch")
	}
	x, y, err := f.sides()
	if err != nil {
		return nil, err
	}
	s := &scene{x: x, y: y}
	if err := f.addCurves(s); err != nil {
		return nil, err
	}
	if err := f.addMarks(s); err != nil {
		return nil, err
	}
	f.addFans(s)
	if len(s.curves)+len(s.marks) == 0 || !s.anywhere() {
		return nil, fmt.Errorf("there is nothing to see: %s against %s has no finite value", y.what(), x.what())
	}
	return s, nil
}

// addCurves puts branches and loci into the scene, each with an ink and a name. In
// a plane of two parameters a branch is the path along which it was followed.
func (f *Figure) addCurves(s *scene) (err error) {
	names := f.names()
	for i, it := range f.lines() {
		c := curve{ink: inks[len(s.curves)%len(inks)], label: names[i], locus: it.locus != nil, motion: it.motion != nil}
		switch {
		case it.locus != nil:
			c.runs, err = s.locusRuns(it.locus)
		case it.motion != nil:
			c.runs, err = s.motionRuns(it.motion)
		case s.plane():
			err = s.addPath(it.branch, len(f.loci()) == 0)
		default:
			c.runs, err = s.runs(it.branch, f.reference())
		}
		if err != nil {
			return err
		}
		if c.runs != nil {
			s.curves = append(s.curves, c)
		}
	}
	return nil
}

// reference is the number of eigenvalues with positive real part that a balance
// has at the start of the first branch; its stretches with that number are solid.
func (f *Figure) reference() int {
	for _, b := range f.branches() {
		if b.Model().Balance() {
			return countAtStart(b)
		}
	}
	return 0
}

func countAtStart(b *continuation.Branch) int {
	for _, s := range b.Stretches() {
		if s.From <= b.Start() && b.Start() <= s.To {
			return s.Unstable
		}
	}
	return b.Points()[b.Start()].Unstable
}

func lineOf(b *continuation.Branch, unstable, reference int) lineKind {
	usual := 0
	if b.Model().Balance() {
		usual = reference
	}
	switch {
	case unstable < 0:
		return dotted
	case unstable == usual:
		return solid
	default:
		return dashed
	}
}

// runs cuts a branch into its stretches, and where a value is not finite.
func (s *scene) runs(b *continuation.Branch, reference int) ([]run, error) {
	places := make([]place, len(b.Points()))
	for i, p := range b.Points() {
		var err error
		if places[i], err = s.place(p); err != nil {
			return nil, err
		}
	}
	s.estimate(places)
	var runs []run
	for _, stretch := range b.Stretches() {
		line := lineOf(b, stretch.Unstable, reference)
		for _, part := range finiteParts(places[stretch.From : stretch.To+1]) {
			runs = append(runs, run{places: part, line: line})
		}
	}
	return joined(runs), nil
}

// joined makes one run of runs that follow each other with the same kind of line,
// also over the seam of a closed curve: dashes go on and no gap is seen.
func joined(runs []run) []run {
	var out []run
	for _, r := range runs {
		if n := len(out); n > 0 && meets(out[n-1], r) {
			out[n-1].places = append(slices.Clip(out[n-1].places), r.places[1:]...)
			continue
		}
		out = append(out, r)
	}
	if n := len(out); n > 1 && meets(out[n-1], out[0]) {
		out[0].places = append(slices.Clip(out[n-1].places), out[0].places[1:]...)
		out = out[:n-1]
	}
	return out
}

// meets reports whether b goes on where a ends, with the same kind of line.
func meets(a, b run) bool {
	end, begin := a.places[len(a.places)-1], b.places[0]
	return a.line == b.line && a.fine == b.fine && end.x == begin.x && end.y == begin.y
}

func finiteParts(places []place) [][]place {
	var parts [][]place
	from := 0
	for i := 0; i <= len(places); i++ {
		if i < len(places) && places[i].finite() {
			continue
		}
		if i > from {
			parts = append(parts, places[from:i])
		}
		from = i + 1
	}
	return parts
}

// estimate gives the curve no tangents where one axis has none: it is drawn
// straight from point to point then, and shows nothing that was not computed.
func (s *scene) estimate(places []place) {
	for i := range places {
		if math.IsNaN(places[i].dx) || math.IsNaN(places[i].dy) {
			places[i].dx, places[i].dy = math.NaN(), math.NaN()
		}
	}
}

// anywhere reports whether there is anything finite.
func (s *scene) anywhere() bool {
	xs, ys := s.values()
	return len(xs) > 0 && len(ys) > 0
}

// values lists what stands on the axes, for their ranges.
func (s *scene) values() (xs, ys []float64) {
	put := func(p place) {
		if p.finite() {
			xs, ys = append(xs, p.x), append(ys, p.y)
		}
	}
	for _, c := range s.curves {
		for _, r := range c.runs {
			for _, p := range r.places {
				put(p)
			}
		}
	}
	for _, h := range s.hair {
		for _, p := range h.places {
			if h.counts {
				put(p)
			}
		}
	}
	for _, m := range s.marks {
		put(m.place)
	}
	for _, sp := range s.spans {
		put(sp.from)
		put(sp.to)
	}
	return xs, ys
}
