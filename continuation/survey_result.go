package continuation

import (
	"fmt"
	"slices"
)

// A Survey is what was found in a box, and how much was tried.
type Survey struct {
	model       *Model
	frame       *frame
	points      []*Point
	outside     []*Point
	notes       []string
	effort      TriedStarts
	interrupted bool
}

// TriedStarts says how much a survey has tried.
type TriedStarts struct {
	Starts      int // places in the box from which Newton's method began
	Barren      int // of them, the last ones in a row that found nothing new
	Runs        int // of Newton's method: each start is used again until nothing more is found
	Evaluations int // of the model's function, those for finite differences included
}

// String says it in words.
func (t TriedStarts) String() string {
	return fmt.Sprintf("%d starts, %d runs of Newton's method, %d evaluations of the model", t.Starts, t.Runs, t.Evaluations)
}

func (s *search) survey() *Survey {
	v := &Survey{model: s.m, frame: s.frame, effort: s.effort, interrupted: s.stopped != nil}
	for _, r := range s.roots {
		switch {
		case !r.inside:
			v.outside = append(v.outside, r.point)
			continue
		case r.vague:
			v.notes = append(v.notes, fmt.Sprintf("f_x is nearly singular at %s: a fold or a branch point is very near, or at it", r.point.place()))
		}
		v.points = append(v.points, r.point)
	}
	for _, list := range [][]*Point{v.points, v.outside} {
		slices.SortStableFunc(list, func(a, b *Point) int { return s.frame.compare(a.State, b.State) })
	}
	if len(v.points) >= s.plan.most {
		v.notes = append(v.notes, fmt.Sprintf("stopped at %d steady states: there may be a whole curve of them; allow more with MostStates", len(v.points)))
	}
	if n := len(s.doubtful); n > 0 {
		at := &Point{State: s.doubtful[0], Parameters: s.p, model: s.m, free: -1}
		v.notes = append(v.notes, fmt.Sprintf("the equations vanish to rounding, but f_x is singular, at %s (%d starts): a fold or a branch point lies there, or a curve of steady states", at.place(), n))
	}
	return v
}

// Model returns the model.
func (s *Survey) Model() *Model { return s.model }

// Points returns the steady states in the box, sorted by the first state, then the
// second and so on. Each is there once.
func (s *Survey) Points() []*Point { return s.points }

// Outside returns steady states that were met outside of the box, sorted alike. They
// were not looked for: there may be others.
func (s *Survey) Outside() []*Point { return s.outside }

// Stable returns those of Points that are stable. Of a [Balance] there are none.
func (s *Survey) Stable() []*Point {
	var list []*Point
	for _, p := range s.points {
		if p.Stable() {
			list = append(list, p)
		}
	}
	return list
}

// Box returns the interval of each state.
func (s *Survey) Box() Box {
	b := make(Box, len(s.model.states))
	for i, v := range s.model.states {
		b[v.Name] = [2]float64{s.frame.low[i], s.frame.low[i] + s.frame.width[i]}
	}
	return b
}

// Tried returns how much was tried.
func (s *Survey) Tried() TriedStarts { return s.effort }

// Interrupted reports whether the survey was interrupted; it holds what was found
// until then.
func (s *Survey) Interrupted() bool { return s.interrupted }

// Notes holds what the survey could not confirm, one line each.
func (s *Survey) Notes() []string { return s.notes }

// Statement says how much was tried. It is no proof that there are no other steady
// states.
func (s *Survey) Statement() string {
	text := fmt.Sprintf("%s; the last %d starts found nothing new", s.effort, s.effort.Barren)
	if s.interrupted {
		text += "; interrupted"
	}
	return text
}

// String says the survey in one line.
func (s *Survey) String() string {
	text := fmt.Sprintf("%d steady states of %s in the box", len(s.points), s.model.name)
	if len(s.points) == 1 {
		text = fmt.Sprintf("1 steady state of %s in the box", s.model.name)
	}
	if !s.model.balance {
		text += fmt.Sprintf(", %d stable", len(s.Stable()))
	}
	return text + "; " + s.Statement()
}

// place names where a point lies.
func (p *Point) place() string {
	s := system{m: p.model, n: len(p.State), free: p.free}
	return s.describe(p.State, p.Parameters)
}
