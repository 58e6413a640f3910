package builtins_test

import (
	"bytes"
	"context"
	"os"
	"strings"
	"testing"

	"gainwright/builtins"
	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/render"
	"gainwright/lang/value"
	"gainwright/stdlib"
)

func TestEveryBuiltinIsDescribedInFull(t *testing.T) {
	seen := map[string]bool{}
	table := builtins.Table()
	for _, b := range table {
		if seen[b.Name] {
			t.Errorf("%s stands twice in the table", b.Name)
		}
		seen[b.Name] = true
	}
	library := libraryNames(t)
	for _, b := range table {
		for field, text := range map[string]string{"Family": b.Family, "Result": b.Result, "Summary": b.Summary, "Doc": b.Doc, "Source": b.Source} {
			if strings.TrimSpace(text) == "" {
				t.Errorf("%s has no %s", b.Name, field)
			}
		}
		if n := len([]rune(b.Summary)); n > 72 {
			t.Errorf("the summary of %s has %d characters; 72 are allowed", b.Name, n)
		}
		if len(b.Examples) == 0 || len(b.Errors) == 0 || len(b.SeeAlso) == 0 {
			t.Errorf("%s lacks examples, errors or names to see also", b.Name)
		}
		if b.Func == nil {
			t.Errorf("%s has no code", b.Name)
		}
		for _, name := range b.SeeAlso {
			if !seen[name] && !library[name] {
				t.Errorf("%s points to %s, which is not there", b.Name, name)
			}
		}
		for _, p := range append(append([]value.Param(nil), b.Params...), b.Bare...) {
			if p.Doc == "" {
				t.Errorf("parameter %s of %s is not described", p.Name, b.Name)
			}
			if p.Optional && p.Default == "" && p.Shape != value.AWhole && b.Name != "pole_pair" {
				t.Errorf("optional parameter %s of %s names no default", p.Name, b.Name)
			}
		}
	}
}

func libraryNames(t *testing.T) map[string]bool {
	names := map[string]bool{}
	session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files})
	for _, n := range session.Names() {
		names[n.Name] = true
	}
	functions, err := session.Library()
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range functions {
		names[f.Name] = true
	}
	return names
}

// shownBy runs a text and gives what its last statement shows, notes left out.
func shownBy(t *testing.T, text string) string {
	t.Helper()
	root, err := os.OpenRoot("files") // the folder of the run, for the examples that read files
	if err != nil {
		t.Fatal(err)
	}
	defer root.Close()
	session := eval.New(eval.Options{Builtins: builtins.Table(), Library: stdlib.Files, Root: root})
	var out bytes.Buffer
	var last string
	session.RunText(context.Background(), diag.NewSource("example", text), func(e eval.Event) {
		if e.Error != nil {
			t.Errorf("%s\n%s", text, e.Error.Render())
		}
		if e.Shown == nil {
			return
		}
		out.Reset()
		last = render.Text("", e.Shown.Value, e.Shown.In, render.Options{Width: 100})
	})
	return last
}

func TestEveryExampleShowsWhatItSays(t *testing.T) {
	for _, b := range builtins.Table() {
		for _, x := range b.Examples {
			got := strings.TrimSpace(shownBy(t, x.Input))
			if normal(got) != normal(x.Output) {
				t.Errorf("%s: the example\n%s\nshows\n%s\nand should show\n%s", b.Name, x.Input, got, x.Output)
			}
		}
	}
}

// normal folds white space, since layouts break lines.
func normal(s string) string { return strings.Join(strings.Fields(s), " ") }
