package eval

import (
	"math"
	"math/cmplx"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// eigenvalueKernel is what Options gave for small eigenvalue problems.
type eigenvalueKernel struct {
	make  func() func(eigenvalues []complex128, matrix []float64) bool
	limit int
}

// flatProgram is the body of a study as functions over plain numbers, made once and free
// of allocation. It knows the figures of closed loops that studies are mostly made of;
// any other body is left to the evaluator.
type flatProgram struct {
	study   *study
	entries []flatNumber
	buffers []int // the sizes of the room that a machine needs
	order   int   // of the largest system
}

// flatNumber gives a number for the sample that a machine stands at.
type flatNumber func(m *machine) float64

// flatSystem is a system's matrices A and B, row-major.
type flatSystem struct {
	states, inputs int
	period         float64 // 0 when continuous
	a, b           func(m *machine) []float64
}

// machine runs a flat program on one goroutine.
type machine struct {
	*worker
	program *flatProgram
	room    [][]float64
	solve   func(eigenvalues []complex128, matrix []float64) bool
	poles   []complex128
	scratch []float64
	unsure  bool // the figures do not settle this sample: the evaluator must
	twinned bool
}

// flatten makes the flat program of the study's body, nil when the body has none or
// when it does not agree with the evaluator at the nominal sample.
func (s *study) flatten(w *worker, nominal []float64) *flatProgram {
	if s.session.eigenvalues.make == nil {
		return nil
	}
	for _, m := range s.models {
		if m.program == nil {
			return nil
		}
	}
	p := &flatProgram{study: s}
	l := &flattening{program: p, worker: w, session: s.session, source: s.source}
	for _, e := range s.entries {
		n, ok := l.node(e.expr)
		if !ok || n.number == nil {
			return nil
		}
		p.entries = append(p.entries, n.number)
	}
	machine := p.machine(w)
	if failed, _ := w.linearise(0); failed != nil {
		return nil
	}
	for k, number := range p.entries {
		got := number(machine)
		difference := math.Abs(got - nominal[k])
		if machine.unsure || !(difference <= 1e-7*math.Abs(nominal[k]) || difference <= 1e-12) {
			return nil
		}
		if !s.value.Results[k].Unit.IsNone() {
			return nil
		}
	}
	return p
}

// machine makes the room for one goroutine; of no program there is none.
func (p *flatProgram) machine(w *worker) *machine {
	if p == nil {
		return nil
	}
	m := &machine{worker: w, program: p, solve: p.study.session.eigenvalues.make()}
	for _, size := range p.buffers {
		m.room = append(m.room, make([]float64, size))
	}
	m.poles = make([]complex128, p.order)
	m.scratch = make([]float64, p.order*p.order)
	return m
}

// sample computes one sample.
func (m *machine) sample(sample, at int) {
	results := m.study.value.Results
	if failed, _ := m.linearise(sample); failed != nil {
		for k := range results {
			results[k].Values[at] = math.NaN()
		}
		return
	}
	m.unsure = false
	for k, number := range m.program.entries {
		v := number(m)
		results[k].Values[at] = v
		m.unsure = m.unsure || v != v
	}
	if m.unsure {
		if !m.twinned {
			m.task.session, m.twinned = m.study.session.twin(), true
		}
		m.ordinary(sample, at)
	}
}

// eigenvalues finds a system's poles; nil when the kernel failed.
func (m *machine) eigenvalues(s *flatSystem) []complex128 {
	n := s.states
	work := m.scratch[:n*n]
	copy(work, s.a(m))
	size := 0.0
	for _, x := range work {
		size = math.Max(size, math.Abs(x))
	}
	poles := m.poles[:n]
	if !m.solve(poles, work) {
		m.unsure = true
		return nil
	}
	for _, p := range poles {
		// What cannot be told from a pole at the origin is left to the evaluator, which knows.
		if d := cmplx.Abs(p); d != 0 && d <= 0x1p-48*size {
			m.unsure = true
		}
	}
	return poles
}

// leastDamping is the smallest −Re p/|p|, with p = ln z/T of a sampled system.
func leastDamping(m *machine, s *flatSystem) float64 {
	least := math.Inf(1)
	for _, p := range m.eigenvalues(s) {
		figure := 0.0
		if s.period > 0 {
			if p == 0 {
				continue
			}
			p = cmplx.Log(p)
		}
		re, im := real(p), imag(p)
		switch {
		case im == 0 && re < 0:
			figure = 1
		case im == 0 && re > 0:
			figure = -1
		case im != 0:
			figure = -re / math.Sqrt(re*re+im*im)
		}
		least = math.Min(least, figure)
	}
	if math.IsInf(least, 1) {
		least = 1 // all at z = 0
	}
	return least
}

// slowestDecay is the smallest −Re p.
func slowestDecay(m *machine, s *flatSystem) float64 {
	least := math.Inf(1)
	for _, p := range m.eigenvalues(s) {
		figure := -real(p)
		if s.period > 0 {
			if p == 0 {
				continue
			}
			figure = -math.Log(cmplx.Abs(p)) / s.period
		}
		least = math.Min(least, figure)
	}
	if math.IsInf(least, 1) {
		m.unsure = true
	}
	return least
}

// flattening turns expressions into nodes of a flat program.
type flattening struct {
	program *flatProgram
	worker  *worker
	session *Session
	source  *diag.Source
	locals  map[string]flatNode // the parameters of the function being written out
	library bool
	depth   int
}

// flatNode is a number, a system, or a value that no sample changes.
type flatNode struct {
	number   flatNumber
	system   *flatSystem
	constant value.Value
}

// deepest nesting of what is flattened, functions written out
const deepestFlat = 100

func (l *flattening) node(e syntax.Expr) (flatNode, bool) {
	if l.depth++; l.depth > deepestFlat {
		return flatNode{}, false
	}
	defer func() { l.depth-- }()
	switch e := e.(type) {
	case *syntax.Name:
		if n, ok := l.locals[e.Name]; ok {
			return n, true
		}
		if k := l.sampled(e.Name); k >= 0 {
			return l.model(k)
		}
	case *syntax.Unary:
		if e.Op == "-" {
			if x, ok := l.number(e.X); ok {
				return flatNode{number: func(m *machine) float64 { return -x(m) }}, true
			}
		}
		return flatNode{}, false
	case *syntax.Binary:
		return l.binary(e)
	case *syntax.If:
		return l.choice(e)
	case *syntax.Call:
		if n, ok := l.call(e); ok {
			return n, true
		}
	}
	return l.constant(e)
}

// sampled finds a model by the name that stands in the user's text; −1 for another name.
func (l *flattening) sampled(name string) int {
	if l.library {
		return -1
	}
	for k, m := range l.worker.study.models {
		if m.name == name {
			return k
		}
	}
	return -1
}

func (l *flattening) model(k int) (flatNode, bool) {
	m := l.worker.study.models[k]
	s := &flatSystem{a: func(m *machine) []float64 { return m.flats[k].A }, b: func(m *machine) []float64 { return m.flats[k].B }}
	s.states, s.inputs, _ = m.program.Sizes()
	if m.model.Every != nil {
		s.period = m.model.Every.Float64()
	}
	if s.states == 0 || s.states > l.session.eigenvalues.limit {
		return flatNode{}, false
	}
	l.program.order = max(l.program.order, s.states)
	return flatNode{system: s}, true
}

// number gives an expression's number.
func (l *flattening) number(e syntax.Expr) (flatNumber, bool) {
	n, ok := l.node(e)
	if !ok {
		return nil, false
	}
	return n.number, n.number != nil
}

// constant evaluates once what reaches no sampled model.
func (l *flattening) constant(e syntax.Expr) (flatNode, bool) {
	if len(l.locals) > 0 || l.library {
		if _, isNumber := e.(*syntax.Number); !isNumber {
			return flatNode{}, false
		}
	}
	lower := &lowering{session: l.session, source: l.source}
	code := lower.compile(e, false)
	if lower.err != nil {
		return flatNode{}, false
	}
	l.worker.task.reached = false
	v, err := l.worker.evaluate(entry{code: code})
	if err != nil || l.worker.task.reached {
		return flatNode{}, false
	}
	n := flatNode{constant: value.Force(v)}
	if x, ok := n.constant.(value.Number); ok {
		f := x.Float64()
		n.number = func(*machine) float64 { return f }
	}
	return n, true
}

var flatOperators = map[string]func(a, b float64) float64{
	"+": func(a, b float64) float64 { return a + b }, "-": func(a, b float64) float64 { return a - b },
	"*": func(a, b float64) float64 { return a * b }, "/": func(a, b float64) float64 { return a / b },
	"<": func(a, b float64) float64 { return truthNumber(a < b) }, "<=": func(a, b float64) float64 { return truthNumber(a <= b) },
	">": func(a, b float64) float64 { return truthNumber(a > b) }, ">=": func(a, b float64) float64 { return truthNumber(a >= b) },
}

func (l *flattening) binary(e *syntax.Binary) (flatNode, bool) {
	op, ok := flatOperators[e.Op]
	if !ok {
		return l.constant(e)
	}
	left, ok := l.number(e.L)
	if !ok {
		return l.constant(e)
	}
	right, ok := l.number(e.R)
	if !ok {
		return l.constant(e)
	}
	if e.Op == "/" {
		return flatNode{number: func(m *machine) float64 {
			a, b := left(m), right(m)
			if b == 0 {
				m.unsure = true // the evaluator refuses it
			}
			return a / b
		}}, true
	}
	return flatNode{number: func(m *machine) float64 { return op(left(m), right(m)) }}, true
}

func (l *flattening) choice(e *syntax.If) (flatNode, bool) {
	condition, ok := l.number(e.Cond)
	if !ok {
		return flatNode{}, false
	}
	then, ok := l.number(e.Then)
	if !ok {
		return flatNode{}, false
	}
	otherwise, ok := l.number(e.Else)
	if !ok {
		return flatNode{}, false
	}
	return flatNode{number: func(m *machine) float64 {
		if condition(m) != 0 {
			return then(m)
		}
		return otherwise(m)
	}}, true
}
