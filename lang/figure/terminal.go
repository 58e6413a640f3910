package figure

import (
	"math"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// the height of a signal's drawing in a terminal, in lines, and the least width that shows anything
const (
	terminalLines  = 5
	leastTerminal  = 30
	mostOnTerminal = 4
)

// Terminal draws a response, or the samples of a study's number, in braille dots within
// width cells; nil for any other value.
func Terminal(v value.Value, width int) []string {
	switch x := v.(type) {
	case *value.Response:
		return responseLines(x, width)
	case *value.Study:
		return studyLines(x, width)
	}
	return nil
}

// responseLines draws each of the first outputs (or inputs, or states where there are no
// others) with its range.
func responseLines(r *value.Response, width int) []string {
	n := len(r.Instants)
	if n < 2 || width < leastTerminal {
		return nil
	}
	var lines []string
	shown := 0
	for _, role := range []string{"output", "input", "state"} {
		if role == "state" && shown > 0 {
			break
		}
		for _, s := range r.Signals {
			if s.Role != role || len(s.Values) != n || shown == mostOnTerminal {
				continue
			}
			if block := signalLines(r, s, width); block != nil {
				lines = append(lines, block...)
				shown++
			}
		}
	}
	if shown == 0 {
		return nil
	}
	return append(lines, terminalFoot(r, width)...)
}

// labelCells is the room for the numbers on the left.
const labelCells = 10

func signalLines(r *value.Response, s value.Trace, width int) []string {
	low, high := math.Inf(1), math.Inf(-1)
	for _, v := range s.Values {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			low, high = math.Min(low, v), math.Max(high, v)
		}
	}
	if low > high {
		return nil
	}
	steady, level := high == low, high
	if steady {
		low, high = low-1, high+1
	}
	cells := width - labelCells - 1
	dots := newDots(cells, terminalLines)
	first, last := r.Instants[0], r.Instants[len(r.Instants)-1]
	previous := -1
	for i, v := range s.Values {
		if math.IsNaN(v) || math.IsInf(v, 0) || last <= first {
			previous = -1
			continue
		}
		x := int(math.Round((r.Instants[i] - first) / (last - first) * float64(2*cells-1)))
		y := int(math.Round((high - v) / (high - low) * float64(4*terminalLines-1)))
		dots.set(x, y)
		if previous >= 0 {
			dots.join(previous, s.Values[i-1], x, v, low, high)
		}
		previous = x
	}
	lines := []string{strings.Repeat(" ", labelCells+1) + heading(symbol(s.Name), s.Unit.Text, 0)}
	for k, row := range dots.rows() {
		label := ""
		switch {
		case steady && k == terminalLines/2:
			label = briefer(level)
		case steady:
		case k == 0:
			label = briefer(high)
		case k == terminalLines-1:
			label = briefer(low)
		}
		lines = append(lines, strings.TrimRight(padded(label)+" "+row, " ⠀"))
	}
	return lines
}

// padded sets a label at the right of its room.
func padded(s string) string {
	return strings.Repeat(" ", max(0, labelCells-len([]rune(s)))) + s
}

func terminalFoot(r *value.Response, width int) []string {
	first, last := briefer(r.Instants[0])+" s", briefer(r.Instants[len(r.Instants)-1])+" s"
	gap := max(1, width-labelCells-1-len([]rune(first))-len([]rune(last)))
	return []string{strings.Repeat(" ", labelCells+1) + first + strings.Repeat(" ", gap) + last}
}

// dots is a field of braille characters, two dots wide and four high each.
type dots struct {
	cells, lines int
	on           []uint8
}

func newDots(cells, lines int) *dots { return &dots{cells, lines, make([]uint8, cells*lines)} }

// bits of a braille character by column and row
var brailleBits = [2][4]uint8{{0x01, 0x02, 0x04, 0x40}, {0x08, 0x10, 0x20, 0x80}}

func (d *dots) set(x, y int) {
	if x >= 0 && y >= 0 && x < 2*d.cells && y < 4*d.lines {
		d.on[y/4*d.cells+x/2] |= brailleBits[x%2][y%4]
	}
}

// join fills the dots between two points.
func (d *dots) join(x0 int, v0 float64, x1 int, v1, low, high float64) {
	row := func(v float64) float64 { return (high - v) / (high - low) * float64(4*d.lines-1) }
	if math.IsNaN(v0) || math.IsInf(v0, 0) {
		return
	}
	y0, y1 := row(v0), row(v1)
	steps := max(x1-x0, int(math.Abs(y1-y0)))
	for k := 1; k < steps; k++ {
		f := float64(k) / float64(steps)
		d.set(int(math.Round(float64(x0)+f*float64(x1-x0))), int(math.Round(y0+f*(y1-y0))))
	}
}

func (d *dots) rows() []string {
	out := make([]string, d.lines)
	for i := range out {
		var b strings.Builder
		for j := range d.cells {
			b.WriteRune(rune(0x2800) + rune(d.on[i*d.cells+j]))
		}
		out[i] = b.String()
	}
	return out
}

// the height of a histogram in a terminal, in lines, and its greatest width in cells
const (
	histogramLines = 3
	widestBars     = 48
)

// studyLines draws how often the drawn samples lie where, from the smallest to the largest.
func studyLines(s *value.Study, width int) []string {
	if len(s.Results) != 1 || s.Results[0].IsTruth || width < leastTerminal {
		return nil
	}
	h := newHistogram(s, &s.Results[0], nil)
	if h == nil || h.low == h.high {
		return nil
	}
	cells := min(widestBars, width-labelCells-1)
	d := newDots(cells, histogramLines)
	counts, most := make([]int, 2*cells), 0
	for _, v := range h.drawn {
		k := min(len(counts)-1, int((v-h.low)/(h.high-h.low)*float64(len(counts))))
		counts[k]++
		most = max(most, counts[k])
	}
	for x, n := range counts {
		for y := range int(math.Ceil(float64(n) / float64(most) * 4 * histogramLines)) {
			d.set(x, 4*histogramLines-1-y)
		}
	}
	var lines []string
	for i, row := range d.rows() {
		label := ""
		if i == 0 {
			label = strconv.Itoa(most)
		} else if i == histogramLines-1 {
			label = "0"
		}
		lines = append(lines, padded(label)+" "+row)
	}
	first, last := briefer(h.low), briefer(h.high)
	if h.unit != "" {
		last += " " + h.unit
	}
	gap := max(1, cells-len([]rune(first))-len([]rune(last)))
	return append(lines, strings.Repeat(" ", labelCells+1)+first+strings.Repeat(" ", gap)+last)
}
