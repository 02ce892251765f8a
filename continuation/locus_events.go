package continuation

import (
	"errors"
	"math"
	"math/cmplx"

	"brinkline/continuation/linalg"
)

// A locusPlan ties a run of the walker to the locus that it follows.
type locusPlan struct {
	locus *Locus
	core  *core
	first defining // as at the start
}

// moved renews the borders at an accepted node.
func (p *locusPlan) moved(t *tracer, a *node) error {
	y := a.x
	t.s.p[t.s.free] = a.lambda
	p.core.load(y, t.s.p)
	if err := p.core.jacobian(y); err != nil {
		return err
	}
	return p.core.def.renew(p.core, y)
}

// restart puts the borders back to those of the start.
func (p *locusPlan) restart() { p.core.def = p.first.copy() }

func (d *foldDefining) copy() defining { return &foldDefining{b: d.b, c: d.c} }

func (d *hopfDefining) copy() defining {
	return &hopfDefining{b: d.b, c: d.c, chosen: d.chosen, unit: d.unit}
}

// Kinds of special points of loci.
const (
	cusp            = "cusp"
	bogdanovTakens  = "Bogdanov-Takens point"
	foldHopf        = "fold-Hopf point"
	hopfHopf        = "Hopf-Hopf point"
	degenerateHopf  = "degenerate Hopf point"
	smallAtRoot     = 1e-5 // of the largest eigenvalue, that a crossing one must be down to
	axisOfOmega     = 1e-4 // ω over the largest eigenvalue, below which a pair counts as real
	mostEigenvalues = 500
)

// watches returns what is looked for along a locus: functions of its points that
// change sign at special points. A NaN says that there is nothing to see.
func (l *Locus) watches(c *core) []watch {
	look := func(kind string, f func(y []float64) float64) watch {
		return watch{name: kind, quiet: true, f: func(p *Point) float64 {
			c.load(p.State, p.Parameters)
			if c.jacobian(p.State) != nil {
				return math.NaN()
			}
			return f(p.State)
		}}
	}
	if l.kind == "fold" {
		d := func() *foldDefining { return c.def.(*foldDefining) }
		return []watch{
			look(cusp, func(y []float64) float64 { return d().quadratic(c, y) }),
			look(bogdanovTakens, func(y []float64) float64 { return d().product(c) }),
			look(foldHopf, func(y []float64) float64 { return c.otherPair(0) }),
		}
	}
	return []watch{
		look(bogdanovTakens, func(y []float64) float64 { return y[c.n+1] }),
		look(foldHopf, func(y []float64) float64 { return c.realNearest(y[c.n+1]) }),
		look(hopfHopf, func(y []float64) float64 { return c.otherPair(y[c.n+1]) }),
		look(degenerateHopf, func(y []float64) float64 { return c.lyapunovAt(y) }),
	}
}

// quadratic returns 1/2 wᵀ f_xx[v, v] for |v| = |w| = 1 in scaled variables, with the
// signs of the borders, which go along with the locus.
func (d *foldDefining) quadratic(c *core, y []float64) float64 {
	if d.solve(c) != nil {
		return math.NaN()
	}
	v, w := unit(d.v), unit(d.w)
	along, out := make([]float64, c.n+1), make([]float64, c.n)
	for i := range c.n {
		along[i] = v[i] * c.s.sx[i]
	}
	if c.s.diff.Second(y[:c.n], c.p, c.first, along, out) != nil {
		return math.NaN()
	}
	sum := 0.0
	for i := range c.n {
		sum += w[i] / c.rows[i] * out[i]
	}
	return sum / 2
}

// product returns wᵀ v in the user's units over the sum of its absolute terms: 0
// where a second eigenvalue vanishes.
func (d *foldDefining) product(c *core) float64 {
	if d.solve(c) != nil {
		return math.NaN()
	}
	sum, size := 0.0, 0.0
	for i := range c.n {
		term := d.w[i] / c.rows[i] * d.v[i] * c.s.sx[i]
		sum, size = sum+term, size+math.Abs(term)
	}
	return sum / size
}

// eigenvalues returns those of f_x at hand.
func (c *core) eigenvalues() []complex128 {
	fx := make([]float64, len(c.fx))
	for i := range c.n {
		for k := range c.n {
			fx[i*c.n+k] = c.fx[i*c.n+k] * c.s.sx[k] / c.s.sx[i]
		}
	}
	var e linalg.Eigen
	values, err := e.Values(fx, c.n)
	if err != nil {
		return nil
	}
	return values
}

// otherPair returns the real part of the complex pair nearest the imaginary axis
// that is not the critical one of squared frequency kappa; NaN where there is none.
func (c *core) otherPair(kappa float64) float64 {
	best := math.NaN()
	critical := nearestTo(c.eigenvalues(), kappa)
	for i, v := range c.eigenvalues() {
		if imag(v) <= 0 || i == critical {
			continue
		}
		if math.IsNaN(best) || math.Abs(real(v)) < math.Abs(best) {
			best = real(v)
		}
	}
	return best
}

// realNearest returns the real eigenvalue nearest 0; NaN where there is none, or
// where the critical pair is real itself.
func (c *core) realNearest(kappa float64) float64 {
	if kappa <= 0 {
		return math.NaN()
	}
	best := math.NaN()
	for _, v := range c.eigenvalues() {
		if imag(v) == 0 && (math.IsNaN(best) || math.Abs(real(v)) < math.Abs(best)) {
			best = real(v)
		}
	}
	return best
}

// nearestTo returns the index of the eigenvalue nearest i sqrt(kappa), -1 for
// kappa <= 0.
func nearestTo(values []complex128, kappa float64) int {
	if kappa <= 0 {
		return -1
	}
	at, best := complex(0, math.Sqrt(kappa)), -1
	for i, v := range values {
		if best < 0 || cmplx.Abs(v-at) < cmplx.Abs(values[best]-at) {
			best = i
		}
	}
	return best
}

// lyapunovAt returns the first Lyapunov coefficient at a Hopf point of the locus,
// scaled by its frequency; NaN where there is no frequency.
func (c *core) lyapunovAt(y []float64) float64 {
	kappa := y[c.n+1]
	if size := spectralSize(c.eigenvalues()); !(kappa > math.Pow(axisOfOmega*size, 2)) {
		return math.NaN()
	}
	omega := math.Sqrt(kappa)
	pair, err := newCriticalPair(append([]float64(nil), c.fx...), c.s.sx, omega)
	if err != nil {
		return math.NaN()
	}
	l1, err := c.forms(y).lyapunov(pair, omega)
	if err != nil {
		return math.NaN()
	}
	return l1
}

func (c *core) forms(y []float64) forms {
	sizes := append(append([]float64(nil), c.s.sx...), c.s.sp[c.first])
	return forms{c.s, c.n, y[:c.n], c.p, c.first, sizes}
}

// collect turns the run on the augmented model into points of the model.
func (l *Locus) collect(c *core) {
	special := map[int]*Event{}
	for _, e := range l.branch.Events() {
		special[e.Index()] = e
	}
	for _, p := range l.branch.points {
		l.points = append(l.points, l.point(c, p))
	}
	for i, p := range l.branch.points {
		if e, ok := special[i]; ok {
			l.special(c, i, e, p)
		}
	}
}

func (l *Locus) point(c *core, p *Point) *LocusPoint {
	c.load(p.State, p.Parameters)
	base := *p
	base.model, base.Parameter, base.Tangent = l.model, l.model.parameters[l.second].Name, nil
	base.State = p.State[:c.n:c.n]
	base.Parameters = append([]float64(nil), c.p...)
	base.sizes = nil
	q := &LocusPoint{Point: &base, First: p.State[c.n], Second: p.Value(), first: l.first}
	if c.jacobian(p.State) != nil {
		return q
	}
	base.Eigenvalues = c.eigenvalues()
	critical := 1
	if l.kind == "fold" {
		q.Quadratic = l.quadratic(c, p.State)
	} else {
		critical = 2
		q.Quadratic = math.NaN()
		q.Omega = math.Sqrt(p.State[c.n+1])
		q.Lyapunov = c.lyapunovAt(p.State)
	}
	base.Unstable = countBeyond(base.Eigenvalues, critical)
	return q
}

// quadratic returns 1/2 wᵀ f_xx[v, v] with the signs of the point before.
func (l *Locus) quadratic(c *core, y []float64) float64 {
	v, w, err := c.nullPair()
	if err != nil {
		return math.NaN()
	}
	if l.lastV != nil && dot(v, l.lastV) < 0 {
		v = negated(v)
	}
	if l.lastW != nil && dot(w, l.lastW) < 0 {
		w = negated(w)
	}
	l.lastV, l.lastW = v, w
	vv, err := c.forms(y).square(state(v))
	if err != nil {
		return math.NaN()
	}
	return dot(w, vv) / 2
}

// countBeyond counts eigenvalues with positive real part, leaving out the critical
// ones, those nearest the imaginary axis.
func countBeyond(values []complex128, critical int) int {
	left := make([]bool, len(values))
	for range min(critical, len(values)) {
		best := -1
		for i, v := range values {
			if !left[i] && (best < 0 || math.Abs(real(v)) < math.Abs(real(values[best]))) {
				best = i
			}
		}
		left[best] = true
	}
	count := 0
	for i, v := range values {
		if !left[i] && real(v) > 0 {
			count++
		}
	}
	return count
}

// special adds what an event of the augmented run stands for, when it is confirmed.
func (l *Locus) special(c *core, i int, e *Event, p *Point) {
	q := l.points[i]
	s := &LocusSpecial{Kind: e.Name, Where: q, index: i}
	if !l.confirmed(c, s, p) {
		return
	}
	l.specials = append(l.specials, s)
	if err := l.describe(c, s, p); err != nil && !errors.Is(err, ErrInterrupted) {
		l.notes = append(l.notes, "the coefficients at the "+s.String()+" could not be computed: "+err.Error())
	}
}

// confirmed checks that what changed sign is zero there, and tells a
// Bogdanov-Takens point from what else vanishes with it.
func (l *Locus) confirmed(c *core, s *LocusSpecial, p *Point) bool {
	c.load(p.State, p.Parameters)
	if c.jacobian(p.State) != nil {
		return false
	}
	values := c.eigenvalues()
	size := spectralSize(values)
	kappa := 0.0
	if l.kind != "fold" {
		kappa = p.State[c.n+1]
	}
	switch s.Kind {
	case foldHopf:
		v := c.otherPair(0)
		if l.kind != "fold" {
			v = c.realNearest(kappa)
		}
		if i := nearestAxis(values); l.kind == "fold" {
			s.Omega = math.Abs(imag(values[i]))
		} else {
			s.Omega = math.Sqrt(kappa)
		}
		return math.Abs(v) < smallAtRoot*size && s.Omega > axisOfOmega*size
	case hopfHopf:
		s.Omega = math.Sqrt(kappa)
		v := c.otherPair(kappa)
		for _, x := range values {
			if real(x) == v && imag(x) > 0 {
				s.Omega2 = imag(x)
			}
		}
		return math.Abs(v) < smallAtRoot*size && kappa > 0
	case degenerateHopf:
		s.Omega = math.Sqrt(kappa)
		return kappa > 0 && l.throughZero(s.index, s.Where.Lyapunov)
	}
	return true
}

// throughZero reports whether the first Lyapunov coefficient changes its sign at a
// point by passing zero, and not through a pole, as it does at a fold-Hopf point: it
// is small there against what it is some points away on either side.
func (l *Locus) throughZero(i int, value float64) bool {
	const around = 4
	for _, side := range []int{-1, +1} {
		largest := 0.0
		for k := i + side; k >= 0 && k < len(l.points) && k != i+side*(around+1); k += side {
			if v := math.Abs(l.points[k].Lyapunov); finite(v) {
				largest = math.Max(largest, v)
			}
		}
		if largest > 0 && math.Abs(value) > 1e-3*largest {
			return false
		}
	}
	return true
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// describe computes the coefficients of a special point.
func (l *Locus) describe(c *core, s *LocusSpecial, p *Point) error {
	var err error
	switch s.Kind {
	case cusp:
		s.Cubic, err = c.cubicAt(p.State)
	case bogdanovTakens:
		s.A2, s.B2, err = c.doubleZero(p.State)
	}
	return err
}
