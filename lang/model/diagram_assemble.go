package model

import (
	"fmt"
	"sort"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// sums expresses base quantities by the diagram's inputs and the states of its blocks.
type sums struct {
	w     *wiring
	rows  []map[int]amount // of each base quantity: direct terms by base quantity
	state []map[int]amount // and by state
	done  []map[int]amount // solved: by input, then len(inputs) + state
	names []string         // of the base quantities that have one
	at    []place
}

// assemble solves for every base quantity and puts the matrices together.
func (w *wiring) assemble(statement *syntax.Diagram) *value.Plant {
	states := w.stateSignals()
	if len(states) > mostDiagramStates {
		fail(w.here(statement.Name.Span), diag.Limit, "a diagram has at most %d states; this one has %d", mostDiagramStates, len(states))
	}
	s := w.sums()
	s.solveAll()
	m, n := len(w.inputs), len(states)
	rows := make([][]value.Number, n)
	for _, b := range w.blocks {
		for i := range b.plant.Order() {
			sum := map[int]amount{}
			for j := range b.plant.Order() {
				s.addTo(sum, m+b.state+j, entryAmount(b.plant.A, i, j), b.at)
			}
			for j := range b.input {
				s.addScaled(sum, s.resolved(b.input[j].terms), entryAmount(b.plant.B, i, j), b.at)
			}
			rows[b.state+i] = s.numbers(sum, m+n, b.at)
		}
	}
	p := &value.Plant{Every: w.every, States: states, Inputs: w.inputs, Title: "diagram " + w.name, X0: w.operating(n)}
	var out [][]value.Number
	for _, o := range w.outputs {
		for k, c := range o.wire {
			out = append(out, s.numbers(s.resolved(c.terms), m+n, w.here(o.signal.Span)))
			p.Outputs = append(p.Outputs, w.outputSignal(o, k))
		}
	}
	if n == 0 && w.every == nil {
		p.Every = nil
	}
	p.B, p.A = split(rows, m, n)
	p.D, p.C = split(out, m, n)
	w.remark(p)
	return p
}

// split cuts rows by input, then state, into the two matrices.
func split(rows [][]value.Number, m, n int) (byInput, byState *value.Matrix) {
	left, right := make([][]value.Number, len(rows)), make([][]value.Number, len(rows))
	for i, row := range rows {
		left[i], right[i] = row[:m], row[m:]
	}
	return matrixOf(left, m), matrixOf(right, n)
}

// outputSignal names a component of an output: y, or y.x of a signal with several.
func (w *wiring) outputSignal(o diagramOutput, k int) value.Signal {
	out := value.Signal{Name: o.signal.Name.Name, Unit: o.wire[k].unit}
	if o.signal.Range != nil {
		declared := w.signal(o.signal)
		out.Range = declared.Range
	}
	if len(o.wire) > 1 {
		part := o.wire[k].name
		if part == "" {
			part = fmt.Sprint(k + 1)
		}
		out.Name += "." + part
	}
	return out
}

// stateSignals joins the states of the blocks. Where a name would stand twice, and for
// the states that a transfer function was given, the block's label is added: x1_H.
func (w *wiring) stateSignals() []value.Signal {
	count := map[string]int{}
	for _, b := range w.blocks {
		for _, x := range b.plant.States {
			count[x.Name]++
		}
	}
	labels := map[string]int{}
	for _, b := range w.blocks {
		if labels[b.label]++; labels[b.label] > 1 {
			b.label += subscripts(labels[b.label])
		}
	}
	var out []value.Signal
	taken := map[string]bool{}
	for _, b := range w.blocks {
		b.state = len(out)
		for _, x := range b.plant.States {
			if count[x.Name] > 1 || madeUp(b.plant) {
				x.Name += "_" + b.label
			}
			for base, next := x.Name, 2; taken[x.Name]; next++ {
				x.Name = base + subscripts(next)
			}
			taken[x.Name] = true
			out = append(out, x)
		}
	}
	return out
}

func subscripts(n int) string {
	return strings.Map(func(r rune) rune { return '₀' + r - '0' }, fmt.Sprint(n))
}

// madeUp tells whether the states have the names that a realisation gives: x, or x1, x2, ….
func madeUp(p *value.Plant) bool {
	names := value.DefaultSignals("x", len(p.States))
	for k, x := range p.States {
		if x.Name != names[k].Name || !x.Unit.IsNone() {
			return false
		}
	}
	return p.X0 == nil
}

// operating joins the operating points of the blocks' states; nil when all are at zero.
func (w *wiring) operating(n int) []value.Number {
	out := make([]value.Number, n)
	rests := true
	for k := range out {
		out[k] = value.Int(0)
	}
	for _, b := range w.blocks {
		for k, x := range b.plant.X0 {
			out[b.state+k] = x
			rests = rests && x.IsZero()
		}
	}
	if rests {
		return nil
	}
	return out
}

// remark notes solved loops, unused inputs and operating points.
func (w *wiring) remark(p *value.Plant) {
	p.Notes = append(p.Notes, w.notes...)
	for _, loop := range w.loops {
		p.Notes = append(p.Notes, "the algebraic loop "+loop+" was solved")
	}
	var about []string
	for _, b := range w.blocks {
		for _, list := range [...][]value.Number{b.plant.X0, b.plant.U0, b.plant.Y0} {
			for _, x := range list {
				if !x.IsZero() && !contains(about, b.label) {
					about = append(about, b.label)
				}
			}
		}
	}
	if len(about) > 0 {
		p.Notes = append(p.Notes, "signals are deviations from the operating point of "+listed(about))
	}
	for _, n := range w.order {
		if n.expr == nil && !n.used {
			p.Notes = append(p.Notes, "no line uses the input "+n.name.Name)
		}
	}
}

// sums collects the equations of the base quantities.
func (w *wiring) sums() *sums {
	s := &sums{w: w, rows: make([]map[int]amount, w.bases), state: make([]map[int]amount, w.bases),
		done: make([]map[int]amount, w.bases), names: make([]string, w.bases), at: make([]place, w.bases)}
	input := 0
	for _, n := range w.order {
		for k := range n.shape {
			i := n.first + k
			s.names[i], s.at[i] = n.name.Name, w.here(n.name.Span)
			if n.expr == nil {
				s.done[i] = map[int]amount{input: oneAmount}
				input++
				continue
			}
			s.rows[i] = n.shape[k].terms
		}
	}
	for _, b := range w.blocks {
		outputs, _ := b.plant.D.Dims()
		for i := range outputs {
			row, state := map[int]amount{}, map[int]amount{}
			for j := range b.input {
				s.addScaled(row, b.input[j].terms, entryAmount(b.plant.D, i, j), b.at)
			}
			for j := range b.plant.Order() {
				s.addTo(state, b.state+j, entryAmount(b.plant.C, i, j), b.at)
			}
			s.rows[b.first+i], s.state[b.first+i], s.at[b.first+i] = row, state, b.at
		}
	}
	return s
}

func entryAmount(m *value.Matrix, i, j int) amount {
	n, _ := m.At(i, j).(value.Number)
	return amount{n: n}
}

func isNothing(a amount) bool { return a.isExact() && a.isZero() }

func (s *sums) addTo(sum map[int]amount, k int, x amount, at place) {
	if x.isZero() && (x.isExact() || x.n.Err == 0) {
		return
	}
	if old, ok := sum[k]; ok {
		total, err := old.add(x)
		if err != nil {
			failWith(at, asError(err))
		}
		x = total
	}
	if sum[k] = x; isNothing(x) {
		delete(sum, k)
	}
}

func (s *sums) addScaled(sum, terms map[int]amount, by amount, at place) {
	if by.isZero() {
		return
	}
	for _, k := range sortedKeys(terms) {
		x, err := terms[k].multiply(by)
		if err != nil {
			failWith(at, asError(err))
		}
		s.addTo(sum, k, x, at)
	}
}

// sortedKeys makes floating sums the same in every run.
func sortedKeys(terms map[int]amount) []int {
	keys := make([]int, 0, len(terms))
	for k := range terms {
		keys = append(keys, k)
	}
	sort.Ints(keys)
	return keys
}

// resolved expresses a sum of solved base quantities by inputs and states.
func (s *sums) resolved(terms map[int]amount) map[int]amount {
	out := map[int]amount{}
	for _, k := range sortedKeys(terms) {
		s.addScaled(out, s.done[k], terms[k], s.at[k])
	}
	return out
}

func (s *sums) numbers(terms map[int]amount, size int, at place) []value.Number {
	out := make([]value.Number, size)
	for k := range out {
		out[k] = value.Int(0)
		if a, ok := terms[k]; ok {
			n, err := a.number()
			if err != nil {
				failWith(at, asError(err))
			}
			out[k] = n
		}
	}
	return out
}

// solveAll solves group by group: the strongly connected components of the direct terms
// in the order in which they depend on each other (Tarjan 1972).
func (s *sums) solveAll() {
	t := &tarjan{s: s, index: make([]int, len(s.rows)), low: make([]int, len(s.rows)), on: make([]bool, len(s.rows))}
	for i := range s.rows {
		if s.done[i] == nil && t.index[i] == 0 {
			t.visit(i)
		}
	}
}

type tarjan struct {
	s          *sums
	index, low []int
	on         []bool
	stack      []int
	next       int
}

func (t *tarjan) visit(i int) {
	t.next++
	t.index[i], t.low[i], t.on[i] = t.next, t.next, true
	t.stack = append(t.stack, i)
	for _, k := range sortedKeys(t.s.rows[i]) {
		switch {
		case t.s.done[k] != nil:
		case t.index[k] == 0:
			t.visit(k)
			t.low[i] = min(t.low[i], t.low[k])
		case t.on[k]:
			t.low[i] = min(t.low[i], t.index[k])
		}
	}
	if t.low[i] != t.index[i] {
		return
	}
	var group []int
	for {
		k := t.stack[len(t.stack)-1]
		t.stack = t.stack[:len(t.stack)-1]
		t.on[k] = false
		group = append(group, k)
		if k == i {
			break
		}
	}
	t.s.solveGroup(group)
}

// known gives what a quantity gets from states and from quantities solved before.
func (s *sums) known(i int) map[int]amount {
	out := map[int]amount{}
	for _, k := range sortedKeys(s.state[i]) {
		s.addTo(out, len(s.w.inputs)+k, s.state[i][k], s.at[i])
	}
	for _, k := range sortedKeys(s.rows[i]) {
		if s.done[k] != nil {
			s.addScaled(out, s.done[k], s.rows[i][k], s.at[i])
		}
	}
	return out
}

// solveGroup solves one quantity, or the several of an algebraic loop: (I − M)·w = known.
func (s *sums) solveGroup(group []int) {
	_, itself := s.rows[group[0]][group[0]]
	if len(group) == 1 && !itself {
		s.done[group[0]] = s.known(group[0])
		return
	}
	rows := make([][]value.Number, len(group))
	known := make([]map[int]amount, len(group))
	for i, q := range group {
		known[i] = s.known(q)
		rows[i] = make([]value.Number, len(group))
		for j, r := range group {
			x := s.rows[q][r].orZero().negate()
			if i == j {
				var err error
				if x, err = x.add(oneAmount); err != nil {
					failWith(s.at[q], asError(err))
				}
			}
			n, err := x.number()
			if err != nil {
				failWith(s.at[q], asError(err))
			}
			rows[i][j] = n
		}
	}
	loop, at := s.loop(group)
	inverse, err := value.InvertMatrix(matrixOf(rows, len(group)))
	if err != nil {
		failWith(at, diag.New(diag.Numerical, "the algebraic loop %s has no solution: what goes round it comes back with the factor 1", loop).
			WithHelp("a delay or a lag somewhere in the loop opens it"))
	}
	for i, q := range group {
		sum := map[int]amount{}
		for j := range group {
			s.addScaled(sum, known[j], entryAmount(inverse, i, j), at)
		}
		s.done[q] = sum
	}
	s.w.loops = append(s.w.loops, loop)
}

func (a amount) orZero() amount {
	if a.n.Exact == nil && a.n.F == 0 && a.n.Err == 0 {
		return zeroAmount
	}
	return a
}

// loop names the signals of an algebraic loop in the order of the text.
func (s *sums) loop(group []int) (string, place) {
	sorted := append([]int{}, group...)
	sort.Ints(sorted)
	var names []string
	at := s.at[sorted[0]]
	for _, i := range sorted {
		if s.names[i] != "" && !contains(names, s.names[i]) {
			names = append(names, s.names[i])
		}
	}
	if len(names) > 0 {
		names = append(names, names[0])
	}
	return strings.Join(names, " → "), at
}
