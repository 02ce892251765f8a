package continuation_test

import (
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
	"brinkline/continuation/internal/reference"
)

// TestExactFolds follows every reference model by the tape of its own source.
// Each fold is to agree with the file to 13 digits, or to those that the file has
// or the point itself allows, and no point may claim digits that it has not.
func TestExactFolds(t *testing.T) {
	cases, err := reference.Load("../testdata/reference-cases.json")
	if err != nil {
		t.Fatal(err)
	}
	folds := 0
	for _, c := range cases {
		t.Run(c.ID, func(t *testing.T) {
			b := exactBranch(t, &c)
			for _, s := range b.Specials() {
				gap, value, fact := nearestFact(&c, s.Where().Value())
				if fact == nil {
					continue
				}
				if claimed := math.Pow(10, -float64(s.Digits())) * math.Abs(value); gap > claimed && value != 0 {
					t.Errorf("%s claims %d digits; the error is %.2g", s.Summary(), s.Digits(), gap)
				}
				if fact.Kind == "fold" {
					folds++
					if gap > 1e-13*math.Max(math.Abs(value), 1e-6) {
						t.Errorf("%s is off by %.2g", s.Summary(), gap)
					}
				}
			}
		})
	}
	if folds < 25 {
		t.Errorf("only %d folds were compared", folds)
	}
}

// exactBranch follows the case and checks that it was done with exact
// derivatives.
func exactBranch(t *testing.T, c *reference.Case) *continuation.Branch {
	t.Helper()
	m, err := c.Model(true, continuation.WithSource("model", c.Equations))
	if err != nil {
		t.Fatal(err)
	}
	if note := m.DerivativesNote(); !strings.HasPrefix(note, "exact, from the source: ") {
		t.Fatalf("derivatives: %s", note)
	}
	x, err := reference.Values(c.Start.State, m)
	if err != nil {
		t.Fatal(err)
	}
	p, err := m.Settle(x)
	if err != nil {
		t.Fatal(err)
	}
	b, err := p.Follow(c.Follow.Param, continuation.Within(float64(c.Follow.From), float64(c.Follow.To)))
	if err != nil {
		t.Fatal(err)
	}
	if note := m.DerivativesNote(); !strings.HasPrefix(note, "exact, from the source: ") {
		t.Fatalf("derivatives after the run: %s", note)
	}
	return b
}

// nearestFact returns the special point of the file that is nearest.
func nearestFact(c *reference.Case, at float64) (gap, value float64, fact *reference.Fact) {
	gap = math.Inf(1)
	for _, k := range c.Branch.SpecialPoints {
		f := &c.Facts[k]
		v, ok := f.At[c.Follow.Param]
		if ok && f.Kind != "neutral saddle" && math.Abs(float64(v)-at) < gap {
			gap, value, fact = math.Abs(float64(v)-at), float64(v), f
		}
	}
	return gap, value, fact
}

const sourceOfSwitch = `
type State struct{ X float64 }
type Params struct {
	A    float64
	Kind int
}

func model(s State, q Params) State {
	if q.Kind == 2 {
		return State{q.A - s.X*s.X}
	}
	return State{q.A*gain - s.X}
}
`

type switchState struct{ X float64 }
type switchParams struct {
	A    float64
	Kind int
}

var gain = 2.0

func switchModel(s switchState, q switchParams) switchState {
	if q.Kind == 2 {
		return switchState{q.A - s.X*s.X}
	}
	return switchState{q.A*gain - s.X}
}

func TestExactIsRefusedAloud(t *testing.T) {
	tests := []struct {
		name, source string
		want         string
		opts         []continuation.Option
	}{
		{"whole number in Params", sourceOfSwitch, "exact, from the source: 2 operations", nil},
		{"other source", strings.Replace(sourceOfSwitch, "s.X*s.X", "s.X", 1), "the source is not that of the function: the equation of X is", nil},
		{"unknown variable", strings.Replace(sourceOfSwitch, "q.Kind == 2", "false", 1), "line 12: the variable gain is not part of the model", nil},
		{"named variable", strings.Replace(sourceOfSwitch, "q.Kind == 2", "false", 1), "the source is not that of the function", []continuation.Option{continuation.Reads("gain", &gain)}},
	}
	for _, test := range tests {
		source := test.source
		if strings.Contains(test.name, "variable") {
			source += "var gain float64\n"
		}
		opts := append(test.opts, continuation.WithSource("model", source))
		m, err := continuation.NewModel(switchModel, switchParams{A: 4, Kind: 2}, opts...)
		if err != nil {
			t.Errorf("%s: %v", test.name, err)
			continue
		}
		p, err := m.Settle(switchState{1.5})
		if err != nil {
			t.Errorf("%s: %v", test.name, err)
			continue
		}
		if v, err := p.At("X"); err != nil || math.Abs(v-2) > 1e-12 {
			t.Errorf("%s: settled at %v, %v; want 2", test.name, v, err)
		}
		if note := m.DerivativesNote(); !strings.Contains(note, test.want) {
			t.Errorf("%s: the note is %q, want %q in it", test.name, note, test.want)
		}
	}
}

// A variable of the package that the model reads may change between two runs.
func TestExactReadsVariableAnew(t *testing.T) {
	old := gain
	defer func() { gain = old }()
	m, err := continuation.NewModel(switchModel, switchParams{A: 4},
		continuation.WithSource("model", sourceOfSwitch+"var gain float64\n"), continuation.Reads("gain", &gain))
	if err != nil {
		t.Fatal(err)
	}
	for _, gain = range []float64{2, 3} {
		p, err := m.Settle(switchState{1})
		if err != nil {
			t.Fatal(err)
		}
		if v, err := p.At("X"); err != nil || math.Abs(v-4*gain) > 1e-12 {
			t.Errorf("with gain %g the state is %v, %v; want %g", gain, v, err, 4*gain)
		}
	}
	if note := m.DerivativesNote(); !strings.HasSuffix(note, "reads gain") {
		t.Errorf("note: %s", note)
	}
}

type nestedState struct {
	Pair  [2]struct{ X, Y float64 }
	Inner struct {
		_ float64
		T float64 `unit:"K"`
	}
}

type nestedParams struct {
	Rate  [2]float64
	Steps int
	Loads []float64
	Law   struct {
		Kind string
		K    float64
	}
}

func nestedModel(s nestedState, q nestedParams) (r nestedState) {
	for i := range s.Pair {
		r.Pair[i].X = q.Rate[i] - s.Pair[i].X*s.Pair[i].X
		r.Pair[i].Y = s.Pair[1-i].X - s.Pair[i].Y
	}
	for range q.Steps {
		r.Inner.T += q.Loads[1]
	}
	if q.Law.Kind == "linear" {
		r.Inner.T -= q.Law.K * s.Inner.T
	}
	return
}

const nestedSource = `
type nestedState struct {
	Pair  [2]struct{ X, Y float64 }
	Inner struct {
		_ float64
		T float64
	}
}

type nestedParams struct {
	Rate  [2]float64
	Steps int
	Loads []float64
	Law   struct {
		Kind string
		K    float64
	}
}

func nestedModel(s nestedState, q nestedParams) (r nestedState) {
	for i := range s.Pair {
		r.Pair[i].X = q.Rate[i] - s.Pair[i].X*s.Pair[i].X
		r.Pair[i].Y = s.Pair[1-i].X - s.Pair[i].Y
	}
	for range q.Steps {
		r.Inner.T += q.Loads[1]
	}
	if q.Law.Kind == "linear" {
		r.Inner.T -= q.Law.K * s.Inner.T
	}
	return
}
`

// States and parameters are numbered alike by the source and by the function.
func TestExactNestedStates(t *testing.T) {
	q := nestedParams{Rate: [2]float64{4, 9}, Steps: 3, Loads: []float64{7, 5}}
	q.Law.Kind, q.Law.K = "linear", 2
	m, err := continuation.NewModel(nestedModel, q, continuation.WithSource("nestedModel", nestedSource))
	if err != nil {
		t.Fatal(err)
	}
	p, err := m.Settle([]float64{1, 1, 1, 1, 1})
	if err != nil {
		t.Fatal(err)
	}
	for name, want := range map[string]float64{"Pair[0].X": 2, "Pair[1].X": 3, "Pair[0].Y": 3, "Pair[1].Y": 2, "Inner.T": 7.5} {
		if v, err := p.At(name); err != nil || math.Abs(v-want) > 1e-12 {
			t.Errorf("%s is %v, %v; want %v", name, v, err, want)
		}
	}
	if note := m.DerivativesNote(); note != "exact, from the source: 11 operations" {
		t.Errorf("derivatives: %s", note)
	}
}

const flipSource = `
type Params struct {
	A     float64
	Table [256]int
}

func model(u []float64, q Params, f []float64) {
	k := 0
	for i, v := range u {
		if v > 0 {
			k += 1 << i
		}
	}
	for i, v := range u {
		f[i] = v - q.A*float64(q.Table[k]>>i&1)
	}
}
`

type flipParams struct {
	A     float64
	Table [256]int
}

func flipModel(u []float64, q flipParams, f []float64) {
	k := 0
	for i, v := range u {
		if v > 0 {
			k += 1 << i
		}
	}
	for i, v := range u {
		f[i] = v - q.A*float64(q.Table[k]>>i&1)
	}
}

// A model whose conditions go another way each time ends up with differences,
// and says so.
func TestExactGivesUpOnGuards(t *testing.T) {
	q := flipParams{A: 1}
	for k := range q.Table {
		q.Table[k] = (k + 1) % 256
	}
	names := []string{"a", "b", "c", "d", "e", "f", "g", "h"}
	m, err := continuation.NewModel(flipModel, q, continuation.States(names, nil, nil), continuation.WithSource("model", flipSource))
	if err != nil {
		t.Fatal(err)
	}
	if note := m.DerivativesNote(); !strings.Contains(note, "follows one side of the conditions at line ") {
		t.Errorf("derivatives at first: %s", note)
	}
	for k := range 100 {
		x := make([]float64, 8)
		for i := range x {
			x[i] = float64(k>>i&1)*2 - 1
		}
		_, _ = m.Settle(x) // has no solution; that it ends is what matters
	}
	if note := m.DerivativesNote(); !strings.HasSuffix(note, "not exact, because the conditions of the model go too many different ways") {
		t.Errorf("derivatives at last: %s", note)
	}
}
