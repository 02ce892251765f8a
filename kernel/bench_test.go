package kernel

import (
	"context"
	"io"
	"testing"

	"brinkline/kernel/internal/protocoltest"
)

// BenchmarkExecute times a cell that does nothing, from the request to the reply
// and to idle: what the sockets and the signatures cost.
func BenchmarkExecute(b *testing.B) {
	path := protocoltest.WriteConnection(b, nil)
	ctx, cancel := context.WithCancel(b.Context())
	ended := make(chan error)
	go func() { ended <- Serve(ctx, path, Options{Executor: new(fake), Log: io.Discard}) }()
	c := protocoltest.Dial(b, path)
	c.Receive("iopub") // welcome
	for b.Loop() {
		c.Execute("value 1")
	}
	for _, s := range c.Socket {
		s.Close()
	}
	cancel()
	if err := <-ended; err != nil {
		b.Error(err)
	}
}
