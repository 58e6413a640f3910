package report

import (
	"fmt"
	"strings"

	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	"github.com/yuin/goldmark/text"

	"gainwright/lang/diag"
	"gainwright/lang/figure"
	"gainwright/lang/render"
	"gainwright/lang/syntax"
)

// File is a figure that stands beside a Markdown document.
type File struct {
	Name    string
	Content []byte
}

// Markdown writes the document as Markdown. The figures are files whose names begin with
// stem, to be put beside it.
func (d *Document) Markdown(stem string) (page []byte, figures []File) {
	m := &markdownWriter{document: d, stem: stem}
	m.head()
	if d.isNotebook() {
		m.notebook()
	} else {
		for _, r := range d.scriptRows() {
			m.row(r)
		}
	}
	for _, r := range d.loose {
		m.result(r, "")
	}
	m.foot()
	return []byte(m.out.String()), m.figures
}

type markdownWriter struct {
	document *Document
	stem     string
	out      strings.Builder
	figures  []File
}

func (m *markdownWriter) printf(format string, args ...any) { fmt.Fprintf(&m.out, format, args...) }

// escaped makes a text plain in Markdown and harmless where HTML is let through.
func escaped(s string) string {
	var b strings.Builder
	for _, r := range s {
		switch {
		case strings.ContainsRune("\\`*_{}[]<>#|~$!", r):
			b.WriteByte('\\')
		case r == '&':
			b.WriteString("&amp;")
			continue
		case r == '\n':
			r = ' '
		}
		b.WriteRune(r)
	}
	return b.String()
}

// fence puts a text between fences that it does not hold.
func fence(language, body string) string {
	marks := "```"
	for strings.Contains(body, marks) {
		marks += "`"
	}
	return marks + language + "\n" + strings.TrimRight(body, "\n") + "\n" + marks + "\n"
}

func (m *markdownWriter) head() {
	d := m.document
	m.printf("# %s\n\n", escaped(d.Title))
	var by []string
	for _, s := range []string{d.Author, d.Date} {
		if s != "" {
			by = append(by, escaped(s))
		}
	}
	if d.Number != "" {
		by = append(by, "document "+escaped(d.Number))
	}
	if len(by) > 0 {
		m.printf("%s\n\n", strings.Join(by, " · "))
	}
	m.printf("**%s**\n\n", escaped(d.Summary.Headline))
	if len(d.Summary.Verdicts) > 0 {
		m.printf("| outcome | what was required or claimed | how it came out | line |\n|---|---|---|---|\n")
		for _, v := range d.Summary.Verdicts {
			text := escaped(v.Text)
			if v.Kind == "claimed" {
				text = "claimed: " + text
			}
			below := make([]string, len(v.Below))
			for i, b := range v.Below {
				below[i] = escaped(b)
			}
			where := itoa(v.Line)
			if v.File != "" {
				where = escaped(v.File) + ":" + where
			}
			m.printf("| %s | %s | %s | %s |\n", v.Word, text, strings.Join(below, "; "), where)
		}
		m.printf("\n")
	}
	for _, g := range d.Summary.Rests {
		m.printf("- %s: %s\n", escaped(g.What), escaped(g.Text))
	}
	m.printf("\n")
}

func (m *markdownWriter) foot() {
	d := m.document
	m.printf("\n## Cautions\n\n%s\n\n## This document\n\n", strings.TrimSpace(cautionsText))
	m.printf("- file: %s\n- SHA-256 of the file: `%s`\n- made with gainwright %s\n- to run it again: `gainwright %s`\n",
		escaped(d.File), d.Hash, escaped(d.Version), strings.ReplaceAll(d.command(), "`", "'"))
}

func (m *markdownWriter) row(r row) {
	for _, p := range r.Comment {
		if p.Kept {
			m.printf("%s\n", fence("text", p.Text))
			continue
		}
		m.printf("%s\n\n", escaped(p.Text))
	}
	if len(r.Code) > 0 {
		var code strings.Builder
		for _, p := range r.Code {
			code.WriteString(p.Text)
		}
		m.printf("%s\n", fence("", code.String()))
		if r.NotRun {
			m.printf("*not run*\n\n")
		}
	}
	for _, one := range r.Results {
		m.result(one, "")
	}
}

// result writes a result; each line begins with the prefix of the list or quotation that
// the block stands in.
func (m *markdownWriter) result(r Result, prefix string) {
	var b strings.Builder
	if r.File != "" {
		fmt.Fprintf(&b, "%s, line %d:\n\n", escaped(r.File), r.Line)
	}
	switch {
	case r.Shown != nil:
		// The terminal's layout is aligned already and reads the same in any viewer.
		o := m.document.run.Options
		o.Width = 100
		if r.Shown.Figure == "" {
			b.WriteString(fence("text", render.Text(r.Event.Text, r.Event.Shown.Value, r.Event.Shown.In, o)))
		}
		m.figure(&b, r.Event.Text, r.Shown.Figure)
	case r.Verdict != nil:
		fmt.Fprintf(&b, "**%s** %s\n", r.Verdict.Word, escaped(r.Verdict.Text))
		lines := append([]string{}, r.Verdict.Below...)
		if r.Verdict.Poles != "" {
			lines = append(lines, "the printed numbers give the poles "+r.Verdict.Poles)
		}
		for _, l := range append(lines, r.Verdict.Notes...) {
			fmt.Fprintf(&b, "\n%s\n", escaped(l))
		}
		m.figure(&b, r.Event.Text, r.Figure)
	case r.Failure != "":
		b.WriteString("**error**\n\n" + fence("text", r.Failure))
	default:
		fmt.Fprintf(&b, "note: %s\n", escaped(r.Note))
	}
	for line := range strings.Lines(b.String() + "\n") {
		m.out.WriteString(strings.TrimRight(prefix+strings.TrimSuffix(line, "\n"), " ") + "\n")
	}
}

// figure puts a drawing beside the document, and a link to it into the text.
func (m *markdownWriter) figure(b *strings.Builder, text, svg string) {
	if svg == "" {
		return
	}
	name := fmt.Sprintf("%s-figure-%d.svg", m.stem, len(m.figures)+1)
	m.figures = append(m.figures, File{name, []byte(figure.Standalone(svg))})
	fmt.Fprintf(b, "\n![%s](%s)\n", escaped(text), strings.ReplaceAll(name, " ", "%20"))
}

// notebook copies the notebook and puts the results below each block.
func (m *markdownWriter) notebook() {
	d := m.document
	_, offset := syntax.FrontMatter(d.run.Source)
	whole := d.run.Source.Text
	source := []byte(whole[offset:])
	tree := goldmark.New(goldmark.WithExtensions(extension.Table)).Parser().Parse(text.NewReader(source))
	at := offset
	_ = ast.Walk(tree, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		block, ok := n.(*ast.FencedCodeBlock)
		if !ok || !entering || block.Lines().Len() == 0 {
			return ast.WalkContinue, nil
		}
		if words := strings.Fields(string(languageOf(block, source))); len(words) == 0 || words[0] != "gain" {
			return ast.WalkContinue, nil
		}
		lines := make([]diag.Span, block.Lines().Len())
		for i := range lines {
			segment := block.Lines().At(i)
			lines[i] = diag.Span{Start: segment.Start + offset, End: segment.Stop + offset}
		}
		last := lines[len(lines)-1].End
		end := lineEnd(whole, last, len(whole)) // the closing fence
		m.out.WriteString(whole[at:end])
		at = end
		begin := strings.LastIndexByte(whole[:lines[0].Start], '\n') + 1
		prefix := whole[begin:lines[0].Start]
		m.out.WriteString(strings.TrimRight(prefix, " ") + "\n")
		for _, r := range d.blockRows(lines) {
			for _, one := range r.Results {
				m.result(one, prefix)
			}
		}
		return ast.WalkContinue, nil
	})
	m.out.WriteString(whole[at:])
}
