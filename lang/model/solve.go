package model

import (
	"fmt"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// linearise evaluates at the operating point with derivatives and keeps the matrices.
func (b *builder) linearise(p point) {
	o, err := b.lineariseAt(p)
	if err != nil {
		failWith(b.around.at, err)
	}
	o.solved = b.operating.solved
	o.free = b.operating.free
	b.operating = *o
	b.remarkSwitches(p)
	if b.around.rest && o.atRest {
		b.operating.free = b.freeDirections(p)
	}
	if !o.atRest {
		b.remarkMotion()
	}
}

// lineariseAt gives values, rates and matrices at a point.
func (m *Model) lineariseAt(p point) (*operating, *diag.Error) {
	roots := append(append([]id{}, m.rates...), m.outputs...)
	e := m.g.evaluate(p, true, roots...)
	o := &operating{point: p, atRest: true}
	var err *diag.Error
	if o.rates, err = m.residuals(e, p); err != nil {
		return nil, err
	}
	for _, r := range o.rates {
		o.atRest = o.atRest && vanishes(r)
	}
	n := len(m.States)
	for i, root := range roots {
		d, err := e.at(root)
		if err != nil {
			return nil, err
		}
		row := make([]value.Number, n+len(m.Inputs))
		for k := range row {
			row[k] = value.Int(0)
		}
		for _, part := range d.gradient {
			x, problem := part.slope.number()
			if problem != nil {
				return nil, asError(problem).At(m.statement.Name.Span).In(m.source)
			}
			row[part.variable] = x
		}
		if i < n {
			o.a, o.b = append(o.a, row[:n]), append(o.b, row[n:])
			continue
		}
		y, problem := d.value.number()
		if problem != nil {
			return nil, asError(problem).At(m.statement.Name.Span).In(m.source)
		}
		o.outputs = append(o.outputs, y)
		o.c, o.d = append(o.c, row[:n]), append(o.d, row[n:])
	}
	return o, nil
}

// matrixOf makes a matrix of rows of numbers: exact when all are.
func matrixOf(rows [][]value.Number, cols int) *value.Matrix {
	isExact := true
	for _, row := range rows {
		for _, n := range row {
			isExact = isExact && n.IsExact()
		}
	}
	if isExact {
		m := exact.NewMatrix(len(rows), cols)
		for i, row := range rows {
			for j, n := range row {
				m.Set(i, j, n.Exact)
			}
		}
		return value.ExactMatrix(m)
	}
	data, worst := make([]float64, 0, len(rows)*cols), 0.0
	for _, row := range rows {
		for _, n := range row {
			data, worst = append(data, n.Float64()), max(worst, n.ErrorEstimate())
		}
	}
	return value.FloatMatrix(len(rows), cols, data, worst)
}

// remarkSwitches notes the corners and jumps that the point stands on.
func (b *builder) remarkSwitches(p point) {
	roots := append(append([]id{}, b.rates...), b.outputs...)
	e := b.g.evaluate(p, true, roots...)
	for _, x := range e.remarks(roots...) {
		n := b.g.nodes[x]
		text := e.duals[x].remark
		if n.at.source != nil {
			line, _ := n.at.source.Position(n.at.span.Start)
			text = fmt.Sprintf("the operating point lies on a switch, %s in line %d: %s", excerpt(n.at.source, n.at.span), line, text)
		}
		b.Notes = append(b.Notes, text)
	}
}

// remarkMotion notes the rates that do not vanish.
func (b *builder) remarkMotion() {
	var parts []string
	for i, r := range b.operating.rates {
		if vanishes(r) {
			continue
		}
		if b.Every != nil {
			parts = append(parts, fmt.Sprintf("%s changes by %s each step", b.States[i].Name, shortWith(r.Float64(), b.States[i].Unit.Text)))
		} else {
			parts = append(parts, fmt.Sprintf("rate %s = %s", b.States[i].Name, shortWith(r.Float64(), b.rateUnit(i))))
		}
	}
	b.Notes = append(b.Notes, "not at rest there: "+abridged(parts))
}

// freeDirections names the directions along which the rest goes on, and says whether the
// matrices change along them.
func (b *builder) freeDirections(p point) string {
	set := b.operating.solved
	if len(set) == 0 {
		return ""
	}
	e := b.g.evaluate(p, true, b.rates...)
	var parts []string
	moving := map[int]bool{}
	for _, direction := range b.kernel(e, set) {
		parts = append(parts, b.variableNames(direction))
		if len(direction) > 1 {
			parts[len(parts)-1] += " together"
		}
		for _, v := range direction {
			moving[v] = true
		}
	}
	if len(parts) == 0 {
		return ""
	}
	verb := " is free"
	if len(moving) > 1 {
		verb = " are free"
	}
	it := "it"
	if len(moving) > 1 {
		it = "them"
	}
	text := strings.Join(parts, "; ") + verb
	if b.separable(moving) {
		return text + "; A and B do not depend on " + it
	}
	return text + "; A and B may depend on " + it
}

// kernel gives, for each direction in which the rates keep vanishing to first order, the
// variables it moves.
func (b *builder) kernel(e *evaluation, set []int) [][]int {
	column := map[int]int{}
	for j, v := range set {
		column[v] = j
	}
	rows := make([][]value.Number, len(b.States))
	isExact := len(set) <= 60
	for i := range rows {
		rows[i] = make([]value.Number, len(set))
		for j := range rows[i] {
			rows[i][j] = value.Int(0)
		}
		for _, part := range b.rateGradient(e, i) {
			j, ok := column[part.variable]
			if !ok {
				continue
			}
			n, err := part.slope.number()
			if err != nil {
				return nil
			}
			rows[i][j] = n
			isExact = isExact && n.IsExact()
		}
	}
	var out [][]int
	if isExact {
		k := matrixOf(rows, len(set)).Exact().Kernel()
		height, width := k.Dims()
		for f := range width {
			var direction []int
			for j := range height {
				if k.At(j, f).Sign() != 0 {
					direction = append(direction, set[j])
				}
			}
			out = append(out, direction)
		}
		return out
	}
	return b.floatingKernel(rows, set)
}

func (b *builder) floatingKernel(rows [][]value.Number, set []int) [][]int {
	l := newLeastNorm(len(rows), len(set))
	for i, row := range rows {
		size := 0.0
		for j, n := range row {
			l.a[i*l.cols+j] = n.Float64() * b.scale(set[j])
			size = max(size, l.a[i*l.cols+j], -l.a[i*l.cols+j])
		}
		for j := range row {
			if size > 0 {
				l.a[i*l.cols+j] /= size
			}
		}
	}
	l.factor()
	var out [][]int
	for _, v := range l.kernel() {
		var direction []int
		for j, x := range v {
			if x > 1e-9 || x < -1e-9 {
				direction = append(direction, set[j])
			}
		}
		out = append(out, direction)
	}
	return out
}

// separable tells whether the equations use the variables only in sums with constant
// factors, so that no derivative depends on them.
func (b *builder) separable(moving map[int]bool) bool {
	const (
		free      = iota // does not use them
		linear           // a sum with constant factors
		entangled        // anything else
	)
	class := make([]int, len(b.g.nodes))
	varies := make([]bool, len(b.g.nodes)) // uses any state or input
	for k, needed := range b.g.reach(b.rates...) {
		if !needed {
			continue
		}
		n := &b.g.nodes[k]
		v := n.index
		switch n.operation {
		case opInput:
			v += len(b.States)
			fallthrough
		case opState:
			varies[k] = true
			if moving[v] {
				class[k] = linear
			}
			continue
		}
		worst := free
		for _, o := range n.operands() {
			worst, varies[k] = max(worst, class[o]), varies[k] || varies[o]
		}
		keeps := n.operation == opAdd || n.operation == opSubtract || n.operation == opNegate ||
			n.operation == opMultiply && (!varies[n.a] || !varies[n.b]) || n.operation == opDivide && !varies[n.b]
		if worst == linear && !keeps {
			worst = entangled
		}
		class[k] = worst
	}
	for _, r := range b.rates {
		if class[r] == entangled {
			return false
		}
	}
	return true
}

// otherRests looks for further points of rest of nonlinear equations and notes one.
func (b *builder) otherRests(start, found point, set, equations []int) {
	if b.program == nil || len(set) > 20 || b.separable(setOf(upTo(len(b.States)+len(b.Inputs)))) {
		return
	}
	kept := b.program.plan.free
	b.program.plan.free = [][]int{set}
	defer func() { b.program.plan.free = kept }()
	if len(b.kernel(b.g.evaluate(found, true, b.rates...), set)) > 0 {
		return // a whole line of them: named as free
	}
	for _, from := range b.starts(start, set)[1:] {
		e := b.program.Evaluator()
		copy(e.x, from[:len(b.States)])
		copy(e.u, from[len(b.States):])
		if !e.solver.find(e) {
			continue
		}
		distance := 0.0
		for _, v := range set {
			d := (e.variable(v) - found.variable(v).Float64()) / (b.scale(v) + max(e.variable(v), -e.variable(v)))
			distance = max(distance, d, -d)
		}
		if distance < 1e-6 {
			continue
		}
		var parts []string
		for _, v := range set {
			parts = append(parts, b.signalOf(v).Name+" = "+shortWith(e.variable(v), b.signalOf(v).Unit.Text))
		}
		note := "it rests elsewhere too, for instance at " + abridged(parts)
		if len(b.around.find) == 0 {
			note += "; around rest, … chooses by holding a value"
		}
		b.Notes = append(b.Notes, note)
		return
	}
}

func setOf(list []int) map[int]bool {
	out := map[int]bool{}
	for _, v := range list {
		out[v] = true
	}
	return out
}
