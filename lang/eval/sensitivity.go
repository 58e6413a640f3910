package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

// runSensitivity is sensitivity(EXPR) over …, bound to a name unless that is empty.
func (r *run) runSensitivity(_ *task, _ *diag.Source, _ syntax.Ident, _ syntax.Expr, over *syntax.Over) *diag.Error {
	return diag.New(diag.Name, "sensitivity is not built yet").At(over.Span)
}
