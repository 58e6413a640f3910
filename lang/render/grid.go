package render

import (
	"fmt"
	"strings"
)

// grid is a set of columns of equal height with optional heads and row labels. The
// columns' texts are padded already, each column to one width.
type grid struct {
	labels  []string // of the rows; nil for none
	heads   []string // of the columns; nil for none
	columns [][]string
	numbers []int // of the columns, for the headings of groups; nil for 1, 2, 3, …
	ruled   int   // a vertical rule stands before this column; 0 for none
	below   int   // a horizontal rule stands before this row; 0 for none
}

const gap = 3 // cells between columns

// lines writes the grid; one that is too wide is split into groups of columns.
func (g *grid) lines(width int) []string {
	widths := make([]int, len(g.columns))
	for j := range g.columns {
		widths[j] = g.columnWidth(j)
	}
	label := 0
	for _, l := range g.labels {
		label = max(label, cells(l))
	}
	var out []string
	groups := groupColumns(widths, label, width)
	for k, group := range groups {
		if len(groups) > 1 {
			if k > 0 {
				out = append(out, "")
			}
			out = append(out, g.groupHeading(group[0], group[1]))
		}
		out = append(out, g.group(group[0], group[1], label, widths)...)
	}
	return out
}

func (g *grid) columnWidth(j int) int {
	w := 0
	if g.heads != nil {
		w = cells(g.heads[j])
	}
	for _, s := range g.columns[j] {
		w = max(w, cells(s))
	}
	return w
}

// groupColumns cuts the columns into ranges [from, to) that fit.
func groupColumns(widths []int, label, width int) [][2]int {
	var groups [][2]int
	from, used := 0, label
	for j, w := range widths {
		step := w + gap
		if j == from && label == 0 {
			step = w
		}
		if j > from && used+step > width {
			groups = append(groups, [2]int{from, j})
			from, used = j, label
			step = w
		}
		used += step
	}
	return append(groups, [2]int{from, len(widths)})
}

func (g *grid) groupHeading(from, to int) string {
	number := func(j int) int {
		if g.numbers != nil {
			return g.numbers[j]
		}
		return j + 1
	}
	// The column of dots is no column of the matrix.
	for to-from > 1 && number(to-1) == 0 {
		to--
	}
	for to-from > 1 && number(from) == 0 {
		from++
	}
	if to-from == 1 {
		return fmt.Sprintf("column %d", number(from))
	}
	return fmt.Sprintf("columns %d to %d", number(from), number(to-1))
}

func (g *grid) group(from, to, label int, widths []int) []string {
	var out []string
	if g.heads != nil {
		out = append(out, g.row("", label, from, to, widths, func(j int) string { return g.heads[j] }))
	}
	rows := 0
	if len(g.columns) > 0 {
		rows = len(g.columns[0])
	}
	for i := range rows {
		if g.below > 0 && i == g.below {
			out = append(out, g.ruleLine(label, from, to, widths))
		}
		name := ""
		if g.labels != nil {
			name = g.labels[i]
		}
		out = append(out, g.row(name, label, from, to, widths, func(j int) string { return g.columns[j][i] }))
	}
	return out
}

func (g *grid) row(name string, label, from, to int, widths []int, text func(j int) string) string {
	var b strings.Builder
	b.WriteString(padRight(name, label))
	for j := from; j < to; j++ {
		switch {
		case g.ruled > 0 && j == g.ruled && j > from:
			b.WriteString("  │  ")
		case j > from || label > 0:
			b.WriteString(strings.Repeat(" ", gap))
		}
		b.WriteString(padLeft(text(j), widths[j]))
	}
	return strings.TrimRight(b.String(), " ")
}

func (g *grid) ruleLine(label, from, to int, widths []int) string {
	n := label
	var b strings.Builder
	for j := from; j < to; j++ {
		if g.ruled > 0 && j == g.ruled && j > from {
			b.WriteString(strings.Repeat("─", n+2) + "┼")
			n = 2
		} else if j > from || label > 0 {
			n += gap
		}
		n += widths[j]
	}
	return b.String() + strings.Repeat("─", n)
}
