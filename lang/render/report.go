package render

import (
	"strconv"

	"gainwright/lang/value"
)

// layReport lays a report out: its fields, then its table.
func layReport(r *value.Report, o Options) laid {
	l := laid{sign: unsigned, title: r.Title, notes: r.Notes, lines: []string{}}
	if r.Holds != nil {
		l.word = strconv.FormatBool(*r.Holds)
	}
	l.lines = append(l.lines, layNamed(r.Fields, o.narrower(2))...)
	if len(r.Columns) > 0 {
		if len(l.lines) > 0 {
			l.lines = append(l.lines, "")
		}
		t := newTable(r, o)
		l.sign = t.sign
		l.lines = append(l.lines, t.lines(o.width()-2)...)
	}
	return l
}

// layFields lays out any other value with fields.
func layFields(v value.HasFields, o Options) laid {
	l := laid{sign: unsigned, title: string(v.Kind()), lines: []string{}}
	var fields []value.Named
	for _, name := range v.FieldNames() {
		if f, ok := v.Field(name); ok {
			fields = append(fields, value.Named{Name: name, Value: f})
		}
	}
	l.lines = append(l.lines, layNamed(fields, o.narrower(2))...)
	return l
}

// widest name that the others are lined up with
const widestFieldName = 24

// layNamed writes fields as "name = value" with the signs under each other; a large
// value follows its name.
func layNamed(fields []value.Named, o Options) []string {
	w := 0
	for _, f := range fields {
		_, _, short := nested(f.Value, o)
		if n := cells(f.Name); n <= widestFieldName && (short || !isLarge(f.Value)) {
			w = max(w, n)
		}
	}
	var lines []string
	for _, f := range fields {
		if text, ok := f.Value.(value.Text); ok {
			lines = append(lines, hanging(padRight(f.Name, w)+"   ", oneLine(string(text)), o.width())...)
			continue
		}
		if text, s, ok := nested(f.Value, o); ok {
			lines = append(lines, labelled(padRight(f.Name, w), laid{sign: s, inline: text}, o)...)
			continue
		}
		name := f.Name
		l := layValue(f.Value, nil, o.narrower(2))
		if !l.isBlock() {
			name = padRight(name, w)
		}
		lines = append(lines, labelled(name, l, o)...)
	}
	return lines
}

// nested writes a small report inside another on one line.
func nested(v value.Value, o Options) (string, sign, bool) {
	r, ok := v.(*value.Report)
	if !ok || len(r.Columns) > 0 || len(r.Notes) > 0 || r.Holds != nil {
		return "", unsigned, false
	}
	return shortFields(r.Fields, o)
}
