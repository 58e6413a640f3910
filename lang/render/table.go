package render

import (
	"strings"

	"gainwright/lang/value"
)

// table is a report's rows laid out in columns: numbers with aligned points, texts
// wrapped where the width asks for it.
type table struct {
	heads   []string
	cells   [][]string // by column, then row
	numeric []bool
	paired  []bool // holds conjugate pairs, which may be set on two lines
	sign    sign
}

// a column of text is not made narrower than this
const narrowestText = 10

// between the columns of a table
const tableGap = 2

func newTable(r *value.Report, o Options) *table {
	t := &table{heads: make([]string, len(r.Columns)), sign: unsigned}
	for j, head := range r.Columns {
		t.heads[j] = oneLine(head)
		entries := make([]entry, len(r.Rows))
		numbers, others, pairs := 0, 0, false
		for i, row := range r.Rows {
			entries[i] = tableEntry(row, j, o)
			pairs = pairs || entries[i].both
			switch {
			case !entries[i].isText:
				numbers++
			case entries[i].text != "":
				others++
			}
		}
		t.sign = t.sign.both(tableSign(r.Rows, j, o))
		texts := make([]string, len(entries))
		if numbers > 0 {
			texts = alignColumn(entries)
		} else {
			for i, e := range entries {
				texts[i] = e.text
			}
		}
		t.cells = append(t.cells, texts)
		t.numeric = append(t.numeric, numbers > 0 && others == 0 && !pairs)
		t.paired = append(t.paired, pairs)
	}
	return t
}

func tableEntry(row []value.Value, j int, o Options) entry {
	if j >= len(row) || row[j] == nil {
		return entry{isText: true}
	}
	cell := force(row[j])
	if text, ok := cell.(value.Text); ok {
		return entry{isText: true, text: oneLine(string(text))}
	}
	if b, ok := cell.(value.Boolean); ok {
		word := "no"
		if b {
			word = "yes"
		}
		return entry{isText: true, text: word}
	}
	return entryOf(cell, o)
}

func tableSign(rows [][]value.Value, j int, o Options) sign {
	s := unsigned
	for _, row := range rows {
		if j < len(row) && row[j] != nil {
			switch row[j].(type) {
			case value.Text, value.Boolean:
			default:
				if e := entryOf(row[j], o); !e.isText {
					s = s.both(e.sign())
					break
				}
				_, t := inlineValue(row[j], o)
				s = s.both(t)
			}
		}
	}
	return s
}

// lines writes the table within the width.
func (t *table) lines(width int) []string {
	if t.naturalWidth() > width {
		t = t.withoutEmptyColumns()
	}
	widths, fits := t.widths(width)
	if !fits {
		return t.asRecords(width)
	}
	var out []string
	heads := make([][]string, len(t.heads))
	height := 1
	for j, h := range t.heads {
		heads[j] = wrapped(h, widths[j])
		height = max(height, len(heads[j]))
	}
	for k := range height {
		out = append(out, t.row(widths, func(j int) string {
			// The last line of each head stands on the rule.
			if i := k - (height - len(heads[j])); i >= 0 {
				return heads[j][i]
			}
			return ""
		}))
	}
	rule := -tableGap
	for _, w := range widths {
		rule += w + tableGap
	}
	out = append(out, strings.Repeat("─", max(rule, 1)))
	if len(t.cells) == 0 {
		return out
	}
	for i := range t.cells[0] {
		out = append(out, t.rowLines(i, widths)...)
	}
	return out
}

func (t *table) rowLines(i int, widths []int) []string {
	parts := make([][]string, len(widths))
	height := 1
	for j, w := range widths {
		text := t.cells[j][i]
		if !t.numeric[j] {
			text = strings.TrimRight(text, " ")
		}
		switch {
		case cells(text) <= w:
			parts[j] = []string{text}
		case t.paired[j]:
			parts[j] = splitPair(text)
		default:
			parts[j] = wrapped(text, w)
		}
		height = max(height, len(parts[j]))
	}
	var out []string
	for k := range height {
		out = append(out, t.row(widths, func(j int) string {
			if k < len(parts[j]) {
				return parts[j][k]
			}
			return ""
		}))
	}
	return out
}

func (t *table) row(widths []int, text func(j int) string) string {
	var b strings.Builder
	for j, w := range widths {
		if j > 0 {
			b.WriteString(strings.Repeat(" ", tableGap))
		}
		if t.numeric[j] {
			b.WriteString(padLeft(text(j), w))
		} else {
			b.WriteString(padRight(text(j), w))
		}
	}
	return strings.TrimRight(b.String(), " ")
}

// naturalWidth is the width of the table with nothing wrapped.
func (t *table) naturalWidth() int {
	total := -tableGap
	for j, h := range t.heads {
		total += max(widest(t.cells[j]), cells(h)) + tableGap
	}
	return total
}

// withoutEmptyColumns leaves out the columns in which no row has anything.
func (t *table) withoutEmptyColumns() *table {
	out := &table{sign: t.sign}
	for j, texts := range t.cells {
		if strings.TrimSpace(strings.Join(texts, "")) == "" && len(texts) > 0 {
			continue
		}
		out.heads, out.cells = append(out.heads, t.heads[j]), append(out.cells, texts)
		out.numeric, out.paired = append(out.numeric, t.numeric[j]), append(out.paired, t.paired[j])
	}
	return out
}

// widths fits the columns: heads are wrapped first, then the widest texts.
func (t *table) widths(width int) ([]int, bool) {
	widths, least, bodies := make([]int, len(t.heads)), make([]int, len(t.heads)), make([]int, len(t.heads))
	total := -tableGap
	for j, h := range t.heads {
		body := widest(t.cells[j])
		widths[j], bodies[j] = max(body, cells(h)), body
		word := widest(strings.Fields(h))
		least[j] = max(body, word)
		if !t.numeric[j] {
			least[j] = max(min(body, narrowestText), longestWord(t.cells[j], body), min(word, width))
		}
		if t.paired[j] {
			least[j] = word
			for _, text := range t.cells[j] {
				least[j] = max(least[j], widest(splitPair(text)))
			}
		}
		total += widths[j] + tableGap
	}
	shrink := func(least func(j int) int) {
		for total > width {
			at, slack := -1, 0
			for j := range widths {
				if widths[j] > least(j) && widths[j] > slack {
					at, slack = j, widths[j]
				}
			}
			if at < 0 {
				return
			}
			widths[at]--
			total--
		}
	}
	shrink(func(j int) int { return max(least[j], bodies[j]) })
	shrink(func(j int) int { return least[j] })
	return widths, total <= width
}

// splitPair sets a conjugate pair on two lines, its imaginary part below the real one.
func splitPair(text string) []string {
	text = strings.TrimRight(text, " ")
	re, im, ok := strings.Cut(text, " ± ")
	if !ok {
		return []string{text}
	}
	indent := cells(text) - cells(strings.TrimLeft(text, " "))
	return []string{strings.TrimRight(re, " "), strings.Repeat(" ", indent) + "± " + strings.TrimLeft(im, " ")}
}

// longestWord is the longest word of a column, at most a third of a terminal's line.
func longestWord(texts []string, body int) int {
	w := 0
	for _, t := range texts {
		w = max(w, widest(strings.Fields(t)))
	}
	return min(w, 26, body)
}

// asRecords writes one block a row where the columns do not fit beside each other.
func (t *table) asRecords(width int) []string {
	w := min(widest(t.heads), width/2)
	var out []string
	for i := range t.cells[0] {
		if i > 0 {
			out = append(out, "")
		}
		for j, h := range t.heads {
			if text := strings.TrimSpace(t.cells[j][i]); text != "" {
				out = append(out, hanging(padRight(h, w)+"  ", text, width)...)
			}
		}
	}
	return out
}
