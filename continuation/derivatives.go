package continuation

// Derivatives makes derivatives of a model available. The finite differences of
// this package are one implementation; a model can bring its own with
// [WithDerivatives].
type Derivatives interface {
	// Describe says in a few words where the derivatives come from.
	Describe() string
	// For returns what differentiates the equations for one run. It is used by
	// one goroutine.
	For(Evaluator) Differentiator
}

// An Evaluator evaluates the equations of a model.
type Evaluator interface {
	Dimensions() (n, m int)                 // numbers of states and of parameters
	Scales() (x, p []float64)               // their typical sizes, all positive
	Eval(x, p []float64, f []float64) error // f(x, p)
}

// A Differentiator gives derivatives of f with respect to z = (x, p_j), the
// state and one parameter: n+1 components, the parameter last. With j < 0 there
// is no parameter: z = x, and n components.
type Differentiator interface {
	// Jacobian stores the derivative f_z in jac, row by row: n x (n+1).
	Jacobian(x, p []float64, j int, jac []float64) error
	// Parameter stores f_{p_j}, n components, in col.
	Parameter(x, p []float64, j int, col []float64) error
	// Second stores the second derivative along a, f_zz[a, a], n components, in
	// out.
	Second(x, p []float64, j int, a, out []float64) error
	// Adjoint stores wᵀ f_zz[a, ·], n+1 components, in out.
	Adjoint(x, p []float64, j int, w, a, out []float64) error
}

// A ThirdOrder Differentiator also gives third derivatives.
type ThirdOrder interface {
	// Third stores f_zzz[a, a, a], n components, in out.
	Third(x, p []float64, j int, a, out []float64) error
}

// A Differentiator whose derivatives carry more than rounding says how much.
type inexact interface {
	// Accuracy returns the estimated relative error of the Jacobian.
	Accuracy() float64
}

// accuracy returns the relative error of first derivatives.
func accuracy(d Differentiator) float64 {
	if i, ok := d.(inexact); ok {
		return i.Accuracy()
	}
	return epsilon
}
