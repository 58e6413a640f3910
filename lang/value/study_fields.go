package value

import (
	"math"
	"sort"
)

// FieldNames lists the fields: of a study of several numbers their names first, of one
// number what is known of it.
func (s *Study) FieldNames() []string {
	var out []string
	if s.isNamed() {
		for _, r := range s.Results {
			out = append(out, r.Name)
		}
	} else {
		out = append(out, "smallest", "largest", "median", "quantile", "values", "influence")
	}
	out = append(out, "failed", "samples", "corners", "seed", "parameters", "draws")
	return out
}

func (s *Study) isNamed() bool { return len(s.Results) > 0 && s.Results[0].Name != "" }

// Field finds a field.
func (s *Study) Field(name string) (Value, bool) {
	if s.isNamed() {
		for _, r := range s.Results {
			if r.Name == name {
				return s.Only(r), true
			}
		}
	} else if v, ok := s.numberField(name); ok {
		return v, true
	}
	switch name {
	case "failed":
		return Int(s.failed()), true
	case "samples":
		return Int(s.Samples), true
	case "corners":
		return Int(s.Corners), true
	case "seed":
		return Int(int(s.Seed)), true
	case "parameters":
		return s.parameterReport(), true
	case "draws":
		return Later(func() Value { return s.draws() }), true
	}
	return nil, false
}

// numberField finds a field of a study of one number.
func (s *Study) numberField(name string) (Value, bool) {
	if len(s.Results) == 0 {
		return nil, false
	}
	orNone := func(v Value, err error) (Value, bool) {
		if err != nil {
			return Text("none: every sample failed"), true
		}
		return v, true
	}
	report := func(largest bool) (Value, bool) {
		r, err := s.Extreme(largest)
		return orNone(r, err)
	}
	switch name {
	case "smallest":
		return report(false)
	case "largest":
		return report(true)
	case "median":
		return orNone(s.Quantile(FloatErr(0.5, 0)))
	case "quantile":
		return &Function{Name: "quantile", Params: []string{"q"}, Builtin: &Builtin{
			Name: "quantile", Params: []Param{{Name: "q", Shape: AReal, Doc: "the part below, between 0 and 1"}},
			Func: func(c *Call) (Value, error) { return s.Quantile(c.Number("q")) },
		}}, true
	case "values":
		r := s.Results[0]
		out := &List{Items: make([]Value, len(r.Values))}
		for k, v := range r.Values {
			out.Items[k] = r.Number(v)
			if v != v {
				out.Items[k] = Text("failed")
			}
		}
		return out, true
	case "influence":
		return Later(func() Value { return s.influence() }), true
	}
	return nil, false
}

// failed counts the samples at which a number does not exist.
func (s *Study) failed() int {
	n := 0
	for k := range s.Done() {
		for _, r := range s.Results {
			if r.Values[k] != r.Values[k] {
				n++
				break
			}
		}
	}
	return n
}

// parameterReport is the table of what varies.
func (s *Study) parameterReport() *Report {
	out := &Report{Title: "what varies", Columns: []string{"parameter", "nominal", "low", "high"}}
	for k, name := range s.ParameterNames() {
		p := s.Parameters[k]
		number := func(f float64) Value { return makeQuantity(tidyNumber(f), p.Unit) }
		out.Rows = append(out.Rows, []Value{Text(name), number(p.Nominal), number(p.Low), number(p.High)})
	}
	return out
}

// draws gives the parameters of all samples, a row each, in the parameters' units.
func (s *Study) draws() Value {
	k, n := len(s.Parameters), s.Done()
	if CheckSize(n, k, false) != nil {
		return Text("too many to hold")
	}
	data := make([]float64, n*k)
	for i := range n {
		s.Draw(s.First+i, data[i*k:(i+1)*k])
	}
	m := FloatMatrix(n, k, data, 0)
	for j, name := range s.ParameterNames() {
		if u := s.Parameters[j].Unit; !u.IsNone() {
			name += " [" + u.Text + "]"
		}
		m.Columns = append(m.Columns, name)
	}
	return m
}

// influence is the rank correlation of each parameter with the number over the drawn
// samples (Spearman 1904), strongest first; ties share their mean rank.
func (s *Study) influence() Value {
	out := &Report{Title: "influence", Columns: []string{"parameter", "rank correlation"}}
	r := s.Results[0]
	var values []float64
	var samples []int
	for k, v := range r.Values {
		if n := s.First + k; n > 0 && n < s.Samples && v == v {
			values, samples = append(values, v), append(samples, n)
		}
	}
	type line struct {
		name  string
		value float64
	}
	var lines []line
	ranked := ranks(values)
	draw, column := make([]float64, len(s.Parameters)), make([]float64, len(samples))
	for j, name := range s.ParameterNames() {
		for i, n := range samples {
			s.Draw(n, draw)
			column[i] = draw[j]
		}
		lines = append(lines, line{name, correlation(ranks(column), ranked)})
	}
	sort.SliceStable(lines, func(a, b int) bool { return math.Abs(lines[a].value) > math.Abs(lines[b].value) })
	for _, l := range lines {
		row := []Value{Text(l.name), nil}
		if l.value == l.value {
			row[1] = FloatErr(l.value, 1e-12)
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}

// ranks gives the places of the values in their order, ties their mean place.
func ranks(values []float64) []float64 {
	order := make([]int, len(values))
	for k := range order {
		order[k] = k
	}
	sort.SliceStable(order, func(a, b int) bool { return values[order[a]] < values[order[b]] })
	out := make([]float64, len(values))
	for from := 0; from < len(order); {
		to := from + 1
		for to < len(order) && values[order[to]] == values[order[from]] {
			to++
		}
		for _, k := range order[from:to] {
			out[k] = float64(from+to-1) / 2
		}
		from = to
	}
	return out
}

// correlation is Pearson's coefficient; NaN when one side does not vary.
func correlation(x, y []float64) float64 {
	mean := float64(len(x)-1) / 2 // of ranks from 0
	var xy, xx, yy float64
	for k := range x {
		dx, dy := x[k]-mean, y[k]-mean
		xy, xx, yy = xy+dx*dy, xx+dx*dx, yy+dy*dy
	}
	if xx == 0 || yy == 0 {
		return math.NaN()
	}
	return xy / math.Sqrt(xx*yy)
}
