package kernel

import (
	"bytes"
	"os"
	"strconv"
)

// residentMemory returns the bytes of memory that the process holds.
func residentMemory() (int64, bool) {
	text, err := os.ReadFile("/proc/self/statm")
	fields := bytes.Fields(text)
	if err != nil || len(fields) < 2 {
		return 0, false
	}
	pages, err := strconv.ParseInt(string(fields[1]), 10, 64)
	return pages * int64(os.Getpagesize()), err == nil
}
