package eval

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

const (
	// how long a computation that looks at its context is waited for, so that it ends in order
	grace = 20 * time.Millisecond
	// computations that were given up and may still run; beyond, the next one is waited for
	mostAbandoned = 4
)

type outcome struct {
	value value.Value
	err   error
}

// interruptible computes on another goroutine, so that a long computation in a numerical
// library, which cannot be stopped, can be given up. What is given up runs to its end
// unseen: it can neither note, nor charge, nor call functions of the language any more.
func (t *task) interruptible(name string, ties *ties, compute func() (value.Value, error)) (value.Value, error) {
	if t.ctx.Done() == nil {
		return guarded(name, compute)
	}
	running := &t.session.abandoned
	done := make(chan outcome, 1)
	go func() {
		v, err := guarded(name, compute)
		done <- outcome{v, err}
	}()
	select {
	case out := <-done:
		return out.value, out.err
	case <-t.ctx.Done():
	}
	timer := time.NewTimer(grace)
	defer timer.Stop()
	select {
	case <-done:
		return nil, t.stopError()
	case <-timer.C:
	}
	if running.Add(1) > mostAbandoned {
		<-done
		running.Add(-1)
		return nil, t.stopError()
	}
	ties.cut()
	go func() {
		<-done
		running.Add(-1)
	}()
	return nil, t.stopError()
}

// ties are what one running built-in may call back.
type ties struct {
	task     *task
	mu       sync.Mutex
	isCut    bool
	applying sync.WaitGroup
}

// cut parts with a computation that is given up. A function of the language that it is
// calling is waited for: it ends by itself, because every operation looks at the context.
func (t *ties) cut() {
	if t == nil {
		return
	}
	t.mu.Lock()
	t.isCut = true
	t.mu.Unlock()
	t.applying.Wait()
}

// guarded turns a panic of a library into an error that names what was computed.
func guarded(name string, compute func() (value.Value, error)) (v value.Value, err error) {
	defer func() {
		if r := recover(); r != nil {
			cause, ok := r.(error)
			if !ok {
				cause = fmt.Errorf("panic: %v", r)
			}
			var known *diag.Error
			if !errors.As(cause, &known) {
				cause = internal("computing "+name, cause)
			}
			v, err = nil, cause
		}
	}()
	v, err = compute()
	if err == nil && v == nil {
		err = internal("computing "+name, errors.New("no value"))
	}
	return v, err
}

// call does something on behalf of the built-in, and nothing once that was given up.
func (t *ties) call(do func()) {
	t.mu.Lock()
	defer t.mu.Unlock()
	if !t.isCut {
		do()
	}
}

// charge accounts for memory.
func (t *ties) charge(bytes int64) error {
	err := context.Cause(t.task.ctx)
	t.call(func() { err = t.task.charge(bytes) })
	return err
}

// apply calls a function of the language.
func (t *ties) apply(call func() (value.Value, *diag.Error)) (value.Value, error) {
	t.mu.Lock()
	if t.isCut {
		t.mu.Unlock()
		return nil, t.task.stopError()
	}
	t.applying.Add(1)
	t.mu.Unlock()
	defer t.applying.Done()
	v, err := call()
	if err != nil {
		return nil, err
	}
	return v, nil
}

// heavy tells whether arithmetic with a value may take long.
func heavy(v value.Value) bool {
	switch v := v.(type) {
	case *value.Matrix:
		r, c := v.Dims()
		if v.IsExact() {
			return r*c > 64
		}
		return r*c > 4096
	case value.Number:
		return v.Exact != nil && v.Exact.Num().BitLen()+v.Exact.Denom().BitLen() > 10_000
	case *value.Polynomial:
		return v.Degree() > 20
	case *value.Transfer, *value.Plant, *value.Model:
		return true
	}
	return false
}
