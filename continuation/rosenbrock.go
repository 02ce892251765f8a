package continuation

import (
	"math"

	"brinkline/continuation/linalg"
)

// rodas holds the coefficients of the Rosenbrock method RODAS of order 4 with an
// embedded one of order 3: six stages, stiffly accurate and L-stable both (Hairer &
// Wanner, Solving Ordinary Differential Equations II, 2nd ed. 1996, section VI.4,
// table 4.2 for the method, in the form 4.7' that needs no product with f_x).
var rodas = struct {
	gamma float64
	a, c  [6][]float64
}{
	gamma: 0.25,
	a: [6][]float64{
		{},
		{1.544},
		{0.9466785280815826, 0.2557011698983284},
		{3.314825187068521, 2.896124015972201, 0.9986419139977817},
		{1.221224509226641, 6.019134481288629, 12.53708332932087, -0.6878860361058950},
		{1.221224509226641, 6.019134481288629, 12.53708332932087, -0.6878860361058950, 1},
	},
	c: [6][]float64{
		{},
		{-5.6688},
		{-2.430093356833875, -0.2063599157091915},
		{-0.1073529058151375, -9.594562251023355, -20.47028614809616},
		{7.496443313967647, -10.24680431464352, -33.99990352819905, 11.70890893206160},
		{8.083246795921522, -7.981132988064893, -31.52159432874371, 16.31930543123136, -6.058818238834054},
	},
}

// A rosenbrock takes steps of dx/dt = f(x). One step costs an LU factorisation, six
// evaluations of f and the exact f_x.
type rosenbrock struct {
	s    *system
	n    int
	jac  []float64 // f_x at the beginning of the step
	lu   linalg.LU
	u    [6][]float64 // stages, in scaled states
	x, f []float64
	size []float64 // of the states, by which the linear systems are scaled
}

func newRosenbrock(s *system) *rosenbrock {
	r := &rosenbrock{s: s, n: s.n, jac: make([]float64, s.n*s.n), x: make([]float64, s.n), f: make([]float64, s.n), size: s.sx}
	for i := range r.u {
		r.u[i] = make([]float64, s.n)
	}
	return r
}

// begin takes f_x at x.
func (r *rosenbrock) begin(x []float64) error { return r.s.diff.Jacobian(x, r.s.p, -1, r.jac) }

// step goes from x, where f is given and f_x was taken by begin, by h. It stores the
// new state in next and the estimated error of one step in err.
//
//	(I/(γh) - f_x) u_i = f(x + Σ a_ij u_j) + Σ c_ij u_j / h,  i = 1..6
//	x(t+h) ≈ x + Σ a_6j u_j + u_6,  error ≈ u_6
func (r *rosenbrock) step(x, f []float64, h float64, next, err []float64) error {
	if e := r.factor(h); e != nil {
		return e
	}
	for i := range r.u {
		at := f
		if i > 0 {
			r.place(x, rodas.a[i], r.x)
			if e := r.s.Eval(r.x, r.s.p, r.f); e != nil {
				return e
			}
			at = r.f
		}
		r.stage(i, at, h)
	}
	for i := range next {
		err[i] = r.u[5][i] * r.size[i]
		next[i] = r.x[i] + err[i]
	}
	return nil
}

// factor factors I/(γh) - f_x in scaled states, so that pivots do not depend on
// units.
func (r *rosenbrock) factor(h float64) error {
	a := r.lu.Matrix(r.n)
	for i := range r.n {
		for k := range r.n {
			a[i*r.n+k] = -r.jac[i*r.n+k] * r.size[k] / r.size[i]
		}
		a[i*r.n+i] += 1 / (rodas.gamma * h)
	}
	return r.lu.Factor()
}

// place stores x + Σ a_j u_j.
func (r *rosenbrock) place(x, a, out []float64) {
	for i := range out {
		sum := 0.0
		for j, v := range a {
			sum += v * r.u[j][i]
		}
		out[i] = x[i] + sum*r.size[i]
	}
}

func (r *rosenbrock) stage(i int, f []float64, h float64) {
	u := r.u[i]
	for k := range u {
		sum := 0.0
		for j, v := range rodas.c[i] {
			sum += v * r.u[j][k]
		}
		u[k] = f[k]/r.size[k] + sum/h
	}
	r.lu.Solve(u)
}

// A hermite is the cubic between two states with their rates of change.
type hermite struct {
	t, h   float64
	x0, x1 []float64
	f0, f1 []float64
}

// at stores the state at time t.
func (c hermite) at(t float64, out []float64) {
	u := (t - c.t) / c.h
	h00, h10, h01, h11 := 1+u*u*(2*u-3), u*(1-u)*(1-u), u*u*(3-2*u), u*u*(u-1)
	for i := range out {
		out[i] = h00*c.x0[i] + h10*c.h*c.f0[i] + h01*c.x1[i] + h11*c.h*c.f1[i]
	}
}

// weighted returns the largest component of v relative to its weight. Where the
// weight is 0, so is the component.
func weighted(v, weight []float64) float64 {
	worst := 0.0
	for i, d := range v {
		if d != 0 {
			worst = math.Max(worst, math.Abs(d)/weight[i])
		}
	}
	return worst
}
