package main

import (
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"gainwright/lang/diag"
	"gainwright/lang/figure"
	"gainwright/lang/render"
)

// The exit statuses.
const (
	statusMet    = 0  // everything ran, every requirement is met, every claim agrees
	statusMissed = 1  // a requirement is missed, a claim disagrees or is undecided
	statusError  = 2  // an error in a file, a file that cannot be read, or an interruption
	statusUsage  = 64 // wrong usage of the command line
)

// app is one invocation: its streams and what the flags said.
type app struct {
	in          io.Reader
	out, errOut io.Writer
	status      int

	json      bool
	part      string // 3/16
	pictures  pictures
	digits    int
	timeLimit time.Duration
}

// usageError is an error of the command line itself.
type usageError struct{ message, help string }

func (e usageError) Error() string { return e.message }

func usage(help, format string, args ...any) error {
	return usageError{fmt.Sprintf(format, args...), help}
}

// Run runs the program with its arguments and gives the exit status.
func Run(args []string, in io.Reader, out, errOut io.Writer) int {
	a := &app{in: in, out: out, errOut: errOut}
	root := a.root()
	root.SetArgs(args)
	root.SetIn(in)
	root.SetOut(out)
	root.SetErr(errOut)
	err := root.Execute()
	if err == nil {
		return a.status
	}
	var failure *diag.Error
	if errors.As(err, &failure) {
		a.fail(failure)
		return statusError
	}
	fmt.Fprintf(errOut, "gainwright: %v\n", err)
	var wrong usageError
	if errors.As(err, &wrong) && wrong.help != "" {
		fmt.Fprintf(errOut, "  %s\n", wrong.help)
	} else {
		fmt.Fprintln(errOut, "  gainwright --help lists the commands and their flags")
	}
	return statusUsage
}

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "gainwright [FILE]",
		Short: "Design and review of state-space controllers",
		Long: `gainwright runs design files for state-space controllers and is a prompt for them.

Without a file it is the prompt. With one it runs the file: a script (.gain), the
blocks marked gain of a notebook (.md), or standard input (-).

Exit status: 0 all met, 1 a requirement or a claim is missed, 2 an error in the file
or an interruption, 64 wrong usage.`,
		Args:              cobra.ArbitraryArgs,
		SilenceErrors:     true,
		SilenceUsage:      true,
		RunE:              a.runRoot,
		ValidArgsFunction: completeDesignFiles,
	}
	root.SetFlagErrorFunc(func(_ *cobra.Command, err error) error { return usageError{message: err.Error()} })
	root.CompletionOptions.HiddenDefaultCmd = false
	a.runFlags(root)
	a.pictures.flags(root)
	root.Flags().StringVar(&a.part, "part", "", "compute one part of the studies, such as 3/16, and write it for merge")
	root.AddCommand(a.checkCommand(), a.mergeCommand(), a.tidyCommand(), a.explainCommand(), a.reportCommand(), a.followCommand(), a.versionCommand())
	return root
}

// runFlags are the flags of the commands that run files.
func (a *app) runFlags(c *cobra.Command) {
	c.Flags().BoolVar(&a.json, "json", false, "one JSON object a line instead of text")
	a.valueFlags(c)
}

// valueFlags are the flags that say how values are worked out and shown.
func (a *app) valueFlags(c *cobra.Command) {
	c.Flags().IntVar(&a.digits, "digits", render.DefaultDigits, "significant digits to show, 1 to 17")
	c.Flags().DurationVar(&a.timeLimit, "time-limit", 0, "longest time for one statement, such as 30s (no bound unless given)")
}

func (a *app) checkFlags() error {
	if a.digits < 1 || a.digits > 17 {
		return usage("", "--digits %d is not between 1 and 17", a.digits)
	}
	if a.timeLimit < 0 {
		return usage("", "--time-limit %v is negative", a.timeLimit)
	}
	return nil
}

func completeDesignFiles(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
	return []string{"gain", "md"}, cobra.ShellCompDirectiveFilterFileExt
}

// terminalOf gives the file behind a stream when that is a terminal.
func terminalOf(stream any) (*os.File, bool) {
	f, ok := stream.(*os.File)
	return f, ok && term.IsTerminal(int(f.Fd()))
}

// look gives the options for writing to a stream.
func (a *app) look(stream io.Writer) render.Options {
	o := render.Options{Digits: a.digits, Drawing: figure.Terminal}
	if f, ok := terminalOf(stream); ok {
		if w, _, err := term.GetSize(int(f.Fd())); err == nil && w > 0 {
			o.Width = w
		}
		o.Colour = os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"
	}
	return o
}

// fail writes an error that belongs to no statement.
func (a *app) fail(err *diag.Error) {
	p := render.Printer{Out: a.errOut, Options: a.look(a.errOut)}
	p.Failure(err)
}
