package model

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// Value gives the model as a value of the language: its plant, and as further fields
// what was given, the equations, what is free and the rates that do not vanish.
func (m *Model) Value() *value.Model {
	out := &value.Model{Name: m.Name, Plant: m.plantAt(&m.operating), Source: m, Notes: m.Notes}
	out.Plant.Origin = out
	if len(m.Givens) > 0 {
		out.Extra = append(out.Extra, value.Named{Name: "given", Value: m.givenReport()})
	}
	if t := m.toleranceReport(); t != nil {
		out.Extra = append(out.Extra, value.Named{Name: "tolerances", Value: t})
	}
	out.Extra = append(out.Extra, value.Named{Name: "equations", Value: m.equationReport()})
	if m.operating.free != "" {
		out.Extra = append(out.Extra, value.Named{Name: "free", Value: value.Text(m.operating.free)})
	}
	if !m.operating.atRest {
		out.Extra = append(out.Extra, value.Named{Name: "rates", Value: m.rateReport()})
	}
	return out
}

func signals(list []Signal) []value.Signal {
	out := make([]value.Signal, len(list))
	for k, s := range list {
		out[k] = s.Signal
	}
	return out
}

// plantAt makes the plant of a linearisation.
func (m *Model) plantAt(o *operating) *value.Plant {
	n, inputs := len(m.States), len(m.Inputs)
	p := &value.Plant{
		A: matrixOf(o.a, n), B: matrixOf(o.b, inputs), C: matrixOf(o.c, n), D: matrixOf(o.d, inputs),
		X0: o.point.states, U0: o.point.inputs, Y0: o.outputs,
	}
	m.label(p)
	return p
}

// label names rows and columns, the rows of A and B by the rates with their units.
func (m *Model) label(p *value.Plant) {
	p.Every, p.States, p.Inputs, p.Outputs = m.Every, signals(m.States), signals(m.Inputs), signals(m.Outputs)
	rates := make([]string, len(m.States))
	for i, s := range m.States {
		rates[i] = withUnit(rateWord(m.Every != nil)+" "+s.Name, m.rateUnit(i))
	}
	states, inputs, outputs := heads(m.States), heads(m.Inputs), heads(m.Outputs)
	p.A.Rows, p.A.Columns = rates, states
	p.B.Rows, p.B.Columns = rates, inputs
	p.C.Rows, p.C.Columns = outputs, states
	p.D.Rows, p.D.Columns = outputs, inputs
}

func withUnit(name, unit string) string {
	if unit == "" {
		return name
	}
	return name + " [" + unit + "]"
}

func heads(list []Signal) []string {
	out := make([]string, len(list))
	for k, s := range list {
		out[k] = withUnit(s.Name, s.Unit.Text)
	}
	return out
}

// PlantOf makes the plant of a flat linearisation, with the errors of rounding alone.
func (m *Model) PlantOf(f *Flat) *value.Plant {
	n, inputs, outputs := len(m.States), len(m.Inputs), len(m.Outputs)
	matrix := func(r, c int, data []float64) *value.Matrix {
		worst := 0.0
		for _, x := range data {
			worst = max(worst, x, -x)
		}
		return value.FloatMatrix(r, c, append([]float64{}, data...), worst*0x1p-52)
	}
	numbers := func(data []float64) []value.Number {
		out := make([]value.Number, len(data))
		for k, x := range data {
			out[k] = value.Float(x)
		}
		return out
	}
	p := &value.Plant{A: matrix(n, n, f.A), B: matrix(n, inputs, f.B), C: matrix(outputs, n, f.C), D: matrix(outputs, inputs, f.D),
		X0: numbers(f.X0), U0: numbers(f.U0), Y0: numbers(f.Y0)}
	m.label(p)
	return p
}

// With gives the model for other values of its parameters, in their units and in the
// order of Givens, its operating point found anew and its matrices exact where they can
// be: what Program.Linearise does in float64.
func (m *Model) With(parameters []value.Number) (out *Model, err *diag.Error) {
	b := &builder{Model: &Model{}, scope: &scope{source: m.source}}
	*b.Model = *m
	b.Notes, b.operating = nil, operating{}
	b.Givens = append([]Given{}, m.Givens...)
	for k := range b.Givens {
		b.Givens[k].Nominal, b.Givens[k].Tolerance = parameters[k], nil
	}
	defer recoverFailure(&out, &err)
	b.solve()
	return b.Model, nil
}

// givenReport holds the nominal values by name.
func (m *Model) givenReport() *value.Report {
	r := &value.Report{}
	for _, g := range m.Givens {
		r.Fields = append(r.Fields, value.Named{Name: g.Name, Value: quantity(g.Nominal, g.Unit)})
	}
	return r
}

// toleranceReport is the table of the parameters that have a tolerance; nil for none.
func (m *Model) toleranceReport() *value.Report {
	r := &value.Report{Columns: []string{"given", "nominal", "tolerance", "low", "high"}}
	for _, g := range m.Givens {
		if g.Tolerance != nil {
			r.Rows = append(r.Rows, []value.Value{value.Text(g.Name), quantity(g.Nominal, g.Unit), quantity(*g.Tolerance, differenceUnit(g.Unit)),
				quantity(g.Low(), g.Unit), quantity(g.High(), g.Unit)})
		}
	}
	if r.Rows == nil {
		return nil
	}
	return r
}

func differenceUnit(u value.Unit) value.Unit {
	if u.Offset != nil {
		u.Offset, u.Text = nil, "K"
	}
	return u
}

func quantity(n value.Number, u value.Unit) value.Value {
	if u.IsNone() {
		return n
	}
	return value.Quantity{Magnitude: n, Unit: u}
}

// equationReport holds the equations as written, by the name of what they determine.
func (m *Model) equationReport() *value.Report {
	r := &value.Report{Columns: []string{"equation", "in"}}
	add := func(left, right, unit string) {
		r.Rows = append(r.Rows, []value.Value{value.Text(left + " = " + right), value.Text(unit)})
	}
	for _, line := range m.lets() {
		add("let "+line[0], line[1], "")
	}
	for i, s := range m.States {
		add(rateWord(m.Every != nil)+" "+s.Name, s.Text, m.rateUnit(i))
	}
	for _, s := range m.Outputs {
		if s.Text != "" {
			add("output "+s.Name, s.Text, s.Unit.Text)
		}
	}
	return r
}

func (m *Model) rateReport() *value.Report {
	r := &value.Report{Title: "rates at the operating point"}
	if m.Every != nil {
		r.Title = "changes in one step at the operating point"
	}
	for i, n := range m.operating.rates {
		u := m.States[i].Unit
		if m.Every == nil {
			u = u.PerSecond()
		} else {
			u = differenceUnit(u)
		}
		if !u.IsNone() {
			u.Offset = nil
		}
		r.Fields = append(r.Fields, value.Named{Name: m.States[i].Name, Value: quantity(n, u)})
	}
	return r
}
