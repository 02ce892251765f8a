package continuation

import (
	"fmt"
	"math"

	"brinkline/continuation/linalg"
)

// A Point is a steady state of a model, alone or on a branch. Its numbers are in
// the user's units.
type Point struct {
	State      []float64 // the n states, in the order of Model().States()
	Parameters []float64 // all parameters, in the order of Model().Parameters()

	// Parameter is the name of the parameter that is followed, empty for a point
	// that lies on no branch.
	Parameter string
	// Tangent is the unit tangent of the branch in scaled arclength s, given in
	// the user's units: dx/ds (n components), then dλ/ds. nil off a branch.
	Tangent []float64
	// Eigenvalues of f_x by falling real part; nil when not asked for: see
	// [WithEigenvalues] and [Point.Spectrum].
	Eigenvalues []complex128
	// Unstable is the number of eigenvalues with positive real part, -1 when
	// eigenvalues were not asked for. At a special point the eigenvalues that
	// vanish or are imaginary there do not count.
	Unstable int

	StepLength float64 // of the step that led here, in scaled arclength
	Arclength  float64 // from the start, negative in the direction followed first
	Iterations int     // of the corrector

	model *Model
	free  int // index of Parameter, -1 for none
	sizes *sizes
}

// sizes are what a run has learnt of the sizes of states and equations; a run
// that starts from one of its points begins with them.
type sizes struct {
	states, equations []float64
	parameter         float64 // of the one that was followed
}

// Model returns the model that the point belongs to.
func (p *Point) Model() *Model { return p.model }

// Value returns the value of the parameter that is followed, NaN off a branch.
func (p *Point) Value() float64 {
	if p.free < 0 {
		return math.NaN()
	}
	return p.Parameters[p.free]
}

// Stable reports whether every eigenvalue has a negative real part. Of a
// [Balance] nothing is called stable: see [Point.Unstable] there.
func (p *Point) Stable() bool { return p.Unstable == 0 && !p.model.balance }

// At returns the value of a state, a parameter or a quantity of the model here.
func (p *Point) At(name string) (float64, error) {
	if i := find(p.model.states, name); i >= 0 {
		return p.State[i], nil
	}
	if i := find(p.model.parameterVariables(), name); i >= 0 {
		return p.Parameters[i], nil
	}
	for _, q := range p.model.quantities {
		if q.Name == name {
			return q.call(p.State, p.Parameters), nil
		}
	}
	_, err := p.model.Variable(name)
	return math.NaN(), err
}

// Spectrum returns the eigenvalues of f_x by falling real part, computing them when
// the point does not hold them.
func (p *Point) Spectrum() ([]complex128, error) {
	if p.Eigenvalues != nil {
		return p.Eigenvalues, nil
	}
	s := newSystem(p.model, p.State, p.Parameters, -1)
	jac := make([]float64, s.n*s.n)
	if err := s.diff.Jacobian(p.State, p.Parameters, -1, jac); err != nil {
		return nil, fmt.Errorf("Spectrum: %w", err)
	}
	var e linalg.Eigen
	return e.Values(jac, s.n)
}

// With returns the steady state that Newton's method finds from this one when a
// parameter is set to another value.
func (p *Point) With(parameter string, value float64) (*Point, error) {
	j, err := p.model.parameterIndex(parameter)
	if err != nil {
		return nil, err
	}
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return nil, fmt.Errorf("%s = %v is not a number", parameter, value)
	}
	params := append([]float64(nil), p.Parameters...)
	params[j] = value
	return p.model.settle(p.State, params)
}

// String says the point in one line.
func (p *Point) String() string {
	s := system{m: p.model, n: len(p.State), free: p.free}
	return "steady state at " + s.describe(p.State, p.Parameters)
}
