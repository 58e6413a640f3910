package main

import (
	"fmt"

	"github.com/spf13/cobra"
)

func (a *app) checkCommand() *cobra.Command {
	var against string
	c := &cobra.Command{
		Use:   "check FILE…",
		Short: "Run files and show only their requirements and claims",
		Long: `check runs each file by itself and shows its requirements and claims, nothing else.
The exit status is the worst of all files.

With --against it runs one file and lists each shown value, requirement and claim that
is not as in a report made earlier; the exit status is 1 when there is one, else 0.`,
		Args:              needsFiles("check"),
		ValidArgsFunction: completeDesignFiles,
		RunE: func(_ *cobra.Command, args []string) error {
			if err := a.checkFlags(); err != nil {
				return err
			}
			if against != "" {
				if len(args) > 1 {
					return usage("", "one file is checked against a report, %d were named", len(args))
				}
				return a.checkAgainst(args[0], against)
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
	c.Flags().StringVar(&against, "against", "", "a report (OUT.html) made earlier; list what differs from it")
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
