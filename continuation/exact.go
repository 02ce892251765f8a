package continuation

import (
	"errors"
	"fmt"
	"go/types"
	"math"
	"reflect"
	"strings"
	"sync"

	"brinkline/continuation/tape"
)

// WithSource gives the model its own source: the function of that name is
// recorded as a tape, of which f and all its derivatives are computed exactly.
// The texts are Go source (as embedded with go:embed) that declares the function
// and all that it calls; what they take from packages other than math is a fault
// only where the function needs it.
//
//	//go:embed tank.go
//	var source string
//	plant, err := continuation.NewModel(tank, Params{...}, continuation.WithSource("tank", source))
//
// Where the function cannot be recorded the model works with finite differences,
// and [Model.DerivativesNote] says why. The values of the tape are compared with
// those of the function before it is used.
func WithSource(function string, texts ...string) Option {
	return func(m *Model) error {
		src, err := tape.Parse(function, texts...)
		if err != nil {
			return err
		}
		return WithSyntax(src)(m)
	}
}

// WithSyntax is [WithSource] for a caller that holds the type-checked syntax of
// the function, and the values of the variables outside of it that it reads.
func WithSyntax(src *tape.Source) Option {
	return func(m *Model) error {
		own, known := *src, src.Variable // the caller may use src again
		e := &exact{m: m, src: &own, named: map[string]reflect.Value{}}
		if old, ok := m.der.(*exact); ok {
			e.named = old.named
		}
		own.Variable = func(v *types.Var) (reflect.Value, error) {
			if at, ok := e.named[v.Name()]; ok {
				return at, nil
			}
			if known == nil {
				return reflect.Value{}, fmt.Errorf("the variable %s is not part of the model; pass it as a parameter, make it a constant, or name it with Reads", v.Name())
			}
			return known(v)
		}
		m.der = e
		return nil
	}
}

// Reads tells a model with [WithSource] where a variable of the package is that
// the function reads: its name, and its address. The tape reads it anew at each
// evaluation.
func Reads(name string, address any) Option {
	return func(m *Model) error {
		v := reflect.ValueOf(address)
		if v.Kind() != reflect.Pointer || v.IsNil() {
			return fmt.Errorf("Reads(%q) wants the address of the variable, not a %T", name, address)
		}
		e, ok := m.der.(*exact)
		if !ok {
			e = &exact{m: m, named: map[string]reflect.Value{}}
			m.der = e
		}
		e.named[name] = v.Elem()
		return nil
	}
}

// exact takes derivatives from tapes of the model's source.
type exact struct {
	m     *Model
	src   *tape.Source
	named map[string]reflect.Value

	mu      sync.Mutex
	family  *tape.Family
	refusal error // why there is no tape
	checked map[*tape.Program]bool
}

// Describe says that derivatives are exact and from what, or why they are not.
func (e *exact) Describe() string {
	p, err := e.first()
	if err != nil {
		return differences{}.Describe() + "; not exact, because " + err.Error()
	}
	words := []string{fmt.Sprintf("exact, from the source: %d operations", p.Operations())}
	if names := p.Hidden(); len(names) > 0 {
		words = append(words, "reads "+strings.Join(names, ", "))
	}
	if names := p.Snapshots(); len(names) > 0 {
		words = append(words, "takes "+strings.Join(names, ", ")+" as it stands")
	}
	if places := p.Guards(); len(places) > 0 {
		words = append(words, "follows one side of the conditions at "+strings.Join(places, ", "))
	}
	words = append(words, p.Notes()...)
	return strings.Join(words, "; ")
}

// first returns a program, recorded where nothing better is known at states of
// their typical size.
func (e *exact) first() (*tape.Program, error) {
	e.mu.Lock()
	defer e.mu.Unlock()
	if e.refusal != nil {
		return nil, e.refusal
	}
	x := make([]float64, len(e.m.states))
	for i, v := range e.m.states {
		x[i] = 1
		if v.Scale > 0 {
			x[i] = v.Scale
		}
	}
	p, err := e.open().First(x, e.m.values())
	if err == nil {
		err = e.fits(p)
	}
	return p, err
}

// open returns the family of tapes.
func (e *exact) open() *tape.Family {
	if e.family == nil {
		p := e.m.values()
		_, params := e.m.equations.own().user(make([]float64, len(e.m.states)), p)
		e.family = tape.NewFamily(e.src, tape.Settings{
			States: len(e.m.states), Params: params, Context: e.m.context,
		})
		e.checked = map[*tape.Program]bool{}
	}
	return e.family
}

// fits compares the numbers of states and parameters with those of the model.
func (e *exact) fits(p *tape.Program) error {
	if n, m := p.Dimensions(); n != len(e.m.states) || m != len(e.m.parameters) {
		e.refusal = fmt.Errorf("the source has %d states and %d parameters, the function %d and %d", n, m, len(e.m.states), len(e.m.parameters))
	}
	return e.refusal
}

// at returns the program for a point, after its values were compared with those
// of the function there. It returns nil where there is none; refused says that
// there never will be one.
func (e *exact) at(x, p []float64, eq equations) (q *tape.Program, refused bool) {
	e.mu.Lock()
	defer e.mu.Unlock()
	if e.refusal != nil {
		return nil, true
	}
	q, err := e.open().At(x, p)
	if err != nil {
		if _, refusal := err.(*tape.Refusal); refusal && e.family.Recorded() == 0 || errors.Is(err, tape.ErrGuards) {
			e.refusal = err
		}
		return nil, e.refusal != nil
	}
	if e.fits(q) != nil || !e.checked[q] && e.compare(q, x, p, eq) != nil {
		return nil, true
	}
	return q, false
}

// compare refuses a tape whose values are not those of the function. On
// processors where the compiler fuses a product with a sum they may differ by
// rounding.
func (e *exact) compare(q *tape.Program, x, p []float64, eq equations) error {
	f, ok := safely(eq, x, p, len(x))
	if !ok {
		return nil // nothing to compare with here
	}
	m := q.ValueAndSparse().NewMachine()
	m.Run(x, p)
	out := m.Out()
	n := len(x)
	start, cols := q.Pattern()
	for i := range f {
		size := math.Abs(f[i])
		for k := start[i]; k < start[i+1]; k++ {
			size += math.Abs(out[n+k] * x[cols[k]])
		}
		if gap := math.Abs(f[i] - out[i]); gap > 1e-9*size || math.IsNaN(f[i]) != math.IsNaN(out[i]) {
			e.refusal = fmt.Errorf("the source is not that of the function: the equation of %s is %g by the source and %g by the function at %s", e.m.states[i].Name, out[i], f[i], whereabouts(e.m.states, x))
			return e.refusal
		}
	}
	e.checked[q] = true
	return nil
}

func whereabouts(vars []Variable, x []float64) string {
	var words []string
	for i, v := range vars[:min(4, len(vars))] {
		words = append(words, v.Name+" "+withUnit(x[i], v.Unit))
	}
	return strings.Join(words, ", ")
}

// safely evaluates the user's function; ok is false where it panics.
func safely(eq equations, x, p []float64, n int) (f []float64, ok bool) {
	defer func() { _ = recover() }()
	f = make([]float64, n)
	eq.eval(x, p, f)
	return f, true
}

// For returns a differentiator, and lets the system evaluate f by the tape too.
func (e *exact) For(ev Evaluator) Differentiator {
	s, ok := ev.(*system)
	if !ok || e.src == nil {
		return differences{}.For(ev)
	}
	run := &exactRun{e: e, s: s, plain: s.eq, fallback: differences{}.For(ev)}
	s.eq = &tapeEquations{equations: s.eq, run: run}
	return run
}

// tapeEquations evaluates f by the tape, and by the function where there is none.
type tapeEquations struct {
	equations
	run *exactRun
}

func (q *tapeEquations) eval(x, p, f []float64) {
	if !q.run.value(x, p, f) {
		q.equations.eval(x, p, f)
	}
}
