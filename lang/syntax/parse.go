package syntax

import (
	"strings"

	"gainwright/lang/diag"
)

// Bounds on a text, so that no file can exhaust the stack, the memory or the time of
// what works on the tree.
const (
	textBytes      = 16 << 20
	lineBytes      = 1 << 20
	statementCount = 100_000
	nestingDepth   = 200     // brackets, signs and powers inside one another
	treeHeight     = 4_000   // of an expression; a sum of n terms has the height n
	nodeCount      = 200_000 // of one statement
)

// mode is what an open bracket does to line ends.
type mode uint8

const (
	modeLines mode = iota // a line end ends the item: top level, { } of a model, a diagram, a study
	modeJoin              // a line end is a blank: ( ), the braces of if
	modeList              // a line end may be a comma: [ ]
)

// inside tells what a bracket holds.
type inside uint8

const (
	insideGroup  inside = iota // (EXPR)
	insideCall                 // f( )
	insideList                 // [ ]
	insideIndex                // A[ ]
	insideChoice               // if C { }
	insideBody                 // model NAME { }
)

type opening struct {
	mode  mode
	holds inside
	sign  string
	span  diag.Span
}

type parser struct {
	scan  *scanner
	ahead []token
	prev  token // the last token taken, line ends aside
	open  []opening
	file  *File

	depth, nodes int
	height       int // of the expression parsed last

	log     []placed // every token taken, for the tidy printer
	logging bool
}

// placed is a token with what the parser knows of its part in the text.
type placed struct {
	token
	role  role
	first bool // begins a statement or an item
}

// Parse reads a script. If the text is wrong, the file holds the statements before the
// error, and the error is a *diag.Error with its place.
func Parse(src *diag.Source) (*File, error) {
	file := &File{Source: src}
	if err := refuseText(src); err != nil {
		return file, err
	}
	p := newParser(file, src.Text, 0, len(src.Text))
	if failure := guarded(p.statements); failure != nil {
		return file, suspectNotebook(src, failure.err)
	}
	return file, nil
}

// Incomplete tells whether a text at the prompt needs another line: a bracket is open,
// or it ends with a binary operator or a comma.
func Incomplete(text string) bool {
	src := diag.NewSource("", text)
	if refuseText(src) != nil {
		return false
	}
	p := newParser(&File{Source: src}, text, 0, len(text))
	failure := guarded(p.statements)
	return failure != nil && failure.atEnd
}

func newParser(file *File, text string, start, end int) *parser {
	return &parser{
		scan: &scanner{src: file.Source, text: text, pos: start, end: end},
		file: file,
	}
}

// refuseText refuses what is no text, and what is too long.
func refuseText(src *diag.Source) error {
	text := src.Text
	if i := strings.IndexByte(text, 0); i >= 0 {
		return diag.New(diag.Syntax, "this is a binary file, not a text (byte %d is zero)", i+1).
			At(diag.Span{Start: i, End: i + 1}).In(src)
	}
	if len(text) > textBytes {
		return diag.New(diag.Limit, "the text is longer than %d MiB", textBytes>>20).
			At(diag.Span{Start: 0, End: 1}).In(src)
	}
	for start := 0; start < len(text); {
		n := strings.IndexByte(text[start:], '\n')
		if n < 0 {
			n = len(text) - start
		}
		if n > lineBytes {
			return diag.New(diag.Limit, "a line is longer than %d bytes", lineBytes).
				At(diag.Span{Start: start, End: start + 1}).In(src).
				WithHelp("long tables are read from a file by matrix_from")
		}
		start += n + 1
	}
	return nil
}

// suspectNotebook adds the help line for a Markdown file that was given as a script.
func suspectNotebook(src *diag.Source, err *diag.Error) error {
	if IsNotebook(src.Name) || !looksLikeNotebook(src.Text) {
		return err
	}
	return err.WithHelp("this looks like a Markdown notebook: its name should end in .md")
}

// peek gives the next token; line ends inside ( ) are passed.
func (p *parser) peek() token {
	if p.mode() == modeJoin {
		p.skipLines()
	}
	return p.raw(0)
}

// raw gives the i-th token ahead, line ends included.
func (p *parser) raw(i int) token {
	for len(p.ahead) <= i {
		p.ahead = append(p.ahead, p.scan.next())
	}
	return p.ahead[i]
}

// take moves past the next token.
func (p *parser) take() token {
	t := p.peek()
	p.drop()
	if t.kind != tokenNewline {
		p.prev = t
		if p.logging {
			p.log = append(p.log, placed{token: t})
		}
	}
	return t
}

func (p *parser) drop() {
	n := copy(p.ahead, p.ahead[1:])
	p.ahead = p.ahead[:n]
}

// skipLines passes line ends.
func (p *parser) skipLines() {
	for p.raw(0).kind == tokenNewline {
		p.drop()
	}
}

// rescan forgets what was looked at ahead, so that the scanner can read a unit.
func (p *parser) rescan() {
	p.ahead = p.ahead[:0]
	p.scan.pos = p.prev.span.End
}

func (p *parser) mode() mode {
	if len(p.open) == 0 {
		return modeLines
	}
	return p.open[len(p.open)-1].mode
}

// enter takes an opening bracket and sets what line ends mean inside.
func (p *parser) enter(m mode, holds inside) {
	t := p.take()
	if holds == insideBody {
		p.setRole(roleBody)
	}
	p.open = append(p.open, opening{mode: m, holds: holds, sign: t.text, span: t.span})
}

// leave takes the closing bracket.
func (p *parser) leave() token {
	t := p.take()
	p.open = p.open[:len(p.open)-1]
	return t
}

// setRole notes the part of the token taken last.
func (p *parser) setRole(r role) {
	if p.logging {
		p.log[len(p.log)-1].role = r
	}
}

// takeFirst takes the token that begins a statement or an item.
func (p *parser) takeFirst() token {
	t := p.take()
	p.markFirst()
	return t
}

func (p *parser) markFirst() {
	if p.logging {
		p.log[len(p.log)-1].first = true
	}
}

// from is the span from an offset to the end of the token taken last.
func (p *parser) from(start int) diag.Span { return diag.Span{Start: start, End: p.prev.span.End} }

// deeper guards the recursion of the parser.
func (p *parser) deeper(span diag.Span) {
	p.depth++
	if p.depth > nestingDepth {
		p.fail(diag.Limit, span, "bind parts of it to names", "the expression is nested more than %d deep", nestingDepth)
	}
}

// grown counts a node over parts of the given height.
func (p *parser) grown(span diag.Span, below int) {
	p.height = below + 1
	p.nodes++
	if p.height > treeHeight {
		p.fail(diag.Limit, span, "bind parts of it to names", "the expression has more than %d operations in a row", treeHeight)
	}
	if p.nodes > nodeCount {
		p.fail(diag.Limit, span, "bind parts of it to names, or read a table from a file", "the statement has more than %d values and operators", nodeCount)
	}
}
