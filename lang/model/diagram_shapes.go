package model

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// shapes finds how many components every signal has, and their names and units, by
// passing over the lines until nothing changes: a loop's signals need each other.
func (w *wiring) shapes() {
	for range len(w.order) + 1 {
		changed := false
		for _, n := range w.order {
			if n.expr == nil {
				continue
			}
			if s := w.shape(n.expr); better(s, n.shape) {
				n.shape, changed = s, true
			}
		}
		if !changed {
			break
		}
	}
	for _, n := range w.order {
		if n.shape == nil { // a loop of nothing but itself
			n.shape = wire{{}}
		}
	}
}

// better tells whether a shape says more than what was known.
func better(s, known wire) bool {
	if s == nil || known == nil {
		return s != nil
	}
	for k := range s {
		if k < len(known) && known[k].unit.IsNone() && !s[k].unit.IsNone() {
			return true
		}
	}
	return false
}

// shape is the shape of an expression as far as it is known; nil for unknown.
func (w *wiring) shape(e syntax.Expr) wire {
	switch e := e.(type) {
	case *syntax.Name:
		return unnamed(w.signals[e.Name].shape)
	case *syntax.Unary:
		return w.shape(e.X)
	case *syntax.List:
		var out wire
		for _, x := range e.Elements {
			s := w.shape(x)
			if s == nil {
				return nil
			}
			out = append(out, namedElements(s, x)...)
		}
		return out
	case *syntax.Index:
		s := w.shape(e.X)
		if s == nil {
			return nil
		}
		var out wire
		for _, k := range w.selected(e, s) {
			out = append(out, s[k])
		}
		return unlabelled(out)
	case *syntax.Binary:
		return w.binaryShape(e)
	}
	return nil
}

// unnamed copies the shape of a signal for use in an expression.
func unnamed(s wire) wire {
	if s == nil {
		return nil
	}
	return append(wire{}, s...)
}

// unlabelled drops the name of a component that stands alone.
func unlabelled(s wire) wire {
	if len(s) == 1 {
		s[0].name = ""
	}
	return s
}

// namedElements names the components of a list's element by the element's own name.
func namedElements(s wire, e syntax.Expr) wire {
	n, ok := e.(*syntax.Name)
	if !ok {
		return s
	}
	out := append(wire{}, s...)
	for k := range out {
		if len(s) == 1 {
			out[k].name = n.Name
		}
	}
	return out
}

func (w *wiring) binaryShape(e *syntax.Binary) wire {
	switch e.Op {
	case "+", "-":
		l, r := w.shape(e.L), w.shape(e.R)
		if l == nil {
			return r
		}
		for k := range l {
			if k < len(r) && l[k].unit.IsNone() {
				l[k].unit = r[k].unit
			}
		}
		return l
	}
	factors, signal, exponent := w.factorOf(e)
	shape := w.shape(signal)
	for i := len(factors) - 1; i >= 0; i-- {
		if factors[i].plant != nil {
			shape = outputShape(factors[i].plant)
			continue
		}
		for k := range shape {
			_, shape[k].unit = scaledUnit(factors[i].value, shape[k].unit, exponent)
		}
	}
	return shape
}

// factorOf parts a product or a quotient into the factors and the signal.
func (w *wiring) factorOf(e *syntax.Binary) (factors []*system, signal syntax.Expr, exponent int) {
	switch {
	case e.Op == "/":
		return w.factors[e.R], e.L, -1
	case w.usesSignals(e.R):
		return w.factors[e.L], e.R, 1
	}
	return w.factors[e.R], e.L, 1
}

func outputShape(p *value.Plant) wire {
	rows, _ := p.D.Dims()
	out := make(wire, rows)
	for k := range out {
		if k < len(p.Outputs) {
			out[k] = component{name: p.Outputs[k].Name, unit: p.Outputs[k].Unit}
		}
	}
	return unlabelled(out)
}

// scaledUnit is by what a signal's number is multiplied, and the unit of the product with
// a constant: a plain number keeps the unit, a quantity makes another.
func scaledUnit(v value.Value, unit value.Unit, exponent int) (amount, value.Unit) {
	one := value.Quantity{Magnitude: value.Int(1), Unit: unit}
	combine := value.Multiply
	left, right := value.Value(one), v
	if exponent < 0 {
		combine = value.Divide
	}
	n, ok := v.(value.Number)
	if ok || unit.IsNone() {
		if q, isQuantity := v.(value.Quantity); isQuantity {
			n, _ = q.SI()
		}
		factor := amount{n: n}
		if exponent < 0 {
			factor, _ = oneAmount.divide(factor)
		}
		return factor, unit
	}
	out, err := combine(left, right)
	if err != nil {
		return oneAmount, value.None()
	}
	switch out := out.(type) {
	case value.Quantity:
		return amount{n: out.Magnitude}, out.Unit
	case value.Number:
		return amount{n: out}, value.None()
	}
	return oneAmount, value.None()
}

// selected evaluates the index of a signal with several components.
func (w *wiring) selected(e *syntax.Index, s wire) []int {
	at := w.here(e.Span)
	if len(e.Subscripts) != 1 {
		failWith(at, diag.New(diag.Shape, "a signal takes one index").WithHelp(`y[1], y[1..2] or y["x"]`))
	}
	position := func(x syntax.Expr) int {
		v, err := w.outer.Evaluate(w.source, x, false)
		if err != nil {
			failWith(w.here(x.Extent()), err)
		}
		switch v := value.Force(v).(type) {
		case value.Text:
			var names []string
			for k, c := range s {
				if c.name == string(v) {
					return k
				}
				names = append(names, c.name)
			}
			failWith(w.here(x.Extent()), diag.New(diag.Name, "%s has no component %q", excerpt(w.source, e.X.Extent()), string(v)).WithHelp("its components are %s", listed(names)))
		case value.Number:
			if k, ok := v.Whole(); ok && k >= 1 && k <= len(s) {
				return k - 1
			}
			fail(w.here(x.Extent()), diag.Shape, "%s has %s, numbered from 1", excerpt(w.source, e.X.Extent()), countOf(len(s), "component"))
		}
		fail(w.here(x.Extent()), diag.Type, "a component is chosen by its number or its quoted name")
		return 0
	}
	low := position(e.Subscripts[0].Low)
	if e.Subscripts[0].High == nil {
		return []int{low}
	}
	var out []int
	for k := low; k <= position(e.Subscripts[0].High); k++ {
		out = append(out, k)
	}
	return out
}
