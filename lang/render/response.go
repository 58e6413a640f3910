package render

import "gainwright/lang/value"

// signalTable says of each signal where it begins, ends and how far it goes.
func signalTable(r *value.Response) *value.Report {
	table := &value.Report{Columns: []string{"signal", "what", "first", "last", "smallest", "largest"}}
	for _, t := range r.Signals {
		if len(t.Values) == 0 {
			continue
		}
		low, high := t.Values[0], t.Values[0]
		for _, x := range t.Values {
			low, high = min(low, x), max(high, x)
		}
		name := signalHead(value.Signal{Name: t.Name, Unit: t.Unit})
		table.Rows = append(table.Rows, []value.Value{value.Text(name), value.Text(t.Role),
			value.Float(t.Values[0]), value.Float(t.Values[len(t.Values)-1]), value.Float(low), value.Float(high)})
	}
	return table
}

// layResponse lays a response out as its signals' table, with a drawing where the options
// can make one.
func layResponse(r *value.Response, o Options) laid {
	l := laid{sign: unsigned, title: firstOf(oneLine(r.Title), "response"), notes: r.Notes, lines: []string{}}
	if table := signalTable(r); len(table.Rows) > 0 {
		l.sign = roughly
		l.lines = append(l.lines, newTable(table, o).lines(o.width()-2)...)
	}
	if o.Drawing == nil {
		return l
	}
	if drawing := o.Drawing(r, o.width()-2); len(drawing) > 0 {
		l.lines = append(append(l.lines, ""), drawing...)
	}
	return l
}

// responseSheet is the same for a page.
func responseSheet(r *value.Response, o Options) Sheet {
	s := Sheet{Title: firstOf(oneLine(r.Title), "response"), Notes: r.Notes}
	if table := signalTable(r); len(table.Rows) > 0 {
		s.Sign = "≈"
		s.Table = reportTable(table, o)
	}
	return s
}
