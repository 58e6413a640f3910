package files

import (
	"encoding/csv"
	"errors"
	"io"
	"math/big"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// mostDigits bounds a written number, exponents included, so that reading it stays cheap.
const mostDigits = 400

// table is a CSV file cut into cells.
type table struct {
	names []string // nil when the first row holds numbers
	cells [][]string
	lines []int
}

// separator is the first of tab, semicolon and comma that the first line with content holds.
func separator(text string) rune {
	for line := range strings.Lines(text) {
		line = strings.TrimSpace(line)
		if line == "" || strings.HasPrefix(line, "#") {
			continue
		}
		for _, r := range "\t;," {
			if strings.ContainsRune(line, r) {
				return r
			}
		}
		return ','
	}
	return ','
}

func parseTable(c *value.Call, text string) (*table, error) {
	r := csv.NewReader(strings.NewReader(text))
	r.Comma, r.Comment, r.TrimLeadingSpace, r.FieldsPerRecord = separator(text), '#', true, -1
	t := &table{}
	width := 0
	for {
		record, err := r.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		var fault *csv.ParseError
		if errors.As(err, &fault) {
			return nil, placed(c, fault.Line, "%v", fault.Err)
		}
		if err != nil {
			return nil, value.Errf(diag.File, "file", "%v", err)
		}
		line, _ := r.FieldPos(0)
		for i := range record {
			record[i] = strings.TrimSpace(record[i])
		}
		if width == 0 {
			width = len(record)
		}
		if len(record) != width {
			return nil, placed(c, line, "this row has %d entries, the first has %d", len(record), width)
		}
		if t.names == nil && len(t.cells) == 0 && !allNumbers(record) {
			t.names = record
			continue
		}
		t.cells, t.lines = append(t.cells, record), append(t.lines, line)
	}
	if width == 0 {
		return nil, value.Errf(diag.File, "file", "the file holds no rows")
	}
	return t, nil
}

func allNumbers(record []string) bool {
	for _, x := range record {
		if _, ok := number(x); !ok {
			return false
		}
	}
	return true
}

// number reads a decimal, a fraction or a number with an exponent, exactly.
func number(text string) (*big.Rat, bool) {
	if text == "" || len(text) > mostDigits || strings.ContainsAny(text, "_xXoObBpP") {
		return nil, false
	}
	if k := strings.IndexAny(text, "eE"); k >= 0 && len(strings.TrimLeft(text[k+1:], "+-0")) > 3 {
		return nil, false
	}
	return new(big.Rat).SetString(strings.TrimPrefix(text, "+"))
}

func (t *table) matrix(c *value.Call) (value.Value, error) {
	width := len(t.names)
	if len(t.cells) > 0 {
		width = len(t.cells[0])
	}
	m, err := newStore(len(t.cells), width)
	if err != nil {
		return nil, err
	}
	for i, row := range t.cells {
		for j, text := range row {
			x, ok := number(text)
			if !ok {
				return nil, placed(c, t.lines[i], "entry %d is %q, which is no number", j+1, clipped(text))
			}
			m.add(i, j, x, nil)
		}
	}
	v := m.matrix(c)
	v.Columns = t.names
	return v, nil
}

func clipped(text string) string {
	if r := []rune(text); len(r) > 40 {
		return string(r[:40]) + "…"
	}
	return text
}

func tableFrom(c *value.Call) (value.Value, error) {
	data, ending, err := read(c)
	if err != nil {
		return nil, err
	}
	if ending != ".csv" && ending != ".tsv" && ending != ".txt" {
		return nil, value.Errf(diag.File, "file", "the ending %q is not known", ending).WithHelp("tables are read from .csv files")
	}
	t, err := parseTable(c, string(data))
	if err != nil {
		return nil, err
	}
	if t.names == nil {
		return nil, placed(c, t.lines[0], "the first row must hold the columns' names").WithHelp("matrix_from reads rows of numbers alone")
	}
	r := &value.Report{Title: "table", Columns: t.names}
	seen := map[string]bool{}
	for j, title := range t.names {
		name := fieldName(title)
		if seen[name] {
			return nil, value.Errf(diag.Name, "file", "two columns are named %q", name)
		}
		seen[name] = true
		column := &value.List{}
		for i := range t.cells {
			column.Items = append(column.Items, cell(t.cells[i][j]))
		}
		r.Fields = append(r.Fields, value.Named{Name: name, Value: column})
	}
	for i := range t.cells {
		var row []value.Value
		for j := range t.names {
			row = append(row, r.Fields[j].Value.(*value.List).Items[i])
		}
		r.Rows = append(r.Rows, row)
	}
	return r, nil
}

func cell(text string) value.Value {
	if x, ok := number(text); ok {
		return value.Rat(x)
	}
	return value.Text(text)
}

// fieldName makes a name of the language from a column's title: "speed [m/s]" becomes speed.
func fieldName(title string) string {
	title, _, _ = strings.Cut(title, "[")
	title = strings.TrimSpace(title)
	var b strings.Builder
	for i, r := range title {
		switch {
		case r == '_' || r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r > 0x7f, i > 0 && r >= '0' && r <= '9':
			b.WriteRune(r)
		default:
			b.WriteByte('_')
		}
	}
	if b.Len() == 0 {
		return "column"
	}
	return b.String()
}
