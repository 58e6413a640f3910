package eval

import (
	"context"
	"errors"
	"time"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// Limits bound one statement. A zero field takes the default; a negative one means no bound.
type Limits struct {
	Steps  int64         // operations and calls
	Bytes  int64         // memory held by results at one time, as estimated from their sizes
	Depth  int           // calls of defined functions inside one another
	Time   time.Duration // wall time of one statement; no bound unless given
	Files  int           // files read by use
	Source int64         // bytes of one file read by use
}

// The defaults: a minute or so of plain arithmetic, a memory that a small machine has,
// and a depth whose Go stack stays far below its bound.
const (
	defaultSteps  = 200_000_000
	defaultBytes  = 2 << 30
	defaultDepth  = 1000
	defaultFiles  = 100
	defaultSource = 8 << 20
)

func (l Limits) filled() Limits {
	if l.Steps == 0 {
		l.Steps = defaultSteps
	}
	if l.Bytes == 0 {
		l.Bytes = defaultBytes
	}
	if l.Depth <= 0 {
		l.Depth = defaultDepth
	}
	if l.Files <= 0 {
		l.Files = defaultFiles
	}
	if l.Source <= 0 {
		l.Source = defaultSource
	}
	return l
}

// task is one running statement: what stops it and what it may use.
type task struct {
	session *Session
	ctx     context.Context
	steps   int64
	held    int64 // bytes of the results alive at this point, an upper estimate
	depth   int
	reached bool // a name that a study replaces was used
	note    func(string)
	close   func()
}

// newTask prepares a statement; close must be called when it ends.
func (s *Session) newTask(ctx context.Context, note func(string)) *task {
	t := &task{session: s, note: note, ctx: ctx, close: func() {}}
	if s.limits.Time > 0 {
		t.ctx, t.close = context.WithTimeoutCause(ctx, s.limits.Time, errTooLong)
	}
	return t
}

var errTooLong = errors.New("the statement ran longer than it may")

// step is called by every operation: it counts, and ends the statement when it was stopped.
func (t *task) step() *diag.Error {
	if t.ctx.Err() != nil {
		return t.stopError()
	}
	t.steps++
	if limit := t.session.limits.Steps; limit > 0 && t.steps > limit {
		return diag.New(diag.Limit, "the statement takes more than %d steps", limit).
			WithHelp("look for a function that calls itself without an end, or a loop over a very long list")
	}
	return nil
}

func (t *task) stopError() *diag.Error {
	cause := context.Cause(t.ctx)
	if errors.Is(cause, errTooLong) {
		return diag.New(diag.Limit, "the statement ran longer than the %v it may take", t.session.limits.Time)
	}
	if errors.Is(cause, context.DeadlineExceeded) {
		return diag.New(diag.Limit, "the statement ran longer than it may")
	}
	return diag.New(diag.Interrupted, "stopped")
}

// charge accounts for memory before or after it is taken.
func (t *task) charge(bytes int64) error {
	if bytes < 0 {
		return diag.New(diag.Limit, "the result is too large")
	}
	t.held += bytes
	limit := t.session.limits.Bytes
	if limit < 0 || t.held <= limit && t.held >= 0 {
		return nil
	}
	t.held = limit
	return diag.New(diag.Limit, "the results need more than the %s of memory a statement may hold", bytesText(limit))
}

// keep ends a section that began with held bytes and leaves the one result behind: what
// else it made is garbage. A result that the section did not make itself costs nothing new.
func (t *task) keep(held int64, result value.Value) {
	made := t.held - held
	t.held = held + min(max(made, 0), sizeOf(result))
}

// frame is the environment that a compiled expression runs in.
type frame struct {
	task    *task
	locals  []value.Value          // parameters and loop variables, outermost first
	overlay map[string]value.Value // names that a study replaces by their samples
}
