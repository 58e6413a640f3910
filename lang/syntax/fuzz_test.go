package syntax

import (
	"errors"
	"fmt"
	"runtime"
	"strings"
	"testing"

	"gainwright/lang/diag"
)

func seed(f *testing.F) {
	for _, c := range statementCases {
		f.Add(c.text)
	}
	for _, c := range errorCases {
		f.Add(c.text)
	}
	for _, c := range tidyCases {
		f.Add(c.text)
	}
	f.Add(modelText)
	f.Add(notebookText)
}

// FuzzParse checks that no text makes the parser panic, that every error has its place,
// and that a text that parses survives formatting.
func FuzzParse(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, text string) {
		fuzzOne(t, "f.gain", text)
		Incomplete(text)
	})
}

// FuzzNotebook does the same with the text as a notebook.
func FuzzNotebook(f *testing.F) {
	seed(f)
	f.Fuzz(func(t *testing.T, text string) { fuzzOne(t, "f.md", text) })
}

func fuzzOne(t *testing.T, name, text string) {
	src := diag.NewSource(name, text)
	parse := Parse
	if IsNotebook(name) {
		parse = ParseNotebook
	}
	file, err := parse(src)
	for _, s := range file.Statements {
		if e := s.Extent(); e.Start < 0 || e.End > len(text) || e.Start >= e.End {
			t.Fatalf("a statement at %v", e)
		}
	}
	if err == nil {
		checkTidy(t, name, text)
		return
	}
	var e *diag.Error
	if !errors.As(err, &e) || e.Message == "" || e.Source != src || e.Span.Start < 0 || e.Span.End > len(text) || e.Span.End < e.Span.Start {
		t.Fatalf("error %#v", err)
	}
	if shown := e.Render(); strings.Contains(shown, "%!") && !strings.Contains(text, "%!") || strings.ContainsAny(strings.ReplaceAll(shown, "\n", ""), "\x00\x1b\r") {
		t.Fatalf("shown as %q", shown)
	}
}

// hundred is a text of a hundred statements of the usual kinds.
func hundred() string {
	return strings.Repeat(craneText, 10) + strings.Repeat("A = [[0, 1, 0], [-2, -3, 1/7], [0.5, 1e-3, 9.81]]\nB = A*Aᵀ + 3*A^-1\n", 10)
}

func BenchmarkParse(b *testing.B) {
	src := diag.NewSource("f.gain", hundred())
	f, err := Parse(src)
	if err != nil || len(f.Statements) != 100 {
		b.Fatalf("%d statements, %v", len(f.Statements), err)
	}
	b.SetBytes(int64(len(src.Text)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Parse(src); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkTidy(b *testing.B) {
	src := diag.NewSource("f.gain", hundred())
	b.SetBytes(int64(len(src.Text)))
	for b.Loop() {
		if _, err := Tidy(src); err != nil {
			b.Fatal(err)
		}
	}
}

// longTexts are texts whose kind a careless step would make quadratic.
var longTexts = map[string]string{
	"statements": craneText,
	"matrix":     "x = [" + strings.Repeat("1, -2.5\n", 100) + "]\n",
	"comments":   strings.Repeat("# a\n", 100),
	"calls":      "x = " + strings.Repeat("f(", 100) + strings.Repeat(")", 100) + "\n",
}

// TestLargeTextsTakeLinearMemory compares what is allocated for a text with one eight times
// as long. BenchmarkLargeTexts compares the time.
func TestLargeTextsTakeLinearMemory(t *testing.T) {
	for name, unit := range longTexts {
		allocated := func(times int) uint64 {
			src := diag.NewSource("f.gain", strings.Repeat(unit, times))
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			if _, err := Tidy(src); err != nil {
				t.Fatal(name, err)
			}
			runtime.ReadMemStats(&after)
			return after.TotalAlloc - before.TotalAlloc
		}
		n := 60_000 / len(unit)
		allocated(n) // what is made once
		short, long := allocated(n), allocated(8*n)
		if long > 16*short {
			t.Errorf("%s: %d bytes, and %d for a text eight times as long", name, short, long)
		}
	}
}

func BenchmarkLargeTexts(b *testing.B) {
	for name, unit := range longTexts {
		for _, kilobytes := range []int{60, 480} {
			src := diag.NewSource("f.gain", strings.Repeat(unit, kilobytes*1000/len(unit)))
			b.Run(fmt.Sprintf("%s/%d", name, kilobytes), func(b *testing.B) {
				b.SetBytes(int64(len(src.Text)))
				for b.Loop() {
					if _, err := Tidy(src); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}
