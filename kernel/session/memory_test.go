package session

import (
	"context"
	"fmt"
	"os"
	"runtime"
	"runtime/pprof"
	"testing"
)

// heapAfter runs a cell n times, each time a little changed, and returns the bytes of live memory after that.
func heapAfter(t *testing.T, s *Session, from, n int) uint64 {
	for i := from; i < from+n; i++ {
		src := fmt.Sprintf(`
type State struct{ X float64 }
type Params struct{ L float64 }
func half(x float64) float64 { return x / 2 }
func rate(s State, q Params) State { return State{q.L + half(%d.5*s.X) - s.X*s.X*s.X} }
m := continuation.NewModel(rate, Params{0.1})
path := m.Settle(State{1}).Follow("L", continuation.Within(-0.2, 0.2))
n := len(path.Points())
`, i%97+1)
		if res := s.Run(context.Background(), Cell{ID: "a", Number: i, Source: src}, &recorder{}); res.Err != nil {
			t.Fatal(res.Err)
		}
	}
	runtime.GC()
	runtime.GC()
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return m.HeapAlloc
}

// TestMemoryStaysBounded reruns a cell that redefines a model and follows a branch: the session must not grow by more than 1 kB a rerun.
func TestMemoryStaysBounded(t *testing.T) {
	warm, n := 64, 128
	if os.Getenv("BRINKLINE_LONG") != "" {
		warm, n = 1000, 9000
	}
	s := sessionAfter(t)
	before := heapAfter(t, s, 0, warm)
	after := heapAfter(t, s, warm, n)
	growth := (int64(after) - int64(before)) / int64(n)
	t.Logf("%d bytes a rerun", growth)
	if f := os.Getenv("BRINKLINE_HEAP"); f != "" {
		w, err := os.Create(f)
		if err != nil {
			t.Fatal(err)
		}
		defer w.Close()
		if err := pprof.WriteHeapProfile(w); err != nil {
			t.Fatal(err)
		}
	}
	if growth > 1024 {
		t.Errorf("the session grows by %d bytes a rerun", growth)
	}
}
