package report

import (
	"bytes"
	"encoding/base64"
	"html"
	"io"
	"io/fs"
	"net/url"
	"path"
	"strconv"
	"strings"

	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	east "github.com/yuin/goldmark/extension/ast"
	"github.com/yuin/goldmark/renderer"
	"github.com/yuin/goldmark/text"
	order "github.com/yuin/goldmark/util"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

func itoa(n int) string { return strconv.Itoa(n) }

// prose renders Markdown. Raw HTML is shown as text, links of unsafe kinds lose their
// target, and gain blocks are handed to the document.
type prose struct {
	document *Document
	offset   int // of the Markdown in the source
}

func markdown(p *prose) goldmark.Markdown {
	return goldmark.New(
		goldmark.WithExtensions(extension.NewTable(extension.WithTableCellAlignMethod(extension.TableCellAlignAttribute)),
			extension.Strikethrough, extension.TaskList, extension.Footnote),
		goldmark.WithRendererOptions(renderer.WithNodeRenderers(order.Prioritized(p, 100))),
	)
}

// RegisterFuncs takes over the nodes that are rendered otherwise than usual.
func (p *prose) RegisterFuncs(r renderer.NodeRendererFuncRegisterer) {
	r.Register(ast.KindHTMLBlock, p.rawBlock)
	r.Register(ast.KindRawHTML, p.rawInline)
	r.Register(ast.KindImage, p.picture)
	r.Register(east.KindTableHeader, p.tableHead)
	if p.document != nil {
		r.Register(ast.KindFencedCodeBlock, p.fenced)
	}
}

func (p *prose) rawBlock(w order.BufWriter, source []byte, n ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	block := n.(*ast.HTMLBlock)
	var b strings.Builder
	for i := range block.Lines().Len() {
		line := block.Lines().At(i)
		b.Write(line.Value(source))
	}
	if block.HasClosure() {
		b.Write(block.ClosureLine.Value(source))
	}
	_, err := w.WriteString("<pre>" + html.EscapeString(strings.TrimRight(b.String(), "\n")) + "</pre>\n")
	return ast.WalkContinue, err
}

// tableHead leaves out a head without a word, which Markdown's tables must have.
func (p *prose) tableHead(w order.BufWriter, source []byte, n ast.Node, entering bool) (ast.WalkStatus, error) {
	empty := true
	for cell := n.FirstChild(); cell != nil; cell = cell.NextSibling() {
		empty = empty && cell.FirstChild() == nil
	}
	switch {
	case entering && empty:
		return ast.WalkSkipChildren, nil
	case entering:
		_, err := w.WriteString("<thead>\n<tr>\n")
		return ast.WalkContinue, err
	}
	text := "</tr>\n</thead>\n"
	if empty {
		text = ""
	}
	if n.NextSibling() != nil {
		text += "<tbody>\n"
	}
	_, err := w.WriteString(text)
	return ast.WalkContinue, err
}

func (p *prose) rawInline(w order.BufWriter, source []byte, n ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkSkipChildren, nil
	}
	raw := n.(*ast.RawHTML)
	for i := range raw.Segments.Len() {
		segment := raw.Segments.At(i)
		if _, err := w.WriteString(html.EscapeString(string(segment.Value(source)))); err != nil {
			return ast.WalkStop, err
		}
	}
	return ast.WalkSkipChildren, nil
}

// the largest picture that is taken into a page
const largestPicture = 4 << 20

func (p *prose) picture(w order.BufWriter, source []byte, n ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkContinue, nil
	}
	image := n.(*ast.Image)
	words := plainText(image, source)
	data, why := p.load(string(image.Destination))
	var err error
	if why != "" {
		_, err = w.WriteString(`<span class="absent">[picture ` + html.EscapeString(strconv.Quote(string(image.Destination))) + " not shown: " +
			html.EscapeString(why) + `] ` + html.EscapeString(words) + `</span>`)
	} else {
		_, err = w.WriteString(`<img src="` + data + `" alt="` + html.EscapeString(words) + `">`)
	}
	return ast.WalkSkipChildren, err
}

func plainText(n ast.Node, source []byte) string {
	var b strings.Builder
	_ = ast.Walk(n, func(c ast.Node, entering bool) (ast.WalkStatus, error) {
		if t, ok := c.(*ast.Text); ok && entering {
			b.Write(t.Segment.Value(source))
		}
		return ast.WalkContinue, nil
	})
	return b.String()
}

// load reads a picture below the run's folder and gives it as a data URL.
func (p *prose) load(destination string) (data, why string) {
	if p.document == nil || p.document.run.Folder == nil {
		return "", "there is no folder to read it from"
	}
	u, err := url.Parse(destination)
	if err != nil || u.IsAbs() || u.Host != "" || u.RawQuery != "" {
		return "", "only pictures in the notebook's folder are shown"
	}
	name := path.Clean(u.Path)
	if !fs.ValidPath(name) {
		return "", "it lies outside the notebook's folder"
	}
	f, err := p.document.run.Folder.Open(name)
	if err != nil {
		return "", "it cannot be read"
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil || !info.Mode().IsRegular() {
		return "", "it is no file"
	}
	content, err := io.ReadAll(io.LimitReader(f, largestPicture+1))
	switch {
	case err != nil:
		return "", "it cannot be read"
	case len(content) > largestPicture:
		return "", "it is larger than 4 MiB"
	}
	kind := pictureKind(name, content)
	if kind == "" {
		return "", "it is no PNG, JPEG, GIF, WebP or SVG picture"
	}
	return "data:" + kind + ";base64," + base64.StdEncoding.EncodeToString(content), ""
}

// pictureKind tells a picture by how its content begins.
func pictureKind(name string, content []byte) string {
	begins := func(s string) bool { return bytes.HasPrefix(content, []byte(s)) }
	switch {
	case begins("\x89PNG\r\n\x1a\n"):
		return "image/png"
	case begins("\xff\xd8\xff"):
		return "image/jpeg"
	case begins("GIF87a"), begins("GIF89a"):
		return "image/gif"
	case begins("RIFF") && len(content) > 12 && string(content[8:12]) == "WEBP":
		return "image/webp"
	case strings.EqualFold(path.Ext(name), ".svg") && bytes.Contains(content, []byte("<svg")):
		return "image/svg+xml"
	}
	return ""
}

// fenced renders a gain block as rows, any other as code.
func (p *prose) fenced(w order.BufWriter, source []byte, n ast.Node, entering bool) (ast.WalkStatus, error) {
	if !entering {
		return ast.WalkSkipChildren, nil
	}
	block := n.(*ast.FencedCodeBlock)
	lines := make([]diag.Span, block.Lines().Len())
	for i := range lines {
		segment := block.Lines().At(i)
		lines[i] = diag.Span{Start: segment.Start + p.offset, End: segment.Stop + p.offset}
	}
	src := p.document.run.Source
	language := ""
	if words := strings.Fields(string(languageOf(block, source))); len(words) > 0 {
		language = words[0]
	}
	if language != "gain" || len(lines) == 0 {
		var b strings.Builder
		for _, l := range lines {
			b.WriteString(src.Text[l.Start:l.End])
		}
		_, err := w.WriteString("<pre><code>" + html.EscapeString(b.String()) + "</code></pre>\n")
		return ast.WalkSkipChildren, err
	}
	return ast.WalkSkipChildren, writeRows(w, p.document.blockRows(lines))
}

func languageOf(block *ast.FencedCodeBlock, source []byte) []byte {
	if block.Info == nil {
		return nil
	}
	return block.Info.Segment.Value(source)
}

// blockRows are the rows of a notebook's block.
func (d *Document) blockRows(lines []diag.Span) []row {
	from, to := lines[0].Start, lines[len(lines)-1].End
	first, count := 0, 0
	for i, s := range d.file.Statements {
		x := s.Extent()
		if x.Start >= from && x.Start < to {
			if count == 0 {
				first = i
			}
			count++
		}
	}
	if count == 0 {
		return d.statementRows(from, to, 0, 0, func(a, b int) string { return sourceBetween(d.run.Source, lines, a, b) })
	}
	return d.statementRows(from, to, first, count, func(a, b int) string { return sourceBetween(d.run.Source, lines, a, b) })
}

// notebookBody renders the whole notebook.
func (d *Document) notebookBody() ([]byte, error) {
	_, offset := syntax.FrontMatter(d.run.Source)
	offset = max(offset, len(d.run.Source.Text)-len(strings.TrimPrefix(d.run.Source.Text, "\ufeff")))
	p := &prose{document: d, offset: offset}
	source := []byte(d.run.Source.Text[offset:])
	m := markdown(p)
	tree := m.Parser().Parse(text.NewReader(source))
	var b bytes.Buffer
	if err := m.Renderer().Render(&b, source, tree); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}
