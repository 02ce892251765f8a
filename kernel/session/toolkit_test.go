package session

import (
	"context"
	"strings"
	"testing"
	"time"

	"brinkline/display"
)

func TestToolkitEndToEnd(t *testing.T) {
	s := sessionAfter(t, tankCells)
	out := &recorder{}
	res := s.Run(t.Context(), Cell{Number: 2, Source: `
plant := continuation.NewModel(tank, Params{Inflow: 100, Coolant: 280})
start := plant.Settle(State{0.05, 320})
path := start.Follow("Coolant", continuation.Within(270, 320))
path
`}, out)
	if res.Err != nil {
		t.Fatal(strings.Join(res.Err.Traceback, "\n"))
	}
	if res.Value == nil || res.Value.Data[display.MIMESVG] == nil {
		t.Fatalf("a branch shows %v", res.Value)
	}
	if !strings.Contains(res.Value.Text(), "fold") || !strings.Contains(res.Value.Text(), "tank") {
		t.Errorf("the picture says %q", res.Value.Text())
	}
	if len(s.Specials()) != len(strings.Fields(strings.Repeat("x ", len(s.Specials())))) || len(s.Specials()) == 0 {
		t.Errorf("special points: %v", s.Specials())
	}
	out = &recorder{}
	res = s.Run(t.Context(), Cell{Number: 3, Source: `
fold := path.LimitAbove(start)
display.Show(fold, start.MarginTo(fold))
for _, f := range path.Folds() {
	fmt.Printf("%s %.2f\n", f.Kind(), f.Value())
}
`}, out)
	if res.Err != nil {
		t.Fatal(strings.Join(res.Err.Traceback, "\n"))
	}
	if strings.Count(out.text(), "display: ") != 2 || !strings.Contains(out.text(), "fold 3") && !strings.Contains(out.text(), "fold 2") {
		t.Errorf("got %s", out.text())
	}
}

func TestToolkitErrorStopsWithItsLine(t *testing.T) {
	s := sessionAfter(t, tankCells, "plant := continuation.NewModel(tank, Params{100, 280})\nstart := plant.Settle(State{0.05, 320})")
	res := s.Run(t.Context(), Cell{Number: 3, Source: "x := 1\npath := start.Follow(\"Coolnt\")"}, &recorder{})
	if res.Err == nil || res.Err.Line != 2 || res.Err.Column != 9 || !strings.Contains(res.Err.Message, "Coolant") {
		t.Fatalf("got %+v", res.Err)
	}
}

// slowCells follow a model that takes its time.
const slowCells = `
type S struct{ X float64 }
type P struct{ L float64 }
func slow(s S, p P) S { time.Sleep(2 * time.Millisecond); return S{p.L - s.X} }
m := continuation.NewModel(slow, P{0})
at := m.Settle(S{0})
`

func TestInterruptKeepsThePartialBranch(t *testing.T) {
	s := sessionAfter(t, slowCells)
	ctx, cancel := context.WithTimeout(t.Context(), 500*time.Millisecond)
	defer cancel()
	begin := time.Now()
	res := s.Run(ctx, Cell{Number: 2, Source: "part := at.Follow(\"L\", continuation.Within(0, 1e9))\nfmt.Println(\"not reached\")"}, &recorder{})
	if took := time.Since(begin); took > 1500*time.Millisecond {
		t.Errorf("took %v", took)
	}
	if res.Err == nil || !res.Err.Interrupted {
		t.Fatalf("got %+v", res.Err)
	}
	res = s.Run(t.Context(), Cell{Number: 3, Source: "len(part.Points()) > 0"}, &recorder{})
	if res.Err != nil || res.Value.Text() != "true" {
		t.Fatalf("got %+v %+v", res.Value, res.Err)
	}
	// What earlier cells made still works after an interrupt.
	res = s.Run(t.Context(), Cell{Number: 4, Source: "p := m.Settle(S{0.5})\np.State[0]"}, &recorder{})
	if res.Err != nil || res.Value == nil {
		t.Fatalf("got %+v %+v", res.Value, res.Err)
	}
}

func TestInterruptReachesAnyLoop(t *testing.T) {
	s := sessionAfter(t, "n := 0\nfunc spin() { for { n++ } }\nvar stuck chan int\nf := func() int { return n }")
	for _, src := range []string{
		"for { n++ }",
		"spin()",
		"for { fmt.Sprint(n) }",
		"<-stuck",
		"select {}",
		"for range stuck {}",
		"time.Sleep(time.Hour)",
		"stuck <- 1",
		"x := []int{}; for { x = append(x[:0], 1) }",
		"for { func() { n++ }() }",
		"sort.Slice(make([]int, 1000), func(i, j int) bool { for {}; return false })",
		"func() { defer func() { recover() }(); for {} }()",
		"go spin(); for {}",
	} {
		ctx, cancel := context.WithTimeout(t.Context(), 30*time.Millisecond)
		begin := time.Now()
		res := s.Run(ctx, Cell{Number: 2, Source: src}, &recorder{})
		took := time.Since(begin)
		cancel()
		if res.Err == nil || !res.Err.Interrupted {
			t.Errorf("%q ended with %+v", src, res.Err)
		}
		if took > 700*time.Millisecond {
			t.Errorf("%q took %v", src, took)
		}
		if res := s.Run(t.Context(), Cell{Number: 3, Source: "f() >= 0"}, &recorder{}); res.Err != nil || res.Value.Text() != "true" {
			t.Fatalf("after %q: %+v %+v", src, res.Value, res.Err)
		}
	}
}
