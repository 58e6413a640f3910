package render

import (
	"fmt"

	"gainwright/lang/value"
)

// Matrices with more rows or columns than most are abridged to the first and the last few.
const (
	mostRows, mostColumns = 40, 40
	firstShown, lastShown = 6, 3
)

// layMatrix lays a matrix out under its own names.
func layMatrix(m *value.Matrix, o Options) laid {
	return layNamedMatrix(m, m.Rows, m.Columns, o)
}

// layNamedMatrix lays a matrix out with names for its rows and columns; either may be nil.
func layNamedMatrix(m *value.Matrix, rowNames, columnNames []string, o Options) laid {
	rows, cols := m.Dims()
	if rows == 0 || cols == 0 {
		return laid{inline: fmt.Sprintf("a matrix with %s and %s", count(rows, "row"), count(cols, "column"))}
	}
	rowIndex, columnIndex := shownIndices(rows, mostRows, o), shownIndices(cols, mostColumns, o)
	entries := matrixEntries(m, rowIndex, columnIndex, o)
	l := laid{sign: unsigned}
	for _, column := range entries {
		l.sign = l.sign.both(signOf(column))
	}
	if !m.IsExact() {
		l.remarks = digitRemark(wholeDigits(m.Digits()), o)
	}
	abridgedRows, abridgedColumns := len(rowIndex) < rows, len(columnIndex) < cols
	if abridgedRows || abridgedColumns {
		l.title = abridged(rows, cols)
		if l.sign == exactly {
			l.sign = keptExact
		}
	}
	g := matrixGrid(entries, rowIndex, columnIndex, rowNames, columnNames, abridgedRows, abridgedColumns)
	l.lines = g.lines(o.width() - 2)
	return l
}

func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

// abridged says which rows and columns are left out.
func abridged(rows, cols int) string {
	text := fmt.Sprintf("%d × %d, without ", rows, cols)
	if rows > mostRows {
		text += fmt.Sprintf("rows %d to %d", firstShown+1, rows-lastShown)
		if cols > mostColumns {
			text += " and "
		}
	}
	if cols > mostColumns {
		text += fmt.Sprintf("columns %d to %d", firstShown+1, cols-lastShown)
	}
	return text
}

func shownIndices(n, most int, o Options) []int {
	var index []int
	for i := range n {
		if n <= most || o.InFull || i < firstShown || i >= n-lastShown {
			index = append(index, i)
		}
	}
	return index
}

// matrixEntries cuts the shown entries, column by column; cut exact ones become
// fractions when that leaves nothing cut.
func matrixEntries(m *value.Matrix, rowIndex, columnIndex []int, o Options) [][]entry {
	if m.IsExact() && !o.Fractions && shortFractionsSuffice(m, rowIndex, columnIndex, o) {
		o.Fractions = true
		return cutEntries(m, rowIndex, columnIndex, o, true)
	}
	return cutEntries(m, rowIndex, columnIndex, o, false)
}

func cutEntries(m *value.Matrix, rowIndex, columnIndex []int, o Options, decimalsFirst bool) [][]entry {
	entries := make([][]entry, len(columnIndex))
	for k, j := range columnIndex {
		entries[k] = make([]entry, len(rowIndex))
		for h, i := range rowIndex {
			options := o
			if decimalsFirst {
				plain := o
				plain.Fractions = false
				if e := entryOf(m.At(i, j), plain); e.sign() == exactly {
					entries[k][h] = e
					continue
				}
			}
			entries[k][h] = entryOf(matrixNumber(m, i, j), options)
		}
	}
	return entries
}

// matrixNumber is an entry with the matrix's own error, so that data taken as it is keeps none.
func matrixNumber(m *value.Matrix, i, j int) value.Value {
	v := m.At(i, j)
	if n, ok := v.(value.Number); ok && n.Exact == nil {
		n.Err = m.Err
		return n
	}
	return v
}

// shortFractionsSuffice tells whether some decimals of an exact real matrix are cut and
// every one that is would be a short fraction.
func shortFractionsSuffice(m *value.Matrix, rowIndex, columnIndex []int, o Options) bool {
	some := false
	for _, j := range columnIndex {
		for _, i := range rowIndex {
			n, ok := m.At(i, j).(value.Number)
			if !ok {
				return false
			}
			if exactFigure(n.Exact, o.digits()).sign == keptExact {
				if !isShortFraction(n.Exact) {
					return false
				}
				some = true
			}
		}
	}
	return some
}

// matrixGrid aligns the columns and marks what is left out.
func matrixGrid(entries [][]entry, rowIndex, columnIndex []int, rowNames, columnNames []string, cutRows, cutColumns bool) *grid {
	g := &grid{}
	if len(rowNames) > 0 {
		g.labels = picked(rowNames, rowIndex)
	}
	if len(columnNames) > 0 {
		g.heads = picked(columnNames, columnIndex)
	}
	for k, j := range columnIndex {
		g.columns = append(g.columns, alignColumn(entries[k]))
		g.numbers = append(g.numbers, j+1)
	}
	if cutColumns {
		g.markColumns(len(rowIndex))
	}
	if cutRows {
		g.markRows()
	}
	return g
}

func picked(names []string, index []int) []string {
	out := make([]string, len(index))
	for k, i := range index {
		if i < len(names) {
			out[k] = oneLine(names[i])
		}
	}
	return out
}

// markColumns puts a column of dots where columns are left out.
func (g *grid) markColumns(rows int) {
	dots := make([]string, rows)
	for i := range dots {
		dots[i] = "⋯"
	}
	insert := func(list []string, s string) []string {
		return append(append(append([]string{}, list[:firstShown]...), s), list[firstShown:]...)
	}
	g.columns = append(g.columns[:firstShown], append([][]string{dots}, g.columns[firstShown:]...)...)
	g.numbers = append(g.numbers[:firstShown], append([]int{0}, g.numbers[firstShown:]...)...)
	if g.heads != nil {
		g.heads = insert(g.heads, "⋯")
	}
}

// markRows puts a row of dots where rows are left out.
func (g *grid) markRows() {
	for j, c := range g.columns {
		dots := padLeft("⋮", (cells(c[0])+1)/2)
		g.columns[j] = append(append(append([]string{}, c[:firstShown]...), padRight(dots, cells(c[0]))), c[firstShown:]...)
	}
	if g.labels != nil {
		g.labels = append(append(append([]string{}, g.labels[:firstShown]...), "⋮"), g.labels[firstShown:]...)
	}
}
