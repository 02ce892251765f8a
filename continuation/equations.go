package continuation

import (
	"errors"
	"fmt"
	"math"
	"reflect"
)

// equations evaluates the user's function on flat lists: x holds n states, p all
// parameters, f receives n values. It does not look at what comes out.
type equations interface {
	eval(x, p, f []float64)
	// state turns what the user gives as a guess into a flat list.
	state(guess any) ([]float64, error)
	// user turns a flat list into the user's own State and Params, for functions
	// of theirs.
	user(x, p []float64) (state, params reflect.Value)
	// own returns the same equations with working storage of their own, for
	// another run.
	own() equations
}

func (m *Model) buildStruct(fn reflect.Value, params *layout) error {
	t := fn.Type().In(0)
	state, err := newLayout(reflect.Zero(t), true)
	if err != nil {
		return err
	}
	if len(state.vars) == 0 {
		return fmt.Errorf("%s holds no float64: the model has no states", t)
	}
	if m.named.given {
		return fmt.Errorf("States is for models on slices; the states of this one are the fields of %s", t)
	}
	out, err := newLayout(reflect.Zero(t), true)
	if err != nil {
		return err
	}
	m.states = state.vars
	m.equations = newStructEquations(fn, state, out, params)
	return nil
}

func newStructEquations(fn reflect.Value, in, out, params *layout) *structEquations {
	return &structEquations{fn: fn, in: in, out: out, params: params, args: []reflect.Value{in.value, params.value}}
}

type structEquations struct {
	fn              reflect.Value
	in, out, params *layout
	args            []reflect.Value
}

func (e *structEquations) eval(x, p, f []float64) {
	e.in.put(x)
	e.params.put(p)
	e.out.value.Set(e.fn.Call(e.args)[0])
	e.out.get(f)
}

func (e *structEquations) state(guess any) ([]float64, error) {
	v := reflect.ValueOf(guess)
	if guess == nil || v.Type() != e.in.value.Type() {
		if x, ok := guess.([]float64); ok {
			return checkLength(x, len(e.in.vars))
		}
		return nil, fmt.Errorf("the guess is a %T; give a %s", guess, e.in.value.Type())
	}
	l, err := newLayout(v, true)
	if err != nil {
		return nil, err
	}
	x := make([]float64, len(l.vars))
	l.get(x)
	return x, nil
}

func (e *structEquations) user(x, p []float64) (state, params reflect.Value) {
	e.in.put(x)
	e.params.put(p)
	return e.in.value, e.params.value
}

func (e *structEquations) own() equations {
	return newStructEquations(e.fn, e.in.own(), e.out.own(), e.params.own())
}

func (m *Model) buildSlice(fn reflect.Value, params *layout) error {
	if !m.named.given {
		return errors.New("a model on slices needs its states named: add continuation.States(names, units, scales)")
	}
	n := len(m.named.names)
	m.states = make([]Variable, n)
	for i, name := range m.named.names {
		v := Variable{Name: name}
		if i < len(m.named.units) {
			v.Unit = m.named.units[i]
		}
		if i < len(m.named.scales) {
			v.Scale = m.named.scales[i]
			if !(v.Scale > 0) || math.IsInf(v.Scale, 0) {
				return fmt.Errorf("the scale %v of %s is not a positive number", v.Scale, name)
			}
		}
		if find(m.states[:i], name) >= 0 {
			return fmt.Errorf("two states are named %s", name)
		}
		m.states[i] = v
	}
	m.equations = newSliceEquations(fn, n, params)
	return nil
}

func newSliceEquations(fn reflect.Value, n int, params *layout) *sliceEquations {
	e := &sliceEquations{fn: fn, params: params, u: make([]float64, n), f: make([]float64, n)}
	// Slices of full length and capacity: a model that appends must not reach
	// beyond them.
	e.args = []reflect.Value{reflect.ValueOf(e.u), params.value, reflect.ValueOf(e.f)}
	return e
}

type sliceEquations struct {
	fn     reflect.Value
	params *layout
	u, f   []float64
	args   []reflect.Value
}

func (e *sliceEquations) eval(x, p, f []float64) {
	copy(e.u, x)
	e.params.put(p)
	for i := range e.f {
		e.f[i] = math.NaN()
	}
	e.fn.Call(e.args)
	copy(f, e.f)
}

func (e *sliceEquations) state(guess any) ([]float64, error) {
	x, ok := guess.([]float64)
	if !ok {
		return nil, fmt.Errorf("the guess is a %T; give a []float64 with the %d states", guess, len(e.u))
	}
	return checkLength(x, len(e.u))
}

func (e *sliceEquations) user(x, p []float64) (state, params reflect.Value) {
	copy(e.u, x)
	e.params.put(p)
	return e.args[0], e.params.value
}

func (e *sliceEquations) own() equations {
	return newSliceEquations(e.fn, len(e.u), e.params.own())
}

func checkLength(x []float64, n int) ([]float64, error) {
	if len(x) != n {
		return nil, fmt.Errorf("the guess has %d numbers; the model has %d states", len(x), n)
	}
	return append([]float64(nil), x...), nil
}
