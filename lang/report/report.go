// Package report makes one document of a run: the text of a script or a notebook with its
// results beside it, in reading order.
//
// [New] takes what a run said and gives a [Document]. [Document.HTML] writes it as one
// page that needs neither network nor script; the results stand in it once more as data,
// which [ReadKept] reads back and [Compare] holds against a later run. [Document.Markdown]
// writes the same as Markdown, with the figures as files.
//
// The text is not trusted: everything from it is escaped, HTML in a notebook is shown as
// text, pictures are read below the run's folder only, and the page forbids itself to load
// or run anything. The same run gives the same bytes.
package report

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"io/fs"
	"path"
	"path/filepath"
	"sort"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/eval"
	"gainwright/lang/figure"
	"gainwright/lang/render"
	"gainwright/lang/syntax"
)

// Run is what a document is made of.
type Run struct {
	Source  *diag.Source
	Events  []eval.Event // all of them, bindings too
	Options render.Options
	Version string // of the program
	Folder  fs.FS  // pictures are read below it; nil when none may
}

// Document is a run in reading order.
type Document struct {
	Title, Author, Date, Number string // Number is the document's own, from the front matter
	File                        string
	Hash                        string // SHA-256 of the file, hexadecimal
	Version                     string
	Summary                     Summary

	run      Run
	file     *syntax.File
	results  [][]Result // by statement
	loose    []Result   // what belongs to no statement
	reached  int        // statements before this one were run
	figures  []Figure
	prepared []byte // the body, once it is laid out
}

// Figure is a drawing of the document with the statement that it belongs to.
type Figure struct {
	Name    string // what the statement shows, or its line; unlike the others'
	Drawing *figure.Drawing
}

// Figures lists the drawings in reading order.
func (d *Document) Figures() []Figure { return d.figures }

// Result is one thing the run said.
type Result struct {
	Event   eval.Event
	Figure  string // a drawing as SVG
	Shown   *render.Sheet
	Verdict *render.Verdict
	Failure string // an error as the terminal shows it
	Note    string
	File    string // the file it comes from, where that is another one
	Line    int
	IsOld   bool // of an earlier run, because this one stopped before
}

// New puts a run in order.
func New(run Run) *Document {
	sum := sha256.Sum256([]byte(run.Source.Text))
	d := &Document{run: run, File: shownName(run.Source.Name), Hash: hex.EncodeToString(sum[:]), Version: run.Version}
	d.readFrontMatter()
	d.parse()
	d.distribute()
	d.summarise()
	return d
}

// shownName is a file's name without the machine's own folders.
func shownName(name string) string {
	name = filepath.ToSlash(name)
	if path.IsAbs(name) || strings.HasPrefix(name, "../") || filepath.VolumeName(name) != "" {
		return path.Base(name)
	}
	return path.Clean(name)
}

func (d *Document) isNotebook() bool { return syntax.IsNotebook(d.run.Source.Name) }

func (d *Document) readFrontMatter() {
	if d.isNotebook() {
		values, _ := syntax.FrontMatter(d.run.Source)
		d.Title, d.Author, d.Date, d.Number = values["title"], values["author"], values["date"], values["document"]
	}
	if d.Title == "" {
		base := path.Base(d.File)
		d.Title = strings.ReplaceAll(strings.TrimSuffix(base, path.Ext(base)), "_", " ")
	}
}

// mostBlanked bounds how many lines that cannot be read are skipped to read on behind them.
const mostBlanked = 20

// parse reads the statements again for their places. The line at which a statement begins
// that cannot be read counts as a statement, and the reading goes on behind it, so that
// what stands there keeps its place.
func (d *Document) parse() {
	read := syntax.Parse
	if d.isNotebook() {
		read = syntax.ParseNotebook
	}
	text := []byte(d.run.Source.Text)
	var skipped []syntax.Statement
	d.file = &syntax.File{Source: d.run.Source}
	for range mostBlanked + 1 {
		file, err := read(diag.NewSource(d.run.Source.Name, string(text)))
		if file != nil && len(file.Statements) >= len(d.file.Statements) {
			d.file = file
		}
		var failure *diag.Error
		if !errors.As(err, &failure) {
			break
		}
		line := d.brokenLine(file, text, failure.Span.Start)
		if len(skipped) == 0 {
			skipped = append(skipped, unread{line})
		}
		if !blankLine(text, line) {
			break
		}
	}
	d.file.Statements = append(d.file.Statements, skipped...)
	sort.SliceStable(d.file.Statements, func(i, j int) bool {
		return d.file.Statements[i].Extent().Start < d.file.Statements[j].Extent().Start
	})
	d.results = make([][]Result, len(d.file.Statements))
}

// brokenLine is the first line of code behind the last statement that could be read, which
// may lie before the error: a bracket left open is missed only further down.
func (d *Document) brokenLine(file *syntax.File, text []byte, failed int) diag.Span {
	from := 0
	if file != nil {
		if n := len(file.Blocks); n > 0 {
			from = file.Blocks[n-1].Span.Start
		}
		if n := len(file.Statements); n > 0 {
			from = max(from, file.Statements[n-1].Extent().End)
		}
	}
	for at := from; at < min(failed, len(text)); {
		line := diag.Span{Start: at, End: lineEnd(string(text), at, len(text))}
		code, _, _ := strings.Cut(string(text[line.Start:line.End]), "#")
		if strings.TrimLeft(code, " \t\r\n>") != "" {
			line.End = line.Start + len(strings.TrimRight(string(text[line.Start:line.End]), "\r\n"))
			return line
		}
		at = line.End
	}
	return d.wholeLine(failed)
}

// blankLine turns a line into blanks and tells whether it held anything. A fence stays.
func blankLine(text []byte, line diag.Span) bool {
	body := bytes.TrimSpace(text[line.Start:line.End])
	if len(body) == 0 || bytes.HasPrefix(body, []byte("```")) || bytes.HasPrefix(body, []byte("~~~")) {
		return false
	}
	for i := line.Start; i < line.End; i++ {
		text[i] = ' '
	}
	return true
}

// unread is the line of an error in the text itself, where there is no statement.
type unread struct{ span diag.Span }

// Extent gives the line's place.
func (u unread) Extent() diag.Span { return u.span }

func (d *Document) wholeLine(at int) diag.Span {
	text := d.run.Source.Text
	at = min(max(at, 0), len(text))
	span := diag.Span{Start: strings.LastIndexByte(text[:at], '\n') + 1, End: len(text)}
	if k := strings.IndexByte(text[at:], '\n'); k >= 0 {
		span.End = at + k
	}
	return span
}

// distribute gives each event to its statement. What a used file says belongs to the
// statement that uses it.
func (d *Document) distribute() {
	last := -1
	for _, e := range d.run.Events {
		at := -1
		if e.Source == d.run.Source || e.Source == nil {
			at = d.statementOf(e)
		} else {
			at = d.nextUse(last)
		}
		if at > last {
			last = at
		}
		r, ok := d.result(e)
		if !ok {
			continue
		}
		if at < 0 {
			d.loose = append(d.loose, r)
			continue
		}
		d.results[at] = append(d.results[at], r)
	}
	d.reached = len(d.run.Source.Text)
	for _, e := range d.run.Events {
		if e.Error != nil && last >= 0 {
			d.reached = d.file.Statements[last].Extent().End
		}
	}
}

// statementOf finds the statement of an event of the file itself. An error of the text
// belongs to the line that could not be read, wherever it was noticed.
func (d *Document) statementOf(e eval.Event) int {
	if e.Error != nil && e.Error.Kind == diag.Syntax {
		for i, s := range d.file.Statements {
			if _, ok := s.(unread); ok {
				return i
			}
		}
	}
	return statementAt(d.file, place(e))
}

func place(e eval.Event) diag.Span {
	if e.Error != nil && e.Span.IsZero() {
		return e.Error.Span
	}
	return e.Span
}

func statementAt(file *syntax.File, span diag.Span) int {
	for i, s := range file.Statements {
		if x := s.Extent(); span.Start >= x.Start && span.Start < max(x.End, x.Start+1) {
			return i
		}
	}
	return -1
}

func (d *Document) nextUse(after int) int {
	for i := max(after, 0); i < len(d.file.Statements); i++ {
		if _, ok := d.file.Statements[i].(*syntax.Use); ok {
			return i
		}
	}
	return max(after, -1)
}

func (d *Document) result(e eval.Event) (Result, bool) {
	r := Result{Event: e, Line: e.Line}
	if e.Source != nil && e.Source != d.run.Source {
		r.File = shownName(e.Source.Name)
	}
	switch {
	case e.Shown != nil:
		sheet := render.SheetOf(e.Text, e.Shown.Value, e.Shown.In, d.run.Options)
		sheet.Figure = d.draw(e, e.Shown.Value)
		r.Shown = &sheet
	case e.Requirement != nil, e.Claim != nil:
		v := render.VerdictOf(e, d.run.Options)
		r.Verdict = &v
		if e.Requirement != nil && e.Requirement.Study != nil && !d.showsStudy(e.Requirement.Study) {
			r.Figure = d.draw(e, e.Requirement.Study)
		}
	case e.Error != nil:
		shown := *e.Error
		if shown.Source != nil {
			shown.Source = diag.NewSource(shownName(shown.Source.Name), shown.Source.Text)
		}
		r.Failure = strings.TrimRight(shown.Render(), "\n")
	case e.Note != "":
		r.Note = e.Note
	default:
		return r, false
	}
	return r, true
}

// Recall shows, behind an error, what an earlier run said there: each statement that was
// not run gets the results of the earlier statement that reads the same.
func (d *Document) Recall(earlier *Document) {
	if earlier == nil || d.reached >= len(d.run.Source.Text) {
		return
	}
	words := func(doc *Document, i int) string {
		span := doc.file.Statements[i].Extent()
		return doc.run.Source.Text[span.Start:min(span.End, len(doc.run.Source.Text))]
	}
	before := map[string][][]Result{}
	for i := range earlier.file.Statements {
		before[words(earlier, i)] = append(before[words(earlier, i)], earlier.results[i])
	}
	for i, s := range d.file.Statements {
		text := words(d, i)
		old := before[text]
		if len(old) == 0 {
			continue
		}
		before[text] = old[1:]
		if s.Extent().Start < d.reached || len(d.results[i]) > 0 {
			continue
		}
		for _, r := range old[0] {
			r.IsOld = true
			d.results[i] = append(d.results[i], r)
		}
	}
	d.prepared = nil
}
