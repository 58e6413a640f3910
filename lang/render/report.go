package render

import (
	"fmt"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// layReport lays a report out: its fields, then its table.
func layReport(r *value.Report, o Options) laid {
	l := laid{sign: unsigned, title: r.Title, notes: r.Notes, lines: []string{}}
	if r.Holds != nil {
		l.word = strconv.FormatBool(*r.Holds)
	}
	l.lines = append(l.lines, fieldLines(r.Fields, len(r.Columns) > 0, o)...)
	if len(r.Columns) > 0 {
		if len(l.lines) > 0 {
			l.lines = append(l.lines, "")
		}
		short, leftOut := abridgedTable(r, o)
		t := newTable(short, o)
		l.sign = t.sign
		if r.Holds != nil {
			// The truth after the sign is exact, whatever the table beside it is.
			if l.sign = exactly; t.sign == roughly || t.sign == keptExact {
				l.remarks = []string{"table rounded"}
			}
		}
		l.lines = append(l.lines, t.lines(o.width()-2)...)
		if leftOut != "" {
			l.notes = append(append([]string{}, l.notes...), leftOut)
		}
	}
	return l
}

// longest table that is shown whole
const mostTableRows = 60

// abridgedTable leaves out rows of a long table and says which.
func abridgedTable(r *value.Report, o Options) (short *value.Report, leftOut string) {
	n := len(r.Rows)
	if n <= mostTableRows || o.InFull {
		return r, ""
	}
	cut := *r
	cut.Rows = append(append([][]value.Value{}, r.Rows[:firstShown]...), r.Rows[n-lastShown:]...)
	return &cut, fmt.Sprintf("%d of %d rows, between the first and the last few, are left out", n-firstShown-lastShown, n)
}

// fieldLines shows the small fields and names the large ones.
func fieldLines(fields []value.Named, hasTable bool, o Options) []string {
	small, large := bySize(fields, hasTable, o)
	lines := layNamed(small, o.narrower(2))
	if len(large) > 0 {
		lines = append(lines, hanging("further  ", strings.Join(large, ", "), o.width()-2)...)
	}
	return lines
}

// longest list among the fields of a report that has a table too
const mostFieldItems = 40

// bySize parts the fields of a report: those that take lines of their own are only named,
// with their size, unless there is nothing else to show.
func bySize(fields []value.Named, hasTable bool, o Options) (small []value.Named, large []string) {
	for _, f := range fields {
		f.Value = force(f.Value)
		if fn, ok := f.Value.(*value.Function); ok && hasTable {
			large = append(large, fmt.Sprintf(".%s(%s)", f.Name, strings.Join(fn.Params, ", ")))
			continue
		}
		_, _, short := nested(f.Value, o)
		list, isList := f.Value.(*value.List)
		isLong := isList && hasTable && len(list.Items) > mostFieldItems
		if short || !isLarge(f.Value) && !isLong {
			small = append(small, f)
			continue
		}
		size := ""
		if isLong {
			size = fmt.Sprintf(" (%d items)", len(list.Items))
		}
		if m, ok := f.Value.(*value.Matrix); ok {
			r, c := m.Dims()
			size = fmt.Sprintf(" (%d × %d)", r, c)
		}
		large = append(large, "."+f.Name+size)
	}
	if len(small) == 0 && !hasTable || o.InFull {
		return fields, nil
	}
	return small, large
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
		f.Value = force(f.Value)
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
	r, ok := force(v).(*value.Report)
	if !ok || len(r.Columns) > 0 || len(r.Notes) > 0 || r.Holds != nil {
		return "", unsigned, false
	}
	return shortFields(r.Fields, o)
}
