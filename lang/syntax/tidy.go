package syntax

import (
	"strings"

	"github.com/mattn/go-runewidth"

	"gainwright/lang/diag"
)

// Layout of tidy text, in columns.
const (
	bodyIndent     = 2  // items of a model, entries after a bracket that ends its line
	continueIndent = 4  // a statement's further lines outside brackets
	commentGap     = 2  // between code and the comment after it
	commentColumn  = 72 // comments of neighbouring lines align if their code ends before it
)

// Tidy formats a script, or the blocks of a notebook if the source's name says it is one.
// Line breaks, comments and the spelling of names, numbers and units stay; blanks,
// indentation and the place of comments become canonical, and one blank line is kept of several. Around
// * and / the author's choice of blanks stays, since it shows what belongs together.
// Formatting twice changes nothing, and the statements stay the same. Text that
// does not parse is refused with its *diag.Error.
func Tidy(src *diag.Source) (string, error) {
	if IsNotebook(src.Name) {
		return tidyNotebook(src)
	}
	if err := refuseText(src); err != nil {
		return "", err
	}
	lines, failure := tidyLines(src, src.Text, 0, len(src.Text))
	if failure != nil {
		return "", suspectNotebook(src, failure.err)
	}
	return joined(lines, "", lineEnd(src.Text)), nil
}

// tidyNotebook formats the blocks' bodies and leaves everything else as it is.
func tidyNotebook(src *diag.Source) (string, error) {
	if _, err := ParseNotebook(src); err != nil {
		return "", err
	}
	var b strings.Builder
	done := 0
	for _, block := range notebookBlocks(src) {
		lines, failure := tidyLines(src, block.text, block.span.Start, block.span.End)
		if failure != nil {
			return "", failure.err
		}
		if len(lines) == 0 {
			continue
		}
		b.WriteString(src.Text[done:block.lineStart])
		b.WriteString(joined(lines, block.prefix, lineEnd(src.Text)))
		done = block.span.End
	}
	b.WriteString(src.Text[done:])
	return b.String(), nil
}

// lineEnd is the line end that a text uses first.
func lineEnd(text string) string {
	if i := strings.IndexByte(text, '\n'); i > 0 && text[i-1] == '\r' {
		return "\r\n"
	}
	return "\n"
}

func joined(lines []string, prefix, end string) string {
	var b strings.Builder
	for _, line := range lines {
		b.WriteString(strings.TrimRight(prefix+line, " \t"))
		b.WriteString(end)
	}
	return b.String()
}

// tidyLines formats the code between two offsets.
func tidyLines(src *diag.Source, text string, start, end int) ([]string, *bailout) {
	p := newParser(&File{Source: src}, text, start, end)
	p.logging = true
	if failure := guarded(p.statements); failure != nil {
		return nil, failure
	}
	t := &tidier{text: text, pieces: merged(p.log, p.scan.comments, text), prev: -1}
	t.padSignals()
	t.markContinued()
	for i := range t.pieces {
		t.place(i)
	}
	t.endLine()
	return t.finished(), nil
}

// piece is a token or a comment on its way to a line.
type piece struct {
	placed
	comment bool
	shown   string
	pad     int  // blanks after it beyond the usual one
	lines   int  // line ends in the text before it
	goesOn  bool // the statement or item before goes on here
}

// merged orders tokens and comments by place and counts the line ends between them.
func merged(log []placed, comments []diag.Span, text string) []piece {
	pieces := make([]piece, 0, len(log)+len(comments))
	before := 0
	add := func(p piece) {
		if len(pieces) > 0 {
			p.lines = strings.Count(text[before:p.span.Start], "\n")
		}
		before = p.span.End
		pieces = append(pieces, p)
	}
	for _, t := range log {
		for len(comments) > 0 && comments[0].Start < t.span.Start {
			add(commentPiece(comments[0], text))
			comments = comments[1:]
		}
		add(piece{placed: t, shown: spelling(t.token, text)})
	}
	for _, c := range comments {
		add(commentPiece(c, text))
	}
	return pieces
}

func commentPiece(span diag.Span, text string) piece {
	shown := strings.TrimRight(text[span.Start:span.End], " \t\r")
	return piece{placed: placed{token: token{span: span}}, comment: true, shown: shown}
}

// spelling is how a token is written: operators plainly, the rest as it was.
func spelling(t token, text string) string {
	written := text[t.span.Start:t.span.End]
	if t.kind == tokenSign && written != "+/-" {
		return t.text
	}
	return written
}

// tidier builds lines from pieces.
type tidier struct {
	text   string
	pieces []piece
	prev   int // the token before on the same line, -1 for none
	open   []tidyBracket
	lines  []tidyLine
	line   tidyLine
	code   strings.Builder // of the line
}

type tidyLine struct {
	indent        int
	width         int // of the code, indentation included
	code, comment string
}

// terminal measures text in columns, whatever the user's locale is.
var terminal = &runewidth.Condition{StrictEmojiNeutral: true}

// tidyBracket is an open bracket: entries align after it, or hang indented if it ends its line.
type tidyBracket struct {
	column int // of the bracket
	indent int // of its line
	hangs  bool
	role   role
}

// padSignals aligns what follows input, state and output on neighbouring items.
func (t *tidier) padSignals() {
	var run []int
	flush := func() {
		longest := 0
		for _, i := range run {
			longest = max(longest, len(t.pieces[i].shown))
		}
		for _, i := range run {
			t.pieces[i].pad = longest - len(t.pieces[i].shown)
		}
		run = run[:0]
	}
	for i, p := range t.pieces {
		switch {
		case p.role == roleSignals && p.lines > 0:
			run = append(run, i)
		case p.first:
			flush()
		}
	}
	flush()
}

// markContinued finds the pieces before which no statement or item ended. A comment goes
// with the token after it.
func (t *tidier) markContinued() {
	goesOn := false
	for i := len(t.pieces) - 1; i >= 0; i-- {
		if p := &t.pieces[i]; p.comment {
			p.goesOn = goesOn
		} else {
			p.goesOn = !p.first
			goesOn = p.goesOn && !p.is("}")
		}
	}
}

// place puts a piece on the current line or begins the next one.
func (t *tidier) place(i int) {
	p := t.pieces[i]
	if i > 0 && p.lines > 0 {
		t.endLine()
		if p.lines > 1 && !t.closes(p) && !t.opensBody(i-1) {
			t.lines = append(t.lines, tidyLine{})
		}
	}
	if t.prev < 0 && t.line.comment == "" {
		t.line.indent = t.indentOf(i)
		t.line.width = t.line.indent
	}
	if p.comment {
		t.line.comment = p.shown
		return
	}
	if t.prev >= 0 {
		blanks := 0
		if t.spaced(t.prev, i) {
			blanks = 1 + t.pieces[t.prev].pad
		}
		t.code.WriteString(strings.Repeat(" ", blanks))
		t.line.width += blanks
	}
	t.bracket(i)
	t.code.WriteString(p.shown)
	t.line.width += terminal.StringWidth(p.shown)
	t.prev = i
}

// opensBody tells whether a piece, comments aside, is an opening bracket.
func (t *tidier) opensBody(i int) bool {
	for i > 0 && t.pieces[i].comment && t.pieces[i].lines == 0 {
		i--
	}
	p := t.pieces[i]
	return !p.comment && (p.is("{") || p.is("(") || p.is("["))
}

func (t *tidier) closes(p piece) bool {
	return !p.comment && (p.is(")") || p.is("]") || p.is("}"))
}

// bracket keeps the stack of open brackets.
func (t *tidier) bracket(i int) {
	p := t.pieces[i]
	switch {
	case p.is("(") || p.is("[") || p.is("{"):
		next := i + 1
		hangs := false
		for ; next < len(t.pieces); next++ {
			hangs = hangs || t.pieces[next].lines > 0
			if !t.pieces[next].comment {
				break
			}
		}
		t.open = append(t.open, tidyBracket{column: t.line.width, indent: t.line.indent, hangs: hangs || p.is("{"), role: p.role})
	case t.closes(p):
		t.open = t.open[:len(t.open)-1]
	}
}

// indentOf is the indentation of a line that begins with a piece.
func (t *tidier) indentOf(i int) int {
	p := t.pieces[i]
	further := 0
	if p.goesOn {
		further = continueIndent
	}
	if len(t.open) == 0 {
		return further
	}
	b := t.open[len(t.open)-1]
	switch {
	case t.closes(p) && b.hangs:
		return b.indent
	case t.closes(p):
		return b.column
	case b.role == roleBody:
		return b.indent + bodyIndent + further
	case b.hangs:
		return b.indent + bodyIndent
	}
	return b.column + 1
}

// spaced tells whether a blank stands between two neighbouring tokens of a line.
func (t *tidier) spaced(before, after int) bool {
	a, b := t.pieces[before], t.pieces[after]
	switch {
	case b.is(")"), b.is("]"), b.is(","), b.is(";"), b.is(":"), a.is("("), a.is("["):
		return false
	case b.is("}"):
		return !a.is("{")
	}
	switch b.role {
	case rolePostfix, roleTight:
		return false
	case rolePercent:
		return b.spaceBefore
	case roleChosen:
		return t.chosen(b) || a.kind == tokenUnit
	}
	switch a.role {
	case roleSign, roleTight:
		return false
	case roleChosen:
		return t.chosen(a) || before > 0 && t.pieces[before-1].kind == tokenUnit
	}
	return true
}

// chosen tells whether the author put a blank on either side of the operator; after a unit there
// always is one, since the unit would go on with what touches it.
func (t *tidier) chosen(p piece) bool {
	return p.spaceBefore || strings.ContainsAny(t.text[p.span.End:p.span.End+1], " \t\r\n#")
}

func (t *tidier) endLine() {
	if t.prev >= 0 || t.line.comment != "" {
		t.line.code = t.code.String()
		t.lines = append(t.lines, t.line)
	}
	t.code.Reset()
	t.line, t.prev = tidyLine{}, -1
}

// finished gives the lines with the comments of neighbouring lines in one column.
func (t *tidier) finished() []string {
	out := make([]string, 0, len(t.lines))
	for i := 0; i < len(t.lines); {
		j, column := i, 0
		for ; j < len(t.lines) && t.lines[j].code != "" && t.lines[j].comment != ""; j++ {
			if w := t.lines[j].width; w <= commentColumn {
				column = max(column, w)
			}
		}
		for ; i < j; i++ {
			l := t.lines[i]
			gap := max(column-l.width, 0) + commentGap
			out = append(out, strings.Repeat(" ", l.indent)+l.code+strings.Repeat(" ", gap)+l.comment)
		}
		if i < len(t.lines) {
			l := t.lines[i]
			out = append(out, strings.Repeat(" ", l.indent)+l.code+l.comment)
			i++
		}
	}
	return out
}
