package session

import (
	"runtime"
	"testing"
	"time"
)

var ballast []byte

// What an earlier cell has left to be collected is not held against the next one.
func TestGarbageIsNotHeldAgainstACell(t *testing.T) {
	s, err := New(Options{MemoryLimit: heapInUse() + 200<<20})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	ballast = make([]byte, 400<<20)
	for i := range ballast {
		ballast[i] = 1
	}
	runtime.KeepAlive(ballast)
	ballast = nil
	res := s.Run(t.Context(), Cell{Number: 1, Source: "time.Sleep(300 * time.Millisecond)"}, &recorder{})
	if res.Err != nil {
		t.Errorf("the cell ended with %v", res.Err)
	}
	begin := time.Now()
	res = s.Run(t.Context(), Cell{Number: 2, Source: "var keep [][]byte\nfor { keep = append(keep, make([]byte, 1<<20)) }"}, &recorder{})
	if res.Err == nil || res.Err.Name != "MemoryError" {
		t.Errorf("a cell that fills the memory ended with %v after %v", res.Err, time.Since(begin))
	}
}
