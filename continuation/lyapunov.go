package continuation

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"brinkline/continuation/linalg"

	"gonum.org/v1/gonum/mat"
)

// oscillation computes what the pair at a Hopf point says of the oscillation that
// is born there: the eigenvector, the speed with which the pair crosses, and the
// first Lyapunov coefficient (Kuznetsov, Elements of Applied Bifurcation Theory,
// 3rd ed. 2004, eq. 3.20 and 5.62),
//
//	l1 = 1/(2ω) Re [ <p, C(q,q,q̄)> - 2 <p, B(q, A⁻¹ B(q,q̄))> + <p, B(q̄, (2iω - A)⁻¹ B(q,q))> ]
//
// with A q = iω q, Aᵀ p = -iω p, |q| = 1 in the user's units and <p, q> = p̄ᵀ q = 1.
func (t *tracer) oscillation(a *node, h *Hopf) error {
	pair, err := t.criticalPair(h.Omega)
	if err != nil {
		return err
	}
	h.Mode = pair.q
	forms := t.forms(a)
	if h.CrossingSpeed, err = t.crossingSpeed(forms, pair); err != nil {
		return err
	}
	h.Lyapunov, err = forms.lyapunov(pair, h.Omega)
	return err
}

// A criticalPair holds the eigenvectors to iω in the user's units, and the
// Jacobian that they belong to.
type criticalPair struct {
	q, p []complex128
	fx   []float64
}

// criticalPair finds the eigenvectors of f_x, whose entries are at hand.
func (t *tracer) criticalPair(omega float64) (*criticalPair, error) {
	fx := make([]float64, t.n*t.n)
	for i := range t.n {
		copy(fx[i*t.n:(i+1)*t.n], t.jac[i*(t.n+1):])
	}
	return newCriticalPair(fx, t.S[:t.n], omega)
}

// newCriticalPair finds the eigenvectors of fx to the eigenvalue nearest iω; sizes
// are those of the states.
func newCriticalPair(fx, sizes []float64, omega float64) (*criticalPair, error) {
	n := len(sizes)
	scaled := mat.NewDense(n, n, nil)
	for i := range n {
		for k := range n {
			scaled.Set(i, k, fx[i*n+k]*sizes[k]/sizes[i])
		}
	}
	var e mat.Eigen
	if !e.Factorize(scaled, mat.EigenBoth) {
		return nil, &refusal{reason: "the eigenvectors did not converge"}
	}
	best := 0
	values := e.Values(nil)
	for i, v := range values {
		if cmplx.Abs(v-complex(0, omega)) < cmplx.Abs(values[best]-complex(0, omega)) {
			best = i
		}
	}
	var right, left mat.CDense
	e.VectorsTo(&right)
	e.LeftVectorsTo(&left)
	c := &criticalPair{q: make([]complex128, n), p: make([]complex128, n), fx: fx}
	for i := range n {
		c.q[i] = right.At(i, best) * complex(sizes[i], 0)
		c.p[i] = left.At(i, best) / complex(sizes[i], 0)
	}
	c.normalise()
	return c, nil
}

// normalise makes |q| = 1, with the component of q that is largest real and
// positive, and <p, q> = 1.
func (c *criticalPair) normalise() {
	size, lead := 0.0, 0
	for i, v := range c.q {
		size += real(v)*real(v) + imag(v)*imag(v)
		if cmplx.Abs(v) > cmplx.Abs(c.q[lead])*(1+1e-6) {
			lead = i
		}
	}
	turn := cmplx.Conj(c.q[lead]) / complex(cmplx.Abs(c.q[lead])*math.Sqrt(size), 0)
	for i := range c.q {
		c.q[i] *= turn
	}
	inner := hermitian(c.p, c.q)
	for i := range c.p {
		c.p[i] /= cmplx.Conj(inner)
	}
}

// hermitian returns p̄ᵀ q.
func hermitian(p, q []complex128) complex128 {
	var sum complex128
	for i, v := range p {
		sum += cmplx.Conj(v) * q[i]
	}
	return sum
}

// split returns the real and the imaginary part of a complex state, as directions
// in z.
func split(v []complex128) (re, im []float64) {
	re, im = make([]float64, len(v)+1), make([]float64, len(v)+1)
	for i, c := range v {
		re[i], im[i] = real(c), imag(c)
	}
	return re, im
}

func join(re, im []float64) []complex128 {
	v := make([]complex128, len(re))
	for i := range v {
		v[i] = complex(re[i], im[i])
	}
	return v
}

// bilinear returns B(a, b) = f_zz[a, b] for complex a and b given as real and
// imaginary parts.
func (f forms) bilinear(ar, ai, br, bi []float64) ([]complex128, error) {
	var parts [4][]float64
	for i, pair := range [][2][]float64{{ar, br}, {ai, bi}, {ar, bi}, {ai, br}} {
		var err error
		if parts[i], err = f.product(pair[0], pair[1]); err != nil {
			return nil, err
		}
	}
	out := make([]complex128, len(parts[0]))
	for i := range out {
		out[i] = complex(parts[0][i]-parts[1][i], parts[2][i]+parts[3][i])
	}
	return out, nil
}

// crossingSpeed returns d Re μ/dλ along the branch, Re p̄ᵀ f_zz[(q, 0), (x', 1)]
// with x' = dx/dλ = -f_x⁻¹ f_λ.
func (t *tracer) crossingSpeed(f forms, c *criticalPair) (float64, error) {
	n := t.n
	slope := make([]float64, n+1)
	for i := range n {
		slope[i] = -t.jac[i*(n+1)+n]
	}
	if err := solveShifted(c.fx, n, 0, slope[:n], nil); err != nil {
		return 0, err
	}
	slope[n] = 1
	re, im := split(c.q)
	b, err := f.bilinear(re, im, slope, make([]float64, n+1))
	if err != nil {
		return 0, err
	}
	return real(hermitian(c.p, b)), nil
}

// lyapunov returns the first Lyapunov coefficient of the pair.
func (f forms) lyapunov(c *criticalPair, omega float64) (float64, error) {
	n := f.n
	re, im := split(c.q)
	minus := negated(im)
	cubic, err := f.cubicForm(re, im)
	if err != nil {
		return 0, err
	}
	mean, err := f.bilinear(re, im, re, minus) // B(q, q̄), real
	if err != nil {
		return 0, err
	}
	steady := make([]float64, n)
	for i, v := range mean {
		steady[i] = real(v)
	}
	if err := solveShifted(c.fx, n, 0, steady, nil); err != nil {
		return 0, err
	}
	second, err := f.bilinear(re, im, state(steady), make([]float64, n+1))
	if err != nil {
		return 0, err
	}
	double, err := f.bilinear(re, im, re, im) // B(q, q)
	if err != nil {
		return 0, err
	}
	hr, hi := make([]float64, n), make([]float64, n)
	for i, v := range double { // (2iω - A) h = B, so (A - 2iω) h = -B
		hr[i], hi[i] = -real(v), -imag(v)
	}
	if err := solveShifted(c.fx, n, 2*omega, hr, hi); err != nil {
		return 0, err
	}
	third, err := f.bilinear(re, minus, state(hr), state(hi))
	if err != nil {
		return 0, err
	}
	sum := hermitian(c.p, cubic) - 2*hermitian(c.p, second) + hermitian(c.p, third)
	return real(sum) / (2 * omega), nil
}

// cubicForm returns C(q, q, q̄) for q = r + i s: C(r,r,r) + C(r,s,s) + i (C(s,r,r) +
// C(s,s,s)).
func (f forms) cubicForm(r, s []float64) ([]complex128, error) {
	var parts [4][]float64
	for i, get := range []func() ([]float64, error){
		func() ([]float64, error) { return f.cube(r) },
		func() ([]float64, error) { return f.mixedCube(r, s) },
		func() ([]float64, error) { return f.mixedCube(s, r) },
		func() ([]float64, error) { return f.cube(s) },
	} {
		var err error
		if parts[i], err = get(); err != nil {
			return nil, err
		}
	}
	re, im := make([]float64, len(parts[0])), make([]float64, len(parts[0]))
	for i := range re {
		re[i], im[i] = parts[0][i]+parts[1][i], parts[2][i]+parts[3][i]
	}
	return join(re, im), nil
}

// solveShifted overwrites br + i bi by the solution of (A - i shift) x = b. With no
// shift bi may be nil.
func solveShifted(a []float64, n int, shift float64, br, bi []float64) error {
	var lu linalg.LU
	if shift == 0 {
		copy(lu.Matrix(n), a)
		if err := lu.Factor(); err != nil {
			return &refusal{reason: err.Error()}
		}
		lu.Solve(br)
		return nil
	}
	m := lu.Matrix(2 * n)
	clear(m)
	for i := range n {
		for k := range n {
			m[i*2*n+k], m[(n+i)*2*n+n+k] = a[i*n+k], a[i*n+k]
		}
		m[i*2*n+n+i], m[(n+i)*2*n+i] = shift, -shift
	}
	if err := lu.Factor(); err != nil {
		return &refusal{reason: err.Error()}
	}
	b := append(append([]float64(nil), br...), bi...)
	lu.Solve(b)
	copy(br, b[:n])
	copy(bi, b[n:])
	return nil
}

// describeOscillation adds to a Hopf point what can be computed; what fails is
// noted, and never loses the point.
func (t *tracer) describeOscillation(a *node, h *Hopf) error {
	err := t.oscillation(a, h)
	if errors.Is(err, ErrInterrupted) {
		return err
	}
	if err != nil {
		h.Lyapunov = math.NaN()
		t.notes = append(t.notes, fmt.Sprintf("the oscillation at %s is not resolved: %v", t.where(a), err))
	}
	return nil
}

// Soft reports whether the oscillation that is born at the point is small and
// stable at first (supercritical, Lyapunov < 0), provided that all other
// eigenvalues are stable.
func (h *Hopf) Soft() bool { return h.Lyapunov < 0 }

// Meaning says in a sentence what happens at the point.
func (h *Hopf) Meaning() string {
	switch {
	case math.IsNaN(h.Lyapunov):
		return "a pair of eigenvalues crosses the imaginary axis; the oscillation could not be computed"
	case min(h.UnstableBefore, h.UnstableAfter) > 0:
		return "a further pair of eigenvalues crosses; the steady state is unstable on both sides"
	case h.Soft():
		return "soft loss of stability: a small stable oscillation grows from the steady state"
	default:
		return "hard loss of stability: the small oscillation is unstable and lies on the stable side, so a disturbance can carry the state away before the point"
	}
}

// Amplitude returns the half-amplitude of a state or quantity in the small
// oscillation near the point when the parameter has the value given, to leading
// order: 2 |q_i| sqrt(-μ_λ (λ - λ*) / (ω l1)). It is NaN on the side where there is
// no oscillation.
func (h *Hopf) Amplitude(state string, value float64) (float64, error) {
	i, err := h.point.model.stateIndex(state)
	if err != nil {
		return math.NaN(), err
	}
	square := -h.CrossingSpeed * (value - h.Value()) / (h.Omega * h.Lyapunov)
	if !(square >= 0) {
		return math.NaN(), nil
	}
	return 2 * cmplx.Abs(h.Mode[i]) * math.Sqrt(square), nil
}
