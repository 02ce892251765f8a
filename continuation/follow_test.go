package continuation_test

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"brinkline/continuation"
)

func mustFollow(t testing.TB, p *continuation.Point, param string, opts ...continuation.FollowOption) *continuation.Branch {
	t.Helper()
	b, err := p.Follow(param, opts...)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func TestTankIgnitesAndGoesOut(t *testing.T) {
	m := newTank(t)
	start := settled(t, m, tankState{0.1, 310})
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330))
	if len(b.Folds()) != 2 {
		t.Fatalf("found %v, want two folds", b.Specials())
	}
	ignition, err := b.LimitAbove(start)
	if err != nil {
		t.Fatal(err)
	}
	if !ignition.Greatest() || ignition.UnstableBefore != 0 || ignition.UnstableAfter != 1 {
		t.Errorf("ignition: %v, unstable %d then %d", ignition, ignition.UnstableBefore, ignition.UnstableAfter)
	}
	checkTankFold(t, ignition)
	margin, err := start.MarginTo(ignition)
	if err != nil {
		t.Fatal(err)
	}
	if want := ignition.Value() - 280; margin.Absolute != want || math.Abs(margin.Percent-100*want/280) > 1e-12 {
		t.Errorf("margin %v, want %v", margin, want)
	}
	if _, err := b.LimitBelow(start); err == nil || !strings.Contains(err.Error(), "no fold below Coolant 280 K") {
		t.Errorf("LimitBelow: %v", err)
	}
}

// checkTankFold holds a fold against another road: the tank's steady states are a
// curve in closed form, Coolant as a function of Temperature, whose derivative is
// zero at a fold.
func checkTankFold(t *testing.T, f *continuation.Fold) {
	t.Helper()
	coolant := func(temp float64) float64 {
		k := 7.2e10 * math.Exp(-8750/temp)
		x := k / (1 + k)
		return temp - ((350-temp)+209.2*x)/2.092
	}
	temp, err := f.At("Temperature")
	if err != nil {
		t.Fatal(err)
	}
	// Golden section on the extremum, at the side that it is.
	sign := 1.0
	if !f.Greatest() {
		sign = -1
	}
	a, b := temp-1, temp+1
	for range 100 {
		c, d := b-0.618033988749895*(b-a), a+0.618033988749895*(b-a)
		if sign*coolant(c) > sign*coolant(d) {
			b = d
		} else {
			a = c
		}
	}
	if want := coolant((a + b) / 2); math.Abs(f.Value()-want) > 1e-10*want {
		t.Errorf("fold at %.13g, closed form %.13g", f.Value(), want)
	}
}

func TestEnds(t *testing.T) {
	m := newTank(t)
	start := settled(t, m, tankState{0.1, 310})
	for _, c := range []struct {
		name   string
		opts   []continuation.FollowOption
		reason continuation.EndReason
		text   string
	}{
		{"range", nil, continuation.LeftRange, "left the range at Coolant 330 K"},
		{"bound", []continuation.FollowOption{continuation.Bound("Temperature", 250, 350)}, continuation.LeftBound, "left the bounds at Temperature 350 K"},
		{"fold", []continuation.FollowOption{continuation.StopAtFold()}, continuation.AtSpecial, "met the fold at Coolant 30"},
		{"special", []continuation.FollowOption{continuation.StopAtSpecial()}, continuation.AtSpecial, "met the fold at Coolant 30"},
		{"condition", []continuation.FollowOption{continuation.Until(func(p *continuation.Point) bool { return p.Value() > 290 })}, continuation.Condition, "met the condition at Coolant 29"},
		{"steps", []continuation.FollowOption{continuation.MaxSteps(3)}, continuation.OutOfSteps, "took all 3 steps"},
		{"natural", []continuation.FollowOption{continuation.Natural()}, continuation.FoldAhead, "a fold is near"},
		{"local", []continuation.FollowOption{continuation.Local("Temperature")}, continuation.LeftRange, "left the range at Coolant 330 K"},
		{"automatic", []continuation.FollowOption{continuation.LocalAutomatic()}, continuation.LeftRange, "left the range at Coolant 330 K"},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := mustFollow(t, start, "Coolant", append(c.opts, continuation.Within(260, 330), continuation.Upward())...)
			end := b.Ends()[1]
			if end.Reason != c.reason || !strings.Contains(end.Text, c.text) {
				t.Errorf("ended by %q: %s; want %q: %s", end.Reason, end.Text, c.reason, c.text)
			}
			if b.Ends()[0].Reason != continuation.NotFollowed {
				t.Errorf("the other end: %s", b.Ends()[0].Text)
			}
		})
	}
}

func TestEndsLandExactly(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330), continuation.Bound("Temperature", 250, 350))
	if v := b.Points()[0].Value(); v != 260 {
		t.Errorf("lower end at Coolant %v, want 260", v)
	}
	last := b.Points()[len(b.Points())-1]
	if v := last.State[1]; v != 350 {
		t.Errorf("upper end at Temperature %v, want 350", v)
	}
	r, err := start.Model().Residual(last.State, last.Parameters)
	if err != nil || math.Abs(r[0]) > 1e-9 || math.Abs(r[1]) > 1e-6 {
		t.Errorf("the end is no steady state: %v %v", r, err)
	}
}

func TestLandAt(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330), continuation.LandAt(300, 302.5, 300))
	count := map[float64]int{}
	for _, p := range b.Points() {
		count[p.Value()]++
	}
	// Three steady states at 300 and 302.5: before, between and after the folds.
	if count[300] != 3 || count[302.5] != 3 {
		t.Errorf("landed %d times at 300 and %d times at 302.5, want 3 and 3", count[300], count[302.5])
	}
}

func TestBranchStartsWhereItWasStarted(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330))
	p := b.Points()[b.Start()]
	if p.Value() != 280 || p.Arclength != 0 {
		t.Errorf("start at %v, arclength %v", p.Value(), p.Arclength)
	}
	for i := 1; i < len(b.Points()); i++ {
		if b.Points()[i].Arclength <= b.Points()[i-1].Arclength {
			t.Fatalf("arclength does not grow at point %d", i)
		}
	}
}

func TestModelUndefinedOnTheWay(t *testing.T) {
	for _, c := range []struct {
		name, text string
		model      any
	}{
		{"NaN", "the equation of X is NaN", func(s scalar, q lambda) scalar { return scalar{math.Sqrt(2-q.L) - s.X} }},
		{"Inf", "the equation of X is", func(s scalar, q lambda) scalar {
			if q.L > 2 {
				return scalar{math.Inf(1)}
			}
			return scalar{q.L - s.X}
		}},
		{"panic", "the model panicked (runtime error: index out of range", func(s scalar, q lambda) scalar {
			var none []float64
			if q.L > 2 {
				return scalar{none[3]}
			}
			return scalar{q.L - s.X}
		}},
	} {
		t.Run(c.name, func(t *testing.T) {
			m, err := continuation.NewModel(c.model, lambda{1})
			if err != nil {
				t.Fatal(err)
			}
			b := mustFollow(t, settled(t, m, scalar{1}), "L", continuation.Within(0, 5))
			end := b.Ends()[1]
			if end.Reason != continuation.OutOfDomain || !strings.Contains(end.Text, c.text) || !strings.Contains(end.Text, "stopped at L ") {
				t.Errorf("ended by %q: %s", end.Reason, end.Text)
			}
			if v := end.Point.Value(); v < 1.9 || v > 2 {
				t.Errorf("stopped at %v, want just below 2", v)
			}
			if b.Ends()[0].Reason != continuation.LeftRange {
				t.Errorf("the other end: %s", b.Ends()[0].Text)
			}
		})
	}
}

func TestInterruptKeepsTheBranch(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	calls := 0
	model := func(s scalar, q lambda) scalar {
		if calls++; calls == 400 {
			cancel()
		}
		return scalar{q.L + s.X - s.X*s.X*s.X}
	}
	m, err := continuation.NewModel(model, lambda{0}, continuation.WithContext(func() context.Context { return ctx }))
	if err != nil {
		t.Fatal(err)
	}
	start := settled(t, m, scalar{1})
	b := mustFollow(t, start, "L", continuation.Within(-1, 1), continuation.StepBetween(1e-8, 1e-3))
	if !b.Interrupted() || len(b.Points()) < 2 {
		t.Errorf("%v, ends %q and %q", b, b.Ends()[0].Text, b.Ends()[1].Text)
	}
	if _, err := start.Follow("L"); !errors.Is(err, continuation.ErrInterrupted) {
		t.Errorf("Follow after the interrupt: %v", err)
	}
}

func TestObserverSeesTheBranchGrow(t *testing.T) {
	var seen []continuation.Progress
	m := newTank(t, continuation.WithObserver(observer(func(p continuation.Progress) {
		if len(p.Partial().Points()) < 2 {
			t.Error("a partial branch without points")
		}
		seen = append(seen, p)
	})))
	mustFollow(t, settled(t, m, tankState{0.1, 310}), "Coolant", continuation.Within(260, 330))
	if len(seen) < 10 || !seen[len(seen)-1].Done {
		t.Fatalf("%d reports", len(seen))
	}
	for _, p := range seen {
		if p.Fraction < 0 || p.Fraction > 1 {
			t.Errorf("fraction %v", p.Fraction)
		}
	}
}

type observer func(continuation.Progress)

func (o observer) Progress(p continuation.Progress) { o(p) }

func TestFollowFromAFold(t *testing.T) {
	b := mustFollow(t, settled(t, newParabola(t, -1), scalar{1}), "L", continuation.Within(-2, 1))
	fold := b.Folds()[0]
	again := mustFollow(t, fold.Where(), "L", continuation.Within(-2, 1))
	if len(again.Folds()) != 1 || math.Abs(again.Folds()[0].Value()) > 1e-12 || again.Folds()[0].Index() != again.Start() {
		t.Errorf("from the fold: %v", again)
	}
	if e := again.Ends(); e[0].Reason != continuation.LeftRange || e[1].Reason != continuation.LeftRange {
		t.Errorf("ends: %q, %q", e[0].Text, e[1].Text)
	}
}

func TestRunIsDeterministic(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	a := mustFollow(t, start, "Coolant", continuation.Within(260, 330))
	b := mustFollow(t, start, "Coolant", continuation.Within(260, 330))
	if len(a.Points()) != len(b.Points()) {
		t.Fatalf("%d and %d points", len(a.Points()), len(b.Points()))
	}
	for i, p := range a.Points() {
		if q := b.Points()[i]; p.State[0] != q.State[0] || p.Value() != q.Value() {
			t.Fatalf("point %d differs", i)
		}
	}
}
