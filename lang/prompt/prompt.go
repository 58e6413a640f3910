// Package prompt is the interactive session: it reads statements line by line, runs them
// one at a time and shows what they give.
//
// On a terminal it edits lines with history and completion through liner; without one it
// is a plain reader that prints no prompts, so that text can be piped in. Besides
// statements it knows sentences of two or three words ([Run] handles them): explain WORD,
// list names, take back, keep in FILE, show N digits, leave session.
//
// A statement that fails leaves every name as it was. Ctrl-C cancels the line being typed
// or the statement that runs, never the session.
package prompt

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/render"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// Options make a session at the prompt.
type Options struct {
	Session  *eval.Session
	Table    []*value.Builtin
	Root     *os.Root // where keep in FILE writes
	In       io.Reader
	Out      io.Writer
	Terminal bool                  // both In and Out are the process's terminal
	Look     func() render.Options // asked before each statement, since a window may change
	Greeting []string
	Quiet    func() // takes a progress line away before something is written; may be nil
}

// source is the name of the place that errors show
const source = "prompt"

// reader gives lines. A prompt is shown where there is somebody to see it.
type reader interface {
	// line reads one; errCancelled when it was given up, io.EOF at the end.
	line(prompt string) (string, error)
	// remember keeps an input for the history.
	remember(text string)
	close()
}

var errCancelled = errors.New("the input was given up")

const (
	firstPrompt = "» "
	nextPrompt  = "… "
)

// talk is a session while it lasts.
type talk struct {
	Options
	reader  reader
	printer *render.Printer
	digits  int // 0 for those of Look
	lines   int // input lines so far
	kept    []accepted
	leaving bool
	missed  bool
	failed  bool
}

// accepted is an input that ran without an error.
type accepted struct {
	text  string
	names []string // what it bound
}

// Run talks until the input ends. The status is 0 on a terminal; for piped input it is 2
// after an error, 1 after a missed requirement or claim.
func Run(o Options) int {
	t := &talk{Options: o, printer: &render.Printer{Out: o.Out, Bindings: true}}
	if o.Terminal {
		t.reader = newLineEditor(t)
	} else {
		t.reader = newPlainReader(o.In)
	}
	defer t.reader.close()
	if o.Terminal {
		for _, l := range o.Greeting {
			fmt.Fprintln(o.Out, l)
		}
	}
	for !t.leaving {
		text, err := t.read()
		if errors.Is(err, errCancelled) {
			continue
		}
		if strings.TrimSpace(text) != "" {
			t.take(text)
		}
		if err != nil {
			t.sayReadError(err)
			break
		}
	}
	switch {
	case o.Terminal:
		return 0
	case t.failed:
		return 2
	case t.missed:
		return 1
	}
	return 0
}

func (t *talk) sayReadError(err error) {
	switch {
	case errors.Is(err, io.EOF):
		if t.Terminal {
			fmt.Fprintln(t.Out)
		}
	default:
		t.printer.Failure(diag.New(diag.File, "the input cannot be read: %v", err))
		t.failed = true
	}
}

// read gives a whole input: lines are joined while a bracket is open.
func (t *talk) read() (string, error) {
	text, err := t.reader.line(firstPrompt)
	if err != nil {
		return text, err
	}
	t.lines++
	for syntax.Incomplete(text) {
		more, err := t.reader.line(nextPrompt)
		if errors.Is(err, errCancelled) {
			return "", err
		}
		if err != nil && more == "" {
			return text, err
		}
		t.lines++
		text += "\n" + more
		if err != nil {
			return text, err
		}
	}
	return text, nil
}

// take runs one input: a sentence or statements.
func (t *talk) take(text string) {
	t.reader.remember(text)
	look := t.Look()
	if t.digits > 0 {
		look.Digits = t.digits
	}
	t.printer.Options = look
	if t.Terminal {
		t.printer.Apart()
	}
	if t.sentence(strings.TrimSpace(text)) {
		return
	}
	t.run(text)
}

// run runs the statements of an input.
func (t *talk) run(text string) {
	first := t.lines - strings.Count(text, "\n")
	// Errors give the line of the session, so the text stands on its own lines.
	src := diag.NewSource(source, strings.Repeat("\n", max(0, first-1))+text)
	file, err := syntax.Parse(src)
	var names []string
	emit := func(e eval.Event) {
		if t.Quiet != nil {
			t.Quiet()
		}
		if e.Bound != nil {
			names = append(names, e.Bound.Name)
		}
		t.printer.Event(e)
	}
	whole := true
	for _, st := range file.Statements {
		names = nil
		outcome := t.statement(src, st, emit)
		t.missed = t.missed || outcome.Missed
		if outcome.Failed {
			t.failed, whole = true, false
			t.hint(st)
			break
		}
		t.kept = append(t.kept, accepted{sourceOf(src, st), names})
	}
	if whole {
		for _, n := range file.Notes {
			line, _ := src.Position(n.Span.Start)
			t.printer.Event(eval.Event{Source: src, Span: n.Span, Line: line, Note: n.Text})
		}
	}
	if err != nil && whole {
		t.failed = true
		var failure *diag.Error
		if !errors.As(err, &failure) {
			failure = diag.New(diag.Syntax, "%v", err)
		}
		t.printer.Event(eval.Event{Error: failure.In(src)})
	}
}

// statement runs one statement under Ctrl-C.
func (t *talk) statement(src *diag.Source, st syntax.Statement, emit func(eval.Event)) eval.Outcome {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	return t.Session.RunStatement(ctx, src, st, emit)
}

// sourceOf is a statement as it was typed.
func sourceOf(src *diag.Source, st syntax.Statement) string {
	span := st.Extent()
	return strings.TrimSpace(src.Text[span.Start:min(span.End, len(src.Text))])
}

// hint helps those who look for the way out or for help by other words.
func (t *talk) hint(st syntax.Statement) {
	show, ok := st.(*syntax.Show)
	if !ok {
		return
	}
	name, ok := show.Expr.(*syntax.Name)
	if call, isCall := show.Expr.(*syntax.Call); isCall {
		name, ok = call.Function.(*syntax.Name)
	}
	if !ok {
		return
	}
	switch strings.ToLower(name.Name) {
	case "exit", "quit", "leave", "bye":
		fmt.Fprintln(t.Out, "  leave session, or Ctrl-D, leaves")
	case "help", "explain":
		fmt.Fprintln(t.Out, "  explain WORD explains a word; list names shows what is bound")
	}
}
