package files

import (
	"math/big"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// marketReader reads the NIST Matrix Market exchange format (Boisvert, Pozo & Remington 1996, NISTIR 5935).
type marketReader struct {
	c                      *value.Call
	coordinate             bool
	field, symmetry        string
	rows, columns, entries int
	entriesOf              *store
	line                   int
}

func matrixMarket(c *value.Call, text string) (value.Value, error) {
	m := &marketReader{c: c}
	sized, done := false, 0
	i, j := 0, 0
	for line := range strings.Lines(text) {
		m.line++
		line = strings.TrimSpace(line)
		if m.line == 1 {
			if err := m.banner(line); err != nil {
				return nil, err
			}
			continue
		}
		if line == "" || strings.HasPrefix(line, "%") {
			continue
		}
		words := strings.Fields(line)
		if !sized {
			if err := m.sizes(words); err != nil {
				return nil, err
			}
			sized, i = true, m.firstRow(0)
			continue
		}
		if done == m.entries {
			return nil, placed(c, m.line, "more entries than the %d announced", m.entries)
		}
		done++
		if m.coordinate {
			if err := m.entry(words); err != nil {
				return nil, err
			}
			continue
		}
		if err := m.store(i, j, words); err != nil {
			return nil, err
		}
		if i++; i == m.rows { // columns run first; symmetric kinds store the lower triangle
			j++
			i = m.firstRow(j)
		}
	}
	if !sized {
		return nil, placed(c, m.line, "the line of sizes is missing")
	}
	if done != m.entries {
		return nil, placed(c, m.line, "%d entries were announced, %d are there", m.entries, done)
	}
	return m.entriesOf.matrix(c), nil
}

// firstRow is where column j of a dense file begins.
func (m *marketReader) firstRow(j int) int {
	switch m.symmetry {
	case "symmetric", "hermitian":
		return j
	case "skew-symmetric":
		return j + 1
	}
	return 0
}

func (m *marketReader) banner(line string) error {
	words := strings.Fields(strings.ToLower(line))
	if len(words) != 5 || words[0] != "%%matrixmarket" || words[1] != "matrix" {
		return placed(m.c, 1, "the first line must read %%%%MatrixMarket matrix, a format, a field and a symmetry")
	}
	m.coordinate, m.field, m.symmetry = words[2] == "coordinate", words[3], words[4]
	if !m.coordinate && words[2] != "array" {
		return placed(m.c, 1, "the format %q is not known; it is array or coordinate", words[2])
	}
	switch m.field {
	case "real", "integer", "complex", "double":
	case "pattern":
		if !m.coordinate {
			return placed(m.c, 1, "a pattern needs the coordinate format")
		}
	default:
		return placed(m.c, 1, "the field %q is not known", m.field)
	}
	switch m.symmetry {
	case "general", "symmetric", "skew-symmetric", "hermitian":
		return nil
	}
	return placed(m.c, 1, "the symmetry %q is not known", m.symmetry)
}

func (m *marketReader) sizes(words []string) error {
	want := 2
	if m.coordinate {
		want = 3
	}
	if len(words) != want {
		return placed(m.c, m.line, "the line of sizes has %d numbers; it needs %d", len(words), want)
	}
	n := make([]int, want)
	for k, w := range words {
		x, err := strconv.Atoi(w)
		if err != nil || x < 0 || x > 1e8 {
			return placed(m.c, m.line, "%q is no size", clipped(w))
		}
		n[k] = x
	}
	m.rows, m.columns = n[0], n[1]
	if m.symmetry != "general" && m.rows != m.columns {
		return placed(m.c, m.line, "a %s matrix must be square; this one is %d×%d", m.symmetry, m.rows, m.columns)
	}
	var err error
	if m.entriesOf, err = newStore(m.rows, m.columns); err != nil {
		return err
	}
	m.entries = m.rows * m.columns
	switch {
	case m.coordinate:
		m.entries = n[2]
	case m.symmetry == "skew-symmetric":
		m.entries = m.rows * (m.rows - 1) / 2
	case m.symmetry != "general":
		m.entries = m.rows * (m.rows + 1) / 2
	}
	return nil
}

// entry stores a line "row column value".
func (m *marketReader) entry(words []string) error {
	if len(words) < 2 {
		return placed(m.c, m.line, "an entry needs its row and column")
	}
	i, err1 := strconv.Atoi(words[0])
	j, err2 := strconv.Atoi(words[1])
	if err1 != nil || err2 != nil || i < 1 || j < 1 || i > m.rows || j > m.columns {
		return placed(m.c, m.line, "[%s, %s] lies outside the %d×%d matrix", clipped(words[0]), clipped(words[1]), m.rows, m.columns)
	}
	if m.field == "pattern" {
		if len(words) != 2 {
			return placed(m.c, m.line, "an entry of a pattern has no value")
		}
		return m.store(i-1, j-1, []string{"1"})
	}
	return m.store(i-1, j-1, words[2:])
}

func (m *marketReader) store(i, j int, words []string) error {
	want := 1
	if m.field == "complex" {
		want = 2
	}
	if len(words) != want {
		return placed(m.c, m.line, "%d numbers where %d are needed", len(words), want)
	}
	re, ok := number(words[0])
	if !ok {
		return placed(m.c, m.line, "%q is no number", clipped(words[0]))
	}
	im := new(big.Rat)
	if want == 2 {
		if im, ok = number(words[1]); !ok {
			return placed(m.c, m.line, "%q is no number", clipped(words[1]))
		}
	}
	m.entriesOf.add(i, j, re, im) // entries given twice are summed, as finite-element files mean them
	if i == j || m.symmetry == "general" {
		return nil
	}
	switch m.symmetry {
	case "skew-symmetric":
		re, im = new(big.Rat).Neg(re), new(big.Rat).Neg(im)
	case "hermitian":
		im = new(big.Rat).Neg(im)
	}
	m.entriesOf.add(j, i, re, im)
	return nil
}
