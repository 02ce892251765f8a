package kernel

import (
	"context"
	"log"
	"os"
	"os/signal"
	"strconv"
	"syscall"
	"time"
)

// watchSignals lets SIGINT end the running cell and SIGTERM the kernel. The
// function it returns ends the watch.
func (k *kernel) watchSignals() func() {
	signals := make(chan os.Signal, 4)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	go func() {
		for s := range signals {
			if s == os.Interrupt {
				k.shell.interrupt()
			} else {
				k.stop()
			}
		}
	}()
	return func() {
		signal.Stop(signals)
		close(signals)
	}
}

// parentPause is the time between looks at the parent process.
const parentPause = 500 * time.Millisecond

// watchParent calls gone when the process that started the kernel, of which
// Jupyter gives the number in JPY_PARENT_PID, has ended: nobody could end the
// kernel then. The function it returns ends the watch.
func watchParent(l *log.Logger, gone func()) func() {
	pid, err := strconv.Atoi(os.Getenv("JPY_PARENT_PID"))
	if err != nil || pid <= 1 || !alive(pid) {
		return func() {}
	}
	ctx, cancel := context.WithCancel(context.Background())
	go func() {
		for alive(pid) {
			select {
			case <-ctx.Done():
				return
			case <-time.After(parentPause):
			}
		}
		l.Printf("the parent process %d is gone; the kernel ends", pid)
		gone()
	}()
	return cancel
}
