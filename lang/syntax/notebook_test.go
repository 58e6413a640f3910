package syntax

import (
	"errors"
	"strings"
	"testing"
	"time"

	"gainwright/lang/diag"
)

func TestNotebook(t *testing.T) {
	src := diag.NewSource("n.md", notebookText)
	f, err := ParseNotebook(src)
	if err != nil {
		t.Fatal(err.(*diag.Error).Render())
	}
	want := "bind M = 1200<kg>\nbind A = [[0, 1], [(- 2), (- 3)]]\n" +
		"model c; given M = 3<kg> ± 5%; state x in <m>,; output y = x,\n" +
		"bind z = (1 + 2)\nbind w = f(a: 3, b: (- 2))\nbind last = 1\n"
	if got := dumpFile(f); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	counts := []int{2, 1, 2, 0, 1}
	first := 0
	if len(f.Blocks) != len(counts) {
		t.Fatalf("%d blocks", len(f.Blocks))
	}
	for i, b := range f.Blocks {
		if b.First != first || b.Count != counts[i] {
			t.Errorf("block %d holds %d statements from %d", i, b.Count, b.First)
		}
		first += b.Count
	}
	for i, text := range []string{"M=1200", "A=[[0", "model  c{", "z=1+", "w=f(", "last=1"} {
		span := f.Statements[i].Extent()
		line, _ := src.Position(span.Start)
		wantLine := strings.Count(notebookText[:strings.Index(notebookText, text)], "\n") + 1
		if line != wantLine || !strings.HasPrefix(notebookText[span.Start:], text) {
			t.Errorf("%s is placed at line %d, stands at %d", text, line, wantLine)
		}
	}
	if body := f.Source.Text[f.Blocks[0].Span.Start:f.Blocks[0].Span.End]; body != "M=1200 kg   # trolley\nA=[[0 , 1],\n[-2,-3]]\n" {
		t.Errorf("the first block's body is %q", body)
	}
}

func TestNotebookErrors(t *testing.T) {
	for _, c := range []struct {
		text         string
		line, column int
		kept         int
		message      string
	}{
		{"# T\n\n```gain\nx = 1\ny = )\n```\n\n```gain\nz = 1\n```\n", 5, 5, 1, ") closes nothing"},
		{"- a\n\n  ```gain\n  x = (1\n  ```\n\ntext\n", 4, 9, 0, ") is missing at the end"},
		{"> ```gain\n> x = 1 +\n> ```\n", 2, 10, 0, "a value is missing after +"},
		{"```gain\nx = (1\n```\n\n```gain\n + 2)\n```\n", 2, 7, 0, ") is missing at the end"},
		{"```gain\r\nx = 1\r\ny z\r\n```\r\n", 3, 3, 1, "an operator is missing between y and z"},
		{"prose \xff\n", 1, 7, 0, "byte 7 of the text (0xFF) is not UTF-8"},
		{"prose \x00\n", 1, 7, 0, "this is a binary file, not a text (byte 7 is zero)"},
	} {
		f, err := ParseNotebook(diag.NewSource("n.md", c.text))
		var e *diag.Error
		if !errors.As(err, &e) {
			t.Errorf("%q is accepted", c.text)
			continue
		}
		line, column := e.Source.Position(e.Span.Start)
		if line != c.line || column != c.column || e.Message != c.message || len(f.Statements) != c.kept {
			t.Errorf("%q gives %d:%d: %s with %d statements", c.text, line, column, e.Message, len(f.Statements))
		}
	}
}

func TestNotebookWithoutBlocks(t *testing.T) {
	for _, text := range []string{"", "prose\n", "---\n", "\ufeffprose"} {
		f, err := ParseNotebook(diag.NewSource("n.md", text))
		if err != nil || len(f.Statements) != 0 || len(f.Blocks) != 0 {
			t.Errorf("%q: %v", text, err)
		}
	}
}

func TestNotebookNestedTooDeepIsProse(t *testing.T) {
	text := strings.Repeat(">", 1_000_000) + "\n\n```gain\nx = 1\n```\n"
	start := time.Now()
	f, err := ParseNotebook(diag.NewSource("n.md", text))
	if err != nil || len(f.Statements) != 1 {
		t.Errorf("%d statements, %v", len(f.Statements), err)
	}
	// Without the bound this takes minutes; the margin is for a busy machine.
	if took := time.Since(start); took > 10*time.Second {
		t.Errorf("took %v", took)
	}
}

func TestFrontMatter(t *testing.T) {
	for _, c := range []struct {
		text   string
		offset int
		values string
	}{
		{"---\ntitle: \"A: B\"\nauthor: 'C'\ndate: 2024\n---\nbody", 45, "title=A: B author=C date=2024"},
		{"\ufeff---\r\ntitle: A\r\n...\r\nbody", 23, "title=A"},
		{"---\n---\nbody", 8, ""},
		{"---\nprose here\n---\n", 0, ""},
		{"---\ntitle: A\nnever closed", 0, ""},
		{"\n---\ntitle: A\n---\n", 0, ""},
		{"", 0, ""},
	} {
		values, offset := FrontMatter(diag.NewSource("n.md", c.text))
		var parts []string
		for _, word := range []string{"title", "author", "date", "document"} {
			if v, ok := values[word]; ok {
				parts = append(parts, word+"="+v)
			}
		}
		if offset != c.offset || strings.Join(parts, " ") != c.values || len(parts) != len(values) {
			t.Errorf("%q: offset %d, values %v", c.text, offset, values)
		}
	}
}
