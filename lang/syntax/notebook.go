package syntax

import (
	"strings"

	"github.com/yuin/goldmark/ast"
	markdown "github.com/yuin/goldmark/parser"
	"github.com/yuin/goldmark/text"
	order "github.com/yuin/goldmark/util"

	"gainwright/lang/diag"
)

// IsNotebook tells whether a file of this name is a Markdown notebook.
func IsNotebook(name string) bool {
	lower := strings.ToLower(name)
	return strings.HasSuffix(lower, ".md") || strings.HasSuffix(lower, ".markdown")
}

// looksLikeNotebook tells whether a text is probably Markdown: it has a fence or front matter.
func looksLikeNotebook(text string) bool {
	if _, body := FrontMatter(diag.NewSource("", text)); body > 0 {
		return true
	}
	for line := range strings.Lines(text) {
		if strings.HasPrefix(line, "```") || strings.HasPrefix(line, "~~~") {
			return true
		}
	}
	return false
}

// ParseNotebook reads the blocks of a Markdown file whose fence is marked gain. Places
// are those of the whole file. A statement lies within one block. If a block is wrong, the file
// holds what stands before the error, and the error is a *diag.Error with its place.
func ParseNotebook(src *diag.Source) (*File, error) {
	file := &File{Source: src, Blocks: []Block{}}
	if err := refuseText(src); err != nil {
		return file, err
	}
	if failure := guarded(func() { refuseEncoding(src) }); failure != nil {
		return file, failure.err
	}
	for _, b := range notebookBlocks(src) {
		block := Block{Span: b.span, First: len(file.Statements)}
		p := newParser(file, b.text, b.span.Start, b.span.End)
		failure := guarded(p.statements)
		block.Count = len(file.Statements) - block.First
		file.Blocks = append(file.Blocks, block)
		if failure != nil {
			return file, failure.err
		}
	}
	return file, nil
}

// refuseEncoding fails on the first byte that is not UTF-8.
func refuseEncoding(src *diag.Source) {
	s := &scanner{src: src, text: src.Text, end: len(src.Text)}
	for pos := 0; pos < s.end; {
		if src.Text[pos] < 0x80 {
			pos++
			continue
		}
		_, size := s.rune(pos)
		pos += size
	}
}

// fenced is the body of one fenced block. Its text is the whole notebook with everything
// else blank, so that places need no translation, also where each line of the block is
// indented (in a list) or marked (in a quotation).
type fenced struct {
	span      diag.Span
	text      string
	lineStart int    // where the body's first line begins, prefix included
	prefix    string // what stands before the code of a line: indentation or quotation marks
}

// byteOrderMark is what some editors put before a UTF-8 text.
const byteOrderMark = "\ufeff"

// containerDepth is how deep lists and quotations may lie in one another. Deeper ones are
// prose to us, because the time to find them grows with the square of their depth.
const containerDepth = 32

// shallow keeps a block parser from opening containers too deep.
type shallow struct{ markdown.BlockParser }

// Open opens the block unless it lies too deep.
func (s shallow) Open(parent ast.Node, reader text.Reader, pc markdown.Context) (ast.Node, markdown.State) {
	depth := 0
	for n := parent; n != nil; n = n.Parent() {
		depth++
	}
	if depth > 2*containerDepth { // a list and its item are two
		return nil, markdown.NoChildren
	}
	return s.BlockParser.Open(parent, reader, pc)
}

// blockParser finds blocks only: what stands inside a paragraph is of no interest here.
var blockParser = markdown.NewParser(markdown.WithBlockParsers(
	order.Prioritized(markdown.NewSetextHeadingParser(), 100),
	order.Prioritized(markdown.NewThematicBreakParser(), 200),
	order.Prioritized(shallow{markdown.NewListParser()}, 300),
	order.Prioritized(markdown.NewListItemParser(), 400),
	order.Prioritized(markdown.NewCodeBlockParser(), 500),
	order.Prioritized(markdown.NewATXHeadingParser(), 600),
	order.Prioritized(markdown.NewFencedCodeBlockParser(), 700),
	order.Prioritized(shallow{markdown.NewBlockquoteParser()}, 800),
	order.Prioritized(markdown.NewHTMLBlockParser(), 900),
	order.Prioritized(markdown.NewParagraphParser(), 1000),
))

func notebookBlocks(src *diag.Source) []fenced {
	_, bodyStart := FrontMatter(src)
	page := []byte(src.Text)
	blank(page[:bodyStart])
	if strings.HasPrefix(src.Text, byteOrderMark) {
		blank(page[:len(byteOrderMark)])
	}
	masked := []byte(src.Text)
	blank(masked)
	var blocks []fenced
	document := blockParser.Parse(text.NewReader(page))
	_ = ast.Walk(document, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		code, ok := n.(*ast.FencedCodeBlock)
		if !ok || !entering || code.Lines().Len() == 0 || !markedGain(code, page) {
			return ast.WalkContinue, nil
		}
		lines := code.Lines()
		for i := range lines.Len() {
			line := lines.At(i)
			copy(masked[line.Start:line.Stop], page[line.Start:line.Stop])
		}
		first := lines.At(0).Start
		blocks = append(blocks, fenced{
			span:      diag.Span{Start: first, End: lines.At(lines.Len() - 1).Stop},
			lineStart: lineStart(src.Text, first),
			prefix:    bodyPrefix(lines, src.Text),
		})
		return ast.WalkContinue, nil
	})
	code := string(masked)
	for i := range blocks {
		blocks[i].text = code
	}
	return blocks
}

func lineStart(text string, offset int) int { return strings.LastIndexByte(text[:offset], '\n') + 1 }

// bodyPrefix is what stands before the code, seen at the first line that is not blank: an
// editor may have cut the blanks of an empty one.
func bodyPrefix(lines *text.Segments, source string) string {
	for i := range lines.Len() {
		line := lines.At(i)
		if strings.TrimSpace(source[line.Start:line.Stop]) != "" {
			return source[lineStart(source, line.Start):line.Start]
		}
	}
	return ""
}

func markedGain(code *ast.FencedCodeBlock, page []byte) bool {
	if code.Info == nil {
		return false
	}
	words := strings.Fields(string(code.Info.Segment.Value(page)))
	return len(words) > 0 && words[0] == "gain"
}

// blank turns everything but line ends into blanks.
func blank(text []byte) {
	for i, c := range text {
		if c != '\n' {
			text[i] = ' '
		}
	}
}

// FrontMatter reads the lines between two lines --- at a notebook's start, each a word, a
// colon and a value (title, author, date, document). It gives the values by word and the
// offset at which the body begins: 0, without values, where there is no front matter.
func FrontMatter(src *diag.Source) (values map[string]string, bodyOffset int) {
	values = map[string]string{}
	offset := 0
	if strings.HasPrefix(src.Text, byteOrderMark) {
		offset = len(byteOrderMark)
	}
	first := true
	for line := range strings.Lines(src.Text[offset:]) {
		offset += len(line)
		line = strings.TrimRight(line, " \t\r\n")
		switch {
		case first && line != "---":
			return values, 0
		case first:
			first = false
		case line == "---" || line == "...":
			return values, offset
		case line == "" || strings.HasPrefix(line, "#"):
		default:
			word, value, found := strings.Cut(line, ":")
			if !found || word == "" || strings.ContainsAny(word, " \t") {
				return map[string]string{}, 0
			}
			values[word] = unquoted(strings.TrimSpace(value))
		}
	}
	return map[string]string{}, 0
}

func unquoted(value string) string {
	if n := len(value); n >= 2 && (value[0] == '"' || value[0] == '\'') && value[n-1] == value[0] {
		return value[1 : n-1]
	}
	return value
}
