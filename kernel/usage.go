package kernel

import (
	"context"
	"os"
	"runtime"
	"sync"
	"time"

	"brinkline/kernel/wire"
)

// usage tells what the process takes of the machine.
func (k *kernel) usage(context.Context, *wire.Message) content {
	host, _ := os.Hostname()
	c := content{"status": "ok", "hostname": host, "pid": os.Getpid(), "cpu_count": runtime.NumCPU()}
	if bytes, ok := residentMemory(); ok {
		c["kernel_memory"] = bytes
	}
	if percent, ok := k.load.percent(); ok {
		c["kernel_cpu"] = percent
	}
	return c
}

// load measures how busy the process keeps the processors.
type load struct {
	mu   sync.Mutex
	when time.Time
	used time.Duration
}

// percent returns the processor time since the last call in percent of the
// time that went by; 100 is one processor.
func (l *load) percent() (float64, bool) {
	used, ok := processorTime()
	if !ok {
		return 0, false
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	now := time.Now()
	spent, went := used-l.used, now.Sub(l.when)
	first := l.when.IsZero()
	l.when, l.used = now, used
	if first || went <= 0 {
		return 0, true
	}
	return 100 * spent.Seconds() / went.Seconds(), true
}
