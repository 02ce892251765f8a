//go:build !linux

package kernel

import "runtime"

// residentMemory returns the bytes of memory that the Go runtime holds.
func residentMemory() (int64, bool) {
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return int64(m.Sys - m.HeapReleased), true
}
