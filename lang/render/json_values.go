package render

import (
	"math"
	"math/big"

	"gainwright/lang/exact"
	"gainwright/lang/value"
)

type numberJSON struct {
	Kind   string `json:"kind"`
	Real   any    `json:"real"`
	Exact  string `json:"exact,omitempty"`
	Digits *int   `json:"digits,omitempty"`
}

type complexJSON struct {
	Kind           string `json:"kind"`
	Real           any    `json:"real"`
	Imaginary      any    `json:"imaginary"`
	Exact          string `json:"exact,omitempty"`
	ExactImaginary string `json:"exact_imaginary,omitempty"`
	Digits         *int   `json:"digits,omitempty"`
}

type quantityObject struct {
	Kind   string `json:"kind"`
	Real   any    `json:"real"`
	Unit   string `json:"unit"`
	Exact  string `json:"exact,omitempty"`
	Digits *int   `json:"digits,omitempty"`
}

type matrixJSON struct {
	Kind           string     `json:"kind"`
	Size           []int      `json:"size"`
	Real           [][]any    `json:"real"`
	Imaginary      [][]any    `json:"imaginary,omitempty"`
	Exact          any        `json:"exact,omitempty"`
	ExactImaginary [][]string `json:"exact_imaginary,omitempty"`
	Rows           []string   `json:"rows,omitempty"`
	Columns        []string   `json:"columns,omitempty"`
	Digits         *int       `json:"digits,omitempty"`
	// Of a gain:
	Role        string   `json:"role,omitempty"`
	Poles       []any    `json:"poles,omitempty"`
	Wanted      []any    `json:"wanted,omitempty"`
	Sensitivity any      `json:"sensitivity,omitempty"`
	Residual    any      `json:"residual,omitempty"`
	Condition   any      `json:"condition,omitempty"`
	Method      string   `json:"method,omitempty"`
	Free        bool     `json:"free,omitempty"`
	Notes       []string `json:"notes,omitempty"`
}

type polynomialJSON struct {
	Kind     string   `json:"kind,omitempty"`
	Variable string   `json:"variable,omitempty"`
	Real     []any    `json:"real"`
	Exact    []string `json:"exact,omitempty"`
	Digits   *int     `json:"digits,omitempty"`
}

type transferJSON struct {
	Kind        string             `json:"kind"`
	Variable    string             `json:"variable"`
	Every       any                `json:"every,omitempty"`
	Numerator   [][]polynomialJSON `json:"numerator"`
	Denominator [][]polynomialJSON `json:"denominator"`
	Inputs      []string           `json:"inputs,omitempty"`
	Outputs     []string           `json:"outputs,omitempty"`
	Notes       []string           `json:"notes,omitempty"`
}

type plantJSON struct {
	Kind    string      `json:"kind"`
	Title   string      `json:"title,omitempty"`
	A       *matrixJSON `json:"A"`
	B       *matrixJSON `json:"B"`
	C       *matrixJSON `json:"C"`
	D       *matrixJSON `json:"D"`
	Every   any         `json:"every,omitempty"`
	States  []string    `json:"states"`
	Inputs  []string    `json:"inputs"`
	Outputs []string    `json:"outputs"`
	X0      []any       `json:"state_point,omitempty"`
	U0      []any       `json:"input_point,omitempty"`
	Y0      []any       `json:"output_point,omitempty"`
	Fields  *ordered    `json:"fields,omitempty"`
	Notes   []string    `json:"notes,omitempty"`
}

type listJSON struct {
	Kind  string `json:"kind"`
	Items []any  `json:"items"`
}

type reportJSON struct {
	Kind   string     `json:"kind"`
	Title  string     `json:"title,omitempty"`
	Holds  *bool      `json:"holds,omitempty"`
	Fields *ordered   `json:"fields,omitempty"`
	Table  *tableJSON `json:"table,omitempty"`
	Notes  []string   `json:"notes,omitempty"`
}

type tableJSON struct {
	Columns []string `json:"columns"`
	Rows    [][]any  `json:"rows"`
}

type textJSON struct {
	Kind string `json:"kind"`
	Text string `json:"text"`
}

type booleanJSON struct {
	Kind string `json:"kind"`
	True bool   `json:"true"`
}

type functionJSON struct {
	Kind       string   `json:"kind"`
	Name       string   `json:"name"`
	Parameters []string `json:"parameters"`
	Text       string   `json:"text,omitempty"`
}

// ordered is an object whose keys keep the order of the fields.
type ordered struct{ fields []value.Named }

// MarshalJSON writes the fields in order.
func (o *ordered) MarshalJSON() ([]byte, error) {
	b := []byte{'{'}
	for i, f := range o.fields {
		if i > 0 {
			b = append(b, ',')
		}
		b = append(b, trimEnd(encode(f.Name))...)
		b = append(b, ':')
		b = append(b, trimEnd(encode(valueJSON(f.Value)))...)
	}
	return append(b, '}'), nil
}

func trimEnd(b []byte) []byte { return b[:len(b)-1] }

func orderedOrNil(fields []value.Named) *ordered {
	if len(fields) == 0 {
		return nil
	}
	return &ordered{fields}
}

// valueJSON builds the object of a value.
func valueJSON(v value.Value) any {
	switch x := force(v).(type) {
	case nil:
		return nil
	case value.Number:
		return numberJSON{Kind: "number", Real: realJSON(x), Exact: exactText(x.Exact), Digits: digitsOf(x.Exact, x.Digits())}
	case value.Quantity:
		if x.Unit.IsPercent() { // shown in per cent, but a part
			if part, err := x.SI(); err == nil {
				return valueJSON(part)
			}
		}
		return quantityJSON(x.Magnitude, x.Unit.Text)
	case value.Complex:
		return complexObject(x)
	case value.Text:
		return textJSON{"text", string(x)}
	case value.Boolean:
		return booleanJSON{"boolean", bool(x)}
	case *value.List:
		return listJSON{"list", valuesJSON(x.Items)}
	case *value.Matrix:
		return matrixObject(x)
	case *value.Polynomial:
		p := polynomialObject(x)
		p.Kind, p.Variable = "polynomial", x.Variable
		return p
	case *value.Transfer:
		return transferObject(x)
	case *value.Response:
		return responseObject(x)
	case *value.Plant:
		return plantObject(x, nil)
	case *value.Model:
		return modelObject(x)
	case *value.Gain:
		return gainObject(x)
	case *value.Report:
		return reportObject(x)
	case *value.Function:
		return functionJSON{"function", x.Name, append([]string{}, x.Params...), x.Doc}
	case *value.Study:
		return studyObject(x)
	case value.HasFields:
		return fieldsObject(x)
	}
	return textJSON{string(v.Kind()), Inline(v, Options{})}
}

func valuesJSON(values []value.Value) []any {
	out := make([]any, len(values))
	for i, v := range values {
		out[i] = valueJSON(v)
	}
	return out
}

func exactText(r *big.Rat) string {
	if r == nil {
		return ""
	}
	return r.RatString()
}

// digitsOf is how many whole digits hold of a floating number; nil for an exact one.
func digitsOf(r *big.Rat, digits float64) *int {
	if r != nil || math.IsInf(digits, 0) || math.IsNaN(digits) {
		return nil
	}
	n := max(0, wholeDigits(digits))
	return &n
}

func quantityJSON(n value.Number, unit string) quantityObject {
	return quantityObject{"quantity", realJSON(n), unit, exactText(n.Exact), digitsOf(n.Exact, n.Digits())}
}

func complexObject(c value.Complex) complexJSON {
	if c.IsExact() {
		return complexJSON{"complex", ratJSON(c.ExactRe), ratJSON(c.ExactIm), c.ExactRe.RatString(), c.ExactIm.RatString(), nil}
	}
	size := value.Number{F: modulus(c.C), Err: c.Err}
	return complexJSON{"complex", floatJSON(real(c.C)), floatJSON(imag(c.C)), "", "", digitsOf(nil, size.Digits())}
}

func matrixObject(m *value.Matrix) *matrixJSON {
	rows, cols := m.Dims()
	out := &matrixJSON{Kind: "matrix", Size: []int{rows, cols}, Rows: m.Rows, Columns: m.Columns}
	re, im := m.Floats()
	table := func(data []float64, kept *exact.Matrix) [][]any {
		lines := make([][]any, rows)
		for i := range lines {
			lines[i] = make([]any, cols)
			for j := range lines[i] {
				if kept != nil {
					lines[i][j] = ratJSON(kept.At(i, j))
				} else {
					lines[i][j] = floatJSON(data[i*cols+j])
				}
			}
		}
		return lines
	}
	out.Real = table(re, m.Exact())
	if m.IsComplex() {
		out.Imaginary = table(im, m.ExactImaginary())
		out.ExactImaginary = exactTable(m.ExactImaginary())
	}
	if m.IsExact() {
		out.Exact = exactTable(m.Exact())
	} else {
		out.Digits = digitsOf(nil, m.Digits())
	}
	return out
}

func exactTable(m *exact.Matrix) [][]string {
	if m == nil {
		return nil
	}
	rows, cols := m.Dims()
	out := make([][]string, rows)
	for i := range out {
		out[i] = make([]string, cols)
		for j := range out[i] {
			out[i][j] = m.At(i, j).RatString()
		}
	}
	return out
}

func polynomialObject(p *value.Polynomial) polynomialJSON {
	out := polynomialJSON{Real: []any{}}
	for _, c := range coefficients(p) {
		out.Real = append(out.Real, realJSON(c))
		if p.Exact != nil {
			out.Exact = append(out.Exact, c.Exact.RatString())
		}
	}
	if p.Exact == nil {
		n := min(15, max(0, polynomialDigits(p)))
		out.Digits = &n
	}
	return out
}

func transferObject(g *value.Transfer) transferJSON {
	out := transferJSON{Kind: "transfer", Variable: g.Variable, Every: everyJSON(g.Every),
		Numerator: [][]polynomialJSON{}, Denominator: [][]polynomialJSON{},
		Inputs: signalHeads(g.Inputs), Outputs: signalHeads(g.Outputs), Notes: g.Notes}
	for _, row := range g.Entries {
		var above, below []polynomialJSON
		for _, r := range row {
			above, below = append(above, polynomialObject(r.Num)), append(below, polynomialObject(r.Den))
		}
		out.Numerator, out.Denominator = append(out.Numerator, above), append(out.Denominator, below)
	}
	return out
}

func everyJSON(n *value.Number) any {
	if n == nil {
		return nil
	}
	return realJSON(*n)
}

func numbersJSON(numbers []value.Number) []any {
	var out []any
	for _, n := range numbers {
		out = append(out, realJSON(n))
	}
	return out
}

func plantObject(p *value.Plant, extra []value.Named) plantJSON {
	return plantJSON{Kind: "plant", Title: p.Title, A: matrixObject(p.A), B: matrixObject(p.B), C: matrixObject(p.C),
		D: matrixObject(p.D), Every: everyJSON(p.Every), States: signalHeads(p.States), Inputs: signalHeads(p.Inputs),
		Outputs: signalHeads(p.Outputs), X0: numbersJSON(p.X0), U0: numbersJSON(p.U0), Y0: numbersJSON(p.Y0),
		Fields: orderedOrNil(append(append([]value.Named{}, p.Extra...), extra...)), Notes: p.Notes}
}

// modelObject is the plant a model gives, with the model's own fields.
func modelObject(m *value.Model) any {
	if m.Plant == nil {
		return reportJSON{Kind: "report", Title: m.Name, Fields: orderedOrNil(m.Extra), Notes: m.Notes}
	}
	out := plantObject(m.Plant, m.Extra)
	out.Notes = append(append([]string{}, out.Notes...), m.Notes...)
	if out.Title == "" {
		out.Title = m.Name
	}
	return out
}

func gainObject(g *value.Gain) *matrixJSON {
	out := matrixObject(g.Values)
	out.Kind = "gain"
	if len(g.RowSignals) > 0 {
		out.Rows = signalHeads(g.RowSignals)
	}
	if len(g.ColumnSignals) > 0 {
		out.Columns = signalHeads(g.ColumnSignals)
	}
	out.Role, out.Method, out.Free, out.Notes = g.Role, g.Method, g.Free, g.Remarks()
	if len(g.Poles) > 0 {
		out.Poles = valuesJSON(g.Poles)
	}
	if len(g.Wanted) > 0 {
		out.Wanted = valuesJSON(g.Wanted)
	}
	out.Sensitivity, out.Residual, out.Condition = everyJSON(g.Sensitivity), everyJSON(g.Residual), everyJSON(g.Condition)
	return out
}

func reportObject(r *value.Report) reportJSON {
	out := reportJSON{Kind: "report", Title: r.Title, Holds: r.Holds, Fields: orderedOrNil(r.Fields), Notes: r.Notes}
	if len(r.Columns) > 0 {
		out.Table = &tableJSON{Columns: r.Columns, Rows: make([][]any, len(r.Rows))}
		for i, row := range r.Rows {
			out.Table.Rows[i] = valuesJSON(row)
		}
	}
	return out
}

func fieldsObject(v value.HasFields) reportJSON {
	var fields []value.Named
	for _, name := range v.FieldNames() {
		if f, ok := v.Field(name); ok {
			fields = append(fields, value.Named{Name: name, Value: f})
		}
	}
	return reportJSON{Kind: string(v.Kind()), Fields: orderedOrNil(fields)}
}
