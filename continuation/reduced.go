package continuation

import "math"

// A Reduced equation describes both branches at a simple stationary bifurcation
// to leading order: with x = x* + s v + m φ + ..., m = λ - λ*, f_x φ = -f_λ,
// vᵀ φ = 0,
//
//	Quadratic s² + Mixed s m + ParameterQuadratic m² (+ Cubic s³) = 0,
//
// in the user's units, for |v| = 1 and wᵀ v = 1 (Keller 1977: the algebraic
// bifurcation equation). The cubic term matters where Quadratic vanishes, at a
// pitchfork.
type Reduced struct {
	Quadratic          float64 // 1/2 wᵀ f_xx[v, v]
	Mixed              float64 // wᵀ (f_xx[v, φ] + f_xλ v)
	ParameterQuadratic float64 // 1/2 wᵀ (f_xx[φ, φ] + 2 f_xλ φ + f_λλ)
	Cubic              float64 // 1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h]), f_x h = -f_xx[v, v]
}

// pitchforkAngle is the angle in scaled variables between v and a tangent below
// which the point is called a pitchfork.
const pitchforkAngle = 1e-5

// reduce computes the reduced equation, the tangents of both branches and the
// name of the point. The factors of [G b; Cᵀ 0] must be at hand.
func (t *tracer) reduce(a *node, s *crossing, b *BranchPoint) error {
	forms := t.forms(a)
	v, phi := state(b.Right), t.complement(s, b)
	vv, err := forms.square(v)
	if err != nil {
		return err
	}
	vm, err := forms.product(v, phi)
	if err != nil {
		return err
	}
	mm, err := forms.square(phi)
	if err != nil {
		return err
	}
	r := &b.Reduced
	r.Quadratic, r.Mixed, r.ParameterQuadratic = dot(b.Left, vv)/2, dot(b.Left, vm), dot(b.Left, mm)/2
	if err := t.tangents(forms, b, v, phi); err != nil {
		return err
	}
	h := t.preimage(s, b, vv)
	vvv, err := forms.cube(v)
	if err != nil {
		return err
	}
	vh, err := forms.product(v, state(h))
	if err != nil {
		return err
	}
	r.Cubic = (dot(b.Left, vvv) + 3*dot(b.Left, vh)) / 6
	return nil
}

// complement returns (φ, 1) with f_x φ = -f_λ, vᵀ φ = 0 in the user's units.
func (t *tracer) complement(s *crossing, b *BranchPoint) []float64 {
	n := t.n
	// The null space of F_z holds (v, 0) and this one.
	k := 0
	if math.Abs(s.phi[1][n]) > math.Abs(s.phi[0][n]) {
		k = 1
	}
	phi := make([]float64, n+1)
	for i := range phi {
		phi[i] = s.phi[k][i] * t.S[i] / (s.phi[k][n] * t.S[n])
	}
	along := dot(b.Right, phi[:n])
	for i := range n {
		phi[i] -= along * b.Right[i]
	}
	phi[n] = 1
	return phi
}

// preimage returns h with f_x h = -g, vᵀ h = 0, for g in the range of f_x.
func (t *tracer) preimage(s *crossing, b *BranchPoint, g []float64) []float64 {
	n := t.n
	rhs := make([]float64, n+2)
	for i, v := range g {
		rhs[i] = -v / s.rows[i]
	}
	s.lu.Solve(rhs)
	// Any combination of both null vectors may be in it; what has a part in λ
	// goes out by the one of them that has, then what lies along v.
	phi := t.complement(s, b)
	h := make([]float64, n)
	lambda := rhs[n] * t.S[n]
	for i := range h {
		h[i] = rhs[i]*t.S[i] - lambda*phi[i]
	}
	along := dot(b.Right, h)
	for i := range h {
		h[i] -= along * b.Right[i]
	}
	return h
}

// tangents solves the reduced equation for the directions of both branches and
// names the point.
func (t *tracer) tangents(f forms, b *BranchPoint, v, phi []float64) error {
	// In scaled variables, so that no unit decides.
	lv, lp := f.length(v), f.length(phi)
	q, m, p := b.Quadratic/(lv*lv), b.Mixed/(lv*lp), b.ParameterQuadratic/(lp*lp)
	disc := m*m - 4*q*p
	if disc <= 0 {
		return &refusal{reason: "the reduced equation has no real directions: the branches do not cross"}
	}
	// Roots (s : m) of q s² + m s m + p m² = 0 without cancellation.
	root := -(m + math.Copysign(math.Sqrt(disc), m)) / 2
	pairs := [2][2]float64{{root, q}, {p, root}} // s/m = root/q and p/root
	for i, r := range pairs {
		d := make([]float64, t.n+1)
		for k := range d {
			d[k] = r[0]/lv*v[k] + r[1]/lp*phi[k]
		}
		b.Tangents[i] = unitTangent(d)
		if math.Abs(r[1]) < pitchforkAngle*math.Abs(r[0]) {
			b.pitchfork = true
		}
	}
	if before(b.Tangents[1], b.Tangents[0]) {
		b.Tangents[0], b.Tangents[1] = b.Tangents[1], b.Tangents[0]
	}
	return nil
}

// unitTangent makes a direction a unit vector in the user's units, its parameter
// component not negative; where that is zero, its largest component positive.
func unitTangent(d []float64) []float64 {
	length := norm(d)
	n := len(d) - 1
	if math.Abs(d[n]) < 1e-9*length {
		d[n] = 0
	}
	if d[n] < 0 || (d[n] == 0 && d[leading(d)] < 0) {
		length = -length
	}
	for i := range d {
		d[i] /= length
	}
	return d
}

// before orders tangents by their parameter component, then by the last state.
func before(a, b []float64) bool {
	n := len(a) - 1
	if a[n] != b[n] {
		return a[n] < b[n]
	}
	return n > 0 && a[n-1] < b[n-1]
}

// Name says which kind of simple stationary bifurcation the point is, in words.
func (b *BranchPoint) Name() string {
	switch {
	case b.Tangents[0] == nil:
		return ""
	case !b.pitchfork:
		return "transcritical bifurcation"
	case b.Cubic < 0:
		return "supercritical pitchfork"
	default:
		return "subcritical pitchfork"
	}
}

// Meaning says in a sentence what happens at the point.
func (b *BranchPoint) Meaning() string {
	switch {
	case b.Tangents[0] == nil:
		return "two branches cross; how could not be computed"
	case !b.pitchfork && b.point.model.balance:
		return "two branches cross"
	case !b.pitchfork:
		return "two branches cross and exchange their stability"
	case b.point.model.balance && b.Cubic < 0:
		return "two symmetric branches leave on the side where this one has more eigenvalues with positive real part"
	case b.point.model.balance:
		return "two symmetric branches leave on the side where this one has fewer eigenvalues with positive real part: an imperfection lowers the limit"
	case b.Cubic < 0:
		return "two symmetric branches leave on the side where this one is unstable, and take over its stability"
	default:
		return "two symmetric unstable branches leave on the side where this one is stable: it can be lost before the point by a disturbance"
	}
}
