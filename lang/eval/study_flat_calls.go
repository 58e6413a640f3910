package eval

import (
	"math"

	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

var flatFigures = map[string]func(m *machine, s *flatSystem) float64{
	"least_damping": leastDamping,
	"slowest_decay": slowestDecay,
}

var flatFunctions = map[string]func(a, b float64) float64{"min": math.Min, "max": math.Max}

// call flattens a call of what is known, or writes a defined function out.
func (l *flattening) call(e *syntax.Call) (flatNode, bool) {
	name, ok := e.Function.(*syntax.Name)
	if !ok {
		return flatNode{}, false
	}
	if _, isLocal := l.locals[name.Name]; isLocal {
		return flatNode{}, false
	}
	for _, a := range e.Args {
		if a.Name != nil {
			return flatNode{}, false
		}
	}
	callee, err := l.session.find(&frame{task: l.worker.task, overlay: l.worker.overlay}, name.Name, l.library)
	if err != nil {
		return flatNode{}, false
	}
	fn, ok := callee.(*value.Function)
	if !ok {
		return flatNode{}, false
	}
	if fn.Builtin == nil {
		return l.written(fn, e)
	}
	if figure := flatFigures[fn.Builtin.Name]; figure != nil && len(e.Args) == 1 {
		if x, ok := l.node(e.Args[0].Value); ok && x.system != nil {
			return flatNode{number: func(m *machine) float64 { return figure(m, x.system) }}, true
		}
		return flatNode{}, false
	}
	if f := flatFunctions[fn.Builtin.Name]; f != nil && len(e.Args) == 2 {
		a, ok := l.number(e.Args[0].Value)
		b, ok2 := l.number(e.Args[1].Value)
		if !ok || !ok2 {
			return flatNode{}, false
		}
		return flatNode{number: func(m *machine) float64 { return f(a(m), b(m)) }}, true
	}
	if fn.Builtin.Name == "closed" && len(e.Args) == 2 {
		return l.closed(e)
	}
	return flatNode{}, false
}

// written flattens the body of a defined function with its arguments in place.
func (l *flattening) written(fn *value.Function, e *syntax.Call) (flatNode, bool) {
	d, ok := fn.Body.(*definition)
	if !ok || len(d.params) != len(e.Args) {
		return flatNode{}, false
	}
	inner := *l
	inner.source, inner.library, inner.locals = d.source, d.library, map[string]flatNode{}
	for k, a := range e.Args {
		n, ok := l.node(a.Value)
		if !ok {
			return flatNode{}, false
		}
		inner.locals[d.params[k]] = n
	}
	return inner.node(d.body)
}

// closed flattens closed(system, gain) with a gain that no sample changes: A − B·K.
func (l *flattening) closed(e *syntax.Call) (flatNode, bool) {
	x, ok := l.node(e.Args[0].Value)
	if !ok || x.system == nil {
		return flatNode{}, false
	}
	y, ok := l.node(e.Args[1].Value)
	if !ok || y.constant == nil {
		return flatNode{}, false
	}
	switch y.constant.(type) {
	case *value.Gain, *value.Matrix, value.Number, *value.List:
	default:
		return flatNode{}, false
	}
	coerced, err := value.Coerce(value.Param{Name: "feedback", Shape: value.AMatrix}, y.constant)
	if err != nil {
		return flatNode{}, false
	}
	gain := coerced.(*value.Matrix)
	n, inputs := x.system.states, x.system.inputs
	if rows, cols := gain.Dims(); rows != inputs || cols != n || gain.IsComplex() {
		return flatNode{}, false
	}
	k, _ := gain.Floats()
	slot := len(l.program.buffers)
	l.program.buffers = append(l.program.buffers, n*n)
	loop := *x.system
	loop.a = func(m *machine) []float64 {
		out, a, b := m.room[slot], x.system.a(m), x.system.b(m)
		for i := range n {
			for j := range n {
				sum := a[i*n+j]
				for q := range inputs {
					sum -= b[i*inputs+q] * k[q*n+j]
				}
				out[i*n+j] = sum
			}
		}
		return out
	}
	return flatNode{system: &loop}, true
}
