package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

func (r *run) runSchedule(_ *task, _ *diag.Source, st *syntax.Schedule) *diag.Error {
	return diag.New(diag.Name, "schedule is not built yet").At(st.Span)
}
