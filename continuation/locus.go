package continuation

import (
	"fmt"
	"math"
)

// A Locus is the curve of folds or of Hopf points in two parameters: where the
// limit moves to when a second parameter drifts.
type Locus struct {
	model    *Model
	kind     string
	first    int     // index of the parameter in which the points were found
	second   int     // index of the parameter along which they are followed
	size     float64 // of the first parameter, from the run that found the start
	branch   *Branch
	points   []*LocusPoint
	specials []*LocusSpecial
	notes    []string

	lastV, lastW []float64 // null vectors of the point collected last
}

// A LocusPoint is a fold or a Hopf point on a locus.
type LocusPoint struct {
	*Point                // the steady state, at both parameter values
	First, Second float64 // values of the two parameters
	// Quadratic is 1/2 wᵀ f_xx[v, v] of a fold, with |v| = |w| = 1 in the user's units
	// and signs kept along the locus: it vanishes at a cusp. NaN for a Hopf point.
	Quadratic float64
	// Omega is the frequency of a Hopf point, 0 on a fold locus; NaN beyond a
	// Bogdanov-Takens point, where the locus is one of neutral saddles.
	Omega float64
	// Lyapunov is the first Lyapunov coefficient of a Hopf point.
	Lyapunov float64

	first int // index of the first parameter
}

// A LocusSpecial is a point of a locus at which the kind of limit changes: a cusp, a
// Bogdanov-Takens, fold-Hopf, Hopf-Hopf or degenerate Hopf point.
type LocusSpecial struct {
	Kind  string
	Where *LocusPoint
	index int

	Cubic  float64 // cusp: 1/6 wᵀ (f_xxx[v,v,v] + 3 f_xx[v,h]), wᵀ v = 1
	A2, B2 float64 // Bogdanov-Takens: coefficients of the normal form
	Omega  float64 // fold-Hopf, degenerate Hopf, and the first of Hopf-Hopf
	Omega2 float64 // Hopf-Hopf: the frequency of the other pair
}

// Pair returns the two parameters of the locus, with their values here.
func (p *LocusPoint) Pair() (first, second Parameter) {
	list := p.model.parameters
	return Parameter{list[p.first].Variable, p.First}, Parameter{list[p.free].Variable, p.Second}
}

// Index returns the place of the point among the points of its locus.
func (s *LocusSpecial) Index() int { return s.index }

// String says the point in one line: cusp at Coolant 303.4 K, Inflow 88 L/min.
func (s *LocusSpecial) String() string {
	m := s.Where.model
	var words []string
	for _, j := range []int{s.Where.first, s.Where.free} {
		q := m.parameters[j]
		words = append(words, q.Name+" "+withUnit(s.Where.Parameters[j], q.Unit))
	}
	return fmt.Sprintf("%s at %s, %s", s.Kind, words[0], words[1])
}

// Model returns the model.
func (l *Locus) Model() *Model { return l.model }

// Kind returns "fold" or "Hopf point".
func (l *Locus) Kind() string { return l.kind }

// First returns the parameter in which the points are limits.
func (l *Locus) First() Parameter { return l.model.parameters[l.first] }

// Second returns the parameter along which the limit was followed.
func (l *Locus) Second() Parameter { return l.model.parameters[l.second] }

// Points returns the points in the order of the curve.
func (l *Locus) Points() []*LocusPoint { return l.points }

// Start returns the index of the point that the locus was followed from.
func (l *Locus) Start() int { return l.branch.start }

// Specials returns the special points in the order of the curve.
func (l *Locus) Specials() []*LocusSpecial { return l.specials }

// Cusps returns the cusps, at which two folds meet and vanish.
func (l *Locus) Cusps() []*LocusSpecial { return l.ofKind("cusp") }

// BogdanovTakens returns the points at which a fold and a Hopf locus touch.
func (l *Locus) BogdanovTakens() []*LocusSpecial { return l.ofKind("Bogdanov-Takens point") }

func (l *Locus) ofKind(kind string) []*LocusSpecial {
	var list []*LocusSpecial
	for _, s := range l.specials {
		if s.Kind == kind {
			list = append(list, s)
		}
	}
	return list
}

// Ends says why the locus ends where it ends.
func (l *Locus) Ends() [2]End { return l.branch.ends }

// Closed reports whether the locus is a closed curve.
func (l *Locus) Closed() bool { return l.branch.closed }

// Notes holds what could not be resolved, one line each.
func (l *Locus) Notes() []string { return l.notes }

// String says the locus in one line.
func (l *Locus) String() string {
	text := fmt.Sprintf("locus of %ss of %s in %s and %s, %d points", l.kind, l.model.name, l.First().Name, l.Second().Name, len(l.points))
	for _, s := range l.specials {
		text += "; " + s.String()
	}
	return text
}

// Limits returns the values of the first parameter at which the locus passes a
// value of the second, on the straight line between its points; [LandAt] puts a
// point there exactly.
func (l *Locus) Limits(second float64) []float64 {
	var list []float64
	for i := 1; i < len(l.points); i++ {
		a, b := l.points[i-1], l.points[i]
		if (a.Second <= second) == (b.Second <= second) {
			continue
		}
		u := (second - a.Second) / (b.Second - a.Second)
		list = append(list, (1-u)*a.First+u*b.First)
	}
	return list
}

// Follow follows the fold in a second parameter: the curve on which f(x, p) = 0 and
// f_x is singular, by the same walker on the minimally augmented system with
// borders renewed along the way. [Within] is for the second parameter, [Bound] for
// the first one and for states.
func (f *Fold) Follow(second string, opts ...FollowOption) (*Locus, error) {
	l, c, start, plan, err := beginLocus(f.point, "fold", second, opts)
	if err != nil {
		return nil, err
	}
	d := &foldDefining{}
	c.def = d
	c.s.sp[c.first] = math.Max(c.s.sp[c.first], l.size)
	// The borders of the fold are its null vectors, in scaled variables.
	d.c, d.b = make([]float64, c.n), make([]float64, c.n)
	for i := range c.n {
		d.c[i], d.b[i] = f.Right[i]/c.s.sx[i], f.Left[i]*c.rows[i]
	}
	d.c, d.b = unit(d.c), unit(d.b)
	return l.follow(c, start, plan)
}

// Follow follows the Hopf point in a second parameter, past a Bogdanov-Takens point
// into neutral saddles, with the frequency as a further unknown.
func (h *Hopf) Follow(second string, opts ...FollowOption) (*Locus, error) {
	l, c, start, plan, err := beginLocus(h.point, "Hopf point", second, opts)
	if err != nil {
		return nil, err
	}
	d := &hopfDefining{}
	c.def = d
	pair, err := newCriticalPair(c.fx, c.s.sx, h.Omega)
	if err != nil {
		return nil, fmt.Errorf("Follow: %w", err)
	}
	start = append(start, h.Omega*h.Omega)
	if err := d.begin(c, start, pair); err != nil {
		return nil, fmt.Errorf("Follow: %w", err)
	}
	return l.follow(c, start, plan)
}

// beginLocus checks names and makes the core at the point.
func beginLocus(p *Point, kind, second string, opts []FollowOption) (*Locus, *core, []float64, *plan, error) {
	m := p.model
	fail := func(err error) (*Locus, *core, []float64, *plan, error) {
		return nil, nil, nil, nil, fmt.Errorf("Follow %s: %w", second, err)
	}
	j, err := m.parameterIndex(second)
	if err != nil {
		return nil, nil, nil, nil, fmt.Errorf("Follow: %w", err)
	}
	if j == p.free {
		return fail(fmt.Errorf("the %s was found in %s; a locus wants a second parameter", kind, second))
	}
	plan, err := newPlan(opts)
	if err != nil {
		return fail(err)
	}
	s := newSystem(m, p.State, p.Parameters, p.free)
	if p.sizes != nil {
		for i, v := range p.sizes.states {
			s.sx[i] = math.Max(s.sx[i], v)
		}
	}
	if err := enters(s, p, j, kind); err != nil {
		return fail(err)
	}
	n := s.n
	c := &core{
		s: s, n: n, first: p.free, p: append([]float64(nil), p.Parameters...),
		fx: make([]float64, n*n), scaled: make([]float64, n*n), rows: make([]float64, n),
	}
	y := append(append([]float64(nil), p.State...), p.Value())
	c.load(y, p.Parameters)
	if err := c.size(y); err != nil {
		return fail(err)
	}
	size := 0.0
	if p.sizes != nil {
		size = p.sizes.parameter
	}
	return &Locus{model: m, kind: kind, first: p.free, second: j, size: size}, c, y, plan, nil
}

// enters checks that the second parameter enters the equations at all.
func enters(s *system, p *Point, j int, kind string) error {
	col := make([]float64, s.n)
	x := append([]float64(nil), p.State...)
	for try := range 2 {
		if err := s.diff.Parameter(x, p.Parameters, j, col); err != nil {
			return err
		}
		for _, v := range col {
			if v != 0 {
				return nil
			}
		}
		for i := range x { // zero by chance at this state, perhaps
			x[i] += 1e-3 * float64(try+1) * s.sx[i]
		}
	}
	return fmt.Errorf("%s does not enter the equations, so the %s does not move with it", s.m.parameters[j].Name, kind)
}

// follow runs the walker on the augmented model.
func (l *Locus) follow(c *core, y []float64, plan *plan) (*Locus, error) {
	augmented := l.augmented(c)
	plan.locus = &locusPlan{locus: l, core: c, first: c.def.copy()}
	plan.spectra = noValues
	if plan.eventful {
		plan.watches = append(plan.watches, l.watches(c)...)
	}
	p := &Point{State: y, Parameters: append([]float64(nil), c.p...), Unstable: -1, model: augmented, free: -1}
	up, err := begin(p, l.second, plan)
	if err != nil {
		return nil, fmt.Errorf("Follow %s: %w", l.model.parameters[l.second].Name, err)
	}
	r := &run{plan: plan, task: fmt.Sprintf("Follow the %s in %s", l.kind, l.model.parameters[l.second].Name), up: up}
	l.branch = r.both()
	l.notes = append(l.notes, l.branch.notes...)
	l.collect(c)
	return l, nil
}

// augmented makes the model that the walker follows.
func (l *Locus) augmented(c *core) *Model {
	m := *l.model
	m.balance = true
	m.equations, m.der = c, c
	first := l.model.parameters[l.first].Variable
	if first.Scale == 0 {
		first.Scale = math.Max(math.Abs(c.p[l.first]), l.size)
	}
	c.s.sp[l.first] = math.Max(c.s.sp[l.first], l.size)
	m.states = append(append([]Variable(nil), l.model.states...), first)
	for i := range c.n {
		m.states[i].Scale = c.s.sx[i]
	}
	if c.def.unknowns() == 2 {
		m.states = append(m.states, Variable{Name: "squared frequency"})
	}
	m.quantities = nil
	m.observer = nil
	return &m
}
