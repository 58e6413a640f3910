package main

import (
	"os"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/prompt"
	"gainwright/lang/render"
)

// prompt is gainwright without a file.
func (a *app) prompt() error {
	root, err := os.OpenRoot(".")
	if err != nil {
		return diag.New(diag.File, "the current folder cannot be read: %s", reason(err))
	}
	defer root.Close()
	progress := newProgress(a.errOut)
	options := a.options(root, progress)
	options.Interactive = true
	w := newWords()
	in, inIsTerminal := terminalOf(a.in)
	_, outIsTerminal := terminalOf(a.out)
	status := prompt.Run(prompt.Options{
		Session:  eval.New(options),
		Table:    w.table,
		Root:     root,
		In:       a.in,
		Out:      a.out,
		Terminal: in == os.Stdin && inIsTerminal && outIsTerminal,
		Look:     func() render.Options { return a.look(a.out) },
		Greeting: greeting(),
		Quiet:    progress.clear,
	})
	a.worsen(status)
	return nil
}

func greeting() []string {
	return []string{
		"gainwright, state-space design. Tab completes a word, explain WORD explains it.",
		"Ctrl-C stops a running statement; leave session, or Ctrl-D, leaves.",
	}
}
