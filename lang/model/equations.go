package model

import (
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// declared gives the term of a name of the model; lets are lowered when first used.
func (b *builder) declared(d *declaration, at place) term {
	d.used = true
	if d.term != nil {
		return *d.term
	}
	for k, open := range b.visiting {
		if open == d {
			b.failLoop(b.visiting[k:])
		}
	}
	var t term
	switch d.kind {
	case isGiven:
		g := b.Givens[d.index]
		t = b.leafIn(opParameter, d.index, g.Unit, at)
		t.dim = dimensionOf(g.Unit.Dim) // a given without a unit is a plain number
	case isState:
		t = b.leafIn(opState, d.index, b.States[d.index].Unit, at)
	case isInput:
		t = b.leafIn(opInput, d.index, b.Inputs[d.index].Unit, at)
	default:
		b.visiting = append(b.visiting, d)
		t = b.number(b.scope, d.expr)
		b.visiting = b.visiting[:len(b.visiting)-1]
		t.celsius = false
	}
	d.term = &t
	return t
}

// leafIn makes a signal in its declared unit and turns it into SI. A signal without a
// declared unit fits any.
func (b *builder) leafIn(o operation, index int, unit value.Unit, at place) term {
	leaf := b.g.leaf(o, index, at)
	if unit.IsNone() {
		return term{node: leaf, dim: open, at: at}
	}
	si := b.g.shifted(b.g.scaled(leaf, conversion(unit), at), offsetOf(unit), at)
	return term{node: si, dim: dimensionOf(unit.Dim), at: at}
}

// inUnit turns a term in SI into the declared unit.
func (b *builder) inUnit(t term, unit value.Unit) id {
	if unit.IsNone() {
		return t.node
	}
	x := b.g.shifted(t.node, offsetOf(unit).negate(), t.at)
	if factor := conversion(unit); !factor.isOne() {
		// A signal that comes back in its own unit is itself.
		if n := b.g.nodes[x]; n.operation == opMultiply {
			if c, ok := b.g.isConstant(n.a); ok && c.isExact() && c.pi == factor.pi && c.n.Exact.Cmp(factor.n.Exact) == 0 {
				return n.b
			}
		}
		return b.g.apply(opDivide, t.at, x, b.g.constant(factor, t.at))
	}
	return x
}

func (b *builder) failLoop(loop []*declaration) {
	names := make([]string, 0, len(loop)+1)
	for _, d := range loop {
		names = append(names, d.name.Name)
	}
	names = append(names, loop[0].name.Name)
	failWith(b.here(loop[0].name.Span), diag.New(diag.Name, "a let goes round in a loop: %s", strings.Join(names, " → ")).
		WithHelp("an unknown that its own equation determines is a state, or is solved for by hand"))
}

// equations lowers the rates and the outputs, and checks that every state has one.
func (b *builder) equations() {
	if len(b.States) == 0 {
		failWith(b.here(b.statement.Name.Span), diag.New(diag.Name, "the model %s has no states", b.Name).WithHelp("state x in m, v in m/s"))
	}
	rates := make([]*syntax.Rate, len(b.States))
	var first *syntax.Rate
	for _, item := range b.statement.Items {
		item, ok := item.(*syntax.Rate)
		if !ok {
			continue
		}
		if first == nil {
			first = item
		}
		i := b.stateOf(item, first)
		if rates[i] != nil {
			failWith(b.here(item.Name.Span), diag.New(diag.Name, "%s %s is given twice", rateWord(item.Next), item.Name.Name).
				WithHelp("first in line %d", b.line(rates[i].Span)))
		}
		rates[i] = item
	}
	b.checkTime(first)
	for i, rate := range rates {
		if rate == nil {
			word := rateWord(b.Every != nil)
			failWith(b.here(b.States[i].At), diag.New(diag.Name, "the state %s has no equation", b.States[i].Name).
				WithHelp("write %s %s = …", word, b.States[i].Name))
		}
	}
	for i, rate := range rates {
		b.rates = append(b.rates, b.rate(i, rate))
	}
	for i, d := range b.outs {
		b.outputs = append(b.outputs, b.output(i, d))
	}
	for _, d := range b.order {
		if d.kind == isLet { // an unused one is checked too
			used := d.used
			b.declared(d, b.here(d.name.Span))
			d.used = used
		}
	}
}

func rateWord(next bool) string {
	if next {
		return "next"
	}
	return "rate"
}

// stateOf finds the state of an equation, whose word must be that of the first one.
func (b *builder) stateOf(item, first *syntax.Rate) int {
	if item.Next != first.Next {
		failWith(b.here(item.Span), diag.New(diag.Syntax, "a model has either rates or next values, and line %d has %s", b.line(first.Span), rateWord(first.Next)).
			WithHelp("rate x = … belongs to continuous time, next x = … with every T to sampled time"))
	}
	word := rateWord(item.Next)
	d, ok := b.names[item.Name.Name]
	if ok && d.kind == isState {
		return d.index
	}
	e := diag.New(diag.Name, "%s %s: there is no state %s", word, item.Name.Name, item.Name.Name)
	if ok {
		e = diag.New(diag.Name, "%s %s: %s is %s, not a state", word, item.Name.Name, item.Name.Name, d.kindName())
	} else {
		var states []string
		for _, s := range b.States {
			states = append(states, s.Name)
		}
		if near := nearestOf(item.Name.Name, states); near != "" {
			e.WithHelp("is %s meant?", near)
		} else {
			e.WithHelp("declare it: state %s in UNIT", item.Name.Name)
		}
	}
	failWith(b.here(item.Name.Span), e)
	return 0
}

// checkTime: every belongs to next, and next needs every.
func (b *builder) checkTime(first *syntax.Rate) {
	if first == nil {
		return
	}
	var every *syntax.Every
	for _, item := range b.statement.Items {
		if item, ok := item.(*syntax.Every); ok {
			every = item
		}
	}
	switch {
	case first.Next && every == nil:
		failWith(b.here(first.Span), diag.New(diag.Name, "next %s = … needs the sample time", first.Name.Name).WithHelp("write every 5 ms"))
	case !first.Next && every != nil:
		failWith(b.here(every.Span), diag.New(diag.Name, "every belongs to a sampled model, and this one has rates").
			WithHelp("write next x = … for the next value, or leave every out; sampled(P, every: …) samples a continuous plant"))
	}
}

// rate lowers an equation and checks its unit.
func (b *builder) rate(i int, item *syntax.Rate) id {
	s := &b.States[i]
	s.Text, s.expr = sliceOf(b.source, item.Expr.Extent()), item.Expr.Extent()
	t := b.number(b.scope, item.Expr)
	unit := s.Unit
	want, wanted := open, "v"
	if !unit.IsNone() {
		want, wanted = dimensionOf(unit.Dim), unit.Text
		if !item.Next {
			b.refuseCelsius(t, "a rate")
			unit.Offset = nil
			want, wanted = want.times(second, -1), unit.PerSecond().Text
			if s.Unit.Offset != nil {
				wanted = "K/s"
			}
		}
	}
	if !t.isZero && !t.dim.fits(want) {
		has := "is in " + t.dim.String()
		if t.dim.isPlain() {
			has = "has no unit"
		}
		e := diag.New(diag.Unit, "the right side of %s %s %s, and it must be in %s", rateWord(item.Next), s.Name, has, wanted)
		if !item.Next {
			e.WithHelp("%s is in %s, so its rate is in %s", s.Name, s.Unit.Text, wanted)
		} else {
			e.WithHelp("%s is in %s", s.Name, s.Unit.Text)
		}
		failWith(t.at, e)
	}
	return b.inUnit(t, unit)
}

// output lowers an output and checks, or finds, its unit.
func (b *builder) output(i int, d *declaration) id {
	s := &b.Outputs[i]
	at := b.here(s.At)
	t := b.declared(d, at)
	if s.Unit.IsNone() {
		if unit, ok := t.dim.unit(); ok && !t.dim.open && !t.dim.isPlain() {
			s.Unit = unit
		}
	}
	if s.Unit.IsNone() {
		return t.node
	}
	if want := dimensionOf(s.Unit.Dim); !t.isZero && !t.dim.fits(want) {
		has := "is in " + t.dim.String()
		if t.dim.isPlain() {
			has = "has no unit"
		}
		if d.kind == isOutput {
			fail(t.at, diag.Unit, "the output %s is declared in %s, and its right side %s", s.Name, s.Unit.Text, has)
		}
		fail(at, diag.Unit, "the output %s is declared in %s, and %s %s", s.Name, s.Unit.Text, s.Name, has)
	}
	return b.inUnit(t, s.Unit)
}

// remarkUnused notes what no equation uses: often a slip.
func (b *builder) remarkUnused() {
	var givens, inputs []string
	for _, d := range b.order {
		switch {
		case d.used:
		case d.kind == isGiven:
			givens = append(givens, d.name.Name)
		case d.kind == isInput:
			inputs = append(inputs, d.name.Name)
		case d.kind == isLet:
			givens = append(givens, d.name.Name)
		}
	}
	if len(givens) > 0 {
		b.Notes = append(b.Notes, "no equation uses "+strings.Join(givens, ", "))
	}
	if len(inputs) > 0 {
		b.Notes = append(b.Notes, "no equation uses the input "+strings.Join(inputs, ", "))
	}
}
