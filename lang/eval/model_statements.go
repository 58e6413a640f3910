package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

// The statements that make and vary models.

func (r *run) runModel(_ *task, _ *diag.Source, st *syntax.Model) *diag.Error {
	return notBuilt("model", st.Span)
}

func (r *run) runDiagram(_ *task, _ *diag.Source, st *syntax.Diagram) *diag.Error {
	return notBuilt("diagram", st.Span)
}

func (r *run) runStudy(_ *task, _ *diag.Source, st *syntax.Study) *diag.Error {
	return notBuilt("study", st.Span)
}

func (r *run) runSchedule(_ *task, _ *diag.Source, st *syntax.Schedule) *diag.Error {
	return notBuilt("schedule", st.Span)
}

// runSensitivity is sensitivity(EXPR) over …, bound to a name unless that is empty.
func (r *run) runSensitivity(_ *task, _ *diag.Source, _ syntax.Ident, _ syntax.Expr, over *syntax.Over) *diag.Error {
	return notBuilt("sensitivity", over.Span)
}

func notBuilt(what string, span diag.Span) *diag.Error {
	return diag.New(diag.Name, "%s is not built yet", what).At(span)
}
