package continuation

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// A NearestLimit is the point of the surface of limits that lies nearest to today's
// parameters, measured in scales or standard deviations.
type NearestLimit struct {
	From *Point
	At   *Point // the steady state at the limit
	Kind string // of the limit: "fold", "Hopf point" or another special point
	// Distance is sqrt(Σ ((p_i - p_i today)/scale_i)²); with correlations that of
	// Mahalanobis.
	Distance float64
	// Normal is the unit normal of the surface there in scaled parameters, away from
	// today's steady state, in the order of Changes. Without bounds it points along the
	// way to the limit.
	Normal  []float64
	Changes []ScaledChange
	// Others are further places at which the surface is locally nearest, by growing
	// distance.
	Others []*NearestLimit

	Tried LimitsTried
	Notes []string

	edge *edge
}

// A ScaledChange is that of one parameter on the way to the nearest limit.
type ScaledChange struct {
	Change
	Scale float64 // in the parameter's unit
	Share float64 // part of the squared distance
	Bound bool    // the parameter stands at a bound
}

// LimitsTried says how much a search for limits has tried.
type LimitsTried struct {
	Starts  int // directions from which the search began
	Met     int // of them, those that met a limit
	Rays    int // rays followed from today's point to check the result
	Nearer  int // limits met on these nearer than what was known then
	Traced  int // rays followed step by step, all in all
	Refined int // limits refined from one near by
}

// String says it in words.
func (t LimitsTried) String() string {
	return fmt.Sprintf("%d starts, %d of which met a limit; %d rays from today's point as a check, %d of which met a nearer one than was known; %d rays traced and %d limits refined in all",
		t.Starts, t.Met, t.Rays, t.Nearer, t.Traced, t.Refined)
}

// NearestLimit returns the limit that is nearest to this steady state when all the
// parameters named may move, each measured by a scale (or standard deviation) of its own
// in its unit: the normal-vector iteration of Dobson (Journal of Nonlinear Science 3
// (1993) 307-327),
//
//	u ← (N · u*) N,  u* the limit met along u, N the unit normal there,
//
// with the steps shortened until the distance falls, from several starts, on the tangent
// plane within bounds where there are any. A limit counts when the straight path from
// today's point meets it first. The result is checked against the full surface: rays in
// many directions are followed step by step to its distance. That is an effort, and no
// proof.
func (p *Point) NearestLimit(scales map[string]float64, opts ...LimitOption) (*NearestLimit, error) {
	s, err := p.hunt(scales, opts)
	if err != nil {
		return nil, fmt.Errorf("NearestLimit: %w", err)
	}
	if err := s.run(); err != nil {
		return nil, fmt.Errorf("NearestLimit: %w", err)
	}
	return s.nearest(), nil
}

// hunt sets up the search in scaled shifts.
func (p *Point) hunt(scales map[string]float64, opts []LimitOption) (*limitSearch, error) {
	plan, err := newLimitPlan(opts)
	if err != nil {
		return nil, err
	}
	if err := p.model.knowsAll(scales); err != nil {
		return nil, err
	}
	var list []*Distribution
	for j, q := range p.model.parameters {
		if scale, ok := scales[q.Name]; ok {
			list = append(list, Normal(q.Name, p.Parameters[j], scale))
		}
	}
	sp, err := newSpace(p.model, p.Parameters, list)
	if err != nil {
		return nil, err
	}
	if err := sp.dependence(plan.pairs); err != nil {
		return nil, err
	}
	return p.search(sp, plan)
}

// A limitSearch looks for the places at which the surface of limits is nearest to the
// origin of a space.
type limitSearch struct {
	from      *Point
	m         *Model
	space     *space
	plan      *limitPlan
	low, high []float64
	bounded   bool

	found []*edge // local minima, nearest first
	tried LimitsTried
	notes []string
}

func (p *Point) search(sp *space, plan *limitPlan) (*limitSearch, error) {
	if err := p.inUse(); err != nil {
		return nil, err
	}
	s := &limitSearch{from: p, m: p.model, space: sp, plan: plan}
	var err error
	if s.low, s.high, err = plan.box(sp, p.Parameters); err != nil {
		return nil, err
	}
	for i := range s.low {
		s.bounded = s.bounded || !math.IsInf(s.low[i], 0) || !math.IsInf(s.high[i], 0)
	}
	return s, nil
}

func (s *limitSearch) origin() []float64 { return make([]float64, s.space.dim()) }

// starts returns the directions to begin with: where f_x becomes singular fastest, along
// each parameter both ways, then random ones.
func (s *limitSearch) starts() [][]float64 {
	k := s.space.dim()
	n := s.plan.starts
	if n == 0 {
		n = 2*k + 8
	}
	var list [][]float64
	if e, err := s.towardsSingular(); err == nil {
		if e = s.inside(e); e != nil {
			list = append(list, e)
		}
	}
	for i := 0; i < 2*k && len(list) < n; i++ {
		e := make([]float64, k)
		e[i/2] = float64(1 - 2*(i%2))
		if e = s.inside(e); e != nil {
			list = append(list, e)
		}
	}
	for i := 0; len(list) < n && i < 4*n; i++ {
		if e := s.inside(s.random(uint64(i))); e != nil {
			list = append(list, e)
		}
	}
	return list
}

// towardsSingular returns the direction in which the least singular value σ of f_x
// (scaled) falls fastest: dσ/dp = wᵀ (f_xp v + f_xx[v, x_p]), f_x x_p = -f_p, with its singular
// vectors v and w.
func (s *limitSearch) towardsSingular() ([]float64, error) {
	x, p := s.from.State, s.from.Parameters
	sys := newSystem(s.m, x, p, -1)
	n := sys.n
	fx, scaled := make([]float64, n*n), mat.NewDense(n, n, nil)
	if err := sys.diff.Jacobian(x, p, -1, fx); err != nil {
		return nil, err
	}
	rows := make([]float64, n)
	for i := range n {
		for k := range n {
			rows[i] += math.Abs(fx[i*n+k]) * sys.sx[k]
		}
		for k := range n {
			scaled.Set(i, k, fx[i*n+k]*sys.sx[k]/rows[i])
		}
	}
	w, right, err := extremes(scaled, 1)
	if err != nil {
		return nil, err
	}
	v := make([]float64, n+1)
	for i := range n {
		v[i], w[i] = right[0][i]*sys.sx[i], w[i]/rows[i]
	}
	gradient := make([]float64, len(p))
	for _, j := range s.space.index {
		way := make([]float64, n+1)
		if err := sys.diff.Parameter(x, p, j, way[:n]); err != nil {
			return nil, err
		}
		if err := solveShifted(fx, n, 0, way[:n], nil); err != nil {
			return nil, err
		}
		for i := range n {
			way[i] = -way[i]
		}
		way[n] = 1
		f := forms{sys, n, x, p, j, append(append([]float64(nil), sys.sx...), sys.sp[j])}
		b, err := f.product(v, way)
		if err != nil {
			return nil, err
		}
		gradient[j] = dot(w, b)
	}
	l := s.space.line(s.origin(), s.origin())
	l.at(0, make([]float64, len(p)))
	e := make([]float64, s.space.dim())
	s.space.pull(gradient, l.slopes, e)
	if dot(w, mulVec(fx, v[:n])) > 0 {
		e = negated(e)
	}
	if !(norm(e) > 0) {
		return nil, errors.New("nothing moves the least singular value")
	}
	e, _ = sized(e)
	return e, nil
}

// mulVec returns A v of a square matrix row by row.
func mulVec(a, v []float64) []float64 {
	n := len(v)
	out := make([]float64, n)
	for i := range out {
		out[i] = dot(a[i*n:(i+1)*n], v)
	}
	return out
}

// random returns random direction i.
func (s *limitSearch) random(i uint64) []float64 {
	r := rand.New(rand.NewPCG(s.plan.seed, 0x9e3779b97f4a7c15+i))
	e := make([]float64, s.space.dim())
	for k := range e {
		e[k] = r.NormFloat64()
	}
	e, _ = sized(e)
	return e
}

// inside turns a direction into the bounds, and returns nil where it has no part in
// them.
func (s *limitSearch) inside(e []float64) []float64 {
	out := slices.Clone(e)
	for i := range out {
		if (out[i] > 0 && s.high[i] == 0) || (out[i] < 0 && s.low[i] == 0) {
			out[i] = -out[i]
			if len(out) > 1 && math.Abs(e[i]) == 1 {
				return nil // the axis itself, whose other half is a start already
			}
		}
	}
	return out
}

// exit returns how far a ray stays within the bounds.
func (s *limitSearch) exit(e []float64) float64 {
	far := math.Inf(1)
	for i, v := range e {
		switch {
		case v > 0:
			far = math.Min(far, s.high[i]/v)
		case v < 0:
			far = math.Min(far, s.low[i]/v)
		}
	}
	return far
}

// trace follows a ray from today's point.
func (s *limitSearch) trace(e []float64, far float64) (*edge, error) {
	return s.m.traced(s.from.State, s.space.line(s.origin(), e), far)
}

// A catchOfRay is what one start or ray has brought.
type catchOfRay struct {
	edge            *edge
	met             bool
	traced, refined int
	note            string
	err             error // an interrupt
}

// run does the whole search.
func (s *limitSearch) run() error {
	starts := s.starts()
	s.tried.Starts = len(starts)
	err := s.all(len(starts), func(i int) catchOfRay { return s.fromDirection(starts[i], s.plan.reach) })
	if err == nil && len(s.found) > 0 {
		err = s.check()
	}
	switch {
	case len(s.found) > 0 && err != nil:
		s.notes = append(s.notes, "interrupted: the search was not brought to its end")
		return nil
	case err != nil:
		return err
	case len(s.found) == 0 && s.bounded:
		return fmt.Errorf("no limit within the bounds and %g scales of today's point, looked for from %d directions%s", s.plan.reach, len(starts), s.why())
	case len(s.found) == 0:
		return fmt.Errorf("no limit within %g scales of today's point in %d directions%s; look farther with Reach", s.plan.reach, len(starts), s.why())
	}
	return nil
}

func (s *limitSearch) why() string {
	if len(s.notes) == 0 {
		return ""
	}
	return fmt.Sprintf(" (%s)", s.notes[0])
}

// all does n jobs and merges what they find, in order.
func (s *limitSearch) all(n int, job func(i int) catchOfRay) error {
	var stopped error
	next := func(i int) func() catchOfRay {
		if i >= n || stopped != nil {
			return nil
		}
		return func() catchOfRay { return job(i) }
	}
	inOrder(s.m.workers(s.plan.workers), lag, next, func(f catchOfRay) {
		s.tried.Traced += f.traced
		s.tried.Refined += f.refined
		if f.err != nil && stopped == nil {
			stopped = f.err
		}
		if f.met {
			s.tried.Met++
		}
		if f.note != "" && !slices.Contains(s.notes, f.note) {
			s.notes = append(s.notes, f.note)
		}
		if f.edge != nil {
			s.add(f.edge)
		}
	})
	return stopped
}

// add keeps a minimum that is not known yet.
func (s *limitSearch) add(e *edge) {
	for _, k := range s.found {
		if distance(e.u, k.u) < 1e-4*math.Max(norm(k.u), 1e-3) {
			return
		}
	}
	s.found = append(s.found, e)
	slices.SortStableFunc(s.found, func(a, b *edge) int {
		switch {
		case norm(a.u) < norm(b.u):
			return -1
		case norm(a.u) > norm(b.u):
			return 1
		}
		return 0
	})
}

func distance(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += (a[i] - b[i]) * (a[i] - b[i])
	}
	return math.Sqrt(sum)
}

// fromDirection follows a ray to its limit and descends from there.
func (s *limitSearch) fromDirection(e []float64, far float64) catchOfRay {
	f := catchOfRay{traced: 1}
	at, err := s.trace(e, far)
	switch {
	case errors.Is(err, ErrInterrupted):
		f.err = err
		return f
	case isSafe(err):
		return f
	case err != nil:
		f.note = "along one direction: " + err.Error()
		return f
	}
	f.met = true
	s.descend(at, &f)
	return f
}

// descend goes from a limit to where the surface is nearest, and makes sure that the
// straight path meets that first.
func (s *limitSearch) descend(at *edge, f *catchOfRay) {
	for range 4 {
		if at.normal == nil {
			f.note = fmt.Sprintf("a %s lies at distance %.4g; the surface has no normal there, and the search does not go on from it", at.kind, norm(at.u))
			return
		}
		sc := newScout(s.m, s.space, at)
		end, ok, err := s.iterate(sc, at)
		f.refined += sc.solved
		if err != nil {
			f.err = err
			return
		}
		if !ok {
			return
		}
		e, length := sized(end.u)
		f.traced++
		first, err := s.trace(e, length*1.001+1e-9)
		switch {
		case errors.Is(err, ErrInterrupted):
			f.err = err
			return
		case err == nil && first.t > length*(1-1e-6):
			f.edge = end
			return
		case err != nil: // lost on the way back to today's point: it is not one of its limits
			return
		}
		at = first // a nearer limit comes first on that path
	}
}

// iterate is the normal-vector iteration. ok says that it has converged to a limit
// within the bounds.
func (s *limitSearch) iterate(sc *scout, at *edge) (end *edge, ok bool, err error) {
	origin := s.origin()
	for range 100 {
		goal := s.footOfPlane(at)
		if goal == nil {
			return at, false, nil // the tangent plane lies out of bounds
		}
		gap := distance(goal, at.u)
		if gap < 1e-9*norm(at.u) {
			return at, s.holds(at), nil
		}
		next, err := s.shorter(sc, origin, at, goal, gap)
		if err != nil {
			return nil, false, err
		}
		if next == nil {
			return at, gap < 1e-5*norm(at.u) && s.holds(at), nil
		}
		at = next
	}
	return at, false, nil
}

// shorter goes from a limit towards the goal as far as the distance falls.
func (s *limitSearch) shorter(sc *scout, origin []float64, at *edge, goal []float64, gap float64) (*edge, error) {
	for share := 1.0; share > 1e-3; share /= 2 {
		u := make([]float64, len(goal))
		for i := range u {
			u[i] = at.u[i] + share*(goal[i]-at.u[i])
		}
		e, _ := sized(u)
		next, err := sc.on(origin, e, at)
		if errors.Is(err, ErrInterrupted) {
			return nil, err
		}
		if err != nil || !(next.t > 0) {
			continue
		}
		if s.better(next, at, share, gap) {
			return next, nil
		}
	}
	return nil, nil
}

// better reports whether a step has come nearer: far from the end by the distance, near
// it, where that does not change any more, by how far the limit is from the foot of its
// tangent plane.
func (s *limitSearch) better(next, at *edge, share, gap float64) bool {
	relative := gap / norm(at.u)
	if relative > 1e-4 {
		return s.merit(next) <= s.merit(at)*(1-1e-6*share*relative*relative)
	}
	foot := s.footOfPlane(next)
	return foot != nil && distance(foot, next.u) < gap
}

// merit is the distance, and more out of bounds.
func (s *limitSearch) merit(e *edge) float64 {
	out := 0.0
	for i, v := range e.u {
		out += math.Max(0, v-s.high[i]) + math.Max(0, s.low[i]-v)
	}
	return norm(e.u) + 10*out
}

// holds reports whether a limit lies within the bounds.
func (s *limitSearch) holds(e *edge) bool {
	size := norm(e.u)
	for i, v := range e.u {
		if v > s.high[i]+1e-6*size || v < s.low[i]-1e-6*size {
			return false
		}
	}
	return true
}

// footOfPlane returns the point of the tangent plane within the bounds that is nearest
// to the origin: u_i = μ N_i cut to the bounds, μ by bisection; nil where the plane does
// not meet the bounds.
func (s *limitSearch) footOfPlane(e *edge) []float64 {
	height := dot(e.normal, e.u)
	at := func(mu float64) ([]float64, float64) {
		u := make([]float64, len(e.u))
		for i, n := range e.normal {
			u[i] = math.Min(math.Max(mu*n, s.low[i]), s.high[i])
		}
		return u, dot(e.normal, u)
	}
	if !s.bounded {
		u, _ := at(height)
		return u
	}
	sign := math.Copysign(1, height)
	low, high := 0.0, math.Abs(height)
	for {
		if _, h := at(sign * high); sign*h >= math.Abs(height) {
			break
		}
		if high *= 2; high > 1e9*(1+math.Abs(height)) {
			return nil
		}
	}
	for range 200 {
		mid := (low + high) / 2
		if _, h := at(sign * mid); sign*h < math.Abs(height) {
			low = mid
		} else {
			high = mid
		}
	}
	u, _ := at(sign * high)
	return u
}

// check follows rays in many directions up to the distance of what was found: half of
// them anywhere, half around the nearest limit.
func (s *limitSearch) check() error {
	for round := range 3 {
		best := norm(s.found[0].u)
		way, _ := sized(s.found[0].u)
		before := s.found[0]
		err := s.all(s.plan.rays, func(i int) catchOfRay {
			e := s.random(uint64(1_000_000*(round+1) + i))
			if i%2 == 1 {
				for k := range e {
					e[k] = e[k] + way[k]*1.2
				}
				e, _ = sized(e)
			}
			if e = s.inside(e); e == nil {
				return catchOfRay{}
			}
			return s.ray(e, best)
		})
		s.tried.Rays += s.plan.rays
		if err != nil || s.found[0] == before {
			return err
		}
		s.tried.Nearer++
	}
	return nil
}

// ray checks one ray.
func (s *limitSearch) ray(e []float64, best float64) catchOfRay {
	far := math.Min(best*(1-1e-6), s.exit(e))
	f := s.fromDirection(e, far)
	f.met = false
	return f
}

// nearest makes the result.
func (s *limitSearch) nearest() *NearestLimit {
	n := s.limit(s.found[0])
	for _, e := range s.found[1:] {
		n.Others = append(n.Others, s.limit(e))
	}
	n.Tried, n.Notes = s.tried, s.notes
	return n
}

func (s *limitSearch) limit(e *edge) *NearestLimit {
	n := &NearestLimit{From: s.from, At: e.point(s.m), Kind: e.kind, Distance: norm(e.u), Normal: e.normal, edge: e}
	for i, j := range s.space.index {
		now := s.from.Parameters[j]
		by := e.p[j] - now
		c := Change{Parameter{s.m.parameters[j].Variable, now}, by / n.Distance, e.p[j], by}
		n.Changes = append(n.Changes, ScaledChange{
			Change: c, Scale: s.space.marg[i].SD, Share: e.u[i] * e.u[i] / (n.Distance * n.Distance),
			Bound: e.u[i] >= s.high[i]-1e-7*n.Distance || e.u[i] <= s.low[i]+1e-7*n.Distance,
		})
	}
	return n
}

// Ranked returns the changes by falling share of the squared distance.
func (n *NearestLimit) Ranked() []ScaledChange {
	list := slices.Clone(n.Changes)
	slices.SortStableFunc(list, func(a, b ScaledChange) int {
		switch {
		case a.Share > b.Share:
			return -1
		case a.Share < b.Share:
			return 1
		}
		return 0
	})
	return list
}

// String says the limit in one line.
func (n *NearestLimit) String() string {
	text := fmt.Sprintf("nearest limit (%s) at distance %.6g:", n.Kind, n.Distance)
	for i, c := range n.Ranked() {
		if i == 6 {
			text += fmt.Sprintf(" ... (%d parameters)", len(n.Changes))
			break
		}
		text += fmt.Sprintf(" %s from %s to %s;", c.Name, withUnit(c.Value, c.Unit), withUnit(c.AtLimit, c.Unit))
	}
	return text[:len(text)-1]
}
