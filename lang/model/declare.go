package model

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// declareAll collects every name of the model, so that equations may stand in any order.
func (b *builder) declareAll() {
	for _, item := range b.statement.Items {
		switch item := item.(type) {
		case *syntax.Given:
			b.declareGiven(item)
		case *syntax.Signals:
			if item.Role != "output" {
				b.declareSignals(item)
			}
		case *syntax.Let:
			b.declare(&declaration{kind: isLet, name: item.Name, expr: item.Expr})
		case *syntax.Every:
			b.declareEvery(item)
		}
	}
	for _, item := range b.statement.Items {
		if item, ok := item.(*syntax.Signals); ok && item.Role == "output" {
			b.declareOutputs(item)
		}
	}
	for i := range b.Givens {
		b.readGiven(i)
	}
}

func (b *builder) line(span diag.Span) int {
	line, _ := b.source.Position(span.Start)
	return line
}

func (b *builder) here(span diag.Span) place { return place{b.source, span} }

func (b *builder) declare(d *declaration) {
	if first, ok := b.names[d.name.Name]; ok {
		failWith(b.here(d.name.Span), diag.New(diag.Name, "%s is declared twice in the model", d.name.Name).
			WithHelp("it is %s already, in line %d", first.kindName(), b.line(first.name.Span)))
	}
	if len(b.order) > mostLets {
		fail(b.here(d.name.Span), diag.Limit, "a model has at most %d names", mostLets)
	}
	b.names[d.name.Name] = d
	b.order = append(b.order, d)
}

func (b *builder) declareGiven(item *syntax.Given) {
	if len(b.Givens) == MostParameters {
		fail(b.here(item.Name.Span), diag.Limit, "a model has at most %d givens", MostParameters)
	}
	b.declare(&declaration{kind: isGiven, index: len(b.Givens), name: item.Name, expr: item.Value})
	b.Givens = append(b.Givens, Given{Name: item.Name.Name, At: item.Span})
}

func (b *builder) declareSignals(item *syntax.Signals) {
	for _, entry := range item.Entries {
		list, k, most := &b.States, isState, MostStates
		if item.Role == "input" {
			list, k, most = &b.Inputs, isInput, MostSignals
		}
		if len(*list) == most {
			fail(b.here(entry.Name.Span), diag.Limit, "a model has at most %d %ss; %s would be one more", most, item.Role, entry.Name.Name)
		}
		b.declare(&declaration{kind: k, index: len(*list), name: entry.Name})
		*list = append(*list, b.signal(entry))
	}
}

// signal reads the unit and the working range of an entry.
func (b *builder) signal(entry syntax.Signal) Signal {
	s := Signal{Signal: value.Signal{Name: entry.Name.Name, Unit: value.None()}, At: entry.Name.Span}
	if entry.Unit != nil {
		unit, err := resolveUnit(entry.Unit)
		if err != nil {
			failWith(b.here(entry.Unit.Span), err)
		}
		s.Unit = unit
	}
	if entry.Range != nil {
		n := b.inDeclaredUnit(entry.Range, s.Unit, "the range of "+s.Name, true)
		if n.Sign() <= 0 {
			fail(b.here(entry.Range.Extent()), diag.Type, "the range of %s must be positive", s.Name)
		}
		s.Range = &n
	}
	return s
}

// inDeclaredUnit evaluates a constant for a signal and expresses it in the signal's unit.
// A plain number is taken in that unit where asIs allows it.
func (b *builder) inDeclaredUnit(e syntax.Expr, unit value.Unit, what string, asIs bool) value.Number {
	at := b.here(e.Extent())
	b.refuseModelNames(b.scope, e)
	v, problem := b.outer.Evaluate(b.source, e, false)
	if problem != nil {
		failWith(at, problem)
	}
	var out amount
	var err error
	switch v := value.Force(v).(type) {
	case value.Number:
		switch {
		case asIs || v.IsZero() || unit.IsNone() || plainIn(unit):
			return v
		case unit.Dim.IsPlain():
			failWith(at, diag.New(diag.Unit, "%s is declared in %s, and %s has no unit", what, unit.Text, excerpt(b.source, at.span)).
				WithHelp("write %s %s, or %s rad", excerpt(b.source, at.span), unit.Text, excerpt(b.source, at.span)))
		}
		failWith(at, diag.New(diag.Unit, "%s is declared in %s, and %s has no unit", what, unit.Text, excerpt(b.source, at.span)).
			WithHelp("write it with its unit, as in 3 %s", unit.Text))
	case value.Quantity:
		if unit.IsNone() {
			failWith(at, diag.New(diag.Unit, "%s has no declared unit, and the value is in %s", what, v.Unit.Text).WithHelp("declare it with in %s", v.Unit.Text))
		}
		if v.Unit.Dim != unit.Dim || v.Unit.IsHertz() {
			fail(at, diag.Unit, "%s is declared in %s, and the value is in %s", what, unit.Text, v.Unit.Text)
		}
		if asIs {
			unit.Offset = nil // a range is a difference
		}
		if v.Unit.Offset != nil && unit.Offset == nil {
			failWith(at, diag.New(diag.Unit, "%s is a point on a scale in degC, and a difference is needed", excerpt(b.source, at.span)).WithHelp("write it in K"))
		}
		converted, e := value.In(v, unit)
		if err = e; err == nil {
			if q, ok := converted.(value.Quantity); ok {
				return q.Magnitude
			}
			out.n, err = numberOf(converted, nil)
		}
	default:
		fail(at, diag.Type, "%s needs a number; this is %s", what, value.Describe(v))
	}
	if err != nil {
		failWith(at, asError(err))
	}
	return out.n
}

// plainIn tells whether a plain number in the unit is what it is without: rad.
func plainIn(u value.Unit) bool { return u.Dim.IsPlain() && u.Pi == 0 && conversion(u).isOne() }

func (b *builder) declareEvery(item *syntax.Every) {
	at := b.here(item.Period.Extent())
	if b.Every != nil {
		fail(b.here(item.Span), diag.Name, "the sample time is given twice")
	}
	v, problem := b.outer.Evaluate(b.source, item.Period, false)
	if problem != nil {
		failWith(at, problem)
	}
	n, err := numberOf(value.Coerce(value.Param{Name: "every", Shape: value.ARate}, v))
	if err != nil {
		failWith(at, asError(err))
	}
	b.Every = &n
}

func (b *builder) declareOutputs(item *syntax.Signals) {
	for _, entry := range item.Entries {
		if len(b.Outputs) == MostSignals {
			fail(b.here(entry.Name.Span), diag.Limit, "a model has at most %d outputs; %s would be one more", MostSignals, entry.Name.Name)
		}
		s := b.signal(entry)
		for _, other := range b.Outputs {
			if other.Name == s.Name {
				failWith(b.here(entry.Name.Span), diag.New(diag.Name, "the output %s is declared twice", s.Name).WithHelp("first in line %d", b.line(other.At)))
			}
		}
		d := &declaration{kind: isOutput, index: len(b.Outputs), name: entry.Name, expr: entry.Expr}
		if entry.Expr != nil {
			b.declare(d)
			s.Text, s.expr = sliceOf(b.source, entry.Expr.Extent()), entry.Expr.Extent()
		} else {
			d = b.sameName(entry)
			if entry.Unit == nil {
				s.Unit = b.unitOf(d)
			}
			if entry.Range == nil && entry.Unit == nil {
				s.Range = b.rangeOf(d)
			}
		}
		b.Outputs = append(b.Outputs, s)
		b.outs = append(b.outs, d)
	}
}

// sameName finds the state, input or let that an output without an equation shows.
func (b *builder) sameName(entry syntax.Signal) *declaration {
	d, ok := b.names[entry.Name.Name]
	if ok && d.kind != isGiven && d.kind != isOutput {
		d.used = true
		return d
	}
	e := diag.New(diag.Name, "the output %s is no state, input or let of the model and has no equation", entry.Name.Name)
	var candidates []string
	for _, d := range b.order {
		if d.kind != isGiven && d.kind != isOutput {
			candidates = append(candidates, d.name.Name)
		}
	}
	if near := nearestOf(entry.Name.Name, candidates); near != "" {
		e.WithHelp("is %s meant?", near)
	} else {
		e.WithHelp("an output of its own is written output %s in UNIT = …", entry.Name.Name)
	}
	failWith(b.here(entry.Name.Span), e)
	return nil
}

func (b *builder) unitOf(d *declaration) value.Unit {
	switch d.kind {
	case isState:
		return b.States[d.index].Unit
	case isInput:
		return b.Inputs[d.index].Unit
	}
	return value.None()
}

func (b *builder) rangeOf(d *declaration) *value.Number {
	switch d.kind {
	case isState:
		return b.States[d.index].Range
	case isInput:
		return b.Inputs[d.index].Range
	}
	return nil
}
