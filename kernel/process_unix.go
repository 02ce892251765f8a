//go:build unix

package kernel

import (
	"errors"
	"os"
	"syscall"
)

// firstParent is the parent at the start. When it was the process to watch, a
// change of parent shows its end even if its number is in use again or nobody
// has collected it.
var firstParent = os.Getppid()

// alive reports whether the process pid has not ended.
func alive(pid int) bool {
	if pid == firstParent {
		return os.Getppid() == pid
	}
	return !errors.Is(syscall.Kill(pid, 0), syscall.ESRCH)
}
