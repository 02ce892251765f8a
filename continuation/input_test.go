package continuation_test

import (
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

// Bad input is answered by one line that says what, where and what to do.
func TestBadModels(t *testing.T) {
	for _, c := range []struct {
		name, want    string
		model, params any
		opts          []continuation.Option
	}{
		{"no function", "not a function", 3, lambda{}, nil},
		{"nil", "not a function", nil, lambda{}, nil},
		{"no struct", "give a struct", parabola, 3.0, nil},
		{"other params", "it must be func(State, Params) State", parabola, tankParams{}, nil},
		{"no float in params", "nothing to follow", func(s scalar, q struct{ N int }) scalar { return s }, struct{ N int }{}, nil},
		{"string in state", "states are float64", func(s struct{ A string }, q lambda) struct{ A string } { return s }, lambda{}, nil},
		{"bad scale", "is not a positive number", func(s struct {
			X float64 `scale:"big"`
		}, q lambda) struct {
			X float64 `scale:"big"`
		} {
			return s
		}, lambda{}, nil},
		{"slices without names", "add continuation.States", func(u []float64, q lambda, f []float64) {}, lambda{}, nil},
		{"States on structs", "States is for models on slices", parabola, lambda{}, []continuation.Option{continuation.States([]string{"A"}, nil, nil)}},
		{"two alike", "two states are named A", func(u []float64, q lambda, f []float64) {}, lambda{}, []continuation.Option{continuation.States([]string{"A", "A"}, nil, nil)}},
		{"quantity of another kind", "must be func", parabola, lambda{}, []continuation.Option{continuation.Quantity("Q", "", func(x float64) float64 { return x })}},
		{"quantity named as a state", "name of a state", parabola, lambda{}, []continuation.Option{continuation.Quantity("X", "", func(s scalar, q lambda) float64 { return 0 })}},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := continuation.NewModel(c.model, c.params, c.opts...)
			oneLine(t, err, c.want)
		})
	}
}

func oneLine(t *testing.T, err error, want string) {
	t.Helper()
	if err == nil || !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "\n") {
		t.Errorf("got %v, want one line with %q", err, want)
	}
}

func TestBadFollow(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	for _, c := range []struct {
		name, param, want string
		opts              []continuation.FollowOption
	}{
		{"unknown parameter", "Coolnt", `no parameter "Coolnt"; the model has Inflow, Coolant (did you mean Coolant?)`, nil},
		{"parameter that is a string", "Label", `no parameter "Label"`, nil},
		{"start outside", "Coolant", "the start has Coolant 280 K, outside the range 300 K to 320 K", []continuation.FollowOption{continuation.Within(300, 320)}},
		{"range upside down", "Coolant", "the first value must be the smaller", []continuation.FollowOption{continuation.Within(320, 300)}},
		{"range of NaN", "Coolant", "is no range", []continuation.FollowOption{continuation.Within(math.NaN(), 300)}},
		{"zero step", "Coolant", "must be positive", []continuation.FollowOption{continuation.StepLength(0)}},
		{"negative step", "Coolant", "must be positive", []continuation.FollowOption{continuation.StepLength(-1)}},
		{"zero tolerance", "Coolant", "must be positive", []continuation.FollowOption{continuation.Tolerance(0)}},
		{"negative tolerance", "Coolant", "must be positive", []continuation.FollowOption{continuation.Tolerance(-1e-6)}},
		{"no steps", "Coolant", "at least one step", []continuation.FollowOption{continuation.MaxSteps(0)}},
		{"unknown bound", "Coolant", `no state "Temprature"; the model has Conversion, Temperature (did you mean Temperature?)`, []continuation.FollowOption{continuation.Bound("Temprature", 0, 1)}},
		{"start out of bounds", "Coolant", "outside its bounds", []continuation.FollowOption{continuation.Bound("Temperature", 0, 1)}},
		{"unknown local parameter", "Coolant", `no state "Heat"`, []continuation.FollowOption{continuation.Local("Heat")}},
		{"no condition", "Coolant", "Until wants a function", []continuation.FollowOption{continuation.Until(nil)}},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := start.Follow(c.param, c.opts...)
			oneLine(t, err, c.want)
		})
	}
}

func TestBadStarts(t *testing.T) {
	slices := func(f func(u []float64, q lambda, f []float64)) *continuation.Model {
		m, err := continuation.NewModel(f, lambda{1}, continuation.States([]string{"A", "B"}, nil, nil))
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
	structs := func(f func(scalar, lambda) scalar) *continuation.Model {
		m, err := continuation.NewModel(f, lambda{1})
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
	for _, c := range []struct {
		name, want string
		model      *continuation.Model
		guess      any
	}{
		{"forgotten equation", "the equation of B is NaN", slices(func(u []float64, q lambda, f []float64) { f[0] = u[0] - q.L }), []float64{1, 1}},
		{"one equation too many", "the model panicked (runtime error: index out of range [2] with length 2)", slices(func(u []float64, q lambda, f []float64) { f[0], f[1], f[2] = 1, 1, 1 }), []float64{1, 1}},
		{"wrong length", "the guess has 3 numbers; the model has 2 states", slices(func(u []float64, q lambda, f []float64) {}), []float64{1, 1, 1}},
		{"wrong kind", "the guess is a int", structs(parabola), 3},
		{"nil", "the guess is a <nil>", structs(parabola), nil},
		{"NaN guess", "the guess for X is NaN", structs(parabola), scalar{math.NaN()}},
		{"NaN at the start", "the equation of X is NaN", structs(func(s scalar, q lambda) scalar { return scalar{math.Log(-s.X)} }), scalar{1}},
		{"panic at the start", "the model panicked (no luck)", structs(func(s scalar, q lambda) scalar { panic("no luck") }), scalar{1}},
		{"no steady state", "no steady state found", structs(func(s scalar, q lambda) scalar { return scalar{1 + s.X*s.X} }), scalar{1.3}},
		{"singular start", "f_x is singular at", structs(func(s scalar, q lambda) scalar { return scalar{q.L - s.X*s.X} }), scalar{0}},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := c.model.Settle(c.guess)
			oneLine(t, err, c.want)
		})
	}
}

func TestStartWhereBranchesCross(t *testing.T) {
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar { return scalar{q.L*s.X - s.X*s.X*s.X} }, lambda{-1})
	if err != nil {
		t.Fatal(err)
	}
	b := mustFollow(t, settled(t, m, scalar{0}), "L", continuation.Within(-1, 1))
	if len(b.BranchPoints()) != 1 {
		t.Fatalf("found %v", b.Specials())
	}
	_, err = b.BranchPoints()[0].Where().Follow("L")
	oneLine(t, err, "a singular point where branches cross")
}

func TestUnknownNameAtAPoint(t *testing.T) {
	p := settled(t, newTank(t), tankState{0.1, 310})
	_, err := p.At("Tempreture")
	oneLine(t, err, "did you mean Temperature?")
}

func TestMarginOfAnotherPoint(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	fold := mustFollow(t, start, "Coolant", continuation.Within(260, 330)).Folds()[0]
	other, err := start.With("Inflow", 101)
	if err != nil {
		t.Fatal(err)
	}
	_, err = other.MarginTo(fold)
	oneLine(t, err, "Inflow is 101 L/min at the steady state and 100 L/min at the fold")
	_, err = settled(t, newTank(t), tankState{0.1, 310}).MarginTo(fold)
	oneLine(t, err, "different models")
	_, err = start.MarginTo(nil)
	oneLine(t, err, "no limit")
}

func TestQuantity(t *testing.T) {
	m := newTank(t, continuation.Quantity("Excess", "K", func(s tankState, q tankParams) float64 { return s.Temperature - q.Coolant }))
	p := settled(t, m, tankState{0.1, 310})
	v, err := p.At("Excess")
	if err != nil || v != p.State[1]-280 {
		t.Errorf("Excess %v, %v", v, err)
	}
}

func TestParametersInArraysAndSlices(t *testing.T) {
	type params struct {
		Load  []float64 `unit:"MW"`
		Gain  [2]float64
		Inner struct{ K float64 }
		On    bool
	}
	load := []float64{1, 2, 3}
	model := func(s scalar, q params) scalar {
		return scalar{q.Load[2] - s.X*s.X*q.Gain[1] + q.Inner.K}
	}
	m, err := continuation.NewModel(model, params{Load: load, Gain: [2]float64{1, 1}})
	if err != nil {
		t.Fatal(err)
	}
	load[2] = 99 // the model has its own
	var names []string
	for _, q := range m.Parameters() {
		names = append(names, q.Label())
	}
	if got, want := strings.Join(names, " "), "Load[0] (MW) Load[1] (MW) Load[2] (MW) Gain[0] Gain[1] Inner.K"; got != want {
		t.Errorf("parameters %s, want %s", got, want)
	}
	b := mustFollow(t, settled(t, m, scalar{1.5}), "Load[2]", continuation.Within(-1, 4))
	if len(b.Folds()) != 1 || math.Abs(b.Folds()[0].Value()) > 1e-12 {
		t.Errorf("found %v, want a fold at 0", b.Specials())
	}
}
