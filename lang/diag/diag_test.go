package diag

import (
	"errors"
	"io/fs"
	"strings"
	"testing"
)

func TestPosition(t *testing.T) {
	src := NewSource("f", "ab\r\nα\tβ\n\nlast")
	for _, c := range []struct{ offset, line, column int }{
		{0, 1, 1}, {1, 1, 2}, {3, 1, 4}, {4, 2, 1}, {6, 2, 2}, {7, 2, 3}, {9, 2, 4},
		{10, 3, 1}, {11, 4, 1}, {15, 4, 5}, {99, 4, 5}, {-3, 1, 1},
	} {
		if line, column := src.Position(c.offset); line != c.line || column != c.column {
			t.Errorf("Position(%d) = %d, %d; want %d, %d", c.offset, line, column, c.line, c.column)
		}
	}
	for n, want := range []string{"", "ab", "α\tβ", "", "last", ""} {
		if got := src.Line(n); got != want {
			t.Errorf("Line(%d) = %q, want %q", n, got, want)
		}
	}
}

func TestPositionOfEmptyText(t *testing.T) {
	src := NewSource("f", "")
	if line, column := src.Position(0); line != 1 || column != 1 || src.Line(1) != "" {
		t.Errorf("empty text: %d, %d, %q", line, column, src.Line(1))
	}
}

// at makes an error whose span is the first occurrence of a part of the text.
func at(text, part string) *Error {
	start := strings.Index(text, part)
	return New(Syntax, "wrong").At(Span{start, start + len(part)}).In(NewSource("f", text))
}

func TestRenderPutsTheCaretUnderThePlace(t *testing.T) {
	for _, c := range []struct{ name, text, part, want string }{
		{"plain", "x = yy\n", "yy", "f:1:5: wrong\n  x = yy\n      ^^\n"},
		{"no final line end", "x = yy", "yy", "f:1:5: wrong\n  x = yy\n      ^^\n"},
		{"carriage returns", "a\r\nx = yy\r\nb", "yy", "f:2:5: wrong\n  x = yy\n      ^^\n"},
		{"tab", "\tx = yy", "yy", "f:1:6: wrong\n   x = yy\n       ^^\n"},
		{"wide characters", "櫃 = 車", "車", "f:1:5: wrong\n  櫃 = 車\n       ^^\n"},
		{"combining mark", "x̂ = yy", "yy", "f:1:6: wrong\n  x̂ = yy\n      ^^\n"},
		{"greek", "ω = δδ", "δδ", "f:1:5: wrong\n  ω = δδ\n      ^^\n"},
		{"span over two lines", "a(b\nc)", "(b\nc)", "f:1:2: wrong\n  a(b\n   ^^\n"},
		{"invalid bytes", "x\xff\xffy", "\xff\xff", "f:1:2: wrong\n  x··y\n   ^^\n"},
		{"escape sequence", "x\x1b[2Jy", "y", "f:1:6: wrong\n  x·[2Jy\n       ^\n"},
		{"turned direction", "x\u202ey", "y", "f:1:3: wrong\n  x·y\n    ^\n"},
	} {
		if got := at(c.text, c.part).Render(); got != c.want {
			t.Errorf("%s:\n%s\nwant\n%s", c.name, got, c.want)
		}
	}
}

func TestRenderAtTheEndOfALine(t *testing.T) {
	e := New(Syntax, "wrong").At(Span{3, 3}).In(NewSource("f", "x =\ny")).WithHelp("add %s", "it")
	if want := "f:1:4: wrong\n  x =\n     ^\n  add it\n"; e.Render() != want {
		t.Errorf("got\n%s\nwant\n%s", e.Render(), want)
	}
}

func TestRenderCutsLongLines(t *testing.T) {
	for _, text := range []string{
		strings.Repeat("a", 5000) + "#" + strings.Repeat("b", 5000),
		strings.Repeat("櫃", 5000) + "#" + strings.Repeat("車", 5000),
		"#" + strings.Repeat("b", 5000),
		strings.Repeat("a", 5000) + "#",
	} {
		lines := strings.Split(at(text, "#").Render(), "\n")
		shown, caret := lines[1], lines[2]
		if w := terminal.StringWidth(shown); w > excerptCells+4 {
			t.Errorf("the excerpt is %d columns wide", w)
		}
		before, _, found := strings.Cut(shown, "#")
		if !found || terminal.StringWidth(before) != strings.Index(caret, "^") {
			t.Errorf("the caret is not under the place:\n%s\n%s", shown, caret)
		}
	}
}

func TestRenderWithoutAPlace(t *testing.T) {
	e := New(Numerical, "no answer").WithHelp("try else")
	if got := e.Render(); got != "no answer\n  try else\n" {
		t.Errorf("got %q", got)
	}
}

func TestTheFirstPlaceStays(t *testing.T) {
	first, second := NewSource("a", "abc"), NewSource("b", "abc")
	e := New(Name, "wrong").At(Span{1, 2}).At(Span{0, 1}).In(first).In(second)
	if e.Span != (Span{1, 2}) || e.Source != first {
		t.Errorf("place %v of %s", e.Span, e.Source.Name)
	}
}

func TestJoin(t *testing.T) {
	if got := (Span{3, 5}).Join(Span{1, 4}); got != (Span{1, 5}) {
		t.Errorf("join gives %v", got)
	}
	if got := (Span{}).Join(Span{1, 4}); got != (Span{1, 4}) {
		t.Errorf("join with nothing gives %v", got)
	}
}

func TestCause(t *testing.T) {
	e := New(File, "no such file")
	e.Cause = fs.ErrNotExist
	if !errors.Is(e, fs.ErrNotExist) {
		t.Error("the cause is not reachable")
	}
}

func TestNearest(t *testing.T) {
	words := []string{
		"assign_poles", "observer_gain", "reachability", "observability", "modes", "model",
		"K", "L", "sin", "cos", "tan", "transmission_zeros", "static_gain", "pole_pair", "poles",
	}
	for _, c := range []struct{ word, want string }{
		{"poles_assign", "assign_poles"}, // words in another order
		{"assign_pole", "assign_poles"},  // a letter left out
		{"asign_ploes", "assign_poles"},  // left out, and two swapped
		{"Reachability", "reachability"}, // capitals
		{"k", "K"},
		{"mods", "modes"},
		{"modle", "model"},
		{"sni", "sin"},
		{"obsevability", "observability"},
		{"q", ""}, // one letter is near every other
		{"zzzzzz", ""},
		{"assign_poles", ""}, // nothing but itself is near
		{"", ""},
		{strings.Repeat("a", 100_000), ""},
	} {
		if got := Nearest(c.word, words); got != c.want {
			t.Errorf("Nearest(%.40q) = %q, want %q", c.word, got, c.want)
		}
	}
}

func TestNearestDoesNotDependOnOrder(t *testing.T) {
	if a, b := Nearest("pat", []string{"bat", "cat"}), Nearest("pat", []string{"cat", "bat"}); a != b {
		t.Errorf("%q and %q", a, b)
	}
}
