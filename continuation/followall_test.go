package continuation_test

import (
	"context"
	"math"
	"os"
	"slices"
	"testing"

	"brinkline/continuation"
)

func everything(t testing.TB, f func(x, l float64) float64, low, high [2]float64, opts ...continuation.SurveyOption) *continuation.Diagram {
	t.Helper()
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar { return scalar{f(s.X, q.L)} }, lambda{0.123})
	if err != nil {
		t.Fatal(err)
	}
	d, err := m.FollowAll("L", continuation.Box{"X": {low[0], high[0]}, "L": {low[1], high[1]}}, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// Plane curves whose branches, folds and crossings are seen in their equations.
func TestFollowAllPlaneCurves(t *testing.T) {
	ring := func(x, l, cx, cl, r float64) float64 { return (x-cx)*(x-cx) + (l-cl)*(l-cl) - r*r }
	for _, c := range []struct {
		name             string
		f                func(x, l float64) float64
		low, high        [2]float64 // of X, then of L
		branches, closed int
		folds, crossings int
	}{
		{"one fold", func(x, l float64) float64 { return l + x*x }, [2]float64{-2, -1}, [2]float64{2, 1}, 1, 0, 1, 0},
		{"S", func(x, l float64) float64 { return l + x - x*x*x }, [2]float64{-2, -1}, [2]float64{2, 1}, 1, 0, 2, 0},
		{"transcritical", func(x, l float64) float64 { return l*x - x*x }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 0, 0, 1},
		{"transcritical at the edge of the box", func(x, l float64) float64 { return l*x - x*x }, [2]float64{0, -1}, [2]float64{2, 1}, 2, 0, 0, 1},
		{"pitchfork", func(x, l float64) float64 { return l*x - x*x*x }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 0, 0, 1},
		{"subcritical pitchfork", func(x, l float64) float64 { return l*x + x*x*x - x*x*x*x*x }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 0, 2, 1},
		{"broken pitchfork", func(x, l float64) float64 { return l*x - x*x*x + 1e-3 }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 0, 1, 0},
		{"line and ring", func(x, l float64) float64 { return (x + 0.8) * ring(x, l, 0.4, 0, 0.3) }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 1, 2, 0},
		{"line and small ring", func(x, l float64) float64 { return (x + 0.8) * ring(x, l, 0.4, 0.31, 0.03) }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 1, 2, 0},
		{"three rings", func(x, l float64) float64 {
			return ring(x, l, 0.5, 0.4, 0.2) * ring(x, l, -0.5, 0.4, 0.2) * ring(x, l, 0.1, -0.4, 0.1)
		}, [2]float64{-2, -1}, [2]float64{2, 1}, 3, 3, 6, 0},
		{"line through a ring", func(x, l float64) float64 { return (x - 0.1) * ring(x, l, 0.2, 0, 0.5) }, [2]float64{-2, -1}, [2]float64{2, 1}, 2, 1, 2, 2},
		{"out of the box and back", func(x, l float64) float64 { return x - 1.4*(1-4*l*l) }, [2]float64{-1, -1}, [2]float64{1, 1}, 2, 0, 0, 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			d := everything(t, c.f, c.low, c.high)
			closed := 0
			for _, b := range d.Branches() {
				if b.Closed() {
					closed++
				}
			}
			folds, crossings := len(d.Folds()), 0
			for _, s := range d.Specials() {
				if _, ok := s.(*continuation.BranchPoint); ok {
					crossings++
				}
			}
			if len(d.Branches()) != c.branches || closed != c.closed || folds != c.folds || crossings != c.crossings || len(d.Notes()) > 0 {
				t.Errorf("%v\nclosed %d, special points %v, notes %q", d, closed, d.Specials(), d.Notes())
				for _, b := range d.Branches() {
					t.Logf("%v; %s; %s", b, b.Ends()[0].Text, b.Ends()[1].Text)
				}
			}
		})
	}
}

// The whole diagram of the stirred tank is the one branch, with both folds.
func TestFollowAllOfTheTank(t *testing.T) {
	box := continuation.Box{"Conversion": {0, 1}, "Temperature": {250, 450}, "Coolant": {270, 330}}
	d, err := newTank(t).FollowAll("Coolant", box)
	if err != nil {
		t.Fatal(err)
	}
	if len(d.Branches()) != 1 || len(d.Folds()) != 2 {
		t.Errorf("%v: %v", d, d.Specials())
	}
}

// The diagram is the same on any number of cores.
func TestFollowAllOnAnyNumberOfCores(t *testing.T) {
	f := func(x, l float64) float64 { return (l*x - x*x*x + 1e-3) * (x*x + l*l - 0.5) }
	low, high := [2]float64{-2, -1}, [2]float64{2, 1}
	want := everything(t, f, low, high, continuation.Workers(1))
	got := everything(t, f, low, high, continuation.Workers(3))
	if got.Statement() != want.Statement() || len(got.Branches()) != len(want.Branches()) {
		t.Fatalf("%v, want %v", got, want)
	}
	for i, b := range got.Branches() {
		for k, p := range b.Points() {
			if !slices.Equal(p.State, want.Branches()[i].Points()[k].State) {
				t.Fatalf("branch %d, point %d: %v, want %v", i, k, p, want.Branches()[i].Points()[k])
			}
		}
	}
}

func TestBadRegions(t *testing.T) {
	m := newTank(t)
	whole := continuation.Box{"Conversion": {0, 1}, "Temperature": {250, 450}, "Coolant": {270, 330}}
	for _, c := range []struct {
		name, want, parameter string
		box                   continuation.Box
		opts                  []continuation.SurveyOption
	}{
		{"unknown parameter", `no parameter "Coolnt"`, "Coolnt", whole, nil},
		{"no range", "the box has no interval for Coolant", "Coolant", tankBox, nil},
		{"upside down", "the box is upside down: Coolant", "Coolant", continuation.Box{"Conversion": {0, 1}, "Temperature": {250, 450}, "Coolant": {330, 270}}, nil},
		{"range twice", "leave Within out", "Coolant", whole, []continuation.SurveyOption{continuation.Following(continuation.Within(280, 300))}},
		{"bad option", "a step length must be positive", "Coolant", whole, []continuation.SurveyOption{continuation.Following(continuation.StepLength(-1))}},
		{"nothing there", "no branch found in the box; tried:", "Coolant", continuation.Box{"Conversion": {0.4, 0.6}, "Temperature": {250, 260}, "Coolant": {270, 330}}, nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := m.FollowAll(c.parameter, c.box, c.opts...)
			oneLine(t, err, c.want)
		})
	}
}

func TestInterruptedFollowAll(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	calls, most := 0, math.MaxInt
	m, err := continuation.NewModel(func(s scalar, q lambda) scalar {
		if calls++; calls == most {
			cancel()
		}
		return scalar{(q.L*s.X - s.X*s.X*s.X + 1e-3)}
	}, lambda{0.1}, continuation.Sequential(), continuation.WithContext(func() context.Context { return ctx }))
	if err != nil {
		t.Fatal(err)
	}
	box := continuation.Box{"X": {-2, 2}, "L": {-1, 1}}
	if _, err := m.FollowAll("L", box); err != nil {
		t.Fatal(err)
	}
	all := calls
	for _, part := range []float64{0.05, 0.5, 0.8, 0.95} {
		ctx, cancel = context.WithCancel(context.Background())
		defer cancel()
		calls, most = 0, int(part*float64(all))
		d, err := m.FollowAll("L", box)
		if err != nil {
			oneLine(t, err, "interrupted before a branch was found")
		} else if !d.Interrupted() || len(d.Branches()) == 0 {
			t.Errorf("interrupted at %g: %v", part, d)
		}
		if calls > most+2 {
			t.Errorf("interrupted at %d calls, made %d", most, calls)
		}
	}
}

// Every special point of the published cases is on the diagram of a box round their
// branch.
func TestFollowAllReferenceCases(t *testing.T) {
	for _, c := range cases(t) {
		if c.N > 4 && os.Getenv("BRINKLINE_LONG") == "" {
			continue
		}
		t.Run(c.ID, func(t *testing.T) {
			b := follow(t, c)
			d, err := b.Model().FollowAll(c.Follow.Param, boxRound(b, c.Follow.Param, float64(c.Follow.From), float64(c.Follow.To)), continuation.Effort(16))
			if err != nil {
				t.Fatal(err)
			}
			for _, s := range b.Specials() {
				if !slices.ContainsFunc(d.Specials(), func(o continuation.Special) bool { return sameSpecial(s, o) }) {
					t.Errorf("%v is missing from %v: %v, %q", s, d, d.Specials(), d.Notes())
				}
			}
			if len(d.Notes()) > 0 {
				t.Logf("%v: %q", d, d.Notes())
			}
		})
	}
}

func sameSpecial(s, o continuation.Special) bool {
	if s.Kind() != o.Kind() {
		return false
	}
	p, q := s.Where(), o.Where()
	for i := range p.State {
		if math.Abs(p.State[i]-q.State[i]) > 1e-5*(1e-3+math.Abs(p.State[i])) {
			return false
		}
	}
	return math.Abs(p.Value()-q.Value()) <= 1e-7*(1e-3+math.Abs(p.Value()))
}

func boxRound(b *continuation.Branch, parameter string, from, to float64) continuation.Box {
	box := continuation.Box{parameter: {from, to}}
	for i, v := range b.Model().States() {
		low, high := math.Inf(1), math.Inf(-1)
		for _, p := range b.Points() {
			low, high = math.Min(low, p.State[i]), math.Max(high, p.State[i])
		}
		if high-low < 1e-6 { // a state that keeps its value
			low, high = low-1, high+1
		}
		room := 0.1 * (high - low)
		box[v.Name] = [2]float64{low - room, high + room}
	}
	return box
}
