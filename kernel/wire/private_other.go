//go:build !unix

package wire

import "net"

func privately(bind func() (net.Listener, error)) (net.Listener, error) { return bind() }
