package display

import (
	"errors"
	"fmt"
	"math"

	"brinkline/continuation"
)

// motions returns the trajectories in the order in which they were given.
func (f *Figure) motions() []item {
	var list []item
	for _, it := range f.items {
		if it.motion != nil {
			list = append(list, it)
		}
	}
	return list
}

// timed reports whether time stands on the x axis: when there is nothing but
// trajectories and nothing else was asked for.
func (f *Figure) timed() bool {
	return f.x == "" && len(f.items) > 0 && len(f.motions()) == len(f.items)
}

// timeSide is the axis of time, on which steady states have no place.
func timeSide() side {
	return side{label: "Time", value: func(*continuation.Point) (float64, error) {
		return math.NaN(), errors.New("a steady state has no place on an axis of time")
	}}
}

// addMotion puts a trajectory on the axes.
func (f *Figure) addMotion(t *continuation.Trajectory, word string) error {
	if t == nil {
		return f.put(false, "trajectory", item{})
	}
	return f.put(true, "", item{motion: t, word: word})
}

// addRelaxation puts the trajectory of a relaxation on the axes, and what it came to
// under them.
func (f *Figure) addRelaxation(r *continuation.Relaxation) error {
	if r == nil {
		return f.put(false, "relaxation", item{})
	}
	return f.addMotion(r.Trajectory(), r.String())
}

// motionRuns is a trajectory on both axes. Where they show time and states it follows
// the integrator's own interpolation between its steps; quantities go straight.
func (s *scene) motionRuns(t *continuation.Trajectory) ([]run, error) {
	if s.y.variable.Name == "" {
		return nil, errors.New("a trajectory has no steady states for YFunc; choose a state or a quantity with Y")
	}
	xs, err := s.x.along(t)
	if err != nil {
		return nil, err
	}
	ys, err := s.y.along(t)
	if err != nil {
		return nil, err
	}
	var places []place
	for i := range xs {
		if i > 0 {
			places = append(places, s.within(t, i)...)
		}
		places = append(places, at(xs[i], ys[i]))
	}
	var runs []run
	for _, part := range finiteParts(places) {
		runs = append(runs, run{places: part})
	}
	return runs, nil
}

// along reads the axis off all steps of a trajectory.
func (s side) along(t *continuation.Trajectory) ([]float64, error) {
	if s.variable.Name == "" {
		return t.Times, nil
	}
	return t.At(s.variable.Name)
}

// within returns places between step i-1 and step i.
func (s *scene) within(t *continuation.Trajectory, i int) []place {
	const parts, most = 6, 20000
	x, y := s.x.stateIndex(t), s.y.stateIndex(t)
	if (x < 0 && s.x.variable.Name != "") || y < 0 || len(t.Times) > most {
		return nil
	}
	var places []place
	for k := 1; k < parts; k++ {
		time := t.Times[i-1] + (t.Times[i]-t.Times[i-1])*float64(k)/parts
		state, err := t.StateAt(time)
		if err != nil {
			return nil
		}
		p := at(time, state[y])
		if x >= 0 {
			p.x = state[x]
		}
		places = append(places, p)
	}
	return places
}

// stateIndex returns which state stands on the axis, -1 for anything else.
func (s side) stateIndex(t *continuation.Trajectory) int {
	for i, v := range t.Model().States() {
		if v.Name == s.variable.Name {
			return i
		}
	}
	return -1
}

// motionBundle is how a trajectory or a relaxation shows itself.
func motionBundle(v any, text string) Bundle {
	f := Plot(v)
	f.captioned = true
	if err := f.Err(); err != nil {
		return plainBundle(text + " (no picture: " + err.Error() + ")")
	}
	return f.bundle()
}

// relaxationTable shows what a relaxation came to.
func relaxationTable(r *continuation.Relaxation) *Grid {
	caption := "Relaxation of " + r.Model().Name()
	if p, err := r.Steady(); err == nil {
		g := pointCard(p)
		g.caption = caption + ": " + g.caption
		return g
	}
	o := r.Oscillation()
	if o == nil {
		g := newCard(caption, "value")
		g.say("outcome", r.String())
		_, state := r.Trajectory().End()
		g.heading("states at the end")
		g.list(r.Model().States(), state, stateDigits)
		return g
	}
	g := newCard(caption+" to an oscillation", "least", "greatest", "mean")
	g.say("period", continuation.FormatUncertain(o.Period, o.Uncertainty, 8)+" in the model's unit of time")
	g.say("repeats itself to", fmt.Sprintf("%s of the swing of the states", significant(o.Repeats, 2)))
	g.heading("states")
	vars := r.Model().States()
	for i, v := range vars {
		if !g.skip(i, len(vars)) {
			g.add(v.Label(), significant(o.Least[i], stateDigits), significant(o.Greatest[i], stateDigits), significant(o.Mean[i], stateDigits))
		}
	}
	return g
}
