package value

import (
	"strings"

	"gainwright/lang/diag"
)

// Field gives v.name. An unknown field is a Name error with the nearest one.
func Field(v Value, name string) (Value, error) {
	v = Force(v)
	owner, ok := v.(HasFields)
	if !ok {
		return nil, diag.New(diag.Type, "%s has no fields", Describe(v))
	}
	if field, ok := owner.Field(name); ok {
		return Force(field), nil
	}
	e := diag.New(diag.Name, "%s has no field %s", Describe(v), shorten(name))
	names := owner.FieldNames()
	if near := Nearest(name, names); near != "" {
		return nil, e.WithHelp("did you mean %s?", near)
	}
	if p, ok := v.(*Plant); ok && name == "every" && p.Every == nil {
		return nil, e.WithHelp("the plant is continuous")
	}
	if len(names) == 0 {
		return nil, e
	}
	return nil, e.WithHelp("its fields are %s", strings.Join(names, ", "))
}

func nameList(signals []Signal) *List {
	out := &List{Items: make([]Value, len(signals))}
	for k, s := range signals {
		out.Items[k] = Text(s.Name)
	}
	return out
}

func seconds(n Number) Value { return Quantity{n, Second()} }

// Second is the unit s.
func Second() Unit { return baseUnit(2) }

// RadianPerSecond is the unit rad/s.
func RadianPerSecond() Unit {
	u := baseUnit(2)
	return Unit{Text: "rad/s", Dim: Dimension{2: -1}, Scale: u.Scale, factors: []UnitFactor{{"rad", 1}, {"s", -1}}}
}

func baseUnit(k int) Unit {
	u := Unit{Text: baseSymbols[k], Scale: ratOne, factors: []UnitFactor{{baseSymbols[k], 1}}}
	u.Dim[k] = 1
	return u
}

// fieldNames lists the names of fields that are there.
func fieldNames(fields []Named) []string {
	out := make([]string, len(fields))
	for k, f := range fields {
		out[k] = f.Name
	}
	return out
}

func findField(fields []Named, name string) (Value, bool) {
	for _, f := range fields {
		if f.Name == name {
			return f.Value, true
		}
	}
	return nil, false
}

func (p *Plant) fields() []Named {
	out := []Named{{"A", p.A}, {"B", p.B}, {"C", p.C}, {"D", p.D},
		{"states", nameList(p.States)}, {"inputs", nameList(p.Inputs)}, {"outputs", nameList(p.Outputs)}}
	if p.Every != nil {
		out = append(out, Named{"every", seconds(*p.Every)})
	}
	if p.X0 != nil || p.U0 != nil || p.Y0 != nil {
		out = append(out, Named{"operating_point", p.operatingPoint()})
	}
	if p.Transformation != nil {
		out = append(out, Named{"transformation", p.Transformation})
	}
	return append(out, p.Extra...)
}

// operatingPoint lists the values of states, inputs and outputs about which the plant holds.
func (p *Plant) operatingPoint() *Report {
	r := &Report{Title: "operating point"}
	for _, part := range [...]struct {
		signals []Signal
		values  []Number
	}{{p.States, p.X0}, {p.Inputs, p.U0}, {p.Outputs, p.Y0}} {
		for k, s := range part.signals {
			n := Int(0)
			if k < len(part.values) {
				n = part.values[k]
			}
			r.Fields = append(r.Fields, Named{s.Name, makeQuantity(n, s.Unit)})
		}
	}
	return r
}

// FieldNames lists the fields.
func (p *Plant) FieldNames() []string { return fieldNames(p.fields()) }

// Field finds a field.
func (p *Plant) Field(name string) (Value, bool) { return findField(p.fields(), name) }

// FieldNames lists the model's own fields, then those of its plant.
func (m *Model) FieldNames() []string {
	out := fieldNames(m.Extra)
	if m.Plant != nil {
		out = append(out, m.Plant.FieldNames()...)
	}
	return out
}

// Field finds a field of the model or of its plant.
func (m *Model) Field(name string) (Value, bool) {
	if v, ok := findField(m.Extra, name); ok || m.Plant == nil {
		return v, ok
	}
	return m.Plant.Field(name)
}

func (g *Gain) fields() []Named {
	out := []Named{{"values", g.Values}}
	add := func(name string, v Value, there bool) {
		if there {
			out = append(out, Named{name, v})
		}
	}
	number := func(name string, n *Number) {
		if n != nil {
			out = append(out, Named{name, *n})
		}
	}
	add("poles", &List{Items: g.Poles}, g.Poles != nil)
	add("wanted", &List{Items: g.Wanted}, g.Wanted != nil)
	number("sensitivity", g.Sensitivity)
	number("residual", g.Residual)
	number("condition", g.Condition)
	add("cost", g.Cost, g.Cost != nil)
	add("method", Text(g.Method), g.Method != "")
	add("plant", g.Plant, g.Plant != nil)
	return append(out, g.Extra...)
}

// FieldNames lists the fields.
func (g *Gain) FieldNames() []string { return fieldNames(g.fields()) }

// Field finds a field.
func (g *Gain) Field(name string) (Value, bool) { return findField(g.fields(), name) }

// FieldNames lists the fields, then the columns of the table.
func (r *Report) FieldNames() []string {
	out := fieldNames(r.Fields)
	for _, name := range r.columnNames() {
		out = append(out, columnField(name))
	}
	return out
}

func columnField(head string) string { return strings.ReplaceAll(head, " ", "_") }

// Field finds a field, or a column of the table as a list: "time constant [s]" by time_constant.
func (r *Report) Field(name string) (Value, bool) {
	if v, ok := findField(r.Fields, name); ok {
		return v, true
	}
	if name == "holds" && r.Holds != nil {
		return Boolean(*r.Holds), true
	}
	for j, head := range r.columnNames() {
		if columnField(head) == name {
			out := &List{Items: make([]Value, 0, len(r.Rows))}
			for _, row := range r.Rows {
				if j < len(row) {
					out.Items = append(out.Items, cellOf(row[j]))
				}
			}
			return out, true
		}
	}
	return nil, false
}

func (t *Transfer) fields() []Named {
	part := func(of func(Ratio) *Polynomial) Value {
		p, m := t.Dims()
		if p == 1 && m == 1 {
			return of(t.Entries[0][0])
		}
		rows := &List{}
		for i := range p {
			row := &List{}
			for j := range m {
				row.Items = append(row.Items, of(t.Entries[i][j]))
			}
			rows.Items = append(rows.Items, row)
		}
		return rows
	}
	out := []Named{
		{"numerator", part(func(r Ratio) *Polynomial { return r.Num })},
		{"denominator", part(func(r Ratio) *Polynomial { return r.Den })},
		{"variable", Text(t.Variable)}}
	if t.Every != nil {
		out = append(out, Named{"every", seconds(*t.Every)})
	}
	if t.Inputs != nil {
		out = append(out, Named{"inputs", nameList(t.Inputs)})
	}
	if t.Outputs != nil {
		out = append(out, Named{"outputs", nameList(t.Outputs)})
	}
	return out
}

// FieldNames lists the fields.
func (t *Transfer) FieldNames() []string { return fieldNames(t.fields()) }

// Field finds a field.
func (t *Transfer) Field(name string) (Value, bool) { return findField(t.fields(), name) }

// FieldNames lists the fields.
func (c Complex) FieldNames() []string { return []string{"real", "imaginary"} }

// Field finds a field.
func (c Complex) Field(name string) (Value, bool) {
	return findField([]Named{{"real", c.RealPart()}, {"imaginary", c.ImaginaryPart()}}, name)
}

// FieldNames lists the fields.
func (q Quantity) FieldNames() []string { return []string{"magnitude", "unit"} }

// Field finds a field.
func (q Quantity) Field(name string) (Value, bool) {
	return findField([]Named{{"magnitude", q.Magnitude}, {"unit", Text(q.Unit.Text)}}, name)
}

// FieldNames lists the fields.
func (l *List) FieldNames() []string { return []string{"length"} }

// Field finds a field.
func (l *List) Field(name string) (Value, bool) {
	return findField([]Named{{"length", Int(len(l.Items))}}, name)
}

// FieldNames lists the fields.
func (m *Matrix) FieldNames() []string { return []string{"rows", "columns"} }

// Field finds a field.
func (m *Matrix) Field(name string) (Value, bool) {
	return findField([]Named{{"rows", Int(m.rows)}, {"columns", Int(m.cols)}}, name)
}

// FieldNames lists the fields.
func (p *Polynomial) FieldNames() []string { return []string{"degree", "variable"} }

// Field finds a field.
func (p *Polynomial) Field(name string) (Value, bool) {
	return findField([]Named{{"degree", Int(p.Degree())}, {"variable", Text(p.Variable)}}, name)
}
