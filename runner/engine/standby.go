package engine

import (
	"context"
	"sync"
	"sync/atomic"

	"rimlight/runner/worker"
)

// A standby is a worker that is started and made ready while others are at
// work, for the step that comes next: each step has a fresh one, and getting
// one ready takes as long as many a step.
type standby struct {
	mu      sync.Mutex
	next    chan *worker.Worker // gives the worker, or nil if there was an error; nil when none is asked for
	waiting atomic.Int64        // steps that have not been begun
}

// small is how many bytes of arguments a worker may be given that was started
// without knowing them.
const small = 16 << 20

// worker gives a fresh worker, ready for calls with so many bytes of arguments.
func (e *Engine) worker(ctx context.Context, arguments int64) (*worker.Worker, error) {
	if arguments > small {
		return e.startWorker(ctx, arguments)
	}
	w := e.standby.take()
	var err error
	if w == nil {
		w, err = e.startWorker(ctx, 0)
	}
	e.prepareNext(ctx)
	return w, err
}

// startWorker starts a worker and makes it ready for arguments.
func (e *Engine) startWorker(ctx context.Context, arguments int64) (*worker.Worker, error) {
	w, err := worker.Start(ctx, e.Limits.For(arguments))
	if err != nil {
		return nil, err
	}
	if err := w.Load(e.Code); err != nil {
		w.Close()
		return nil, err
	}
	return w, nil
}

// prepareNext begins to make a worker ready, if there are steps to come and none
// stands by.
func (e *Engine) prepareNext(ctx context.Context) {
	s := &e.standby
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.next != nil || s.waiting.Load() <= 0 || ctx.Err() != nil {
		return
	}
	next := make(chan *worker.Worker, 1)
	s.next = next
	go func() {
		w, _ := e.startWorker(ctx, 0) // an error comes up again where the worker is needed
		next <- w
	}()
}

// take gives the worker that stands by, waiting until it is ready, or nil.
func (s *standby) take() *worker.Worker {
	s.mu.Lock()
	next := s.next
	s.next = nil
	s.mu.Unlock()
	if next == nil {
		return nil
	}
	return <-next
}

// dismiss ends the worker that stands by.
func (s *standby) dismiss() {
	s.waiting.Store(0)
	if w := s.take(); w != nil {
		w.Close()
	}
}
