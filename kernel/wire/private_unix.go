//go:build unix

package wire

import (
	"net"
	"syscall"
)

// privately calls bind so that files it makes are open to their owner only.
func privately(bind func() (net.Listener, error)) (net.Listener, error) {
	defer syscall.Umask(syscall.Umask(0o177))
	return bind()
}
