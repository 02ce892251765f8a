package continuation

import (
	"errors"
	"fmt"
	"math"

	"brinkline/continuation/linalg"
)

// A node is a point of a branch as the tracer works with it: state and parameter
// in the user's units, tangent and curvature in scaled variables.
type node struct {
	x      []float64
	lambda float64
	t      []float64 // unit tangent dz/ds, n+1 components, λ last
	scales []float64 // in which t and k are given
	k      []float64 // curvature d²z/ds²; nil where it could not be had
	det    int       // sign of det [F_z; tᵀ]

	eigenvalues []complex128 // nil where the count was proved without them
	unstable    int
	clear       bool      // proved: no eigenvalue crossed and returned on the way here
	proof       int       // number of the certificate that holds here, 0 for none
	fx          []float64 // f_x in scaled states; kept for the latest nodes only

	step, arc  float64
	iterations int
	contract   float64 // first contraction rate of the corrector
	special    Special // what the node is, when it is something
}

// A tracer follows a branch in one direction. The scaled variables are
// z_i = x_i / S_i and z_n = λ / S_n, with S_i = sqrt(n) times the size of state i:
// so the length of z weighs the states by their mean square, and a large system
// steps like a small one.
type tracer struct {
	s      *system
	plan   *plan
	n      int
	S      []float64 // n+1 scales
	rows   []float64 // n sizes of the equations by which they are scaled just now
	known  []float64 // sizes of states learnt from an earlier run, 0 for none
	most   []float64 // the largest sizes of the equations met so far
	jac    []float64 // n x (n+1), the last Jacobian, in the user's units
	f      []float64
	lu     linalg.LU
	stable stability

	tolerance float64 // of the corrector just now

	nodes    []*node // accepted, in order
	ds       float64 // next step length
	rejected []Rejection
	notes    []string
	steps    int
	end      *End
	lost     error // the model's last complaint, when a step failed by it
}

func newTracer(s *system, p *plan) *tracer {
	t := &tracer{s: s, plan: p, n: s.n, ds: p.first, tolerance: p.tolerance}
	t.S = make([]float64, s.n+1)
	t.rows, t.most, t.f = make([]float64, s.n), make([]float64, s.n), make([]float64, s.n)
	t.jac, t.known = make([]float64, s.n*(s.n+1)), make([]float64, s.n)
	return t
}

// setScales chooses the scales from tags, else from the start and the width of
// the parameter's range.
func (t *tracer) setScales(x []float64, lambda float64) error {
	width := t.plan.high - t.plan.low
	size := t.s.sp[t.s.free]
	if !math.IsInf(width, 0) {
		size = width
		if t.s.m.parameters[t.s.free].Scale == 0 {
			t.s.sp[t.s.free] = math.Max(math.Abs(lambda), 0.1*width)
		}
	}
	t.S[t.n] = size
	if err := t.s.Fz(x, lambda, t.jac); err != nil {
		return err
	}
	slopes := t.slopes(x)
	unknown := make([]bool, t.n)
	for i := range t.n {
		if t.s.tagged[i] {
			continue
		}
		// A state that is 0 at the start takes its size from how fast it leaves
		// it: that follows its unit, which a fixed number would not.
		s := math.Max(math.Abs(x[i]), 0.1*size*math.Abs(slopes[i]))
		s = math.Max(s, t.known[i])
		if unknown[i] = s == 0; unknown[i] {
			s = 1
		}
		t.s.sx[i] = s
	}
	t.equilibrate(unknown)
	root := math.Sqrt(float64(t.n))
	for i := range t.n {
		t.S[i] = root * t.s.sx[i]
	}
	return nil
}

// equilibrate gives states of unknown size sizes at which their terms in the
// equations are as large as those of the others (Ruiz, A scaling algorithm to
// equilibrate both rows and columns norms in matrices, 2001).
func (t *tracer) equilibrate(unknown []bool) {
	term := func(i, k int) float64 { return math.Abs(t.jac[i*(t.n+1)+k]) * t.s.sx[k] }
	rows := make([]float64, t.n)
	for range 10 {
		for i := range t.n {
			rows[i] = 0
			for k := range t.n {
				rows[i] = math.Max(rows[i], term(i, k))
			}
		}
		for k := range t.n {
			worst := 0.0
			for i, r := range rows {
				if r > 0 {
					worst = math.Max(worst, term(i, k)/r)
				}
			}
			if unknown[k] && worst > 0 {
				t.s.sx[k] /= worst
			}
		}
	}
}

// slopes returns dx/dλ at the start, zeros where f_x is singular.
func (t *tracer) slopes(x []float64) []float64 {
	slopes := make([]float64, t.n)
	a := t.lu.Matrix(t.n)
	for i := range t.n {
		copy(a[i*t.n:(i+1)*t.n], t.jac[i*(t.n+1):])
		slopes[i] = -t.jac[i*(t.n+1)+t.n]
	}
	if t.lu.Factor() != nil || t.lu.Condition() > 1e12 {
		clear(slopes)
		return slopes
	}
	t.lu.Solve(slopes)
	return slopes
}

// grow widens the scales of states that have outgrown them, and expresses the
// node in the new ones.
func (t *tracer) grow(a *node) {
	grown := false
	old := t.S
	t.S = append([]float64(nil), old...) // the old ones stay with their nodes
	for i := range t.n {
		if !t.s.tagged[i] && math.Abs(a.x[i]) > 4*t.s.sx[i] {
			t.s.sx[i] = math.Abs(a.x[i])
			t.S[i] = math.Sqrt(float64(t.n)) * t.s.sx[i]
			grown = true
		}
	}
	if !grown {
		t.S = old
		return
	}
	var length float64
	a.t, length = t.inScales(a)
	a.k, a.scales, a.fx, a.proof = nil, t.S, nil, 0
	t.stable.forget()
	t.ds = math.Max(t.ds*length, t.plan.least)
}

// inScales returns the tangent of a node in today's scales, and the length that
// it had in them before it was made a unit vector.
func (t *tracer) inScales(a *node) (tangent []float64, length float64) {
	tangent = make([]float64, len(a.t))
	for i, v := range a.t {
		tangent[i] = v * a.scales[i] / t.S[i]
	}
	length = norm(tangent)
	for i := range tangent {
		tangent[i] /= length
	}
	return tangent, length
}

// scaled returns z of a node.
func (t *tracer) scaled(a *node) []float64 {
	z := make([]float64, t.n+1)
	for i, v := range a.x {
		z[i] = v / t.S[i]
	}
	z[t.n] = a.lambda / t.S[t.n]
	return z
}

// place sets state and parameter of a node from z.
func (t *tracer) place(a *node, z []float64) {
	for i := range t.n {
		a.x[i] = z[i] * t.S[i]
	}
	a.lambda = z[t.n] * t.S[t.n]
}

func norm(v []float64) float64 { return math.Sqrt(dot(v, v)) }

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

// jacobian takes derivatives at a node and the sizes of its equations, the sums
// of their scaled terms. An equation whose terms all vanish, as those of a trivial
// branch do at a bifurcation, keeps a size from where they did not.
func (t *tracer) jacobian(a *node) error {
	if err := t.s.Fz(a.x, a.lambda, t.jac); err != nil {
		return err
	}
	for i := range t.n {
		sum := 0.0
		for k, s := range t.S {
			sum += math.Abs(t.jac[i*(t.n+1)+k]) * s
		}
		t.most[i] = math.Max(t.most[i], sum)
		t.rows[i] = math.Max(sum, 1e-4*t.most[i])
		if t.rows[i] == 0 {
			t.rows[i] = 1
		}
	}
	return nil
}

// naturalRows scales the equations by the largest sizes met, for the systems on
// which singular points are refined and judged.
func (t *tracer) naturalRows() {
	for i, v := range t.most {
		t.rows[i] = v
		if v == 0 {
			t.rows[i] = 1
		}
	}
}

// border fills and factors the scaled matrix [F_z; cᵀ].
func (t *tracer) border(c []float64) error {
	m := t.n + 1
	a := t.lu.Matrix(m)
	for i := range t.n {
		for k, s := range t.S {
			a[i*m+k] = t.jac[i*m+k] * s / t.rows[i]
		}
	}
	copy(a[t.n*m:], c)
	return t.lu.Factor()
}

// residual returns the largest |f_i| relative to the terms of its equation, and
// the rounding that those terms carry.
func (t *tracer) residual(a *node) (worst, rounding float64) {
	m := t.n + 1
	for i, v := range t.f {
		worst = math.Max(worst, math.Abs(v)/t.rows[i])
		sum := math.Abs(t.jac[i*m+t.n] * a.lambda)
		for k, x := range a.x {
			sum += math.Abs(t.jac[i*m+k] * x)
		}
		rounding = math.Max(rounding, 64*epsilon*sum/t.rows[i])
	}
	return worst, rounding
}

// A refusal says why a step was not taken. fatal refusals end the run.
type refusal struct {
	reason string
	cause  error
}

func (r *refusal) Error() string { return r.reason }

const correctorSteps = 10

// correct brings a node onto the branch by Newton's method on F = 0 with
// cᵀ (z - z_predicted) = 0, leaving Jacobian and factors of [F_z; cᵀ] behind.
func (t *tracer) correct(a *node, c []float64) error {
	z := t.scaled(a)
	step := make([]float64, t.n+1)
	previous := math.Inf(1)
	for a.iterations = 1; a.iterations <= correctorSteps; a.iterations++ {
		if err := t.s.F(a.x, a.lambda, t.f); err != nil {
			return t.refuse(err)
		}
		if err := t.jacobian(a); err != nil {
			return t.refuse(err)
		}
		if t.border(c) != nil {
			return &refusal{reason: "the bordered matrix is singular"}
		}
		for i, v := range t.f {
			step[i] = -v / t.rows[i]
		}
		step[t.n] = 0
		t.lu.Solve(step)
		size := norm(step)
		if rate := size / previous; a.iterations == 2 {
			a.contract = rate
		}
		small := t.tolerance * (1 + norm(z))
		if size > 0.5*previous && size > small {
			return &refusal{reason: fmt.Sprintf("the corrector contracts slowly (rate %.2g)", size/previous)}
		}
		previous = size
		for i := range z {
			z[i] += step[i]
		}
		t.place(a, z)
		if size <= small {
			return t.confirm(a)
		}
	}
	return &refusal{reason: fmt.Sprintf("the corrector did not converge in %d iterations", correctorSteps)}
}

// confirm checks the residual of a node that the corrector has reached.
func (t *tracer) confirm(a *node) error {
	if err := t.s.F(a.x, a.lambda, t.f); err != nil {
		return t.refuse(err)
	}
	if worst, rounding := t.residual(a); worst > math.Max(t.plan.tolerance, rounding) {
		return &refusal{reason: fmt.Sprintf("the residual stays at %.2g of its terms", worst)}
	}
	return nil
}

func (t *tracer) refuse(err error) error { return refuse(err) }

func refuse(err error) error {
	if errors.Is(err, ErrInterrupted) {
		return err
	}
	return &refusal{reason: err.Error(), cause: err}
}

// complete gives a corrected node its tangent, oriented along the direction
// given, curvature, determinant and eigenvalues. It needs the factors that
// correct left, taken with border c.
func (t *tracer) complete(a *node, c, along []float64) error {
	a.t, a.scales = make([]float64, t.n+1), t.S
	a.t[t.n] = 1
	t.lu.Solve(a.t)
	length := norm(a.t)
	if length == 0 || math.IsNaN(length) || math.IsInf(length, 0) {
		return &refusal{reason: "the tangent is not defined"}
	}
	if dot(a.t, along) < 0 {
		length = -length
	}
	for i := range a.t {
		a.t[i] /= length
	}
	a.det = t.lu.Sign()
	if dot(a.t, c) < 0 {
		a.det = -a.det
	}
	if err := t.curvature(a); err != nil {
		return err
	}
	return t.spectrum(a)
}

// curvature solves F_z k = -F_zz[t, t], tᵀ k = 0.
func (t *tracer) curvature(a *node) error {
	k, err := t.bend(a, a.t)
	var out *DomainError
	if errors.As(err, &out) {
		return nil // a step towards the edge of the domain goes without
	}
	if err != nil {
		return err
	}
	along := dot(a.t, k)
	for i := range k {
		k[i] -= along * a.t[i]
	}
	a.k = k
	return nil
}

// bend returns a solution k of F_z k = -F_zz[d, d] with the factors at hand.
func (t *tracer) bend(a *node, d []float64) ([]float64, error) {
	direction, second := make([]float64, t.n+1), make([]float64, t.n)
	for i := range direction {
		direction[i] = d[i] * t.S[i]
	}
	t.s.p[t.s.free] = a.lambda
	if err := t.s.diff.Second(a.x, t.s.p, t.s.free, direction, second); err != nil {
		return nil, err
	}
	k := make([]float64, t.n+1)
	for i, v := range second {
		k[i] = -v / t.rows[i]
	}
	t.lu.Solve(k)
	return k, nil
}

// fresh returns an empty node.
func (t *tracer) fresh() *node { return &node{x: make([]float64, t.n)} }
