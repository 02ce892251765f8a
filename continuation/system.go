package continuation

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
)

// A system is a model at work on one job: its own storage, the parameter that is
// free, and the scales. It is not shared between goroutines.
type system struct {
	m    *Model
	n    int // states
	free int // index of the free parameter, -1 for none
	eq   equations
	diff Differentiator
	ctx  context.Context

	p      []float64 // all parameters, p[free] overwritten by each call
	sx     []float64 // typical sizes of the states
	sp     []float64 // typical sizes of the parameters
	tagged []bool    // sx[i] was given by the analyst

	evaluations int
}

// newSystem makes a system at parameters p that begins its work at x. A state
// without a scale of the analyst's has the size that it has there.
func newSystem(m *Model, x, p []float64, free int) *system {
	s := &system{m: m, n: len(m.states), free: free, eq: m.equations.own(), ctx: m.context()}
	s.p = append([]float64(nil), p...)
	s.sx = make([]float64, s.n)
	s.tagged = make([]bool, s.n)
	for i, v := range m.states {
		s.sx[i], s.tagged[i] = v.Scale, v.Scale > 0
		if v.Scale == 0 {
			s.sx[i] = math.Abs(x[i])
		}
		if !(s.sx[i] > 0) || math.IsInf(s.sx[i], 0) {
			s.sx[i] = 1
		}
	}
	s.sp = make([]float64, len(p))
	for i, q := range m.parameters {
		s.sp[i] = q.Scale
		if q.Scale == 0 {
			s.sp[i] = math.Abs(p[i])
		}
		if s.sp[i] == 0 {
			s.sp[i] = 1
		}
	}
	s.diff = m.der.For(s)
	return s
}

// ErrInterrupted is wrapped by what is returned when the model's context was
// cancelled.
var ErrInterrupted = errors.New("interrupted")

// A DomainError says that the model cannot be evaluated somewhere: it returned
// NaN or an infinity, or panicked.
type DomainError struct {
	What  string // "the equation of Temperature is NaN"
	Where string // "Conversion 0.5, Temperature 350 K, Coolant 300 K"
	Cause error  // the panic, when it was one and carried an error
}

func (e *DomainError) Error() string { return e.What + " at " + e.Where }
func (e *DomainError) Unwrap() error { return e.Cause }

// Dimensions returns the number of states and of parameters.
func (s *system) Dimensions() (n, m int) { return s.n, len(s.p) }

// Scales returns the typical sizes of the states and the parameters.
func (s *system) Scales() (x, p []float64) { return s.sx, s.sp }

// Eval stores f(x, p) in f. The error is a *DomainError, or wraps
// [ErrInterrupted].
func (s *system) Eval(x, p, f []float64) (err error) {
	defer func() {
		// A panic of the model is the model's, not ours: it says so and the
		// run keeps what it has. Interrupts may also come up this way.
		if r := recover(); r != nil {
			cause, _ := r.(error)
			err = &DomainError{fmt.Sprintf("the model panicked (%v)", r), s.describe(x, p), cause}
		}
		if s.ctx.Err() != nil {
			err = ErrInterrupted
		}
	}()
	if s.ctx.Err() != nil {
		return ErrInterrupted
	}
	s.evaluations++
	s.eq.eval(x, p, f)
	for i, v := range f {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return &DomainError{What: fmt.Sprintf("the equation of %s is %v", s.m.states[i].Name, v), Where: s.describe(x, p)}
		}
	}
	return nil
}

// describe names a place in words: the free parameter (or all, when none is)
// and the first states.
func (s *system) describe(x, p []float64) string {
	var words []string
	add := func(v Variable, value float64) { words = append(words, v.Name+" "+withUnit(value, v.Unit)) }
	for i, q := range s.m.parameters {
		if s.free == i || (s.free < 0 && i < 4) {
			add(q.Variable, p[i])
		}
	}
	for i, v := range s.m.states {
		if i == 4 && s.n > 5 {
			words = append(words, fmt.Sprintf("... (%d states)", s.n))
			break
		}
		add(v, x[i])
	}
	return strings.Join(words, ", ")
}

func withUnit(value float64, unit string) string {
	text := fmt.Sprintf("%.6g", value)
	if unit != "" {
		text += " " + unit
	}
	return text
}

// F stores f at x and the value lambda of the free parameter.
func (s *system) F(x []float64, lambda float64, f []float64) error {
	s.p[s.free] = lambda
	return s.Eval(x, s.p, f)
}

// Fz stores [f_x f_λ], n x (n+1), row by row.
func (s *system) Fz(x []float64, lambda float64, jac []float64) error {
	s.p[s.free] = lambda
	return s.diff.Jacobian(x, s.p, s.free, jac)
}
