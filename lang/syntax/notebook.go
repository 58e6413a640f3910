package syntax

import (
	"strings"

	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/text"

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
// else blank, so that places need no translation, also where each line of
// the block is indented (in a list) or marked (in a quotation).
type fenced struct {
	span   diag.Span
	text   string
	prefix string // what stands before the code on the body's first line
}

func notebookBlocks(src *diag.Source) []fenced {
	_, bodyStart := FrontMatter(src)
	markdown := []byte(src.Text)
	blank(markdown[:bodyStart])
	masked := []byte(src.Text)
	blank(masked)
	var blocks []fenced
	document := goldmark.DefaultParser().Parse(text.NewReader(markdown))
	_ = ast.Walk(document, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		code, ok := n.(*ast.FencedCodeBlock)
		if !ok || !entering || code.Lines().Len() == 0 || !markedGain(code, markdown) {
			return ast.WalkContinue, nil
		}
		lines := code.Lines()
		for i := range lines.Len() {
			line := lines.At(i)
			copy(masked[line.Start:line.Stop], markdown[line.Start:line.Stop])
		}
		first := lines.At(0)
		start := strings.LastIndexByte(src.Text[:first.Start], '\n') + 1
		blocks = append(blocks, fenced{
			span:   diag.Span{Start: first.Start, End: lines.At(lines.Len() - 1).Stop},
			prefix: src.Text[start:first.Start],
		})
		return ast.WalkContinue, nil
	})
	code := string(masked)
	for i := range blocks {
		blocks[i].text = code
	}
	return blocks
}

func markedGain(code *ast.FencedCodeBlock, markdown []byte) bool {
	if code.Info == nil {
		return false
	}
	words := strings.Fields(string(code.Info.Segment.Value(markdown)))
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
	if strings.HasPrefix(src.Text, "\ufeff") {
		offset = len("\ufeff")
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
