package continuation

import (
	"fmt"
	"reflect"
)

// A quantity is a named function of a point that the analyst adds to a model:
// a yield, a flow, a stress.
type quantity struct {
	Variable
	fn   reflect.Value
	call func(x, p []float64) float64
}

// Quantity adds a named quantity to the model that [Point.At], pictures and
// tables can show: f is a func(State, Params) float64, or for models on slices a
// func(u []float64, q Params) float64.
func Quantity(name, unit string, f any) Option {
	return func(m *Model) error {
		fn := reflect.ValueOf(f)
		if f == nil || fn.Kind() != reflect.Func || fn.IsNil() {
			return fmt.Errorf("the quantity %s is a %T, not a function", name, f)
		}
		for _, q := range m.quantities {
			if q.Name == name {
				return fmt.Errorf("two quantities are named %s", name)
			}
		}
		m.quantities = append(m.quantities, quantity{Variable: Variable{Name: name, Unit: unit}, fn: fn})
		return nil
	}
}

// bind checks that the function fits the model.
func (q *quantity) bind(m *Model) error {
	if find(m.states, q.Name) >= 0 || find(m.parameterVariables(), q.Name) >= 0 {
		return fmt.Errorf("the quantity %s has the name of a state or a parameter", q.Name)
	}
	state, params := m.equations.user(make([]float64, len(m.states)), m.values())
	t := q.fn.Type()
	if t.NumIn() != 2 || t.NumOut() != 1 || t.IsVariadic() ||
		t.In(0) != state.Type() || t.In(1) != params.Type() || t.Out(0).Kind() != reflect.Float64 {
		return fmt.Errorf("the quantity %s is %s; it must be func(%s, %s) float64", q.Name, t, state.Type(), params.Type())
	}
	fn := q.fn
	q.call = func(x, p []float64) float64 {
		s, r := m.equations.own().user(x, p)
		return fn.Call([]reflect.Value{s, r})[0].Float()
	}
	return nil
}

// Quantities returns the names and units of the quantities that were added to
// the model.
func (m *Model) Quantities() []Variable {
	vars := make([]Variable, len(m.quantities))
	for i, q := range m.quantities {
		vars[i] = q.Variable
	}
	return vars
}

// Variable returns what the model knows under a name: a state, a parameter or a
// quantity.
func (m *Model) Variable(name string) (Variable, error) {
	all := append(m.States(), m.parameterVariables()...)
	all = append(all, m.Quantities()...)
	if i := find(all, name); i >= 0 {
		return all[i], nil
	}
	return Variable{}, unknown("state, parameter or quantity", name, all)
}
