package session

import (
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"strings"
	"testing"
	"time"

	"go.uber.org/goleak"
)

// alive fails the test when the session does not run the next cell.
func alive(t *testing.T, s *Session, after string) {
	t.Helper()
	res := s.Run(t.Context(), Cell{Number: 99, Source: "6 * 7"}, &recorder{})
	if res.Err != nil || res.Value.Text() != "42" {
		t.Fatalf("after %s: %+v %+v", after, res.Value, res.Err)
	}
}

func TestRunawayMemoryIsStopped(t *testing.T) {
	s, err := New(Options{MemoryLimit: heapInUse() + 200<<20})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	res := s.Run(t.Context(), Cell{Number: 1, Source: "var xs [][]byte\nfor {\n\txs = append(xs, make([]byte, 1<<20))\n}"}, &recorder{})
	if res.Err == nil || res.Err.Name != "MemoryError" {
		t.Fatalf("got %+v", res.Err)
	}
	if res := s.Run(t.Context(), Cell{Number: 2, Source: "xs = nil\nn := 1 << 40\nbig := make([]float64, n)"}, &recorder{}); res.Err == nil ||
		!strings.Contains(res.Err.Message, "memory limit") || res.Err.Line != 3 {
		t.Fatalf("got %+v", res.Err)
	}
	alive(t, s, "running out of memory")
}

func TestContained(t *testing.T) {
	s := sessionAfter(t)
	for _, c := range []struct{ source, name, says string }{
		{"func down(n int) int { return down(n+1) }\ndown(0)", "Panic", "too deep"},
		{"var f func(int) int\nf = func(n int) int { return f(n) + 1 }\nf(1)", "Panic", "too deep"},
		{"type T struct{}\nfunc (t T) String() string { return fmt.Sprint(t) }\nT{}", "", ""},
		{"go func() { panic(\"in the background\") }()\ntime.Sleep(30 * time.Millisecond)", "", ""},
		{"os.Exit(2)", "Panic", "os.Exit(2)"},
		{"panic(nil)", "Panic", "nil"},
		{"ch := make(chan int)\nclose(ch)\nclose(ch)", "Panic", "close of closed channel"},
		{"var ch chan int\nclose(ch)", "Panic", "close of nil channel"},
		{"n := -1\n_ = make([]int, n)", "Panic", "len out of range"},
		{"var f func()\nf()", "Panic", "nil pointer"},
		{"xs := []int{1}\nxs[5] = 1", "Panic", "index out of range"},
		{"xs := []int{1}\nn := 5\nxs[2:n]", "Panic", "slice bounds out of range"},
		{"var x any = \"s\"\nx.(int)", "Panic", "interface conversion: interface {} is string, not int"},
	} {
		out := &recorder{}
		res := s.Run(t.Context(), Cell{Number: 1, Source: c.source}, out)
		switch {
		case c.name == "" && res.Err != nil && res.Err.Name != "Panic":
			t.Errorf("%q: %+v", c.source, res.Err)
		case c.name != "" && (res.Err == nil || res.Err.Name != c.name || !strings.Contains(res.Err.Message, c.says)):
			t.Errorf("%q: %+v, want %s with %q", c.source, res.Err, c.name, c.says)
		}
		alive(t, s, c.source)
	}
}

// TestManyInterrupts interrupts cells at random moments: each ends within a second as interrupted, the next runs, nothing is left.
func TestManyInterrupts(t *testing.T) {
	n := 40
	if os.Getenv("BRINKLINE_LONG") != "" {
		n = 1000
	}
	ignore := goleak.IgnoreCurrent()
	s := sessionAfter(t, slowCells, "var stuck chan int\nfunc spin(n int) int { for { n++ } }")
	kinds := []string{
		"for { }", "spin(0)", "for i := 0; ; i++ { fmt.Sprint(i) }", "for { fmt.Println(1) }", "time.Sleep(time.Hour)", "<-stuck",
		"stuck <- 1", "select {}", "at.Follow(\"L\", continuation.Within(0, 1e9))", "go spin(1)\nfor { }",
		"for { func() { defer func() { recover() }(); panic(1) }() }", "for range stuck { }",
		"xs := []float64{}; for { xs = append(xs[:0], 1) }", "for { m := map[int]int{}; m[1]++ }",
	}
	rng := rand.New(rand.NewPCG(1, 2))
	for i := range n {
		src := kinds[i%len(kinds)]
		ctx, cancel := context.WithTimeout(t.Context(), time.Duration(rng.IntN(30))*time.Millisecond+10*time.Millisecond)
		deadline, _ := ctx.Deadline()
		res := s.Run(ctx, Cell{Number: i, Source: src}, &recorder{})
		late := time.Since(deadline)
		cancel()
		if res.Err == nil || !res.Err.Interrupted {
			t.Fatalf("%q ended with %+v", src, res.Err)
		}
		if late > time.Second {
			t.Errorf("%q ended %v after the interrupt", src, late)
		}
		alive(t, s, fmt.Sprintf("interrupting %q", src))
	}
	s.Close()
	goleak.VerifyNone(t, ignore, goleak.IgnoreAnyFunction("testing.(*T).Run"))
}
