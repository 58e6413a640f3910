package report

import (
	"bytes"
	"crypto/sha256"
	_ "embed"
	"encoding/base64"
	"html/template"
	"io"
	"strings"
	"sync"

	"gainwright/lang/figure"
	"gainwright/lang/render"
)

//go:embed page.html
var pageText string

//go:embed style.css
var styleText string

//go:embed cautions.md
var cautionsText string

// pages are parsed when the first document is written, not when the program starts.
var pages = sync.OnceValue(func() *template.Template {
	return template.Must(template.New("page").Funcs(templateFunctions).Parse(pageText))
})

var templateFunctions = template.FuncMap{
	"trim":    strings.TrimSpace,
	"numeric": func(t *render.SheetTable, j int) bool { return j < len(t.Numeric) && t.Numeric[j] },
	"paired":  func(t *render.SheetTable, j int) bool { return j < len(t.Paired) && t.Paired[j] },
	"ruled":   func(at, j int) bool { return at > 0 && at == j },
	"label":   func(t *render.SheetTable, i int) string { return t.Labels[i] },
	"math":    func(s string) template.HTML { return template.HTML(s) }, // built from escaped texts by render
	"drawing": func(s string) template.HTML { return template.HTML(s) }, // built from escaped texts by figure
	"state":   stateOf,
}

// stateOf is the class of a verdict's word.
func stateOf(word string) string {
	switch word {
	case "met", "agrees":
		return "good"
	case "not judged":
		return "open"
	}
	return "bad"
}

//go:embed live.js
var liveScript string

// Live makes the page one that a server renews: its policy comes from the server's own
// header, and its script, allowed there by Nonce, asks for later versions.
type Live struct {
	Nonce   string
	Version int
	Renews  bool   // a page is renewed with this: without style sheet and script, which that page has
	Problem string // why the file cannot be read at present; empty when it can
}

type pageData struct {
	*Document
	Style    template.CSS
	Policy   string
	Bare     bool // without style sheet and script
	Body     template.HTML
	Cautions template.HTML
	Data     template.HTML
	Live     *Live
	Script   template.JS
	Loose    []Result
	Command  string
	Language string
}

// HTML writes the page.
func (d *Document) HTML(w io.Writer) error { return d.page(w, nil) }

// LiveHTML writes the page for a server that renews it.
func (d *Document) LiveHTML(w io.Writer, live Live) error { return d.page(w, &live) }

// Prepare reads the pictures of a notebook and lays the text out; afterwards the folder is
// needed no more.
func (d *Document) Prepare() error {
	body, err := d.body()
	d.prepared = body
	return err
}

func (d *Document) page(w io.Writer, live *Live) error {
	body := d.prepared
	if body == nil {
		var err error
		if body, err = d.body(); err != nil {
			return err
		}
	}
	cautions, err := renderProse(cautionsText)
	if err != nil {
		return err
	}
	style := strings.TrimSpace(styleText) + "\n" + strings.TrimSpace(figure.Style) + "\n"
	data := pageData{Document: d, Style: template.CSS(style), Policy: Policy(style), Body: template.HTML(body),
		Cautions: template.HTML(cautions), Live: live, Loose: d.loose, Command: d.command()}
	if live != nil {
		data.Script, data.Bare = template.JS(liveScript), live.Renews
	} else {
		// The data may hold any text; its encoder writes < and > as escapes.
		data.Data = template.HTML(`<script type="application/json" id="results">` + string(d.Data()) + `</script>`)
	}
	var b bytes.Buffer
	if err := pages().ExecuteTemplate(&b, "page", data); err != nil {
		return err
	}
	_, err = w.Write(b.Bytes())
	return err
}

// Policy is the page's own rule: nothing is loaded, run or sent; the one style sheet is
// known by its hash.
func Policy(style string) string {
	sum := sha256.Sum256([]byte(style))
	return "default-src 'none'; img-src data:; style-src 'sha256-" + base64.StdEncoding.EncodeToString(sum[:]) + "'; base-uri 'none'; form-action 'none'"
}

func (d *Document) body() ([]byte, error) {
	if d.isNotebook() {
		return d.notebookBody()
	}
	var b bytes.Buffer
	err := writeRows(&b, d.scriptRows())
	return b.Bytes(), err
}

func writeRows(w io.Writer, rows []row) error {
	var b bytes.Buffer
	for _, r := range rows {
		if err := pages().ExecuteTemplate(&b, "row", r); err != nil {
			return err
		}
	}
	_, err := w.Write(b.Bytes())
	return err
}

func renderProse(text string) (string, error) {
	var b bytes.Buffer
	err := markdown(&prose{}).Convert([]byte(text), &b)
	return b.String(), err
}

// command is how the file is run again.
func (d *Document) command() string {
	name := d.File
	if strings.ContainsAny(name, " '\"\\$`*?&;|<>()[]{}!#~") {
		name = "'" + strings.ReplaceAll(name, "'", `'\''`) + "'"
	}
	if strings.HasPrefix(name, "-") {
		name = "./" + name
	}
	return name
}
