package eval

import (
	"context"
	"errors"
	"fmt"
	"path"
	"path/filepath"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// Outcome tells how a run ended.
type Outcome struct {
	Missed bool // a requirement was missed, or a claim disagrees or is undecided
	Failed bool // an error stopped the run
}

// Run runs a file's statements in order and tells emit what they say. It stops at the
// first error, which is the last event; what was bound before stays bound.
func (s *Session) Run(ctx context.Context, file *syntax.File, emit func(Event)) Outcome {
	r := &run{session: s, ctx: ctx, emit: emit}
	defer s.reading(file.Source)()
	r.file(file)
	return r.outcome
}

// RunText parses and runs a script, or a notebook when the source's name ends in .md.
// Statements before an error of syntax are run.
func (s *Session) RunText(ctx context.Context, src *diag.Source, emit func(Event)) Outcome {
	r := &run{session: s, ctx: ctx, emit: emit}
	defer s.reading(src)()
	r.text(src)
	return r.outcome
}

// reading notes the file that is run, so that files which use it in turn are found out.
func (s *Session) reading(src *diag.Source) (done func()) {
	s.using = []string{path.Join(s.folder, path.Base(filepath.ToSlash(src.Name)))}
	return func() { s.using = nil }
}

// RunStatement runs one statement at the prompt. One that fails leaves every name as it was.
func (s *Session) RunStatement(ctx context.Context, src *diag.Source, st syntax.Statement, emit func(Event)) Outcome {
	mark := len(s.journal)
	r := &run{session: s, ctx: ctx, emit: emit}
	r.statement(src, st)
	if r.outcome.Failed {
		s.undo(mark)
	}
	s.trim()
	return r.outcome
}

// run is one pass over a file and the files it uses.
type run struct {
	session *Session
	ctx     context.Context
	emit    func(Event)
	outcome Outcome
}

// text parses and runs; it gives the error that stopped it.
func (r *run) text(src *diag.Source) {
	file, err := parse(src)
	r.file(file)
	if err != nil && !r.outcome.Failed {
		r.fail(src, diag.Span{}, "", err)
	}
}

// parse reads a script or a notebook; the file holds what stands before an error.
func parse(src *diag.Source) (*syntax.File, *diag.Error) {
	read := syntax.Parse
	if syntax.IsNotebook(src.Name) {
		read = syntax.ParseNotebook
	}
	file, err := read(src)
	if err == nil {
		return file, nil
	}
	if file == nil {
		file = &syntax.File{Source: src}
	}
	return file, asError(err, "reading").In(src)
}

// parseText is parse for a text that must be whole.
func parseText(name, text string) (*syntax.File, *diag.Error) {
	return parse(diag.NewSource(name, text))
}

func (r *run) file(file *syntax.File) {
	notes := file.Notes
	for _, st := range file.Statements {
		for len(notes) > 0 && notes[0].Span.Start < st.Extent().End {
			r.remark(file.Source, notes[0].Span, notes[0].Text)
			notes = notes[1:]
		}
		r.statement(file.Source, st)
		if r.outcome.Failed {
			return
		}
	}
	for _, n := range notes {
		r.remark(file.Source, n.Span, n.Text)
	}
}

func (r *run) event(src *diag.Source, span diag.Span, text string) Event {
	line, _ := src.Position(span.Start)
	return Event{Source: src, Span: span, Line: line, Text: text}
}

func (r *run) remark(src *diag.Source, span diag.Span, note string) {
	e := r.event(src, span, "")
	e.Note = note
	r.emit(e)
}

func (r *run) fail(src *diag.Source, span diag.Span, text string, err *diag.Error) {
	err = err.At(span).In(src)
	e := r.event(err.Source, err.Span, text)
	e.Error = err
	r.outcome.Failed = true
	r.emit(e)
}

// statement runs one statement. Whatever goes wrong inside becomes an event.
func (r *run) statement(src *diag.Source, st syntax.Statement) {
	span := st.Extent()
	text := oneLine(sliceOf(src, span))
	defer func() {
		if p := recover(); p != nil {
			r.fail(src, span, text, internal("running this statement", fmt.Errorf("panic: %v", p)))
		}
	}()
	t := r.session.newTask(r.ctx, func(note string) { r.remark(src, span, note) })
	defer t.close()
	if err := r.dispatch(t, src, st, text); err != nil {
		if !errors.Is(err, errAlreadyTold) {
			r.fail(src, span, text, err)
		}
	}
}

// errAlreadyTold marks a failure whose event was emitted by a file that was used.
var errAlreadyTold = diag.New(diag.File, "a file that is used has an error")

func (r *run) dispatch(t *task, src *diag.Source, st syntax.Statement, text string) *diag.Error {
	switch st := st.(type) {
	case *syntax.Binding:
		if st.Over != nil {
			return r.runSensitivity(t, src, st.Name, st.Expr, st.Over)
		}
		return r.bind(t, src, st, text)
	case *syntax.Show:
		if st.Over != nil {
			return r.runSensitivity(t, src, syntax.Ident{}, st.Expr, st.Over)
		}
		return r.show(t, src, st, text)
	case *syntax.Require:
		return r.require(t, src, st)
	case *syntax.Claim:
		return r.claim(t, src, st)
	case *syntax.Define:
		return r.defineName(src, st, text)
	case *syntax.Use:
		return r.use(src, st)
	case *syntax.Model:
		return r.runModel(t, src, st)
	case *syntax.Diagram:
		return r.runDiagram(t, src, st)
	case *syntax.Study:
		return r.runStudy(t, src, st)
	case *syntax.Schedule:
		return r.runSchedule(t, src, st)
	}
	return diag.New(diag.Internal, "a statement of an unknown form")
}

func (r *run) bind(t *task, src *diag.Source, st *syntax.Binding, text string) *diag.Error {
	note, err := r.session.mayBind(src, st.Name)
	if err != nil {
		return err
	}
	v, err := r.session.evaluate(t, src, st.Expr)
	if err != nil {
		return err
	}
	r.bound(src, st.Span, st.Name, v, "", text)
	if note != "" {
		r.remark(src, st.Name.Span, note)
	}
	return nil
}

// bound binds a name that mayBind has allowed, and says so.
func (r *run) bound(src *diag.Source, span diag.Span, name syntax.Ident, v value.Value, doc, text string) {
	r.session.set(name.Name, &binding{value: v, source: src, span: name.Span, doc: doc})
	e := r.event(src, span, text)
	e.Bound = &Bound{Name: name.Name, Value: v}
	r.emit(e)
}

// mayBind tells whether a name may be bound now, with a note when it hides a built-in.
func (s *Session) mayBind(src *diag.Source, name syntax.Ident) (note string, err *diag.Error) {
	if _, ok := variables[name.Name]; ok {
		return "", diag.New(diag.Name, "%s is the variable of polynomials and cannot be bound", name.Name).At(name.Span).
			WithHelp("inside a model it is free")
	}
	if first, ok := s.names[name.Name]; ok && !s.interactive {
		return "", alreadyBound(src, name, first)
	}
	if _, ok := s.names[name.Name]; ok {
		return "", nil
	}
	if _, ok := s.builtins[name.Name]; ok {
		return fmt.Sprintf("%s is also a built-in, which this name now hides", name.Name), nil
	}
	if s.library.has(name.Name) {
		return fmt.Sprintf("%s is also in the library, which this name now hides", name.Name), nil
	}
	return "", nil
}

func alreadyBound(src *diag.Source, name syntax.Ident, first *binding) *diag.Error {
	e := diag.New(diag.Name, "%s is bound already", name.Name).At(name.Span)
	if first.source == nil {
		return e
	}
	line, _ := first.source.Position(first.span.Start)
	where := fmt.Sprintf("line %d", line)
	if first.source.Name != src.Name {
		where += " of " + first.source.Name
	}
	return e.WithHelp("it was first bound in %s: %s", where, oneLine(first.source.Line(line)))
}

func (r *run) show(t *task, src *diag.Source, st *syntax.Show, text string) *diag.Error {
	var in *value.Unit
	if st.In != nil {
		unit, err := unitOf(st.In)
		if err != nil {
			return err
		}
		if unit.IsHertz() {
			return hertzElsewhere(unit.Text).At(st.In.Span)
		}
		in = &unit
	}
	v, err := r.session.evaluate(t, src, st.Expr)
	if err != nil {
		return err
	}
	if in != nil {
		if _, err := value.In(v, *in); err != nil {
			return asError(err, "in").At(st.In.Span)
		}
	}
	e := r.event(src, st.Span, text)
	e.Shown = &Shown{Value: v, In: in}
	r.emit(e)
	return nil
}

func (r *run) defineName(src *diag.Source, st *syntax.Define, text string) *diag.Error {
	note, err := r.session.mayBind(src, st.Name)
	if err != nil {
		return err
	}
	fn, err := r.session.define(src, st, false)
	if err != nil {
		return err
	}
	r.bound(src, st.Span, st.Name, fn, st.Doc, text)
	if note != "" {
		r.remark(src, st.Name.Span, note)
	}
	return nil
}

// sliceOf gives the text of a span.
func sliceOf(src *diag.Source, span diag.Span) string {
	start := min(max(span.Start, 0), len(src.Text))
	return src.Text[start:min(max(span.End, start), len(src.Text))]
}
