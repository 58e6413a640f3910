package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/model"
	"gainwright/lang/syntax"
)

// The statements that make and vary models.

// runModel builds a model and binds it.
func (r *run) runModel(t *task, src *diag.Source, st *syntax.Model) *diag.Error {
	note, err := r.session.mayBind(src, st.Name)
	if err != nil {
		return err
	}
	m, err := model.Build(src, st, &surroundings{session: r.session, task: t})
	if err != nil {
		return err
	}
	v := m.Value()
	r.bound(src, st.Span, st.Name, v, "", oneLine(sliceOf(src, st.Span)))
	if note != "" {
		r.remark(src, st.Name.Span, note)
	}
	for _, n := range m.Notes {
		r.remark(src, st.Name.Span, st.Name.Name+": "+n)
	}
	return nil
}

// runDiagram wires systems into a plant and binds it.
func (r *run) runDiagram(t *task, src *diag.Source, st *syntax.Diagram) *diag.Error {
	note, err := r.session.mayBind(src, st.Name)
	if err != nil {
		return err
	}
	p, err := model.BuildDiagram(src, st, &surroundings{session: r.session, task: t})
	if err != nil {
		return err
	}
	r.bound(src, st.Span, st.Name, p, "", oneLine(sliceOf(src, st.Span)))
	if note != "" {
		r.remark(src, st.Name.Span, note)
	}
	for _, n := range p.Notes {
		r.remark(src, st.Name.Span, st.Name.Name+": "+n)
	}
	return nil
}
