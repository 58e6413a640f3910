package render

import (
	"strings"

	"gainwright/lang/value"
)

// layModel lays a model out: what was given, the equations, what is free, then the plant
// that it gives around its operating point.
func layModel(m *value.Model, o Options) laid {
	l := laid{sign: unsigned, title: "model", lines: []string{}}
	if m.Plant != nil {
		l = layPlant(m.Plant, o)
		if m.Name != "" {
			l.title = "model, " + l.title
		}
	}
	l.notes = append(l.notes, m.Notes...)
	var head []string
	var rest []value.Named
	for _, f := range m.Extra {
		r, _ := force(f.Value).(*value.Report)
		switch {
		case f.Name == "given" && r != nil:
			head = append(head, hanging("given  ", givenText(m, r, o), o.width()-2)...)
		case f.Name == "tolerances":
		case f.Name == "equations" && r != nil:
			head = append(head, equationLines(r, o)...)
		case f.Name == "free":
			if text, ok := f.Value.(value.Text); ok {
				l.lines = append(l.lines, hanging("", "at rest: "+string(text), o.width()-2)...)
			}
		default:
			rest = append(rest, f)
		}
	}
	if len(head) > 0 {
		l.lines = append(append(head, ""), l.lines...)
	}
	if len(rest) > 0 {
		l.lines = append(append(l.lines, ""), layNamed(rest, o.narrower(2))...)
	}
	return l
}

// givenText writes the parameters with their tolerances: "M = 1200 kg ± 60 kg, …".
func givenText(m *value.Model, r *value.Report, o Options) string {
	tolerance := map[string]string{}
	if v, ok := m.Field("tolerances"); ok {
		if t, ok := force(v).(*value.Report); ok {
			for _, row := range t.Rows {
				name, _ := row[0].(value.Text)
				tolerance[string(name)], _ = inlineValue(row[2], o)
			}
		}
	}
	parts := make([]string, len(r.Fields))
	for k, f := range r.Fields {
		text, s := inlineValue(f.Value, o)
		equal := " = "
		if s == roughly || s == keptExact {
			equal = " ≈ "
		}
		parts[k] = oneLine(f.Name) + equal + text
		if t := tolerance[f.Name]; t != "" {
			parts[k] += " ± " + t
		}
	}
	return strings.Join(parts, ", ")
}

// equationLines writes the equations as they stand in the model.
func equationLines(r *value.Report, o Options) []string {
	var out []string
	for _, row := range r.Rows {
		if text, ok := row[0].(value.Text); ok {
			out = append(out, hanging("  ", oneLine(string(text)), o.width()-2)...)
		}
	}
	return out
}
