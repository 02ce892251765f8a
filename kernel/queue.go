package kernel

import (
	"context"
	"sync"
	"sync/atomic"
	"time"

	"brinkline/kernel/wire"
)

// job is a request that waits to be served.
type job struct {
	channel wire.Channel
	request *wire.Message
	arrived time.Time
	taken   atomic.Bool
	aborted atomic.Bool // an earlier cell failed

	ctx    context.Context // done when the job is interrupted
	cancel context.CancelFunc
}

func newJob(ch wire.Channel, request *wire.Message) *job {
	j := &job{channel: ch, request: request, arrived: time.Now()}
	j.ctx, j.cancel = context.WithCancel(context.Background())
	return j
}

// take reports whether the caller is the first that wants to serve the job.
func (j *job) take() bool { return j.taken.CompareAndSwap(false, true) }

// queue holds the requests of a channel in the order in which they came.
type queue struct {
	mu      sync.Mutex
	wake    *sync.Cond
	jobs    []*job
	current *job // the latest that next returned
	closed  bool
}

func newQueue() *queue {
	q := new(queue)
	q.wake = sync.NewCond(&q.mu)
	return q
}

func (q *queue) add(j *job) {
	q.mu.Lock()
	defer q.mu.Unlock()
	q.jobs = append(q.jobs, j)
	q.wake.Signal()
}

// next waits for the next job. It returns nil when the queue is closed.
func (q *queue) next() *job {
	q.mu.Lock()
	defer q.mu.Unlock()
	for len(q.jobs) == 0 && !q.closed {
		q.wake.Wait()
	}
	if q.closed {
		return nil
	}
	q.current, q.jobs = q.jobs[0], q.jobs[1:]
	return q.current
}

// abort marks the execute requests that are waiting now.
func (q *queue) abort() {
	q.mu.Lock()
	defer q.mu.Unlock()
	q.abortWaiting()
}

func (q *queue) abortWaiting() {
	for _, j := range q.jobs {
		if j.request.Header.Type == "execute_request" {
			j.aborted.Store(true)
		}
	}
}

// interrupt cancels the current job, however little of it has run, and aborts
// those that wait.
func (q *queue) interrupt() {
	q.mu.Lock()
	defer q.mu.Unlock()
	if q.current != nil {
		q.current.cancel()
	}
	q.abortWaiting()
}

func (q *queue) close() {
	q.mu.Lock()
	defer q.mu.Unlock()
	q.closed = true
	q.wake.Broadcast()
}
