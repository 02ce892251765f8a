//go:build unix

package kernel

import (
	"syscall"
	"time"
)

// processorTime returns how long the process has kept processors busy.
func processorTime() (time.Duration, bool) {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0, false
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano()), true
}
