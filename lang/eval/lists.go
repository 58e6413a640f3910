package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// listSite is a list literal as written; rows and widths are set for one written as rows.
type listSite struct {
	entries []entrySite
	rows    []diag.Span
	widths  []int
}

// entrySite is an element as written; zero and one tell the bare tokens 0 and 1.
type entrySite struct {
	span      diag.Span
	zero, one bool
}

// list makes a list; pairs are spliced one level.
func list(f *frame, args []any) (any, error) {
	items := make([]value.Value, len(args)-1)
	for i, a := range args[1:] {
		items[i] = a.(value.Value)
	}
	v, err := value.Collect(items)
	return charged(f, v, err)
}

// matrix makes a matrix of a literal written as rows, or a list of lists where the
// entries cannot stand in a matrix.
func matrix(f *frame, args []any) (any, error) {
	site := args[0].(*listSite)
	rows := make([][]value.Entry, len(site.widths))
	next := 0
	for i, width := range site.widths {
		rows[i] = make([]value.Entry, width)
		for j := range rows[i] {
			e := site.entries[next]
			rows[i][j] = value.Entry{Value: args[next+1].(value.Value), Zero: e.zero, One: e.one}
			next++
		}
	}
	v, at, err := value.MatrixLiteral(rows)
	if err != nil {
		return nil, placedAt(err, site.place(at))
	}
	return charged(f, v, nil)
}

// place is the span of an entry, or of a row when the column is −1.
func (s *listSite) place(at [2]int) diag.Span {
	row, column := at[0], at[1]
	if row < 0 || row >= len(s.rows) {
		return diag.Span{}
	}
	if column < 0 || column >= s.widths[row] {
		return s.rows[row]
	}
	before := 0
	for _, w := range s.widths[:row] {
		before += w
	}
	return s.entries[before+column].span
}
