package render

import (
	"math"
	"math/big"
	"math/cmplx"
	"strings"

	"gainwright/lang/value"
)

func abs(x float64) float64        { return math.Abs(x) }
func modulus(c complex128) float64 { return cmplx.Abs(c) }

// signalHead is a signal's name with its unit, as in a table's head.
func signalHead(s value.Signal) string {
	if s.Unit.Text == "" {
		return oneLine(s.Name)
	}
	return oneLine(s.Name) + " [" + s.Unit.Text + "]"
}

func signalHeads(signals []value.Signal) []string {
	heads := make([]string, len(signals))
	for i, s := range signals {
		heads[i] = signalHead(s)
	}
	return heads
}

// plantHeadline says in a line what a plant is.
func plantHeadline(p *value.Plant) string {
	var parts []string
	if p.Title != "" {
		parts = append(parts, p.Title)
	}
	if p.Every == nil {
		parts = append(parts, "continuous")
	} else {
		parts = append(parts, everyText(*p.Every))
	}
	n, _ := p.A.Dims()
	_, m := p.B.Dims()
	q, _ := p.C.Dims()
	parts = append(parts, count(n, "state"), count(m, "input"), count(q, "output"))
	return strings.Join(parts, ", ")
}

func layPlant(p *value.Plant, o Options) laid {
	l := laid{title: plantHeadline(p), notes: p.Notes}
	l.lines, l.sign = systemArray(p, o)
	for _, m := range []*value.Matrix{p.A, p.B, p.C, p.D} {
		if r, c := m.Dims(); !m.IsExact() && r*c > 0 && largestOf(m) > 0 {
			l.remarks = digitRemark(wholeDigits(m.Digits()), o)
			if l.remarks != nil {
				break
			}
		}
	}
	if text, s := operatingPoint(p, o); text != "" {
		l.lines = append(l.lines, "")
		l.lines = append(l.lines, hanging("around ", text, o.width()-2)...)
		l.sign = l.sign.both(s)
	}
	l.lines = append(l.lines, fieldLines(p.Extra, true, o)...)
	return l
}

func largestOf(m *value.Matrix) float64 {
	re, im := m.Floats()
	largest := 0.0
	for k := range re {
		largest = math.Max(largest, math.Abs(re[k]))
		if im != nil {
			largest = math.Max(largest, math.Abs(im[k]))
		}
	}
	return largest
}

// systemArray sets A, B over C, D as one array with named rows and columns where that
// fits, else the four matrices after each other.
func systemArray(p *value.Plant, o Options) ([]string, sign) {
	n, _ := p.A.Dims()
	_, m := p.B.Dims()
	q, _ := p.C.Dims()
	states, inputs, outputs := signalHeads(p.States), signalHeads(p.Inputs), signalHeads(p.Outputs)
	word := "rate "
	if p.Every != nil {
		word = "next "
	}
	rates := make([]string, len(p.States))
	for i, s := range p.States {
		if p.Every == nil {
			s.Unit = s.Unit.PerSecond()
		}
		rates[i] = word + signalHead(s)
	}
	if n+q <= mostRows && n+m <= mostColumns && n+m > 0 && n+q > 0 {
		g, s := arrayGrid(p, o)
		g.labels = append(append([]string{}, rates...), outputs...)
		g.heads = append(append([]string{}, states...), inputs...)
		if g.width() <= o.width()-2 {
			return g.lines(o.width()), s
		}
	}
	var lines []string
	s := unsigned
	for _, part := range []struct {
		name       string
		m          *value.Matrix
		rows, cols []string
	}{{"A", p.A, rates, states}, {"B", p.B, rates, inputs}, {"C", p.C, outputs, states}, {"D", p.D, outputs, inputs}} {
		if r, c := part.m.Dims(); r*c == 0 {
			continue
		}
		l := layNamedMatrix(part.m, part.rows, part.cols, o.narrower(4))
		lines = append(lines, labelled(part.name, l, o.narrower(2))...)
		s = s.both(l.sign)
	}
	return lines, s
}

func (g *grid) width() int {
	w := widest(g.labels)
	for j := range g.columns {
		w += gap + g.columnWidth(j)
	}
	if g.ruled > 0 {
		w += 2
	}
	return w
}

// arrayGrid aligns the columns of [A B; C D].
func arrayGrid(p *value.Plant, o Options) (*grid, sign) {
	n, _ := p.A.Dims()
	_, m := p.B.Dims()
	q, _ := p.C.Dims()
	g := &grid{}
	if n > 0 && m > 0 {
		g.ruled = n
	}
	if n > 0 && q > 0 {
		g.below = n
	}
	s := unsigned
	for j := range n + m {
		column := make([]entry, 0, n+q)
		for i := range n + q {
			var from *value.Matrix
			r, c := i, j
			switch {
			case i < n && j < n:
				from = p.A
			case i < n:
				from, c = p.B, j-n
			case j < n:
				from, r = p.C, i-n
			default:
				from, r, c = p.D, i-n, j-n
			}
			column = append(column, entryOf(matrixNumber(from, r, c), o))
		}
		s = s.both(signOf(column))
		g.columns = append(g.columns, alignColumn(column))
	}
	return g, s
}

// operatingPoint lists the signals that do not rest at zero.
func operatingPoint(p *value.Plant, o Options) (string, sign) {
	var parts []string
	s := unsigned
	listed := map[string]bool{}
	add := func(signals []value.Signal, at []value.Number) {
		for i, n := range at {
			if i >= len(signals) || (n.Exact != nil && n.Exact.Sign() == 0) || listed[signalHead(signals[i])] {
				continue // an output that shows a state is not repeated
			}
			listed[signalHead(signals[i])] = true
			f := figureOf(n, o)
			s = s.both(f.sign)
			equal := " = "
			if f.sign != exactly {
				equal = " ≈ "
			}
			parts = append(parts, oneLine(signals[i].Name)+equal+withUnit(f.text(), signals[i].Unit.Text))
		}
	}
	add(p.States, p.X0)
	add(p.Inputs, p.U0)
	add(p.Outputs, p.Y0)
	return strings.Join(parts, ", "), unsigned
}

func layGain(g *value.Gain, o Options) laid {
	rows, cols := g.Values.Rows, g.Values.Columns
	if len(g.RowSignals) > 0 {
		rows = signalHeads(g.RowSignals)
	}
	if len(g.ColumnSignals) > 0 {
		cols = signalHeads(g.ColumnSignals)
	}
	l := layNamedMatrix(g.Values, rows, cols, o)
	if !l.isBlock() {
		l.lines, l.inline = []string{l.inline}, ""
	}
	title := g.Role
	if title == "state feedback" {
		title = "state feedback, u = -K*x"
		if anyNonzero(g.X0) || anyNonzero(g.U0) {
			title = "state feedback, u = u₀ - K*(x - x₀)"
		}
	}
	if l.title != "" && title != "" {
		title += ", "
	}
	l.title = title + l.title
	l.notes = append(l.notes, g.Remarks()...)
	if g.Free {
		l.notes = append(l.notes, "several gains give these poles; this is one of them")
	}
	if fields := gainFields(g); len(fields) > 0 {
		l.lines = append(append(l.lines, ""), layNamed(fields, o.narrower(2))...)
	}
	return l
}

func anyNonzero(numbers []value.Number) bool {
	for _, n := range numbers {
		if n.Float64() != 0 || n.Err != 0 {
			return true
		}
	}
	return false
}

func gainFields(g *value.Gain) []value.Named {
	var fields []value.Named
	if len(g.Poles) > 0 {
		fields = append(fields, value.Named{Name: "poles it gives", Value: &value.List{Items: g.Poles}})
	}
	for _, f := range []struct {
		name string
		n    *value.Number
	}{{"sensitivity", g.Sensitivity}, {"residual", g.Residual}, {"condition", g.Condition}} {
		if f.n != nil {
			fields = append(fields, value.Named{Name: f.name, Value: *f.n})
		}
	}
	if g.Method != "" {
		fields = append(fields, value.Named{Name: "method", Value: value.Text(g.Method)})
	}
	return append(fields, g.Extra...)
}

// everyText is a sample time in the unit that suits it.
func everyText(n value.Number) string {
	seconds := n.Float64()
	for _, u := range []struct {
		least float64
		scale int64
		name  string
	}{{0.1, 1, "s"}, {1e-4, 1000, "ms"}, {0, 1_000_000, "us"}} {
		if seconds < u.least {
			continue
		}
		if n.Exact != nil {
			n = value.Rat(new(big.Rat).Mul(n.Exact, big.NewRat(u.scale, 1)))
		} else {
			n.F, n.Err = n.F*float64(u.scale), n.Err*float64(u.scale)
		}
		return "every " + inlineNumber(n, Options{}) + " " + u.name
	}
	return "every " + inlineNumber(n, Options{}) + " s"
}
