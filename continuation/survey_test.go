package continuation_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"sync/atomic"
	"testing"

	"brinkline/continuation"
)

func surveyed(t testing.TB, m *continuation.Model, box continuation.Box, opts ...continuation.SurveyOption) *continuation.Survey {
	t.Helper()
	s, err := m.Survey(box, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

var tankBox = continuation.Box{"Conversion": {0, 1}, "Temperature": {250, 450}}

// The stirred tank between its folds has the three steady states that its branch has.
func TestSurveyOfTheTank(t *testing.T) {
	start, err := newTank(t).Settle(tankState{0.1, 310})
	if err != nil {
		t.Fatal(err)
	}
	const between = 300.5
	branch := mustFollow(t, start, "Coolant", continuation.Within(200, 330), continuation.LandAt(between))
	stable := 0
	var there []*continuation.Point
	for _, p := range branch.Points() {
		if p.Value() == between {
			there = append(there, p)
			if p.Stable() {
				stable++
			}
		}
	}
	m, err := continuation.NewModel(tank, tankParams{Inflow: 100, Coolant: between})
	if err != nil {
		t.Fatal(err)
	}
	s := surveyed(t, m, tankBox)
	if len(s.Points()) != 3 || len(there) != 3 || len(s.Stable()) != stable || len(s.Notes()) > 0 {
		t.Fatalf("%v; %v", s, s.Notes())
	}
	for i, p := range s.Points() {
		if i > 0 && p.State[0] <= s.Points()[i-1].State[0] {
			t.Errorf("not sorted: %v", s.Points())
		}
		f, err := m.Residual(p.State, nil)
		if err != nil || largestOf(f) > 1e-9 {
			t.Errorf("f = %v at %v", f, p)
		}
	}
	if s.Box()["Temperature"] != [2]float64{250, 450} {
		t.Errorf("box %v", s.Box())
	}
}

// The result is the same, bit by bit, on any number of cores.
func TestSurveyOnAnyNumberOfCores(t *testing.T) {
	for k := range 20 {
		s := randomSystem(rand.New(rand.NewPCG(uint64(k), 6)))
		m, box := s.model(t, slices.Repeat([]float64{1}, s.n))
		want := surveyed(t, m, box, continuation.Workers(1))
		for _, workers := range []int{2, 3, 16} {
			got := surveyed(t, m, box, continuation.Workers(workers))
			if got.Statement() != want.Statement() || len(got.Points()) != len(want.Points()) {
				t.Fatalf("system %d on %d cores: %v, on one %v", k, workers, got, want)
			}
			for i, p := range got.Points() {
				if !slices.Equal(p.State, want.Points()[i].State) || !slices.Equal(p.Eigenvalues, want.Points()[i].Eigenvalues) {
					t.Errorf("system %d on %d cores: %v, on one %v", k, workers, p.State, want.Points()[i].State)
				}
			}
		}
	}
}

// What the statement says about the effort is what the model sees.
func TestStatedEffortIsTrue(t *testing.T) {
	for _, workers := range []int{1, 2} {
		var calls atomic.Int64
		m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
			calls.Add(1)
			return scalar{(s.X - 0.3) * (s.X + 0.2) * (s.X - q.L)}
		}, lambda{0.7})
		if err != nil {
			t.Fatal(err)
		}
		calls.Store(0)
		s := surveyed(t, m, continuation.Box{"X": {-1, 1}}, continuation.Workers(workers), continuation.Effort(20))
		tried := s.Tried()
		if int64(tried.Evaluations) != calls.Load() {
			t.Errorf("%d evaluations stated, %d made", tried.Evaluations, calls.Load())
		}
		if tried.Barren < 20 || tried.Starts < tried.Barren || tried.Runs < tried.Starts || len(s.Points()) != 3 {
			t.Errorf("%+v, %v", tried, s)
		}
		want := fmt.Sprintf("%d starts, %d runs of Newton's method, %d evaluations of the model; the last %d starts found nothing new", tried.Starts, tried.Runs, tried.Evaluations, tried.Barren)
		if s.Statement() != want {
			t.Errorf("states %q, want %q", s.Statement(), want)
		}
	}
}

// A model whose function must not be called by two goroutines is not.
func TestSequentialModel(t *testing.T) {
	var inside, most atomic.Int64
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
		if n := inside.Add(1); n > most.Load() {
			most.Store(n)
		}
		defer inside.Add(-1)
		return scalar{s.X*s.X - q.L}
	}, lambda{0.5}, continuation.Sequential())
	if err != nil {
		t.Fatal(err)
	}
	s := surveyed(t, m, continuation.Box{"X": {-1, 1}}, continuation.Workers(8))
	if most.Load() != 1 || len(s.Points()) != 2 {
		t.Errorf("%d calls at once, %v", most.Load(), s)
	}
}

// States of small size, and one that is 0, are exact; those beyond the edge are told
// apart.
func TestSurveyOfSmallStates(t *testing.T) {
	type two struct{ A, B float64 }
	m, err := continuation.NewModel(func(s two, q lambda) two {
		return two{(s.A - 1e-9) * (s.A - 3e-9) * (s.A - 0.5), (s.B + 0.1*s.A*(s.A-0.5)) * (s.B - 1.5)}
	}, lambda{1})
	if err != nil {
		t.Fatal(err)
	}
	s := surveyed(t, m, continuation.Box{"A": {0, 1}, "B": {-1, 1}})
	if len(s.Points()) != 3 {
		t.Fatalf("%v: %v", s, s.Points())
	}
	for i, want := range []float64{1e-9, 3e-9, 0.5} {
		if got := s.Points()[i].State[0]; math.Abs(got-want) > 1e-9*want {
			t.Errorf("A = %v, want %v", got, want)
		}
	}
	for _, p := range s.Outside() {
		if math.Abs(p.State[1]-1.5) > 1e-9 {
			t.Errorf("outside: %v", p)
		}
	}
}

// Many states by one interval: discretised u” + λ e^u = 0 has two solutions below its
// fold (Gelfand; Ascher, Mattheij & Russell, Numerical Solution of Boundary Value
// Problems, 1995, example 1.2).
func TestSurveyOfARod(t *testing.T) {
	const n = 40
	names := make([]string, n)
	for i := range names {
		names[i] = fmt.Sprintf("U[%d]", i)
	}
	m, err := continuation.NewModel(func(u []float64, q lambda, f []float64) {
		h := 1.0 / (n + 1)
		for i := range u {
			left, right := 0.0, 0.0
			if i > 0 {
				left = u[i-1]
			}
			if i < n-1 {
				right = u[i+1]
			}
			f[i] = (left-2*u[i]+right)/(h*h) + q.L*math.Exp(u[i])
		}
	}, lambda{1}, continuation.States(names, nil, nil))
	if err != nil {
		t.Fatal(err)
	}
	for _, box := range []continuation.Box{{"U": {0, 8}}, m.Box(0, 8)} {
		s := surveyed(t, m, box, continuation.Effort(16))
		if len(s.Points()) != 2 || len(s.Stable()) != 1 {
			t.Fatalf("%v, %d outside", s, len(s.Outside()))
		}
		// u(1/2) of the continuous problem is 0.140539 and 4.091147; the differences
		// move it by less than 0.02.
		for i, want := range []float64{0.140539, 4.091147} {
			if got := slices.Max(s.Points()[i].State); math.Abs(got-want) > 0.02 {
				t.Errorf("middle %v, want about %v", got, want)
			}
		}
	}
}

func TestBadBoxes(t *testing.T) {
	m := newTank(t)
	for _, c := range []struct {
		name, want string
		box        continuation.Box
		opts       []continuation.SurveyOption
	}{
		{"upside down", "the box is upside down: Temperature from 450 to 250", continuation.Box{"Conversion": {0, 1}, "Temperature": {450, 250}}, nil},
		{"flat", "the box has no volume: Temperature from 300 to 300", continuation.Box{"Conversion": {0, 1}, "Temperature": {300, 300}}, nil},
		{"endless", "two finite numbers are wanted", continuation.Box{"Conversion": {0, 1}, "Temperature": {300, math.Inf(1)}}, nil},
		{"NaN", "two finite numbers are wanted", continuation.Box{"Conversion": {math.NaN(), 1}, "Temperature": {300, 400}}, nil},
		{"empty", "the box has no interval for Conversion, Temperature", nil, nil},
		{"one missing", "the box has no interval for Temperature", continuation.Box{"Conversion": {0, 1}}, nil},
		{"unknown", `no state "Temprature"; the model has Conversion, Temperature (did you mean Temperature?)`, continuation.Box{"Conversion": {0, 1}, "Temprature": {300, 400}}, nil},
		{"parameter", "Coolant is a parameter", continuation.Box{"Conversion": {0, 1}, "Temperature": {300, 400}, "Coolant": {280, 300}}, nil},
		{"no effort", "at least one start", tankBox, []continuation.SurveyOption{continuation.Effort(0)}},
		{"no workers", "at least one", tankBox, []continuation.SurveyOption{continuation.Workers(0)}},
		{"none wanted", "at least one", tankBox, []continuation.SurveyOption{continuation.MostStates(-1)}},
		{"nothing there", "no steady state found in the box; tried: 10 starts, 10 runs", continuation.Box{"Conversion": {0.4, 0.6}, "Temperature": {250, 260}}, []continuation.SurveyOption{continuation.Effort(10)}},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := m.Survey(c.box, c.opts...)
			oneLine(t, err, c.want)
		})
	}
}

func TestSurveyThatFindsNothing(t *testing.T) {
	model := func(f func(x float64) float64) *continuation.Model {
		m, err := continuation.NewModel(func(s scalar, q lambda) scalar { return scalar{f(s.X)} }, lambda{1})
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
	box := continuation.Box{"X": {-1, 1}}
	_, err := model(func(x float64) float64 { return 1 + x*x }).Survey(box, continuation.Effort(30))
	oneLine(t, err, "no steady state found in the box; tried: 30 starts, 30 runs of Newton's method,")
	_, err = model(func(x float64) float64 { return math.Log(-2 - x) }).Survey(box)
	oneLine(t, err, "the model could not be evaluated at any of 64 starts in the box: the equation of X is NaN")
	_, err = model(func(x float64) float64 { panic("no luck") }).Survey(box)
	oneLine(t, err, "the model panicked (no luck)")
	_, err = model(func(x float64) float64 { return x - 1.5 }).Survey(box)
	oneLine(t, err, "no steady state in the box, but 1 near it, the first at L 1, X 1.5; tried: 64 starts")
}

// A double root is there once, with a word about it.
func TestSurveyOfADoubleRoot(t *testing.T) {
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
		return scalar{(s.X - 0.25) * (s.X - 0.25) * (s.X + 0.5)}
	}, lambda{1})
	if err != nil {
		t.Fatal(err)
	}
	s := surveyed(t, m, continuation.Box{"X": {-1, 1}})
	if len(s.Points()) != 2 || len(s.Notes()) != 1 {
		t.Errorf("%v; %q", s.Points(), s.Notes())
	}
}

// A whole curve of steady states does not keep a survey for ever.
func TestSurveyOfACurve(t *testing.T) {
	type two struct{ A, B float64 }
	m, err := continuation.NewModel(func(s two, q lambda) two {
		r := s.A*s.A + s.B*s.B - q.L
		return two{r, 2 * r}
	}, lambda{0.5})
	if err != nil {
		t.Fatal(err)
	}
	s, err := m.Survey(continuation.Box{"A": {-1, 1}, "B": {-1, 1}}, continuation.MostStates(50))
	if err != nil {
		oneLine(t, err, "tried:")
		return
	}
	if len(s.Points()) > 80 || len(s.Notes()) == 0 {
		t.Errorf("%v, %q", s, s.Notes())
	}
}

func TestInterruptedSurvey(t *testing.T) {
	for _, workers := range []int{1, 2} {
		ctx, cancel := context.WithCancel(context.Background())
		var calls atomic.Int64
		m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
			if calls.Add(1) == 2000 {
				cancel()
			}
			return scalar{(s.X - 0.3) * (s.X + 0.2) * (s.X - q.L)}
		}, lambda{0.7}, continuation.WithContext(func() context.Context { return ctx }))
		if err != nil {
			t.Fatal(err)
		}
		s := surveyed(t, m, continuation.Box{"X": {-1, 1}}, continuation.Workers(workers), continuation.Effort(1_000_000))
		if !s.Interrupted() || len(s.Points()) == 0 || calls.Load() > 2100 {
			t.Errorf("%v after %d calls", s, calls.Load())
		}
		// A survey that begins interrupted has nothing to keep.
		_, err = m.Survey(continuation.Box{"X": {-1, 1}})
		oneLine(t, err, "interrupted before a steady state was found")
		if !errors.Is(err, continuation.ErrInterrupted) {
			t.Errorf("%v does not wrap ErrInterrupted", err)
		}
	}
}

type told struct{ last, count atomic.Int64 }

func (o *told) Progress(p continuation.Progress) {
	o.count.Add(1)
	if p.Done {
		o.last.Add(1)
	}
}

func TestSurveyTellsItsProgress(t *testing.T) {
	o := &told{}
	m := newTank(t, continuation.WithObserver(o))
	s := surveyed(t, m, tankBox)
	if int(o.count.Load()) != s.Tried().Starts+1 || o.last.Load() != 1 {
		t.Errorf("told %d times, %d of them the last, for %d starts", o.count.Load(), o.last.Load(), s.Tried().Starts)
	}
}

// BenchmarkSurvey looks for the steady states of a network of coupled cells on one
// core and on two.
func BenchmarkSurvey(b *testing.B) {
	const n = 5
	names := make([]string, n)
	for i := range names {
		names[i] = fmt.Sprintf("X[%d]", i)
	}
	m, err := continuation.NewModel(func(u []float64, q lambda, f []float64) {
		for i, x := range u {
			f[i] = x - x*x*x + q.L*(u[(i+1)%n]-2*x+u[(i+n-1)%n])
		}
	}, lambda{0.3}, continuation.States(names, nil, nil))
	if err != nil {
		b.Fatal(err)
	}
	for _, workers := range []int{1, 2} {
		b.Run(fmt.Sprintf("cores=%d", workers), func(b *testing.B) {
			for b.Loop() {
				surveyed(b, m, continuation.Box{"X": {-1.5, 1.5}}, continuation.Workers(workers))
			}
		})
	}
}

// A model that brings its source is surveyed with exact derivatives, on several cores
// too.
func TestSurveyWithSource(t *testing.T) {
	const source = `package p
type scalar struct{ X float64 }
type lambda struct{ L float64 }
func model(s scalar, q lambda) scalar {
	if s.X > 0.5 {
		return scalar{(s.X - q.L) * (s.X - 0.6)}
	}
	return scalar{(s.X - q.L) * (s.X - 0.6) * (1 + 10*(s.X-0.5)*(s.X-0.5)*(s.X+0.1))}
}`
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
		if s.X > 0.5 {
			return scalar{(s.X - q.L) * (s.X - 0.6)}
		}
		return scalar{(s.X - q.L) * (s.X - 0.6) * (1 + 10*(s.X-0.5)*(s.X-0.5)*(s.X+0.1))}
	}, lambda{-0.3}, continuation.WithSource("model", source))
	if err != nil {
		t.Fatal(err)
	}
	var want *continuation.Survey
	for _, workers := range []int{1, 2, 4} {
		s := surveyed(t, m, continuation.Box{"X": {-1, 1}}, continuation.Workers(workers))
		if want == nil {
			want = s
		}
		if len(s.Points()) != 3 || s.Statement() != want.Statement() || !slices.Equal(s.Points()[0].State, want.Points()[0].State) {
			t.Errorf("on %d cores %v: %v, want %v", workers, s, s.Points(), want)
		}
	}
	if note := m.DerivativesNote(); strings.Contains(note, "finite") {
		t.Errorf("derivatives: %s", note)
	}
}
