package main

import (
	"fmt"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

func (a *app) tidyCommand() *cobra.Command {
	var only bool
	c := &cobra.Command{
		Use:   "tidy FILE…",
		Short: "Lay files out in the usual form",
		Long: `tidy rewrites scripts, and the gain blocks of notebooks, in the usual form; comments
stay. - reads standard input and writes to standard output.

With --check nothing is written: files that differ are listed, and the exit status is 1
when there are any.`,
		Args:              needsFiles("tidy"),
		ValidArgsFunction: completeDesignFiles,
		RunE: func(_ *cobra.Command, args []string) error {
			for _, name := range args {
				if failure := a.tidy(name, only); failure != nil {
					a.fail(failure)
					a.worsen(statusError)
				}
			}
			return nil
		},
	}
	c.Flags().BoolVar(&only, "check", false, "list the files that differ, write nothing")
	return c
}

func (a *app) tidy(name string, only bool) *diag.Error {
	d, failure := a.open(name)
	if failure != nil {
		return failure
	}
	text, err := syntax.Tidy(d.source)
	if err != nil {
		return asFailure(err, d.source)
	}
	differs := text != d.source.Text
	switch {
	case only && differs:
		fmt.Fprintln(a.out, name)
		a.worsen(statusMissed)
	case only:
	case name == "-":
		fmt.Fprint(a.out, text)
	case differs:
		if err := replaceFile(name, text); err != nil {
			return diag.New(diag.File, "%s cannot be written: %s", name, reason(err))
		}
	}
	return nil
}

// replaceFile writes beside the file and renames, so that a full disk cannot leave half
// of it; the permissions stay.
func replaceFile(name, text string) error {
	target, err := filepath.EvalSymlinks(name)
	if err != nil {
		return err
	}
	info, err := os.Stat(target)
	if err != nil {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(target), ".tidy-*")
	if err != nil {
		return err
	}
	defer os.Remove(f.Name())
	if _, err = f.WriteString(text); err == nil {
		err = f.Chmod(info.Mode().Perm())
	}
	if closed := f.Close(); err == nil {
		err = closed
	}
	if err != nil {
		return err
	}
	return os.Rename(f.Name(), target)
}
