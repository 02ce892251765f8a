package session

import (
	"fmt"
	"os"
	"runtime"
	"runtime/metrics"
	"strconv"
	"strings"
	"time"
)

// defaultMemoryLimit is half of the machine's memory, or 4 GB where that cannot be read.
func defaultMemoryLimit() uint64 {
	const fallback = 4 << 30
	data, err := os.ReadFile("/proc/meminfo")
	if err != nil {
		return fallback
	}
	for line := range strings.Lines(string(data)) {
		if rest, ok := strings.CutPrefix(line, "MemTotal:"); ok {
			kb, err := strconv.ParseUint(strings.Fields(rest)[0], 10, 64)
			if err != nil {
				return fallback
			}
			return kb * 1024 / 2
		}
	}
	return fallback
}

// watchEvery is how often a running cell's memory is looked at.
const watchEvery = 50 * time.Millisecond

// heapInUse is the memory of the process that holds live or not yet collected values.
func heapInUse() uint64 {
	sample := []metrics.Sample{{Name: "/memory/classes/heap/objects:bytes"}}
	metrics.Read(sample)
	return sample[0].Value.Uint64()
}

// watchMemory ends a run that fills the memory, before the system kills the process.
func (s *Session) watchMemory(r *run) {
	t := time.NewTicker(watchEvery)
	defer t.Stop()
	for {
		select {
		case <-r.ended:
			return
		case <-t.C:
			if s.overLimit() {
				r.full.Store(true)
				r.cancel()
				return
			}
		}
	}
}

// overLimit reports whether live values pass the limit: what only waits to be
// collected, perhaps from an earlier cell, is collected before it is held against
// this one.
func (s *Session) overLimit() bool {
	if heapInUse() <= s.limit {
		return false
	}
	runtime.GC()
	return heapInUse() > s.limit
}

// memoryError says that a cell was stopped for its memory.
func (s *Session) memoryError() *Error {
	return s.errorAt(s.placeOf(*s.line), "MemoryError",
		fmt.Sprintf("the cell was stopped: the session holds more than its limit of %.1f GB", float64(s.limit)/(1<<30))).
		withHint("set large variables to nil, or work in smaller pieces")
}

// needRoom refuses to make a slice that alone would pass the limit; the runtime could not survive the attempt.
func (s *Session) needRoom(n, size int) int {
	if n > 0 && size > 0 && uint64(n) > s.limit/uint64(size) {
		panic(&runtimeError{fmt.Sprintf("make of %d elements of %d bytes passes the session's memory limit of %.1f GB",
			n, size, float64(s.limit)/(1<<30))})
	}
	return n
}
