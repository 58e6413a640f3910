package model

import (
	"fmt"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// number gives every input and named signal its base quantities.
func (w *wiring) number() {
	for _, inputs := range [...]bool{true, false} {
		for _, n := range w.order {
			if (n.expr == nil) == inputs {
				n.first = w.bases
				w.bases += len(n.shape)
			}
		}
	}
}

// connect reads every line as sums of base quantities, and makes a block of every use of
// a system.
func (w *wiring) connect() {
	for _, n := range w.order {
		if n.expr == nil {
			continue
		}
		w.target = n.name.Name
		form := w.form(n.expr)
		if len(form) != len(n.shape) {
			fail(w.here(n.expr.Extent()), diag.Shape, "the signal %s has %s by other lines and %s here", n.name.Name,
				countOf(len(n.shape), "component"), countOf(len(form), "component"))
		}
		for k := range form {
			n.shape[k].terms = w.inUnitOf(form[k], n.shape[k].unit, w.here(n.expr.Extent()), n.name.Name)
		}
	}
	for k := range w.outputs {
		o := &w.outputs[k]
		w.target = o.signal.Name.Name
		e := o.signal.Expr
		if e == nil {
			e = &syntax.Name{Name: o.signal.Name.Name, Span: o.signal.Name.Span}
		}
		o.wire = w.form(e)
		if o.signal.Unit != nil {
			unit, err := resolveUnit(o.signal.Unit)
			if err != nil {
				failWith(w.here(o.signal.Unit.Span), err)
			}
			for i := range o.wire {
				o.wire[i].terms = w.inUnitOf(o.wire[i], unit, w.here(o.signal.Span), "the output "+o.signal.Name.Name)
				o.wire[i].unit = unit
			}
		}
	}
}

// inUnitOf expresses a component in another unit; undeclared units fit any.
func (w *wiring) inUnitOf(c component, unit value.Unit, at place, what string) map[int]amount {
	factor, ok := unitRatio(c.unit, unit)
	if !ok {
		e := diag.New(diag.Unit, "%s is in %s, and what it joins is in %s", what, unit.Text, c.unit.Text)
		failWith(at, e.WithHelp("a gain with a unit turns one into the other, as in 3 %s * e", ratioText(c.unit, unit)))
	}
	return scaledTerms(c.terms, factor)
}

// unitRatio is by what a number in one unit is multiplied to be in another.
func unitRatio(from, to value.Unit) (amount, bool) {
	if from.IsNone() || to.IsNone() {
		return oneAmount, true
	}
	if from.Dim != to.Dim {
		return oneAmount, false
	}
	ratio, err := conversion(from).divide(conversion(to))
	return ratio, err == nil
}

// ratioText writes the unit of a gain from one unit to another.
func ratioText(from, to value.Unit) string {
	q, err := value.Divide(value.Quantity{Magnitude: value.Int(1), Unit: to}, value.Quantity{Magnitude: value.Int(1), Unit: from})
	if v, ok := q.(value.Quantity); ok && err == nil {
		return v.Unit.Text
	}
	return "UNIT"
}

func scaledTerms(terms map[int]amount, by amount) map[int]amount {
	out := make(map[int]amount, len(terms))
	for k, a := range terms {
		x, err := a.multiply(by)
		if err != nil {
			panic(failure{asError(err)})
		}
		out[k] = x
	}
	return out
}

// form reads a signal expression.
func (w *wiring) form(e syntax.Expr) wire {
	switch e := e.(type) {
	case *syntax.Number: // the zero that may stand for no signal
		return wire{{terms: map[int]amount{}}}
	case *syntax.Name:
		n := w.signals[e.Name]
		n.used = true
		out := append(wire{}, n.shape...)
		for k := range out {
			out[k].terms = map[int]amount{n.first + k: oneAmount}
		}
		return out
	case *syntax.Unary:
		out := w.form(e.X)
		for k := range out {
			out[k].terms = scaledTerms(out[k].terms, oneAmount.negate())
		}
		return out
	case *syntax.List:
		var out wire
		for _, x := range e.Elements {
			out = append(out, namedElements(w.form(x), x)...)
		}
		return out
	case *syntax.Index:
		s := w.form(e.X)
		var out wire
		for _, k := range w.selected(e, s) {
			out = append(out, s[k])
		}
		return unlabelled(out)
	case *syntax.Binary:
		if e.Op == "+" || e.Op == "-" {
			return w.sumForm(e)
		}
		return w.productForm(e)
	}
	fail(w.here(e.Extent()), diag.Internal, "a signal expression of an unknown form")
	return nil
}

func (w *wiring) sumForm(e *syntax.Binary) wire {
	l, r := w.form(e.L), w.form(e.R)
	at := w.here(e.R.Extent())
	if isZeroLiteral(e.R) {
		return l
	}
	if len(l) != len(r) && !isZeroLiteral(e.L) {
		fail(at, diag.Shape, "signals of different sizes are added: %s has %s, %s has %s", excerpt(w.source, e.L.Extent()), countOf(len(l), "component"),
			excerpt(w.source, e.R.Extent()), countOf(len(r), "component"))
	}
	sign := oneAmount
	if e.Op == "-" {
		sign = sign.negate()
	}
	if isZeroLiteral(e.L) {
		for k := range r {
			r[k].terms = scaledTerms(r[k].terms, sign)
		}
		return r
	}
	for k := range l {
		ratio, ok := unitRatio(r[k].unit, l[k].unit)
		if !ok {
			failWith(at, diag.New(diag.Unit, "signals of different kinds are added: %s is in %s, %s is in %s", excerpt(w.source, e.L.Extent()), l[k].unit.Text,
				excerpt(w.source, e.R.Extent()), r[k].unit.Text))
		}
		if l[k].unit.IsNone() {
			l[k].unit = r[k].unit
		}
		signed, err := ratio.multiply(sign)
		if err != nil {
			failWith(at, asError(err))
		}
		l[k].terms = sumTerms(l[k].terms, scaledTerms(r[k].terms, signed))
	}
	return l
}

func isZeroLiteral(e syntax.Expr) bool {
	n, ok := e.(*syntax.Number)
	return ok && n.Value.Sign() == 0
}

func sumTerms(a, b map[int]amount) map[int]amount {
	for k, x := range b {
		y, ok := a[k]
		if !ok {
			a[k] = x
			continue
		}
		sum, err := y.add(x)
		if err != nil {
			panic(failure{asError(err)})
		}
		if a[k] = sum; sum.isExact() && sum.isZero() {
			delete(a, k)
		}
	}
	return a
}

// productForm applies the factors of a product to a signal, the last one first.
func (w *wiring) productForm(e *syntax.Binary) wire {
	factors, signal, exponent := w.factorOf(e)
	out := w.form(signal)
	at := w.here(signal.Extent())
	for i := len(factors) - 1; i >= 0; i-- {
		s := factors[i]
		if s.plant != nil {
			out = w.applied(s, out, at)
			at.span = at.span.Join(s.at.span)
			continue
		}
		if exponent < 0 && isZeroConstant(s.value) {
			fail(s.at, diag.Numerical, "division by zero")
		}
		for k := range out {
			factor, unit := scaledUnit(s.value, out[k].unit, exponent)
			out[k].terms, out[k].unit = scaledTerms(out[k].terms, factor), unit
		}
		at.span = at.span.Join(s.at.span)
	}
	return out
}

// applied makes a block of a system with its input, and gives its outputs.
func (w *wiring) applied(s *system, in wire, at place) wire {
	_, inputs := s.plant.D.Dims()
	if len(in) != inputs {
		fail(at, diag.Shape, "%s takes %s, and %s has %s", excerpt(w.source, s.at.span), countOf(inputs, "signal"),
			excerpt(w.source, at.span), countOf(len(in), "component"))
	}
	for k := range in {
		if k < len(s.plant.Inputs) {
			name := fmt.Sprintf("the input %s of %s", s.plant.Inputs[k].Name, excerpt(w.source, s.at.span))
			in[k].terms = w.inUnitOf(in[k], s.plant.Inputs[k].Unit, at, name)
		}
	}
	b := &block{plant: s.plant, label: w.labelOf(s), input: in, first: w.bases, at: s.at}
	w.blocks = append(w.blocks, b)
	out := outputShape(s.plant)
	w.bases += len(out)
	if w.bases > mostDiagramSignals {
		fail(s.at, diag.Limit, "a diagram has at most %d signals", mostDiagramSignals)
	}
	for k := range out {
		out[k].terms = map[int]amount{b.first + k: oneAmount}
	}
	return out
}

func isZeroConstant(v value.Value) bool {
	switch x := v.(type) {
	case value.Number:
		return x.IsZero()
	case value.Quantity:
		return x.Magnitude.IsZero()
	}
	return false
}
