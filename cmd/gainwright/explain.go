package main

import (
	"fmt"
	"io"
	"sort"
	"strings"

	"github.com/spf13/cobra"

	"gainwright/builtins"
	"gainwright/lang/eval"
	"gainwright/lang/render"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

func (a *app) explainCommand() *cobra.Command {
	var all, asJSON, markdown bool
	c := &cobra.Command{
		Use:   "explain [WORD…]",
		Short: "Explain words of the language",
		Long: `explain says what a word of the language takes, gives and refuses, with examples and
its source. Without a word it lists all of them; --all explains all.`,
		ValidArgsFunction: func(_ *cobra.Command, _ []string, prefix string) ([]string, cobra.ShellCompDirective) {
			return newWords().candidates(prefix), cobra.ShellCompDirectiveNoFileComp
		},
		RunE: func(_ *cobra.Command, args []string) error {
			switch {
			case asJSON && markdown:
				return usage("", "--json and --markdown exclude each other")
			case all && len(args) > 0:
				return usage("", "--all needs no word")
			}
			return a.explain(args, all, asJSON, markdown)
		},
	}
	c.Flags().BoolVar(&all, "all", false, "explain every word")
	c.Flags().BoolVar(&asJSON, "json", false, "one JSON object a line for each word")
	c.Flags().BoolVar(&markdown, "markdown", false, "as a page of Markdown")
	return c
}

func (a *app) explain(args []string, all, asJSON, markdown bool) error {
	w := newWords()
	functions, err := w.session.Library()
	if err != nil {
		return err
	}
	o := a.look(a.out)
	chosen, library := w.table, functions
	if len(args) > 0 {
		chosen, library = nil, nil
		for _, word := range args {
			b, f := w.find(word, functions)
			statement, isStatement := render.StatementNamed(word)
			switch {
			case b != nil:
				chosen = append(chosen, b)
			case f != nil:
				library = append(library, f)
			case isStatement && len(args) == 1 && !asJSON && !markdown:
				io.WriteString(a.out, render.ExplainStatement(statement, o))
				return nil
			default:
				return usage(w.hint(word), "there is no word %s", word)
			}
		}
	}
	switch {
	case asJSON:
		for _, b := range chosen {
			a.out.Write(render.ExplainJSON(b))
		}
		for _, f := range library {
			a.out.Write(render.ExplainFunctionJSON(f))
		}
	case markdown && len(args) > 0:
		io.WriteString(a.out, strings.TrimLeft(render.ReferenceEntries(chosen, library), "\n"))
	case markdown:
		io.WriteString(a.out, render.Reference(chosen, library))
	case all || len(args) > 0:
		a.explainText(chosen, library, o)
	default:
		io.WriteString(a.out, render.Overview(chosen, library, o))
	}
	return nil
}

func (a *app) explainText(chosen []*value.Builtin, library []*value.Function, o render.Options) {
	first := true
	write := func(text string) {
		if !first {
			fmt.Fprintln(a.out)
		}
		first = false
		io.WriteString(a.out, text)
	}
	for _, b := range chosen {
		write(render.Explain(b, o))
	}
	for _, f := range library {
		write(render.ExplainFunction(f, o))
	}
}

// words finds what can be explained.
type words struct {
	table   []*value.Builtin
	session *eval.Session
}

func newWords() *words {
	table := builtins.Table()
	return &words{table, eval.New(eval.Options{Builtins: table, Library: stdlib.Files})}
}

func (w *words) find(word string, library []*value.Function) (*value.Builtin, *value.Function) {
	for _, b := range w.table {
		if b.Name == word {
			return b, nil
		}
	}
	for _, f := range library {
		if f.Name == word {
			return nil, f
		}
	}
	return nil, nil
}

func (w *words) candidates(prefix string) []string {
	names := w.session.Candidates(prefix)
	sort.Strings(names)
	return names
}

// hint names a word that is near.
func (w *words) hint(word string) string {
	if near := value.Nearest(word, w.session.Candidates("")); near != "" {
		return "is " + near + " meant?"
	}
	if names := render.Mentions(w.table, word); len(names) > 0 {
		return "it occurs under " + strings.Join(names, ", ")
	}
	return "gainwright explain lists all words"
}
