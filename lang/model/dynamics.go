package model

import "gainwright/lang/value"

// Dynamics gives the compiled equations with this model's parameters, for responses; nil
// where there is no program.
func (m *Model) Dynamics() value.Dynamics {
	if m.program == nil {
		return nil
	}
	e := m.program.Evaluator()
	// A model made by With shares the program of the one it varies.
	parameters := make([]float64, len(m.Givens))
	for k, g := range m.Givens {
		parameters[k] = g.Nominal.Float64()
	}
	e.SetParameters(parameters)
	return e
}
