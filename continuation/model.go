package continuation

import (
	"context"
	"errors"
	"fmt"
	"reflect"
)

// A Model is a set of n equations f(x, p) = 0 given by a plain Go function,
// with the values of its parameters and the names, units and scales of all.
type Model struct {
	name       string
	balance    bool
	states     []Variable
	parameters []Parameter
	quantities []quantity
	equations  equations
	der        Derivatives
	context    func() context.Context
	observer   Observer
	notice     func() string

	sequential bool // from the option Sequential
	sweeps     *sweepMemory

	named sliceStates // from the option States
}

type sliceStates struct {
	given  bool
	names  []string
	units  []string
	scales []float64
}

// An Option changes how a model is made.
type Option func(*Model) error

// NewModel makes a model of a function and the values of its parameters.
//
// The function is either func(State, Params) State, where State is a struct of
// float64 (also arrays and nested structs) and the result holds the value of f
// that belongs to each state, or func(u []float64, q Params, f []float64), which
// fills f; f comes filled with NaN, so that a forgotten equation is found. The
// states of the second kind are named by [States].
//
// Params is a struct; its float64s, also those in arrays, slices and nested
// structs, are the parameters that can be followed (Load[3]). Ints, bools and
// strings in it are kept. The tags `unit:"K"` and `scale:"300"` of a field carry
// its unit and its typical size.
func NewModel(f any, params any, opts ...Option) (*Model, error) {
	m := &Model{name: "model", context: context.Background, sweeps: &sweepMemory{}}
	for _, set := range opts {
		if err := set(m); err != nil {
			return nil, fmt.Errorf("model %s: %w", m.name, err)
		}
	}
	if err := m.build(f, params); err != nil {
		return nil, fmt.Errorf("model %s: %w", m.name, err)
	}
	for i := range m.quantities {
		if err := m.quantities[i].bind(m); err != nil {
			return nil, fmt.Errorf("model %s: %w", m.name, err)
		}
	}
	if m.der == nil {
		m.der = newDifferences(m)
	}
	return m, nil
}

// Named gives the model the name under which cards and tables show it.
func Named(name string) Option {
	return func(m *Model) error { m.name = name; return nil }
}

// Balance says that the equations have no time behind them (equilibrium of
// forces, load flow): nothing is called stable, and sign changes of det f_x are
// the only events.
func Balance() Option {
	return func(m *Model) error { m.balance = true; return nil }
}

// States names the states of a model on slices, and with that says how many
// there are. Units and scales may be nil, or shorter than names: what is missing
// is dimensionless, or takes its scale from the start.
func States(names, units []string, scales []float64) Option {
	return func(m *Model) error {
		switch {
		case len(names) == 0:
			return errors.New("States wants at least one name")
		case len(units) > len(names):
			return fmt.Errorf("States has %d units for %d names", len(units), len(names))
		case len(scales) > len(names):
			return fmt.Errorf("States has %d scales for %d names", len(scales), len(names))
		}
		m.named = sliceStates{true, names, units, scales}
		return nil
	}
}

// WithContext gives the model a source of the context under which it works: when
// that is cancelled, a run ends as interrupted and keeps what it has.
func WithContext(current func() context.Context) Option {
	return func(m *Model) error { m.context = current; return nil }
}

// WithObserver tells o how work on the model goes on.
func WithObserver(o Observer) Option {
	return func(m *Model) error { m.observer = o; return nil }
}

// WithDerivatives gives the model derivatives of its own in place of finite
// differences.
func WithDerivatives(d Derivatives) Option {
	return func(m *Model) error { m.der = d; return nil }
}

// An Observer is told how a long piece of work goes on, after each accepted
// step. It must return quickly.
type Observer interface {
	Progress(Progress)
}

// Progress is what an [Observer] is told.
type Progress struct {
	Task     string         // "Follow Coolant"
	Steps    int            // accepted steps so far
	Fraction float64        // of the work done, between 0 and 1, as far as can be known
	Value    float64        // of the followed parameter
	Done     bool           // the last word on this task
	Partial  func() *Branch // the branch as far as it is known
}

// Name returns the model's name.
func (m *Model) Name() string { return m.name }

// Balance reports whether the model is a pure balance without time.
func (m *Model) Balance() bool { return m.balance }

// States returns the names, units and scales of the states.
func (m *Model) States() []Variable { return append([]Variable(nil), m.states...) }

// Parameters returns the parameters with the values that the model was made
// with.
func (m *Model) Parameters() []Parameter { return append([]Parameter(nil), m.parameters...) }

// DerivativesNote says in a few words where the derivatives come from.
func (m *Model) DerivativesNote() string { return m.der.Describe() }

// Residual returns f(x, p) for all states and all parameters in order; nil
// parameters are those that the model was made with.
func (m *Model) Residual(x, p []float64) ([]float64, error) {
	if p == nil {
		p = m.values()
	}
	if len(x) != len(m.states) || len(p) != len(m.parameters) {
		return nil, fmt.Errorf("model %s: %d states and %d parameters are wanted, not %d and %d", m.name, len(m.states), len(m.parameters), len(x), len(p))
	}
	f := make([]float64, len(x))
	if err := newSystem(m, x, p, -1).Eval(x, p, f); err != nil {
		return nil, fmt.Errorf("model %s: %w", m.name, err)
	}
	return f, nil
}

func (m *Model) values() []float64 {
	p := make([]float64, len(m.parameters))
	for i, q := range m.parameters {
		p[i] = q.Value
	}
	return p
}

func (m *Model) parameterVariables() []Variable {
	vars := make([]Variable, len(m.parameters))
	for i, q := range m.parameters {
		vars[i] = q.Variable
	}
	return vars
}

// parameterIndex returns the index of a parameter, or an error that helps.
func (m *Model) parameterIndex(name string) (int, error) {
	vars := m.parameterVariables()
	if i := find(vars, name); i >= 0 {
		return i, nil
	}
	return 0, unknown("parameter", name, vars)
}

func (m *Model) stateIndex(name string) (int, error) {
	if i := find(m.states, name); i >= 0 {
		return i, nil
	}
	return 0, unknown("state", name, m.states)
}

// build finds out which kind of function f is and lays out states and
// parameters.
func (m *Model) build(f, params any) error {
	fn := reflect.ValueOf(f)
	if f == nil || fn.Kind() != reflect.Func || fn.IsNil() {
		return fmt.Errorf("the model is a %T, not a function: %s", f, wanted)
	}
	q := reflect.ValueOf(params)
	if params == nil || q.Kind() != reflect.Struct {
		return fmt.Errorf("the parameters are a %T; give a struct with their values", params)
	}
	lay, err := newLayout(q, false)
	if err != nil {
		return err
	}
	values := make([]float64, len(lay.vars))
	lay.get(values)
	m.parameters = make([]Parameter, len(values))
	for i, v := range lay.vars {
		m.parameters[i] = Parameter{v, values[i]}
	}
	if len(values) == 0 {
		return fmt.Errorf("%s holds no float64, so there is nothing to follow", q.Type())
	}
	switch t := fn.Type(); {
	case isStructModel(t, q.Type()):
		return m.buildStruct(fn, lay)
	case isSliceModel(t, q.Type()):
		return m.buildSlice(fn, lay)
	default:
		return fmt.Errorf("the model is %s with parameters %s: %s", t, q.Type(), wanted)
	}
}

const wanted = "it must be func(State, Params) State or func(u []float64, q Params, f []float64), with the Params given here"

var floatSlice = reflect.TypeFor[[]float64]()

func isStructModel(t, params reflect.Type) bool {
	return t.NumIn() == 2 && t.NumOut() == 1 && !t.IsVariadic() && t.In(0) == t.Out(0) && t.In(1) == params &&
		(t.In(0).Kind() == reflect.Struct || t.In(0).Kind() == reflect.Array)
}

func isSliceModel(t, params reflect.Type) bool {
	return t.NumIn() == 3 && t.NumOut() == 0 && !t.IsVariadic() && t.In(0) == floatSlice && t.In(1) == params && t.In(2) == floatSlice
}
