package continuation

import (
	"fmt"
	"math"
	"slices"
	"strings"
)

// A DirectionMargin is how far several parameters can be pushed together before a limit
// is met.
type DirectionMargin struct {
	From  *Point
	Limit *Point // the steady state at the limit, all parameters in their own units
	Kind  string // of the limit: "fold", "Hopf point" or another special point
	// Steps is how many steps of the direction lead from today's parameters to the limit.
	Steps       float64
	Uncertainty float64 // estimated error of Steps
	Changes     []Change
	// Sensitivities of Steps to a change of today's value of each parameter, per unit of
	// it, in the order of the model's parameters; nil at a branch point.
	Sensitivities []float64
}

// A Change is that of one parameter on the way to a limit.
type Change struct {
	Parameter         // with its value now
	Step      float64 // of the direction, in the parameter's unit
	AtLimit   float64 // value at the limit
	By        float64 // AtLimit - Value
}

// MarginAlong follows the steady state while several parameters move together, each by
// steps of its own (name to step, in its unit), and returns how many such steps lead to
// the first limit: a fold, or a Hopf or branch point that comes before it. It looks as
// far as mostSteps steps. The derivatives along the direction come by the chain rule from
// those of the model.
func (p *Point) MarginAlong(direction map[string]float64, mostSteps float64) (*DirectionMargin, error) {
	l, err := p.ray(direction)
	if err != nil {
		return nil, fmt.Errorf("MarginAlong: %w", err)
	}
	if !positive(mostSteps) {
		return nil, fmt.Errorf("MarginAlong: %g steps are no distance to look; give a positive number", mostSteps)
	}
	if err := p.inUse(); err != nil {
		return nil, fmt.Errorf("MarginAlong: %w", err)
	}
	e, err := p.model.traced(p.State, l, mostSteps)
	if isSafe(err) {
		return nil, fmt.Errorf("MarginAlong: no limit within %g steps of %s", mostSteps, directionText(p.model, direction))
	}
	if err != nil {
		return nil, fmt.Errorf("MarginAlong: %w", err)
	}
	return p.directionMargin(l, e)
}

// ray makes the line from here along a direction.
func (p *Point) ray(direction map[string]float64) (*line, error) {
	var list []*Distribution
	e := []float64{}
	for j, q := range p.model.parameters {
		step, ok := direction[q.Name]
		switch {
		case !ok || step == 0:
			continue
		case math.IsNaN(step) || math.IsInf(step, 0):
			return nil, fmt.Errorf("the step of %s is %v", q.Name, step)
		}
		list = append(list, Normal(q.Name, p.Parameters[j], math.Abs(step)))
		e = append(e, math.Copysign(1, step))
	}
	if err := p.model.knowsAll(direction); err != nil {
		return nil, err
	}
	s, err := newSpace(p.model, p.Parameters, list)
	if err != nil {
		return nil, err
	}
	return s.line(make([]float64, s.dim()), e), nil
}

// knowsAll refuses names that are no parameters.
func (m *Model) knowsAll(values map[string]float64) error {
	for _, name := range sortedNames(values) {
		if _, err := m.parameterIndex(name); err != nil {
			return err
		}
	}
	return nil
}

func sortedNames(values map[string]float64) []string {
	var names []string
	for name := range values {
		names = append(names, name)
	}
	slices.Sort(names)
	return names
}

func directionText(m *Model, direction map[string]float64) string {
	var words []string
	for _, q := range m.parameters {
		if step := direction[q.Name]; step != 0 {
			words = append(words, fmt.Sprintf("%s %+.6g", q.Name, step))
		}
	}
	return strings.Join(words, ", ")
}

func (p *Point) directionMargin(l *line, e *edge) (*DirectionMargin, error) {
	m := &DirectionMargin{From: p, Limit: e.point(p.model), Kind: e.kind, Steps: e.t, Uncertainty: e.error}
	for i, j := range l.space.index {
		q := Parameter{p.model.parameters[j].Variable, p.Parameters[j]}
		step := l.e[i] * l.space.marg[i].SD
		m.Changes = append(m.Changes, Change{q, step, e.p[j], e.p[j] - q.Value})
	}
	if e.normal == nil {
		return m, nil
	}
	var err error
	m.Sensitivities, err = p.model.slopesOfDistance(l, e)
	return m, err
}

// slopesOfDistance returns dt/dp_j of a limit at t on a line for a shift of each of the
// parameters: -g_j / (g · dp/dt) with g the gradient of what vanishes at the limit.
func (m *Model) slopesOfDistance(l *line, e *edge) ([]float64, error) {
	all := make([]int, len(m.parameters))
	for j := range all {
		all[j] = j
	}
	s := m.systemAt(e)
	g := make([]float64, len(all))
	if e.omega > 0 {
		var err error
		if g, _, err = s.hopfSlopes(e.x, e.p, e.omega, all); err != nil {
			return nil, err
		}
	} else {
		col := make([]float64, s.n)
		for j := range g {
			if err := s.diff.Parameter(e.x, e.p, j, col); err != nil {
				return nil, err
			}
			g[j] = dot(e.w, col)
		}
	}
	speed := make([]float64, l.space.dim())
	l.at(e.t, make([]float64, len(m.parameters)))
	l.speed(speed)
	along := 0.0
	for i, j := range l.space.index {
		along += g[j] * speed[i]
	}
	for j := range g {
		g[j] = -g[j] / along
	}
	return g, nil
}

// point makes a steady state of an edge.
func (e *edge) point(m *Model) *Point {
	return &Point{State: e.x, Parameters: e.p, Unstable: e.unstable, model: m, free: -1}
}

// String says the margin in one line.
func (m *DirectionMargin) String() string {
	var words []string
	for _, c := range m.Changes {
		words = append(words, fmt.Sprintf("%s from %s to %s", c.Name, withUnit(c.Value, c.Unit), withUnit(c.AtLimit, c.Unit)))
	}
	return fmt.Sprintf("%s after %s steps: %s", m.Kind, FormatUncertain(m.Steps, m.Uncertainty, 6), strings.Join(words, ", "))
}
