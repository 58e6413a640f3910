package model

import (
	"fmt"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// isConstantFactor evaluates a factor that must be a number or a quantity.
func (w *wiring) isConstantFactor(e syntax.Expr) bool {
	for _, s := range w.factor(e) {
		if !isConstantValue(s.value) {
			return false
		}
	}
	return true
}

// factor evaluates what multiplies a signal. Constants in a product with systems are kept
// apart, so that their units meet those of the signals.
func (w *wiring) factor(e syntax.Expr) []*system {
	if list, ok := w.factors[e]; ok {
		return list
	}
	var list []*system
	for _, part := range factorsOf(e) {
		s := w.evaluated(part)
		last := len(list) - 1
		if last < 0 || isConstantValue(s.value) || isConstantValue(list[last].value) {
			list = append(list, s)
			continue
		}
		v, err := value.Multiply(list[last].value, s.value)
		if err != nil {
			failWith(s.at, asError(err))
		}
		list[last] = &system{value: value.Force(v), at: place{w.source, list[last].at.span.Join(s.at.span)}}
	}
	w.factors[e] = list
	w.systems = append(w.systems, list...)
	return list
}

// factorsOf parts a product into its factors.
func factorsOf(e syntax.Expr) []syntax.Expr {
	if b, ok := e.(*syntax.Binary); ok && b.Op == "*" {
		return append(factorsOf(b.L), factorsOf(b.R)...)
	}
	return []syntax.Expr{e}
}

// evaluated evaluates one factor.
func (w *wiring) evaluated(e syntax.Expr) *system {
	at := w.here(e.Extent())
	v, err := w.outer.Evaluate(w.source, e, false)
	if err != nil {
		failWith(at, err)
	}
	s := &system{value: value.Force(v), at: at}
	switch x := s.value.(type) {
	case value.Number:
	case *value.Matrix, *value.Gain, *value.Plant, *value.Model, *value.Transfer, *value.Polynomial:
		if unit := unitInside(e); unit != nil {
			failWith(w.here(unit.Span), diag.New(diag.Unit, "a system has no place for the unit %s inside it", unit.Text).
				WithHelp("multiply the signal by the quantity: H * 3 V/rad * e"))
		}
	case value.Quantity:
		if x.Unit.Offset != nil || x.Unit.IsHertz() {
			fail(at, diag.Unit, "a quantity in %s cannot be a factor", x.Unit.Text)
		}
	default:
		fail(at, diag.Type, "a system, a matrix or a number multiplies a signal; this is %s", value.Describe(v))
	}
	return s
}

// unitInside finds a unit in the sums and quotients of a system's expression.
func unitInside(e syntax.Expr) *syntax.Unit {
	switch e := e.(type) {
	case *syntax.Number:
		return e.Unit
	case *syntax.Unary:
		return unitInside(e.X)
	case *syntax.Binary:
		if u := unitInside(e.L); u != nil {
			return u
		}
		return unitInside(e.R)
	}
	return nil
}

// agreeOnTime finds the one sample time, or that all is continuous.
func (w *wiring) agreeOnTime() {
	var first *system
	for _, s := range w.systems {
		every, has := timeOf(s.value)
		if !has {
			continue
		}
		if first == nil {
			first, w.every = s, every
			continue
		}
		if (every == nil) != (w.every == nil) || every != nil && every.Float64() != w.every.Float64() {
			failWith(s.at, diag.New(diag.Type, "the sample times differ: %s is %s, %s is %s", excerpt(w.source, first.at.span), timeText(w.every),
				excerpt(w.source, s.at.span), timeText(every)).WithHelp("sampled(P, every: …) brings a continuous plant to a sample time"))
		}
	}
}

// timeOf gives the sample time of a system that has one of its own; a constant and a
// transfer function in z without a sample time take that of the others.
func timeOf(v value.Value) (every *value.Number, has bool) {
	switch x := v.(type) {
	case *value.Model:
		return x.Plant.Every, true
	case *value.Plant:
		return x.Every, x.Order() > 0 || x.Every != nil
	case *value.Transfer:
		if x.Every != nil {
			return x.Every, true
		}
		return nil, x.Variable == "s" && !constantTransfer(x)
	case *value.Polynomial:
		return nil, x.Variable == "s" && x.Degree() > 0
	}
	return nil, false
}

func constantTransfer(t *value.Transfer) bool {
	for _, row := range t.Entries {
		for _, e := range row {
			if e.Num.Degree() > 0 || e.Den.Degree() > 0 {
				return false
			}
		}
	}
	return true
}

func timeText(every *value.Number) string {
	if every == nil {
		return "continuous"
	}
	return fmt.Sprintf("sampled every %.6g s", every.Float64())
}

// realise makes a plant of what is no number.
func (w *wiring) realise(s *system) {
	if isConstantValue(s.value) {
		return
	}
	v := s.value
	if t, ok := v.(*value.Transfer); ok && t.Variable == "z" && t.Every == nil && !constantTransfer(t) {
		timed := *t
		if timed.Every = w.every; w.every == nil {
			if w.hasContinuous() {
				fail(s.at, diag.Type, "%s is in z, and the diagram is continuous", excerpt(w.source, s.at.span))
			}
			one := value.Int(1)
			timed.Every, w.every = &one, &one
			w.notes = append(w.notes, "the sample time is taken as 1 s; timed(G, every: …) sets it")
		}
		v = &timed
	}
	p, err := value.ToPlant(v)
	if err != nil {
		failWith(s.at, asError(err))
	}
	s.plant = p
}

func (w *wiring) hasContinuous() bool {
	for _, s := range w.systems {
		if every, has := timeOf(s.value); has && every == nil {
			return true
		}
	}
	return false
}

// labelOf is what the states of a use of a system are named after where names clash.
func (w *wiring) labelOf(s *system) string {
	text := sliceOf(w.source, s.at.span)
	if len(text) <= 12 && !strings.ContainsAny(text, "+-*/^()[]\"., ") {
		return text
	}
	return w.target
}
