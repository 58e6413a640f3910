package value

import (
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// Subscript is one index, or the range Low..High when High is not nil. Both count from 1;
// channels and named rows may be given by name.
type Subscript struct{ Low, High Value }

// Indexable is a value of another family that can be indexed, such as a response.
type Indexable interface {
	Value
	Index(subscripts []Subscript) (Value, error)
}

// Index gives v[subscripts]: entries and parts of matrices, items of lists, channels of
// systems, entries of gains, rows and cells of reports. On error at is the subscript at
// fault, from 0, or −1.
func Index(v Value, subscripts []Subscript) (result Value, at int, err error) {
	need := func(n int, form string) error {
		if len(subscripts) == n {
			return nil
		}
		many := "one index"
		if n == 2 {
			many = "two indices"
		}
		return diag.New(diag.Shape, "%s takes %s, as in %s; there are %d here", Describe(v), many, form, len(subscripts))
	}
	switch x := Force(v).(type) {
	case *List:
		if err := need(1, "L[2]"); err != nil {
			return nil, -1, err
		}
		return indexList(x, subscripts[0])
	case *Matrix:
		if len(subscripts) == 1 && (x.rows == 1 || x.cols == 1) {
			return indexVector(x, subscripts[0])
		}
		if err := need(2, "A[1, 2]"); err != nil {
			return nil, -1, err
		}
		return indexGrid(x, subscripts, x.Rows, x.Columns)
	case *Gain:
		if err := need(2, "K[1, 2]"); err != nil {
			return nil, -1, err
		}
		return indexGrid(x.Values, subscripts, namesOf(x.RowSignals), namesOf(x.ColumnSignals))
	case *Model:
		return Index(x.Plant, subscripts)
	case *Plant:
		if err := need(2, `P["y", "u"]`); err != nil {
			return nil, -1, err
		}
		return indexPlant(x, subscripts)
	case *Transfer:
		if err := need(2, "G[1, 2]"); err != nil {
			return nil, -1, err
		}
		return indexTransfer(x, subscripts)
	case *Report:
		return indexReport(x, subscripts)
	case Indexable:
		result, err = x.Index(subscripts)
		return result, -1, err
	}
	e := diag.New(diag.Type, "%s cannot be indexed", Describe(v))
	if v.Kind() == KPolynomial {
		e = e.WithHelp("coefficients(p) lists the coefficients, highest power first")
	}
	return nil, -1, e
}

func namesOf(signals []Signal) []string {
	out := make([]string, len(signals))
	for k, s := range signals {
		out[k] = s.Name
	}
	return out
}

func wholeRange(n int) []int {
	out := make([]int, n)
	for k := range out {
		out[k] = k
	}
	return out
}

// axis is what a subscript runs along.
type axis struct {
	noun  string // "row", "column", "item", "output", "input"
	size  int
	names []string
}

// position finds one index, from 0.
func (a axis) position(v Value) (int, error) {
	switch x := Force(v).(type) {
	case Text:
		for k, name := range a.names {
			// a label carries its unit: "x [m]"
			if plain, _, _ := strings.Cut(name, " ["); name == string(x) || plain == string(x) {
				return k, nil
			}
		}
		e := diag.New(diag.Name, "there is no %s named %q", a.noun, shorten(string(x)))
		if len(a.names) == 0 {
			return 0, e.WithHelp("the %ss have no names here; they are numbered from 1 to %d", a.noun, a.size)
		}
		if near := Nearest(string(x), a.names); near != "" {
			return 0, e.WithHelp("did you mean %q?", near)
		}
		return 0, e.WithHelp("the %ss are %s", a.noun, shorten(strings.Join(a.names, ", ")))
	case Number:
		k, ok := x.Whole()
		if !ok {
			return 0, diag.New(diag.Type, "an index is a whole number; this one is %s", brief(x))
		}
		if k < 1 || k > a.size {
			if a.size == 0 {
				return 0, diag.New(diag.Shape, "there is no %s %d: there are none", a.noun, k)
			}
			return 0, diag.New(diag.Shape, "there is no %s %d: they are numbered from 1 to %d", a.noun, k, a.size)
		}
		return k - 1, nil
	}
	return 0, diag.New(diag.Type, "an index is a whole number or a name; this one is %s", Describe(v))
}

// positions finds the indices of a subscript; single tells that it was one index.
func (a axis) positions(s Subscript) (at []int, single bool, err error) {
	if l, ok := Force(s.Low).(*List); ok && s.High == nil {
		for _, item := range l.Items {
			k, err := a.position(item)
			if err != nil {
				return nil, false, err
			}
			at = append(at, k)
		}
		return at, false, nil
	}
	low, err := a.position(s.Low)
	if err != nil || s.High == nil {
		return []int{low}, true, err
	}
	high, err := a.position(s.High)
	if err != nil {
		return nil, false, err
	}
	if high < low {
		return nil, false, diag.New(diag.Shape, "the range %d..%d runs backwards", low+1, high+1)
	}
	for k := low; k <= high; k++ {
		at = append(at, k)
	}
	return at, false, nil
}

func indexList(l *List, s Subscript) (Value, int, error) {
	at, single, err := axis{"item", len(l.Items), nil}.positions(s)
	if err != nil {
		return nil, 0, err
	}
	if single {
		return Force(l.Items[at[0]]), 0, nil
	}
	out := &List{Items: make([]Value, len(at))}
	for k, i := range at {
		out.Items[k] = l.Items[i]
	}
	return out, 0, nil
}

func indexVector(m *Matrix, s Subscript) (Value, int, error) {
	if m.cols == 1 {
		at, single, err := axis{"entry", m.rows, m.Rows}.positions(s)
		if err != nil {
			return nil, 0, err
		}
		if single {
			return m.At(at[0], 0), 0, nil
		}
		return m.slice(at, []int{0}), 0, nil
	}
	at, single, err := axis{"entry", m.cols, m.Columns}.positions(s)
	if err != nil {
		return nil, 0, err
	}
	if single {
		return m.At(0, at[0]), 0, nil
	}
	return m.slice([]int{0}, at), 0, nil
}

// twoAxes resolves a row and a column subscript.
func twoAxes(subscripts []Subscript, first, second axis) (rows, cols []int, single bool, at int, err error) {
	rows, one, err := first.positions(subscripts[0])
	if err != nil {
		return nil, nil, false, 0, err
	}
	cols, other, err := second.positions(subscripts[1])
	return rows, cols, one && other, 1, err
}

func indexGrid(m *Matrix, subscripts []Subscript, rowNames, columnNames []string) (Value, int, error) {
	rows, cols, single, at, err := twoAxes(subscripts, axis{"row", m.rows, rowNames}, axis{"column", m.cols, columnNames})
	if err != nil {
		return nil, at, err
	}
	if single {
		return m.At(rows[0], cols[0]), 0, nil
	}
	out := m.slice(rows, cols)
	out.Rows, out.Columns = pick(rowNames, rows), pick(columnNames, cols)
	return out, 0, nil
}

func pick[T any](all []T, at []int) []T {
	if len(all) == 0 {
		return nil
	}
	out := make([]T, 0, len(at))
	for _, k := range at {
		if k < len(all) {
			out = append(out, all[k])
		}
	}
	return out
}

// slice copies rows and columns, names included.
func (m *Matrix) slice(rows, cols []int) *Matrix {
	var out *Matrix
	if m.exactRe != nil {
		part := func(from *exact.Matrix) *exact.Matrix { return from.Rows(rows...).Columns(cols...) }
		out = ExactMatrix(part(m.exactRe))
		if m.exactIm != nil {
			out = ExactComplexMatrix(part(m.exactRe), part(m.exactIm))
		}
	} else {
		part := func(from []float64) []float64 {
			if from == nil {
				return nil
			}
			to := make([]float64, 0, len(rows)*len(cols))
			for _, i := range rows {
				for _, j := range cols {
					to = append(to, from[i*m.cols+j])
				}
			}
			return to
		}
		out = FloatComplexMatrix(len(rows), len(cols), part(m.re), part(m.im), m.Err)
	}
	out.Rows, out.Columns = pick(m.Rows, rows), pick(m.Columns, cols)
	return out
}

// Row gives row i (from 1) as a 1×n matrix, Column column j as an n×1 matrix.
func (m *Matrix) Row(i int) (*Matrix, error) {
	k, err := axis{"row", m.rows, nil}.position(Int(i))
	if err != nil {
		return nil, err
	}
	return m.slice([]int{k}, wholeRange(m.cols)), nil
}

// Column gives column j (from 1) as an n×1 matrix.
func (m *Matrix) Column(j int) (*Matrix, error) {
	k, err := axis{"column", m.cols, nil}.position(Int(j))
	if err != nil {
		return nil, err
	}
	return m.slice(wholeRange(m.rows), []int{k}), nil
}

func indexPlant(p *Plant, subscripts []Subscript) (Value, int, error) {
	rows, cols, _, at, err := twoAxes(subscripts,
		axis{"output", p.outputCount(), namesOf(p.Outputs)}, axis{"input", p.inputCount(), namesOf(p.Inputs)})
	if err != nil {
		return nil, at, err
	}
	all := wholeRange(p.Order())
	return &Plant{A: p.A, B: p.B.slice(all, cols), C: p.C.slice(rows, all), D: p.D.slice(rows, cols), Every: p.Every,
		States: p.States, Inputs: pick(p.Inputs, cols), Outputs: pick(p.Outputs, rows),
		X0: p.X0, U0: pick(p.U0, cols), Y0: pick(p.Y0, rows), Origin: p.Origin}, 0, nil
}

func indexTransfer(t *Transfer, subscripts []Subscript) (Value, int, error) {
	p, m := t.Dims()
	rows, cols, _, at, err := twoAxes(subscripts,
		axis{"output", p, namesOf(t.Outputs)}, axis{"input", m, namesOf(t.Inputs)})
	if err != nil {
		return nil, at, err
	}
	out := &Transfer{Variable: t.Variable, Every: t.Every, Inputs: pick(t.Inputs, cols), Outputs: pick(t.Outputs, rows)}
	for _, i := range rows {
		out.Entries = append(out.Entries, pick(t.Entries[i], cols))
	}
	return out, 0, nil
}

// row gives a row of a report's table as a list; a blank cell is an empty text.
func (r *Report) row(i int) *List {
	out := &List{Items: make([]Value, len(r.Rows[i]))}
	for k, cell := range r.Rows[i] {
		out.Items[k] = cellOf(cell)
	}
	return out
}

func cellOf(v Value) Value {
	if v == nil {
		return Text("")
	}
	return Force(v)
}

func indexReport(r *Report, subscripts []Subscript) (Value, int, error) {
	if text, ok := subscripts[0].Low.(Text); ok && len(subscripts) == 1 && subscripts[0].High == nil {
		v, err := Field(r, string(text))
		return v, 0, err
	}
	if len(r.Columns) == 0 || len(subscripts) > 2 {
		return nil, -1, diag.New(diag.Type, "this report has fields, not rows").WithHelp("fields(v) lists them; r.name reads one")
	}
	if len(subscripts) == 1 {
		at, single, err := axis{"row", len(r.Rows), nil}.positions(subscripts[0])
		if err != nil {
			return nil, 0, err
		}
		if single {
			return r.row(at[0]), 0, nil
		}
		out := &List{}
		for _, i := range at {
			out.Items = append(out.Items, r.row(i))
		}
		return out, 0, nil
	}
	rows, cols, single, at, err := twoAxes(subscripts, axis{"row", len(r.Rows), nil}, axis{"column", len(r.Columns), r.columnNames()})
	if err != nil {
		return nil, at, err
	}
	out := &List{}
	for _, i := range rows {
		for _, j := range cols {
			if j < len(r.Rows[i]) {
				out.Items = append(out.Items, cellOf(r.Rows[i][j]))
			}
		}
	}
	if single && len(out.Items) == 1 {
		return out.Items[0], 0, nil
	}
	return out, 0, nil
}

// columnNames gives the heads without their units.
func (r *Report) columnNames() []string {
	out := make([]string, len(r.Columns))
	for k, head := range r.Columns {
		if cut := strings.Index(head, "["); cut > 0 {
			head = head[:cut]
		}
		out[k] = strings.TrimSpace(head)
	}
	return out
}
