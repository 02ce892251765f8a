package continuation

import (
	"runtime"
	"sync"
)

// Sequential says that the model's function must not be called by two goroutines at
// once: it uses storage that its calls share, or lives in an interpreter. Surveys
// then use one core, and call it from the goroutine that asked. Without it a function
// must be fit for concurrent calls, as every function is that only looks at its
// arguments.
func Sequential() Option {
	return func(m *Model) error { m.sequential = true; return nil }
}

// workers returns how many goroutines may work on the model when n are asked for, 0
// for one on each core.
func (m *Model) workers(n int) int {
	if m.sequential {
		return 1
	}
	if n == 0 {
		return runtime.GOMAXPROCS(0)
	}
	return n
}

// An outcome is what a job gave, or how it panicked.
type outcome[T any] struct {
	value    T
	panicked any
}

// inOrder does the jobs that next gives, until that is nil, and hands what they give
// to take, in order. next(i) is called when take has had everything up to job i-lag
// and nothing more, whatever the number of workers: what next decides by what take has
// seen is the same on one core and on many. When it gives nil it is asked again with
// all jobs taken before that counts. next and take run on the caller's
// goroutine, and with one worker the jobs do too. A job that panics does so there.
func inOrder[T any](workers, lag int, next func(i int) func() T, take func(T)) {
	start, stop := crew[T](min(workers, lag))
	defer stop()
	var pending []chan outcome[T]
	first := func() {
		out := <-pending[0]
		pending = pending[1:]
		if out.panicked != nil {
			panic(out.panicked)
		}
		take(out.value)
	}
	for i := 0; ; i++ {
		if len(pending) == lag {
			first()
		}
		job := next(i)
		for job == nil && len(pending) > 0 {
			// Enough is enough only when everything under way has been seen.
			first()
			job = next(i)
		}
		if job == nil {
			return
		}
		out := make(chan outcome[T], 1)
		pending = append(pending, out)
		start(job, out)
	}
}

// crew returns what starts a job and what dismisses the goroutines.
func crew[T any](workers int) (start func(func() T, chan<- outcome[T]), stop func()) {
	if workers <= 1 {
		return func(job func() T, out chan<- outcome[T]) { out <- outcome[T]{value: job()} }, func() {}
	}
	type task struct {
		job func() T
		out chan<- outcome[T]
	}
	tasks := make(chan task)
	var busy sync.WaitGroup
	for range workers {
		busy.Go(func() {
			for t := range tasks {
				t.out <- guarded(t.job)
			}
		})
	}
	return func(job func() T, out chan<- outcome[T]) { tasks <- task{job, out} },
		func() { close(tasks); busy.Wait() }
}

func guarded[T any](job func() T) (out outcome[T]) {
	defer func() { out.panicked = recover() }()
	out.value = job()
	return out
}
