// Package diag holds the one error type of the language and how it is shown.
//
// Every error a user can see is an *Error: a kind, what is wrong in a sentence, the
// place in the source, and where there is one a line that helps. Packages that do not
// know the place (arithmetic, built-ins) leave the span empty; the evaluator fills it
// in with the span of the operator or argument at fault.
package diag

import (
	"fmt"
	"sort"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/mattn/go-runewidth"
)

// Kind sorts errors by what the user can do about them.
type Kind int

// The kinds of error.
const (
	Syntax      Kind = iota + 1 // the text is not a statement
	Name                        // an unknown, doubled or reserved name
	Type                        // a value of the wrong kind
	Unit                        // units that are unknown or clash
	Shape                       // sizes that do not agree
	Numerical                   // a question without an answer: singular, not assignable, not converged
	Limit                       // a bound on time, memory, depth or size was met
	File                        // a file that cannot be read or must not be
	Interrupted                 // stopped by the user
	Internal                    // a defect of the program itself
)

// Span is a half-open range of byte offsets in a source text.
type Span struct{ Start, End int }

// IsZero tells whether the span says nothing.
func (s Span) IsZero() bool { return s.Start == 0 && s.End == 0 }

// Join is the smallest span that covers both.
func (s Span) Join(o Span) Span {
	if s.IsZero() {
		return o
	}
	if o.IsZero() {
		return s
	}
	return Span{min(s.Start, o.Start), max(s.End, o.End)}
}

// Source is a named text with an index of its lines. For a notebook it is the whole
// Markdown file, so that lines are the notebook's own.
type Source struct {
	Name  string
	Text  string
	lines []int // byte offset of each line's start
}

// NewSource indexes a text.
func NewSource(name, text string) *Source {
	s := &Source{Name: name, Text: text, lines: []int{0}}
	for i := 0; i < len(text); i++ {
		if text[i] == '\n' {
			s.lines = append(s.lines, i+1)
		}
	}
	return s
}

// Position gives line and column of a byte offset, both from 1; the column counts characters.
func (s *Source) Position(offset int) (line, column int) {
	offset = min(max(offset, 0), len(s.Text))
	i := sort.SearchInts(s.lines, offset+1) - 1
	return i + 1, utf8.RuneCountInString(s.Text[s.lines[i]:offset]) + 1
}

// Line returns the text of a line (from 1) without its end.
func (s *Source) Line(n int) string {
	if n < 1 || n > len(s.lines) {
		return ""
	}
	end := len(s.Text)
	if n < len(s.lines) {
		end = s.lines[n] - 1
	}
	return strings.TrimSuffix(s.Text[s.lines[n-1]:end], "\r")
}

// Error is an error with its place.
type Error struct {
	Kind    Kind
	Message string  // what is wrong, one sentence without a final point
	Help    string  // a line that helps, or empty
	Source  *Source // nil until known
	Span    Span    // empty until known
	Param   string  // the parameter of the called function that is at fault, if one is
	Cause   error
}

// New makes an error without a place.
func New(kind Kind, format string, args ...any) *Error {
	return &Error{Kind: kind, Message: fmt.Sprintf(format, args...)}
}

// At returns the error with a span, unless it has one already.
func (e *Error) At(span Span) *Error {
	if e.Span.IsZero() {
		e.Span = span
	}
	return e
}

// In returns the error with its source, unless it has one already.
func (e *Error) In(src *Source) *Error {
	if e.Source == nil {
		e.Source = src
	}
	return e
}

// WithHelp adds the line that helps.
func (e *Error) WithHelp(format string, args ...any) *Error {
	e.Help = fmt.Sprintf(format, args...)
	return e
}

// For names the parameter at fault, so that the caller can point at the argument.
func (e *Error) For(param string) *Error {
	e.Param = param
	return e
}

// Unwrap gives the cause.
func (e *Error) Unwrap() error { return e.Cause }

// Error is "FILE:LINE:COLUMN: message", or the message alone while the place is unknown.
func (e *Error) Error() string {
	message := strings.Map(visible, e.Message)
	if e.Source == nil {
		return message
	}
	line, col := e.Source.Position(e.Span.Start)
	return fmt.Sprintf("%s:%d:%d: %s", strings.Map(visible, e.Source.Name), line, col, message)
}

// Render shows the error with its source line, a caret under the exact place and the
// line that helps. It ends with a newline.
func (e *Error) Render() string {
	var b strings.Builder
	b.WriteString(e.Error())
	b.WriteByte('\n')
	if e.Source != nil {
		line, col := e.Source.Position(e.Span.Start)
		text := e.Source.Line(line)
		shown, before, width := excerpt(text, col, e.Span)
		if strings.TrimSpace(shown) != "" {
			fmt.Fprintf(&b, "  %s\n  %s%s\n", shown, strings.Repeat(" ", before), strings.Repeat("^", width))
		}
	}
	if e.Help != "" {
		fmt.Fprintf(&b, "  %s\n", strings.Map(visible, e.Help))
	}
	return b.String()
}

// excerptCells is the widest excerpt of a source line, in terminal columns.
const excerptCells = 100

// terminal measures text in columns, whatever the user's locale is.
var terminal = &runewidth.Condition{StrictEmojiNeutral: true}

// visible makes a character harmless on a terminal: nothing that moves the cursor or
// turns the reading direction comes through.
func visible(r rune) rune {
	switch {
	case r == '\t' || r == '\u00a0':
		return ' '
	case unicode.IsControl(r) || r == utf8.RuneError || unicode.Is(unicode.Bidi_Control, r) || r == '\ufeff':
		return '·'
	}
	return r
}

// excerpt cuts a long line around the column and returns the columns before the caret and
// the caret's width.
func excerpt(text string, col int, span Span) (shown string, before, width int) {
	runes := []rune(text)
	at := min(col-1, len(runes))
	end := at + caretRunes(runes[at:], text, at, span)
	for i, r := range runes {
		runes[i] = visible(r)
	}
	from, to := 0, len(runes)
	lead, tail := "", ""
	if terminal.StringWidth(string(runes)) > excerptCells {
		from, to = window(runes, at)
		if from > 0 {
			lead = "…"
		}
		if to < len(runes) {
			tail = "…"
		}
	}
	before = terminal.StringWidth(lead + string(runes[from:at]))
	width = max(1, terminal.StringWidth(string(runes[at:max(at, min(end, to))])))
	return lead + string(runes[from:to]) + tail, before, width
}

// caretRunes is how many characters of the line, from the one at the caret, the span covers.
func caretRunes(rest []rune, text string, at int, span Span) int {
	offset := 0
	for range at {
		_, size := utf8.DecodeRuneInString(text[offset:])
		offset += size
	}
	left, count := span.End-span.Start, 0
	for ; count < len(rest) && left > 0; count++ {
		_, size := utf8.DecodeRuneInString(text[offset:])
		offset += size
		left -= size
	}
	return count
}

// window chooses the part of a long line that shows the character at the caret, half of
// it before and half after.
func window(runes []rune, at int) (from, to int) {
	from = at
	for cells := 0; from > 0; from-- {
		cells += terminal.RuneWidth(runes[from-1])
		if cells > excerptCells/2 {
			break
		}
	}
	to = from
	for cells := 0; to < len(runes); to++ {
		cells += terminal.RuneWidth(runes[to])
		if cells > excerptCells {
			break
		}
	}
	return from, max(to, at)
}
