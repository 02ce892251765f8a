package continuation

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// A Chance is the probability that a limit is passed when parameters scatter: that the
// straight path from their medians, in the space of independent standard normal variables
// u that stand for them, meets a limit before it reaches them.
type Chance struct {
	From          *Point // the steady state at the medians
	Distributions []*Distribution

	// Index is the reliability index β, the distance of the nearest limit in u.
	Index float64
	// Nearest is that limit, the most likely one to be passed.
	Nearest *NearestLimit
	// Curvatures are the principal curvatures of the surface there in u, positive where it
	// bends away from the medians, by growing value.
	Curvatures []float64

	First float64 // Φ(-β), first order (Hasofer & Lind 1974; Rackwitz & Fiessler 1978)
	// Second is Φ(-β) Π (1 + β κ)^(-1/2) (Breitung 1984), SecondImproved the same with
	// φ(β)/Φ(-β) for β (Hohenbichler & Rackwitz 1988); NaN where the curvature could not
	// be had.
	Second, SecondImproved float64

	// Sampled is the probability by directional sampling and Error its standard error;
	// NaN without sampling.
	Sampled, Error float64
	Importance     []Importance // of the parameters, in the order of Distributions
	Sampling       SamplingTried
	Notes          []string
}

// Importance says how much of the scatter that matters comes from a parameter.
type Importance struct {
	Parameter         // with its median
	AtLimit   float64 // value at the nearest limit
	// Factor is the component of the unit vector to the nearest limit (with correlations
	// that of Der Kiureghian, γ ∝ L⁻ᵀ α); Share is its square.
	Factor, Share float64
}

// SamplingTried says what directional sampling has cost.
type SamplingTried struct {
	Directions int // in all
	Uniform    int // of them spread evenly, so that no other part of the surface is missed
	Traced     int // rays followed step by step
	Refined    int // limits refined from one near by
	Compared   int // of the refined ones, those compared with a traced ray
	Differ     int // of these, those that differed: all rays were traced then
}

// String says it in words.
func (t SamplingTried) String() string {
	text := fmt.Sprintf("%d directions (%d spread evenly), %d rays traced and %d limits refined; %d refined limits compared with traced ones",
		t.Directions, t.Uniform, t.Traced, t.Refined, t.Compared)
	if t.Differ > 0 {
		return text + fmt.Sprintf(", of which %d differed, so that all rays were traced", t.Differ)
	}
	return text
}

// Scatter lists distributions.
func Scatter(list ...*Distribution) []*Distribution { return list }

const chanceReach = 9 // Φ(-9) = 1e-19

// Chance returns the probability that a limit is passed for parameters with the
// distributions given, correlated or not (Nataf's model): to first order at the nearest
// limit in standard normal variables, to second order with the curvature there, and by
// directional sampling (Ditlevsen, Melchers & Gluver, Structural Safety 7 (1990) 91-101)
//
//	P = E[ Q_k(r(e)²) w(e) ],  Q_k the upper tail of χ² with k degrees of freedom,
//
// over random unit vectors e with the distance r(e) of the limit along e. Directions are
// drawn about the nearest limits by the curved surface that the second order assumes,
// one in eight evenly, and weighted for it by w(e), so that the mean is right whatever the
// surface is (star-shaped about the medians: behind the first limit on a ray everything
// counts as passed). The standard error is that of the means of independent batches.
//
// The parameters that have no distribution keep their values here. It is an error when
// the medians themselves lie beyond a limit.
func (p *Point) Chance(scatter []*Distribution, opts ...LimitOption) (*Chance, error) {
	c, err := p.chance(scatter, opts)
	if err != nil {
		return nil, fmt.Errorf("Chance: %w", err)
	}
	return c, nil
}

func (p *Point) chance(scatter []*Distribution, opts []LimitOption) (*Chance, error) {
	plan, err := newLimitPlan(opts)
	if err != nil {
		return nil, err
	}
	if len(plan.bounds) > 0 {
		return nil, fmt.Errorf("Keep, OnlyUp and OnlyDown are for NearestLimit; a distribution says itself where a parameter can lie")
	}
	plan.reach = math.Min(plan.reach, chanceReach)
	sp, err := newSpace(p.model, p.Parameters, scatter)
	if err != nil {
		return nil, err
	}
	if err := sp.dependence(plan.pairs); err != nil {
		return nil, err
	}
	middle, err := p.medians(sp)
	if err != nil {
		return nil, err
	}
	s, err := middle.search(sp, plan)
	if err != nil {
		return nil, err
	}
	if err := s.run(); err != nil {
		return nil, err
	}
	return s.chance(scatter)
}

// medians follows the steady state from here to the medians of a space.
func (p *Point) medians(sp *space) (*Point, error) {
	if err := p.inUse(); err != nil {
		return nil, err
	}
	u := sp.coordinates(p.Parameters)
	e, far := sized(u)
	if far < 1e-12 {
		return p, nil
	}
	if far > 12 {
		return nil, fmt.Errorf("today's parameters lie %.3g standard deviations from the medians: give distributions around them", far)
	}
	l := sp.line(u, negated(e))
	b, err := p.model.followed(p.State, l, far)
	if err != nil {
		return nil, err
	}
	switch end := b.ends[1]; end.Reason {
	case LeftRange:
	case Interrupted:
		return nil, ErrInterrupted
	case AtSpecial:
		return nil, fmt.Errorf("on the straight way from today's parameters to the medians a limit (%s) is met: the medians lie beyond it, on the wrong side", b.specials[len(b.specials)-1].Kind())
	default:
		return nil, fmt.Errorf("the steady state could not be followed from today's parameters to the medians: it %s", end.Text)
	}
	last := b.points[len(b.points)-1]
	params := make([]float64, len(p.Parameters))
	sp.line(make([]float64, len(u)), e).at(0, params)
	return p.model.settle(last.State, params)
}

// chance makes the result of a search.
func (s *limitSearch) chance(scatter []*Distribution) (*Chance, error) {
	n := s.nearest()
	c := &Chance{
		From: s.from, Distributions: scatter, Index: n.Distance, Nearest: n, First: standard.CDF(-n.Distance),
		Second: math.NaN(), SecondImproved: math.NaN(), Sampled: math.NaN(), Error: math.NaN(), Notes: s.notes,
	}
	c.Importance = s.importance()
	var cones []*cone
	for i, e := range s.found {
		cone, err := s.cone(e)
		if errors.Is(err, ErrInterrupted) {
			return c, nil
		}
		if err != nil {
			c.Notes = append(c.Notes, fmt.Sprintf("the curvature of the surface at distance %.4g is not known: %v", norm(e.u), err))
		}
		cones = append(cones, cone)
		if i == 0 && err == nil {
			c.Curvatures = cone.curvatures
			c.Second, c.SecondImproved = cone.second(cone.beta), cone.second(standard.Prob(cone.beta)/c.First)
		}
	}
	if !s.plan.noSampling {
		s.sample(c, cones)
	}
	return c, nil
}

// importance returns the direction cosines of the nearest limit.
func (s *limitSearch) importance() []Importance {
	e := s.found[0]
	alpha, _ := sized(e.u)
	if s.space.lower != nil {
		g := mat.NewVecDense(len(alpha), nil)
		if err := g.SolveVec(s.space.lower.T(), mat.NewVecDense(len(alpha), append([]float64(nil), alpha...))); err == nil {
			alpha, _ = sized(g.RawVector().Data)
		}
	}
	var list []Importance
	for i, j := range s.space.index {
		q := Parameter{s.m.parameters[j].Variable, s.from.Parameters[j]}
		list = append(list, Importance{q, e.p[j], alpha[i], alpha[i] * alpha[i]})
	}
	return list
}

// A cone describes the surface about a place where it is nearest: the unit vector to it,
// the distance, the principal directions in the tangent plane and the curvatures along
// them. Directions are drawn from it.
type cone struct {
	edge       *edge
	way        []float64
	beta       float64
	axes       [][]float64
	curvatures []float64
	stretch    []float64 // of the tangent plane along the axes
	share      float64   // of the directions
}

// cone takes the Hessian of the height of the surface over the tangent plane from
// differences of its normals.
func (s *limitSearch) cone(e *edge) (*cone, error) {
	c := &cone{edge: e}
	c.way, c.beta = sized(e.u)
	k := len(c.way)
	c.axes = complementOf(c.way)
	c.curvatures, c.stretch = make([]float64, k-1), make([]float64, k-1)
	for i := range c.stretch {
		c.stretch[i] = 1
	}
	if k == 1 || e.normal == nil {
		return c, nil
	}
	h := mat.NewSymDense(k-1, nil)
	rows, err := s.heights(e, c)
	if err != nil {
		return c, err
	}
	for i := range rows {
		for j := range i + 1 {
			h.SetSym(i, j, (rows[i][j]+rows[j][i])/2)
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(h, true) {
		return c, errors.New("its principal directions did not converge")
	}
	eigen.Values(c.curvatures)
	var turn mat.Dense
	eigen.VectorsTo(&turn)
	axes := make([][]float64, k-1)
	for i := range axes {
		axes[i] = make([]float64, k)
		for j, a := range c.axes {
			addMultiple(axes[i], turn.At(j, i), a)
		}
	}
	c.axes = axes
	psi := standard.Prob(c.beta) / standard.CDF(-c.beta)
	for i, v := range c.curvatures {
		c.stretch[i] = math.Min(math.Max(1/math.Sqrt(math.Max(1+psi*v, 0.01)), 0.25), 4)
	}
	return c, nil
}

// heights returns the rows of the Hessian of the height in the tangent plane.
func (s *limitSearch) heights(e *edge, c *cone) ([][]float64, error) {
	const h = 1e-2
	sc := newScout(s.m, s.space, e)
	defer func() { s.tried.Refined += sc.solved }()
	rows := make([][]float64, len(c.axes))
	for i, a := range c.axes {
		rows[i] = make([]float64, len(c.axes))
		for _, term := range []struct{ at, weight float64 }{{1, 8}, {-1, -8}, {2, -1}, {-2, 1}} {
			origin := make([]float64, len(a))
			addMultiple(origin, term.at*h*c.beta, a)
			at, err := sc.on(origin, c.way, e)
			if err != nil {
				return nil, err
			}
			up := dot(at.normal, c.way)
			for j, b := range c.axes {
				rows[i][j] -= term.weight * dot(at.normal, b) / up / (12 * h * c.beta)
			}
		}
	}
	return rows, nil
}

// complementOf returns an orthonormal basis of what is orthogonal to a unit vector.
func complementOf(way []float64) [][]float64 {
	k := len(way)
	basis := [][]float64{way}
	var list [][]float64
	for range k - 1 {
		// The axis that is farthest from what is there already.
		best, at := -1.0, []float64(nil)
		for i := range k {
			v := make([]float64, k)
			v[i] = 1
			for range 2 {
				for _, b := range basis {
					addMultiple(v, -dot(b, v), b)
				}
			}
			if size := norm(v); size > best+1e-12 {
				best, at = size, v
			}
		}
		at, _ = sized(at)
		basis, list = append(basis, at), append(list, at)
	}
	return list
}

// second is the second-order probability, with b for the index in the factors.
func (c *cone) second(b float64) float64 {
	p := standard.CDF(-c.beta)
	for _, v := range c.curvatures {
		if !(1+b*v > 0) {
			return math.NaN()
		}
		p /= math.Sqrt(1 + b*v)
	}
	return p
}

// Reliability returns 1 - P by the best value at hand.
func (c *Chance) Reliability() float64 { return 1 - c.Best() }

// Best returns the sampled probability, without sampling the improved second-order one,
// and without that the first-order one.
func (c *Chance) Best() float64 {
	for _, p := range []float64{c.Sampled, c.SecondImproved} {
		if !math.IsNaN(p) {
			return p
		}
	}
	return c.First
}

// String says the chance in one line.
func (c *Chance) String() string {
	text := fmt.Sprintf("probability that a limit (%s) is passed: first order %.4g (index %.4g)", c.Nearest.Kind, c.First, c.Index)
	if !math.IsNaN(c.SecondImproved) {
		text += fmt.Sprintf(", second order %.4g", c.SecondImproved)
	}
	if !math.IsNaN(c.Sampled) {
		text += fmt.Sprintf(", by directional sampling %.4g ± %.1g", c.Sampled, c.Error)
	}
	return text
}
