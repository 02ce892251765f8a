package continuation

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// A space describes some parameters by independent coordinates u, all of one size:
// standard normal variables, or distances over a scale. z = L u with L Lᵀ the
// correlations of z, and p_i = T_i(z_i); the other parameters keep their values.
type space struct {
	m     *Model
	base  []float64 // all parameters
	index []int     // of those that vary
	marg  []*Distribution
	lower *mat.TriDense // L; nil for the identity
}

func (s *space) dim() int { return len(s.index) }

// at stores all parameters at u in p, and dT_i/dz_i in slopes.
func (s *space) at(u, p, slopes []float64) {
	copy(p, s.base)
	for i, j := range s.index {
		p[j], slopes[i] = s.marg[i].at(s.z(u, i))
	}
}

// z returns component i of L u.
func (s *space) z(u []float64, i int) float64 {
	if s.lower == nil {
		return u[i]
	}
	sum := 0.0
	for k := 0; k <= i; k++ {
		sum += s.lower.At(i, k) * u[k]
	}
	return sum
}

// pull stores the gradient with respect to u of something whose gradient with respect
// to all parameters is g.
func (s *space) pull(g, slopes, out []float64) {
	clear(out)
	for i, j := range s.index {
		d := g[j] * slopes[i]
		if s.lower == nil {
			out[i] += d
			continue
		}
		for k := 0; k <= i; k++ {
			out[k] += s.lower.At(i, k) * d
		}
	}
}

// coordinates returns the u of parameters p.
func (s *space) coordinates(p []float64) []float64 {
	u := make([]float64, s.dim())
	for i, j := range s.index {
		if s.marg[i].Kind == "normal" {
			u[i] = (p[j] - s.marg[i].Mean) / s.marg[i].SD
		} else {
			u[i] = s.marg[i].score(p[j])
		}
	}
	if s.lower != nil {
		v := mat.NewVecDense(len(u), u)
		if err := v.SolveVec(s.lower, mat.NewVecDense(len(u), append([]float64(nil), u...))); err != nil {
			panic(err) // the factor has a positive diagonal
		}
	}
	return u
}

// newSpace looks up the parameters of distributions.
func newSpace(m *Model, base []float64, list []*Distribution) (*space, error) {
	s := &space{m: m, base: append([]float64(nil), base...)}
	if len(list) == 0 {
		return nil, fmt.Errorf("no parameter is to vary: name at least one")
	}
	for _, d := range list {
		if d == nil {
			return nil, fmt.Errorf("a distribution is nil")
		}
		if d.err != nil {
			return nil, d.err
		}
		j, err := m.parameterIndex(d.Parameter)
		if err != nil {
			return nil, err
		}
		for _, k := range s.index {
			if k == j {
				return nil, fmt.Errorf("%s is given twice", d.Parameter)
			}
		}
		s.index = append(s.index, j)
		s.marg = append(s.marg, d)
	}
	return s, nil
}

// A line is a straight line u0 + t e in a space, along which a limit is looked for.
type line struct {
	space     *space
	origin, e []float64

	u, slopes []float64
}

func (s *space) line(origin, e []float64) *line {
	return &line{s, origin, e, make([]float64, s.dim()), make([]float64, s.dim())}
}

// at stores the parameters at t.
func (l *line) at(t float64, p []float64) {
	for i := range l.u {
		l.u[i] = l.origin[i] + t*l.e[i]
	}
	l.space.at(l.u, p, l.slopes)
}

// speed stores dp_j/dt at the t of the last call of at, for the parameters that vary.
func (l *line) speed(out []float64) {
	for i := range out {
		out[i] = l.slopes[i] * l.space.z(l.e, i)
	}
}

// own returns the same line with storage of its own.
func (l *line) own() *line { return l.space.line(l.origin, l.e) }

// sized returns the vector divided by its length, and the length.
func sized(v []float64) ([]float64, float64) {
	length := norm(v)
	u := make([]float64, len(v))
	for i, x := range v {
		u[i] = x / length
	}
	return u, length
}

// dependence turns the correlations of the parameters into those of z and factors
// them.
func (s *space) dependence(pairs []correlation) error {
	if len(pairs) == 0 {
		return nil
	}
	n := s.dim()
	r := mat.NewSymDense(n, nil)
	for i := range n {
		r.SetSym(i, i, 1)
	}
	for _, c := range pairs {
		i, k, err := s.pair(c)
		if err != nil {
			return err
		}
		rho, err := equivalent(s.marg[i], s.marg[k], c.rho)
		if err != nil {
			return err
		}
		r.SetSym(i, k, rho)
	}
	var chol mat.Cholesky
	if !chol.Factorize(r) || chol.Cond() > 1e14 {
		var e mat.EigenSym
		least := math.NaN()
		if e.Factorize(r, false) {
			least = e.Values(nil)[0]
		}
		return fmt.Errorf("the correlations are not positive definite (least eigenvalue %.3g): no variables can have all of them at once", least)
	}
	s.lower = mat.NewTriDense(n, mat.Lower, nil)
	chol.LTo(s.lower)
	return nil
}

// A correlation is that of two parameters.
type correlation struct {
	a, b string
	rho  float64
}

func (s *space) pair(c correlation) (i, k int, err error) {
	i, k = -1, -1
	for at, d := range s.marg {
		if d.Parameter == c.a {
			i = at
		}
		if d.Parameter == c.b {
			k = at
		}
	}
	switch {
	case i < 0 || k < 0:
		missing := c.a
		if i >= 0 {
			missing = c.b
		}
		return 0, 0, fmt.Errorf("%s is correlated but has no distribution", missing)
	case i == k:
		return 0, 0, fmt.Errorf("%s cannot be correlated with itself", c.a)
	case !(math.Abs(c.rho) < 1):
		return 0, 0, fmt.Errorf("the correlation of %s and %s is %g; it must lie between -1 and 1", c.a, c.b, c.rho)
	}
	return i, k, nil
}

// equivalent returns the correlation of the normal variables that gives the parameters
// the correlation wanted: Nataf's model (Liu & Der Kiureghian, Probabilistic Engineering
// Mechanics 1 (1986) 105-112), its integral by the trapezoidal rule instead of their fits.
func equivalent(a, b *Distribution, rho float64) (float64, error) {
	if a.Kind == "normal" && b.Kind == "normal" || rho == 0 {
		return rho, nil
	}
	const most = 0.9999
	low, high := -most, most
	if got := implied(a, b, low); rho < got {
		return 0, fmt.Errorf("no %s %s and %s %s can have a correlation of %g; the least is %.3g", a.Kind, a.Parameter, b.Kind, b.Parameter, rho, got)
	}
	if got := implied(a, b, high); rho > got {
		return 0, fmt.Errorf("no %s %s and %s %s can have a correlation of %g; the greatest is %.3g", a.Kind, a.Parameter, b.Kind, b.Parameter, rho, got)
	}
	for range 50 {
		mid := (low + high) / 2
		if implied(a, b, mid) < rho {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2, nil
}

// implied returns the correlation of T_a(z_a) and T_b(z_b) for normal z of correlation
// r.
func implied(a, b *Distribution, r float64) float64 {
	const reach, n = 7.0, 120 // trapezoidal rule over [-7, 7], exponentially accurate for smooth T
	h := 2 * reach / n
	away := math.Sqrt(1 - r*r)
	var ma, mb, aa, bb, ab, sum float64
	for i := 0; i <= n; i++ {
		z := -reach + h*float64(i)
		wz := standard.Prob(z)
		va, _ := a.at(z)
		for k := 0; k <= n; k++ {
			y := -reach + h*float64(k)
			w := wz * standard.Prob(y)
			vb, _ := b.at(r*z + away*y)
			da, db := va-a.Mean, vb-b.Mean
			sum += w
			ma, mb = ma+w*da, mb+w*db
			aa, bb, ab = aa+w*da*da, bb+w*db*db, ab+w*da*db
		}
	}
	ma, mb = ma/sum, mb/sum
	return (ab/sum - ma*mb) / math.Sqrt((aa/sum-ma*ma)*(bb/sum-mb*mb))
}
