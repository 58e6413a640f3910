package main

import (
	"fmt"

	"github.com/spf13/cobra"
)

func (a *app) checkCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "check FILE…",
		Short: "Run files and show only their requirements and claims",
		Long: `check runs each file by itself and shows its requirements and claims, nothing else.
The exit status is the worst of all files.`,
		Args:              needsFiles("check"),
		ValidArgsFunction: completeDesignFiles,
		RunE: func(_ *cobra.Command, args []string) error {
			if err := a.checkFlags(); err != nil {
				return err
			}
			for i, name := range args {
				if len(args) > 1 && !a.json {
					if i > 0 {
						fmt.Fprintln(a.out)
					}
					fmt.Fprintf(a.out, "%s\n", name)
				}
				d, failure := a.open(name)
				if failure != nil {
					a.fail(failure)
					a.worsen(statusError)
					continue
				}
				if err := a.runDesign(d, true); err != nil {
					return err
				}
			}
			return nil
		},
	}
	a.runFlags(c)
	return c
}

// needsFiles is the check of a command's arguments that names what is missing.
func needsFiles(command string) cobra.PositionalArgs {
	return func(_ *cobra.Command, args []string) error {
		if len(args) == 0 {
			return usage("gainwright "+command+" FILE…", "%s needs a file", command)
		}
		return nil
	}
}
