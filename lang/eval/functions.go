package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// definition is the body of a defined function, compiled when it is first called.
type definition struct {
	params  []string
	body    syntax.Expr
	source  *diag.Source
	library bool
	code    *program
}

// define makes a function value. The body is compiled at once, so that mistakes in it
// show where it is written; names in it are looked up when it runs, so that two
// functions may call each other.
func (s *Session) define(src *diag.Source, st *syntax.Define, library bool) (*value.Function, *diag.Error) {
	d := &definition{body: st.Body, source: src, library: library}
	seen := map[string]bool{}
	for _, p := range st.Params {
		if seen[p.Name] {
			return nil, diag.New(diag.Name, "the parameter %s stands twice", p.Name).At(p.Span).In(src)
		}
		seen[p.Name] = true
		d.params = append(d.params, p.Name)
	}
	if err := s.compileDefinition(d); err != nil {
		return nil, err
	}
	return &value.Function{Name: st.Name.Name, Params: d.params, Doc: st.Doc, Body: d}, nil
}

func (s *Session) compileDefinition(d *definition) *diag.Error {
	l := &lowering{session: s, source: d.source, locals: d.params, lenient: true, library: d.library}
	d.code = l.compile(d.body, false)
	return l.err
}

func (s *Session) callDefined(f *frame, fn *value.Function, d *definition, site *callSite, args []value.Value) (value.Value, *diag.Error) {
	t := f.task
	if t.depth >= s.limits.Depth {
		return nil, diag.New(diag.Limit, "%s is called more than %d deep", fn.Name, s.limits.Depth).At(site.callee).
			WithHelp("does it call itself without an end?")
	}
	locals, err := d.arguments(fn.Name, site, args)
	if err != nil {
		return nil, err
	}
	inner := &frame{task: t, overlay: f.overlay, locals: locals}
	t.depth++
	held := t.held
	v, err := d.code.value(inner)
	t.depth--
	if err != nil {
		return nil, s.fromInside(err, fn, d, site)
	}
	t.keep(held, v)
	return v, nil
}

// arguments puts the arguments of a call in the order of the parameters.
func (d *definition) arguments(name string, site *callSite, args []value.Value) ([]value.Value, *diag.Error) {
	if !site.named() && len(args) == len(d.params) {
		return args, nil
	}
	params := make([]value.Param, len(d.params))
	for i, p := range d.params {
		params[i] = value.Param{Name: p}
	}
	placed, err := place(name, params, site, args)
	if err != nil {
		return nil, err
	}
	locals := make([]value.Value, len(params))
	for _, p := range placed {
		for i := range params {
			if p.param == &params[i] {
				locals[i] = p.value
			}
		}
	}
	return locals, nil
}

// fromInside explains an error that arose in a function's body. In the library, whose
// text the user does not see, it moves to the call.
func (s *Session) fromInside(err *diag.Error, fn *value.Function, d *definition, site *callSite) *diag.Error {
	if !d.library || err.Kind == diag.Interrupted {
		return err
	}
	moved := *err
	moved.Source, moved.Span = nil, site.callee
	if moved.Param != "" {
		for i, name := range d.params {
			if name == moved.Param && i < len(site.args) {
				moved.Span = site.args[i].span
			}
		}
	}
	if moved.Help == "" {
		moved.Help = "this arose inside " + fn.Name + ", which is written in the language"
	}
	return &moved
}

// apply calls a function value from inside a built-in.
func (s *Session) apply(f *frame, fn *value.Function, site *callSite, args []value.Value) (value.Value, *diag.Error) {
	if fn == nil {
		return nil, internal("calling a function", nil)
	}
	inner := &callSite{name: fn.Name, local: -1, span: site.span, callee: site.callee}
	if err := f.task.step(); err != nil {
		return nil, err
	}
	return s.callFunction(f, fn, inner, args)
}
