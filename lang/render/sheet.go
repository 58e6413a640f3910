package render

import (
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// Sheet is a value laid out for a page instead of a terminal: what stands beside its
// label, and what stands below. The texts are plain; only Math is markup, built from
// escaped texts.
type Sheet struct {
	Label   string // the expression that gave the value, a field's name
	Sign    string // "=", "≈", or empty where there is nothing to say
	Text    string // of a value on one line, in the form the language reads
	Math    string // the same as MathML, or empty
	Word    string // of a block: its truth
	Title   string // of a block: what it is
	Remark  string
	Lines   []string // to stand as they are, one below the other
	Fields  []Sheet
	Table   *SheetTable
	Further []string // fields too large to show, by name
	Notes   []string
	Figure  string // a drawing as SVG, put there by who can draw
}

// SheetTable is a matrix or a report's table. The texts of a column of numbers are
// padded, so that in a face of equal widths their points stand under each other.
type SheetTable struct {
	Heads     []string   // of the columns; nil for none
	Labels    []string   // of the rows; nil for none
	Rows      [][]string // texts, row by row
	Numeric   []bool     // by column
	Paired    []bool     // by column: holds numbers, some of them conjugate pairs
	RuleAt    int        // a vertical rule stands before this column; 0 for none
	RuleBelow int        // a horizontal rule stands before this row; 0 for none
	IsMatrix  bool
	LeftOut   string // what an abridged table does not show
}

// SheetOf lays a value out for a page; in is the unit asked for, or nil.
func SheetOf(label string, v value.Value, in *value.Unit, o Options) Sheet {
	if text, ok := v.(value.Text); ok && label == quoted(string(text)) {
		// A text alone is a heading.
		return Sheet{Title: oneLine(string(text))}
	}
	s := sheetOf(v, in, o)
	s.Label = oneLine(label)
	return s
}

func sheetOf(v value.Value, in *value.Unit, o Options) Sheet {
	if f, ok := v.(*value.Fractions); ok {
		o.Fractions, v = true, f.Value
	}
	v = force(v)
	if in != nil {
		// What cannot be shown in the unit was refused when it was evaluated.
		if converted, err := value.In(v, *in); err == nil {
			v = converted
		}
	}
	var s Sheet
	switch x := v.(type) {
	case *value.Matrix:
		s = matrixSheet(x, x.Rows, x.Columns, o)
	case *value.Gain:
		s = gainSheet(x, o)
	case *value.Plant:
		s = plantSheet(x, o)
	case *value.Model:
		s = modelSheet(x, o)
	case *value.Report:
		s = reportSheet(x, o)
	case *value.Response:
		s = responseSheet(x, o)
	case *value.Transfer:
		s = transferSheet(x, o)
	case *value.List:
		s = listSheet(x, o)
	case nil:
		s = Sheet{Text: "nothing"}
	default:
		s = plainSheet(v, o)
	}
	return s
}

// plainSheet takes over what the terminal shows.
func plainSheet(v value.Value, o Options) Sheet {
	l := layValue(v, nil, o)
	s := Sheet{Sign: signText(l.sign), Text: l.inline, Word: l.word, Title: l.title, Remark: l.remark(), Lines: l.lines, Notes: l.notes}
	if p, ok := v.(*value.Polynomial); ok {
		s.Math = mathDocument(mathPolynomial(p, o))
	}
	return s
}

func signText(s sign) string {
	if s == unsigned {
		return ""
	}
	return s.String()
}

func matrixSheet(m *value.Matrix, rowNames, columnNames []string, o Options) Sheet {
	l := layNamedMatrix(m, rowNames, columnNames, o)
	s := Sheet{Sign: signText(l.sign), Text: l.inline, Title: l.title, Remark: l.remark()}
	rows, cols := m.Dims()
	if rows == 0 || cols == 0 {
		return s
	}
	rowIndex, columnIndex := shownIndices(rows, mostRows, o), shownIndices(cols, mostColumns, o)
	entries := matrixEntries(m, rowIndex, columnIndex, o)
	g := matrixGrid(entries, rowIndex, columnIndex, rowNames, columnNames, len(rowIndex) < rows, len(columnIndex) < cols)
	s.Table = gridTable(g)
	return s
}

func gridTable(g *grid) *SheetTable {
	t := &SheetTable{Heads: g.heads, Labels: g.labels, RuleAt: g.ruled, RuleBelow: g.below, IsMatrix: true}
	if len(g.columns) == 0 {
		return t
	}
	for i := range g.columns[0] {
		row := make([]string, len(g.columns))
		for j := range g.columns {
			row[j] = g.columns[j][i]
		}
		t.Rows = append(t.Rows, row)
	}
	t.Numeric = make([]bool, len(g.columns))
	for j := range t.Numeric {
		t.Numeric[j] = true
	}
	return t
}

func gainSheet(g *value.Gain, o Options) Sheet {
	l := layGain(g, o)
	rows, cols := g.Values.Rows, g.Values.Columns
	if len(g.RowSignals) > 0 {
		rows = signalHeads(g.RowSignals)
	}
	if len(g.ColumnSignals) > 0 {
		cols = signalHeads(g.ColumnSignals)
	}
	s := matrixSheet(g.Values, rows, cols, o)
	s.Title, s.Notes = l.title, l.notes
	s.Fields, s.Further = fieldSheets(gainFields(g), true, o)
	return s
}

func plantSheet(p *value.Plant, o Options) Sheet {
	l := layPlant(p, o)
	s := Sheet{Sign: signText(l.sign), Title: l.title, Remark: l.remark(), Notes: l.notes}
	n, _ := p.A.Dims()
	_, m := p.B.Dims()
	q, _ := p.C.Dims()
	word := "rate "
	if p.Every != nil {
		word = "next "
	}
	rates := make([]string, len(p.States))
	for i, signal := range p.States {
		if p.Every == nil {
			signal.Unit = signal.Unit.PerSecond()
		}
		rates[i] = word + signalHead(signal)
	}
	states, inputs, outputs := signalHeads(p.States), signalHeads(p.Inputs), signalHeads(p.Outputs)
	if n+q <= mostRows && n+m <= mostColumns && n+m > 0 && n+q > 0 {
		g, _ := arrayGrid(p, o)
		g.labels = append(append([]string{}, rates...), outputs...)
		g.heads = append(append([]string{}, states...), inputs...)
		s.Table = gridTable(g)
	} else {
		for _, part := range []struct {
			name       string
			m          *value.Matrix
			rows, cols []string
		}{{"A", p.A, rates, states}, {"B", p.B, rates, inputs}, {"C", p.C, outputs, states}, {"D", p.D, outputs, inputs}} {
			if r, c := part.m.Dims(); r*c > 0 {
				field := matrixSheet(part.m, part.rows, part.cols, o)
				field.Label = part.name
				s.Fields = append(s.Fields, field)
			}
		}
	}
	if text, _ := operatingPoint(p, o); text != "" {
		s.Lines = append(s.Lines, "around "+text)
	}
	fields, further := fieldSheets(p.Extra, true, o)
	s.Fields, s.Further = append(s.Fields, fields...), further
	return s
}

func modelSheet(m *value.Model, o Options) Sheet {
	s := Sheet{Title: "model"}
	if m.Plant != nil {
		s = plantSheet(m.Plant, o)
		s.Title = "model, " + s.Title
	}
	s.Notes = append(s.Notes, m.Notes...)
	var head []string
	var rest []value.Named
	wide := o
	wide.Width = 1 << 14 // the page wraps by itself
	for _, f := range m.Extra {
		r, _ := force(f.Value).(*value.Report)
		switch {
		case f.Name == "given" && r != nil:
			head = append(head, "given "+givenText(m, r, o))
		case f.Name == "tolerances":
		case f.Name == "equations" && r != nil:
			for _, line := range equationLines(r, wide) {
				head = append(head, strings.TrimSpace(line))
			}
		case f.Name == "free":
			if text, ok := f.Value.(value.Text); ok {
				s.Lines = append(s.Lines, "at rest: "+oneLine(string(text)))
			}
		default:
			rest = append(rest, f)
		}
	}
	s.Lines = append(head, s.Lines...)
	fields, further := fieldSheets(rest, true, o)
	s.Fields, s.Further = append(s.Fields, fields...), append(s.Further, further...)
	return s
}

func reportSheet(r *value.Report, o Options) Sheet {
	l := layReport(r, o)
	s := Sheet{Sign: signText(l.sign), Word: l.word, Title: oneLine(l.title), Remark: l.remark(), Notes: r.Notes}
	s.Fields, s.Further = fieldSheets(r.Fields, len(r.Columns) > 0, o)
	if len(r.Columns) > 0 {
		s.Table = reportTable(r, o)
	}
	return s
}

func reportTable(r *value.Report, o Options) *SheetTable {
	r, leftOut := abridgedTable(r, o)
	t := newTable(r, o)
	out := &SheetTable{Heads: t.heads, Numeric: t.numeric, Paired: t.paired, LeftOut: leftOut}
	for i := range r.Rows {
		row := make([]string, len(t.cells))
		for j := range t.cells {
			row[j] = t.cells[j][i]
			if !t.numeric[j] {
				row[j] = strings.TrimSpace(row[j])
			}
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}

// fieldSheets lays the small fields out and names the large ones.
func fieldSheets(fields []value.Named, hasTable bool, o Options) (sheets []Sheet, further []string) {
	small, large := bySize(fields, hasTable, o)
	for _, f := range small {
		v := force(f.Value)
		var s Sheet
		if text, ok := v.(value.Text); ok {
			s = Sheet{Text: oneLine(string(text))}
		} else if text, sign, ok := nested(v, o); ok {
			s = Sheet{Sign: signText(sign), Text: text}
		} else {
			s = sheetOf(v, nil, o)
		}
		s.Label = oneLine(f.Name)
		sheets = append(sheets, s)
	}
	return sheets, large
}

func transferSheet(g *value.Transfer, o Options) Sheet {
	l := layTransfer(g, o)
	s := Sheet{Sign: signText(l.sign), Title: l.title, Remark: l.remark(), Notes: l.notes}
	single := len(g.Entries) == 1 && len(g.Entries[0]) == 1
	for i, row := range g.Entries {
		for j, r := range row {
			text, _ := ratioText(r, o)
			math := mathDocument(mathRatio(r, o))
			if single {
				s.Text, s.Math = text, math
				break
			}
			name := strings.TrimSuffix(channelName(g, i, j), ":")
			s.Fields = append(s.Fields, Sheet{Label: name, Sign: s.Sign, Text: text, Math: math})
		}
	}
	if s.Text == "" && len(s.Fields) == 0 {
		s.Text = "a transfer function without channels"
	}
	return s
}

func listSheet(l *value.List, o Options) Sheet {
	if len(l.Items) == 0 || !isLarge(l) {
		laid := layList(l, o)
		return Sheet{Sign: signText(laid.sign), Text: laid.inline, Remark: laid.remark()}
	}
	s := Sheet{Title: "a list of " + strconv.Itoa(len(l.Items))}
	for i, item := range l.Items {
		if i == mostItems {
			s.Lines = append(s.Lines, "… and "+strconv.Itoa(len(l.Items)-i)+" more")
			break
		}
		field := sheetOf(item, nil, o)
		field.Label = "[" + strconv.Itoa(i+1) + "]"
		s.Fields = append(s.Fields, field)
	}
	return s
}
