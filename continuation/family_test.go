package continuation_test

import (
	"context"
	"fmt"
	"math"
	"slices"
	"testing"

	"brinkline/continuation"
)

func TestSweep(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	inflows := []float64{80, 90, 100, 110, 120}
	f, err := start.Sweep("Coolant", "Inflow", inflows, continuation.Within(260, 330))
	if err != nil {
		t.Fatal(err)
	}
	if len(f.Branches()) != 5 || f.Interrupted() || f.Parameter().Name != "Coolant" || f.Second().Name != "Inflow" {
		t.Fatalf("%v, missing %v", f, f.Missing())
	}
	for i, m := range f.Members() {
		at := settledAt(t, start, "Inflow", inflows[i])
		b := mustFollow(t, at, "Coolant", continuation.Within(260, 330))
		if len(b.Folds()) != len(m.Branch.Folds()) || m.Value != inflows[i] {
			t.Fatalf("inflow %g: %v", m.Value, m.Branch.Specials())
		}
		for k, fold := range m.Branch.Folds() {
			if math.Abs(fold.Value()-b.Folds()[k].Value()) > 1e-9 {
				t.Errorf("inflow %g: %v and %v", m.Value, fold, b.Folds()[k])
			}
		}
		if _, err := at.MarginTo(m.Branch.Folds()[0]); err != nil {
			t.Errorf("a branch of a family is one of the model: %v", err)
		}
	}
}

// Beyond a fold in the second parameter there is no start, and the reason is said.
func TestSweepBeyondAFold(t *testing.T) {
	start := settled(t, newBus(t).Model(), busState{0, 1})
	f, err := start.Sweep("Q", "P", []float64{0.5, 1, 1.5}, continuation.Within(0, 0.6))
	if err != nil {
		t.Fatal(err)
	}
	if len(f.Branches()) != 2 || len(f.Missing()) != 1 {
		t.Fatalf("%v", f)
	}
	oneLine(t, fmt.Errorf("%s", f.Missing()[0].Reason), "no start: the branch in P met the fold at P")
	for _, m := range f.Members()[:2] {
		// E⁴ = 4 X E² Q + 4 X² P²
		if want := (1 - 0.64*m.Value*m.Value) / 1.6; math.Abs(m.Branch.Folds()[0].Value()-want) > 1e-9 {
			t.Errorf("P %g: %v, closed form %.12g", m.Value, m.Branch.Folds()[0], want)
		}
	}
}

// countdown interrupts after some members.
type countdown struct {
	left   int
	cancel func()
}

func (c *countdown) Progress(p continuation.Progress) {
	if c.left--; c.left == 0 {
		c.cancel()
	}
}

// An interrupted sweep keeps what it has, and the same call goes on from there.
func TestSweepIsResumed(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	o := &countdown{left: math.MaxInt, cancel: func() { cancel() }}
	m := newTank(t, continuation.WithContext(func() context.Context { return ctx }), continuation.WithObserver(o), continuation.Sequential())
	start := settled(t, m, tankState{0.1, 310})
	var values []float64
	for v := 80.0; v <= 120; v += 2 {
		values = append(values, v)
	}
	sweep := func() *continuation.Family {
		f, err := start.Sweep("Coolant", "Inflow", values, continuation.Within(260, 330))
		if err != nil {
			t.Fatal(err)
		}
		return f
	}
	whole := sweep()
	if whole.Resumed() != 0 || len(whole.Branches()) != len(values) {
		t.Fatalf("%v", whole)
	}
	o.left = math.MaxInt - o.left - 12 // as many words as the whole sweep had, less a dozen
	part := sweep()
	n := len(part.Branches())
	if !part.Interrupted() || n == 0 || n == len(values) {
		t.Fatalf("%v: %d of %d", part, n, len(values))
	}
	ctx, cancel = context.WithCancel(context.Background())
	o.left = math.MaxInt
	rest := sweep()
	if rest.Resumed() == 0 || rest.Interrupted() || len(rest.Branches()) != len(values) {
		t.Errorf("%v, %d taken over", rest, rest.Resumed())
	}
	for i, b := range rest.Branches() {
		if w := whole.Branches()[i]; !slices.Equal(b.Points()[len(b.Points())-1].State, w.Points()[len(w.Points())-1].State) || len(b.Points()) != len(w.Points()) {
			t.Errorf("member %d differs from that of an undisturbed sweep", i)
		}
	}
	if again := sweep(); again.Resumed() != 0 {
		t.Errorf("a finished sweep was taken over: %d", again.Resumed())
	}
	cancel()
}

func TestBadSweeps(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	_, err := start.Sweep("Coolant", "Inflw", []float64{1})
	oneLine(t, err, "did you mean Inflow?")
	_, err = start.Sweep("Coolant", "Coolant", []float64{1})
	oneLine(t, err, "the values are for another parameter")
	_, err = start.Sweep("Coolant", "Inflow", nil)
	oneLine(t, err, "no values of Inflow")
	_, err = start.Sweep("Coolant", "Inflow", []float64{90, 90})
	oneLine(t, err, "given twice")
	_, err = start.Sweep("Coolant", "Inflow", []float64{90}, continuation.Within(290, 300))
	oneLine(t, err, "outside the range")
}

// Compare -cpu 1 with -cpu 2.
func BenchmarkSweep(b *testing.B) {
	net := readFourteenBus(b)
	start := newFourteenFlow(net).today(b)
	var values []float64
	for v := 0.5; v < 1.5; v += 0.0625 {
		values = append(values, v)
	}
	for b.Loop() {
		f, err := start.Sweep("Load[13]", "Load[8]", values, continuation.Within(0.5, 8), continuation.StopAtFold(), continuation.Upward())
		if err != nil || len(f.Missing()) > 0 {
			b.Fatal(f, err)
		}
	}
}
