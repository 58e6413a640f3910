package main

import (
	"bufio"
	"context"
	"os"
	"os/signal"

	"github.com/spf13/cobra"

	"gainwright/builtins"
	"gainwright/builtins/numeric"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/render"
	"gainwright/lang/report"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

// runRoot is gainwright without a subcommand: the prompt, or a file to run.
func (a *app) runRoot(_ *cobra.Command, args []string) error {
	if err := a.checkFlags(); err != nil {
		return err
	}
	if err := a.pictures.check(); err != nil {
		return err
	}
	switch len(args) {
	case 0:
		if a.part != "" {
			return usage("gainwright FILE --part 3/16", "--part needs a file")
		}
		if a.pictures.folder != "" {
			return usage("gainwright FILE --figures DIR", "--figures needs a file")
		}
		if a.json {
			return usage("gainwright --json FILE runs a file, - for standard input", "--json needs a file")
		}
		return a.prompt()
	case 1:
		if a.part != "" {
			return a.runPart(args[0], a.part)
		}
		return a.runFile(args[0])
	}
	if _, err := os.Stat(args[0]); err != nil {
		return usage("gainwright --help lists the commands", "%s is neither a command nor a file", args[0])
	}
	return usage("gainwright check FILE… checks several", "one file is run at a time, %d were named", len(args))
}

func (a *app) runFile(name string) error {
	d, failure := a.open(name)
	if failure != nil {
		return failure
	}
	return a.runDesign(d, false)
}

// runDesign runs a design and sets the exit status. With onlyVerdicts it shows
// requirements, claims and errors alone.
func (a *app) runDesign(d *design, onlyVerdicts bool) error {
	return a.runDesignWith(d, onlyVerdicts, nil)
}

// runDesignWith is runDesign with the values of its studies taken from elsewhere, unless
// computed is nil.
func (a *app) runDesignWith(d *design, onlyVerdicts bool, computed func(string, *value.Study) ([][]float64, error)) error {
	root, err := os.OpenRoot(d.folder)
	if err != nil {
		return unreadable(d.folder, err)
	}
	defer root.Close()
	progress := newProgress(a.errOut)
	options := a.options(root, progress)
	options.Computed = computed

	out := bufio.NewWriterSize(a.out, 64<<10)
	defer out.Flush()
	emit := a.emitter(d.source, out, progress, onlyVerdicts)
	var events []eval.Event
	if a.pictures.folder != "" {
		show := emit
		emit = func(e eval.Event) {
			events = append(events, e)
			show(e)
		}
	}
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	// A second interruption ends the program at once.
	context.AfterFunc(ctx, stop)
	outcome := eval.New(options).RunText(ctx, d.source, emit)
	progress.clear()
	a.worsen(statusOf(outcome))
	if a.pictures.folder == "" {
		return nil
	}
	return a.pictures.write(report.New(report.Run{Source: d.source, Events: events}), d.source.Name)
}

// options are those of a run with everything that the program has.
func (a *app) options(root *os.Root, progress *progress) eval.Options {
	return eval.Options{
		Builtins: builtins.Table(),
		Library:  stdlib.Files,
		Root:     root,
		Limits:   eval.Limits{Time: a.timeLimit},
		Progress: progress.report,

		Eigenvalues: func() func([]complex128, []float64) bool {
			return new(numeric.EigenvalueKernel).Eigenvalues
		},
		EigenvalueLimit: numeric.EigenvalueKernelLimit,
	}
}

// emitter writes events: values and verdicts on standard output, errors in text on
// standard error.
func (a *app) emitter(main *diag.Source, out *bufio.Writer, progress *progress, onlyVerdicts bool) func(eval.Event) {
	if a.json {
		return func(e eval.Event) {
			progress.clear()
			if onlyVerdicts && (e.Shown != nil || e.Note != "") {
				return
			}
			if line := render.JSON(e, main); line != nil {
				out.Write(line)
				out.Flush()
			}
		}
	}
	values := render.Printer{Out: out, Options: a.look(a.out), OnlyVerdicts: onlyVerdicts}
	errors := render.Printer{Out: a.errOut, Options: a.look(a.errOut)}
	return func(e eval.Event) {
		progress.clear()
		if e.Error != nil {
			out.Flush()
			errors.Event(e)
			return
		}
		values.Event(e)
		// What is shown stands on the screen before a long statement begins.
		out.Flush()
	}
}

func statusOf(o eval.Outcome) int {
	switch {
	case o.Failed:
		return statusError
	case o.Missed:
		return statusMissed
	}
	return statusMet
}

// worsen keeps the worst status of several files.
func (a *app) worsen(status int) { a.status = max(a.status, status) }
