package kernel

import (
	"context"
	"io"
	"log"
	"os"
	"sync"
	"time"

	"brinkline/kernel/wire"
)

// Options are the settings of a kernel. The zero value is ready for use.
type Options struct {
	// Executor runs the cells. The default is a new session.
	Executor Executor

	// Log gets the kernel's complaints, a line each. The default is standard
	// error, which clients show or keep.
	Log io.Writer
}

// linger is how long clients get to take their last messages. They end a kernel
// by force after 2.5 s.
const linger = time.Second

// Serve runs a kernel on the sockets that the connection file names, until a
// client or a signal shuts it down, its parent process is gone or ctx is done.
// An error means that it could not start.
func Serve(ctx context.Context, connectionPath string, o Options) error {
	if o.Log == nil {
		o.Log = os.Stderr
	}
	logger := log.New(o.Log, "brinkline kernel: ", 0)
	connection, err := wire.ReadConnection(connectionPath)
	if err != nil {
		return err
	}
	if o.Executor == nil {
		if o.Executor, err = newSession(); err != nil {
			return err
		}
	}
	defer o.Executor.Close()
	k := newKernel(o.Executor, logger)
	k.sockets, err = wire.Open(connection, wire.Config{Receive: k.receive, Subscribed: k.announce, Log: logger})
	if err != nil {
		return err
	}
	return k.run(ctx)
}

// kernel is a running kernel. One goroutine serves the requests of the shell
// channel in order, one those of the control channel, and one those of the shell
// channel that have waited for long behind a cell and need not.
type kernel struct {
	sockets  *wire.Sockets
	executor Executor
	log      *log.Logger

	shell   *queue // all requests of the shell channel
	aside   *queue // those of them that can be served beside a running cell
	control *queue

	stdin    stdin
	history  history
	starting sync.Once
	load     load

	statusMu sync.Mutex
	busyWith *wire.Message // the execute_request that is being served

	stop context.CancelFunc // ends the kernel
}

func newKernel(e Executor, l *log.Logger) *kernel {
	return &kernel{
		executor: e,
		log:      l,
		shell:    newQueue(),
		aside:    newQueue(),
		control:  newQueue(),
	}
}

// run serves requests until the kernel is stopped.
func (k *kernel) run(ctx context.Context) error {
	ctx, k.stop = context.WithCancel(ctx)
	defer k.stop()
	defer k.watchSignals()()
	defer watchParent(k.log, k.stop)()

	k.sockets.Start()
	var loops sync.WaitGroup
	loops.Go(func() { k.serve(ctx, k.shell, 0) })
	loops.Go(func() { k.serve(ctx, k.control, 0) })
	loops.Go(func() { k.serve(ctx, k.aside, asideAfter) })
	<-ctx.Done()
	for _, q := range []*queue{k.shell, k.control, k.aside} {
		q.close()
	}
	k.shell.interrupt()
	waitAtMost(linger, &loops)
	k.sockets.Close(linger)
	return nil
}

// waitAtMost waits for g, but no longer than d: a cell that cannot be ended
// must not keep the process.
func waitAtMost(d time.Duration, g *sync.WaitGroup) {
	done := make(chan struct{})
	go func() {
		g.Wait()
		close(done)
	}()
	select {
	case <-done:
	case <-time.After(d):
	}
}
