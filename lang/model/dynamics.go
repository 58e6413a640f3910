package model

import "gainwright/lang/value"

// Dynamics gives the compiled equations with the nominal parameters, for responses; nil
// where there is no program.
func (m *Model) Dynamics() value.Dynamics {
	if m.program == nil {
		return nil
	}
	return m.program.Evaluator()
}
