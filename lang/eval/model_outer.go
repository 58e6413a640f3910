package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/model"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// surroundings is what a model sees of the session.
type surroundings struct {
	session *Session
	task    *task
}

// Evaluate gives the value of an expression without names of the model.
func (o *surroundings) Evaluate(source *diag.Source, e syntax.Expr, library bool) (value.Value, *diag.Error) {
	if err := o.task.step(); err != nil {
		return nil, err
	}
	l := &lowering{session: o.session, source: source, library: library, inCall: 1}
	p := l.compile(e, false)
	if l.err != nil {
		return nil, l.err
	}
	return p.value(&frame{task: o.task})
}

// Function gives the text of a function that is written in the language.
func (o *surroundings) Function(name string, library bool) (model.Function, bool) {
	v, err := o.session.find(&frame{task: o.task}, name, library)
	if err != nil {
		return model.Function{}, false
	}
	fn, ok := v.(*value.Function)
	if !ok || fn.Builtin != nil {
		return model.Function{}, false
	}
	d, ok := fn.Body.(*definition)
	if !ok {
		return model.Function{}, false
	}
	return model.Function{Params: d.params, Body: d.body, Source: d.source, Library: d.library}, true
}

// Names lists what is in scope.
func (o *surroundings) Names() []string { return o.session.Candidates("") }
