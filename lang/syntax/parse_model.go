package syntax

import "gainwright/lang/diag"

// model reads model NAME { … }.
func (p *parser) model() Statement {
	start := p.takeFirst().span.Start
	m := &Model{Name: p.newName("the model's name")}
	m.Items = p.body("model NAME { … }", p.modelItem)
	m.Span = p.from(start)
	return m
}

// diagram reads diagram NAME { … }.
func (p *parser) diagram() Statement {
	start := p.takeFirst().span.Start
	d := &Diagram{Name: p.newName("the diagram's name")}
	d.Items = p.body("diagram NAME { … }", p.diagramItem)
	d.Span = p.from(start)
	return d
}

// body reads { … } with one item a line, or separated by semicolons.
func (p *parser) body(form string, item func() []Item) []Item {
	var items []Item
	p.expectOpen("{", form)
	p.enter(modeLines, insideBody)
	for {
		p.skipSeparators()
		if p.raw(0).is("}") {
			p.leave()
			return items
		}
		if p.raw(0).kind == tokenEnd {
			p.unexpected(p.raw(0))
		}
		items = append(items, item()...)
		if t := p.raw(0); !t.is(";") && !t.is("}") && t.kind != tokenNewline {
			p.unexpected(t)
		}
	}
}

// skipSeparators passes line ends and semicolons.
func (p *parser) skipSeparators() {
	for {
		p.skipLines()
		if !p.raw(0).is(";") {
			return
		}
		p.take()
	}
}

const modelHelp = "an item begins with given, input, state, output, let, rate, next, every or around"

func (p *parser) modelItem() []Item {
	t := p.raw(0)
	if t.kind == tokenWord && p.raw(1).is("=") {
		p.fail(diag.Syntax, t.span, "write let "+t.text+" = …, or given "+t.text+" = … for a parameter", "an equation of a model begins with a word that says what it is")
	}
	if t.kind == tokenWord {
		switch t.text {
		case "given":
			return p.givens()
		case "input", "state", "output":
			return []Item{p.signals()}
		case "let", "rate", "next":
			return []Item{p.equation(t.text)}
		case "every":
			start := p.takeFirst().span.Start
			return []Item{&Every{Period: p.expression(), Span: p.from(start)}}
		case "around":
			return []Item{p.around()}
		}
		help := modelHelp
		if near := diag.Nearest(t.text, []string{"given", "input", "state", "output", "let", "rate", "next", "every", "around"}); near != "" {
			help = "did you mean " + near + "? " + modelHelp
		}
		p.fail(diag.Syntax, t.span, help, "%s begins no item of a model", t.text)
	}
	p.failHere(t, modelHelp, "an item of the model is expected before %s", describe(t))
	return nil
}

// diagramItem reads input …, output … or NAME = EXPR.
func (p *parser) diagramItem() []Item {
	t := p.raw(0)
	if t.kind == tokenWord && !p.raw(1).is("=") && (t.text == "input" || t.text == "output") {
		return []Item{p.signals()}
	}
	if t.kind != tokenWord {
		p.failHere(t, "input r; e = r - y; output y", "an item of the diagram is expected before %s", describe(t))
	}
	start := t.span.Start
	name := p.newName("a signal's name")
	p.markFirst()
	p.expect("=", "a diagram holds input …, output … and NAME = EXPR")
	return []Item{&Let{Name: name, Expr: p.expression(), Span: p.from(start)}}
}

// givens reads given NAME = VALUE ± TOL, NAME = VALUE ± TOL, ….
func (p *parser) givens() []Item {
	const form = "given NAME = VALUE ± TOLERANCE"
	start := p.takeFirst().span.Start
	var items []Item
	for {
		g := &Given{Name: p.newName("the parameter's name")}
		p.expect("=", form)
		g.Value = p.expression()
		if b, ok := g.Value.(*Binary); ok && b.Op == "±" {
			g.Value, g.Tolerance = b.L, b.R
		}
		g.Span = p.from(start)
		items = append(items, g)
		if !p.raw(0).is(",") {
			return items
		}
		p.take()
		p.skipLines()
		start = p.raw(0).span.Start
	}
}

// equation reads let NAME = EXPR, rate NAME = EXPR, next NAME = EXPR.
func (p *parser) equation(word string) Item {
	form := word + " NAME = EXPR"
	start := p.takeFirst().span.Start
	name := p.newName("a name")
	p.expect("=", form)
	x := p.expression()
	span := p.from(start)
	if word == "let" {
		return &Let{Name: name, Expr: x, Span: span}
	}
	return &Rate{Name: name, Expr: x, Next: word == "next", Span: span}
}

// signals reads input u in UNIT range R, …; state …; output y, z in UNIT = EXPR, ….
func (p *parser) signals() Item {
	t := p.takeFirst()
	p.setRole(roleSignals)
	s := &Signals{Role: t.text}
	for {
		s.Entries = append(s.Entries, p.signal(t.text))
		if !p.raw(0).is(",") {
			break
		}
		p.take()
		p.skipLines()
	}
	s.Span = p.from(t.span.Start)
	return s
}

// signal reads one entry: a name, then in UNIT, range R and = EXPR in any order.
func (p *parser) signal(role string) Signal {
	s := Signal{Name: p.newName("a signal's name")}
	for {
		t := p.raw(0)
		switch {
		case t.word("in"):
			p.once(s.Unit != nil, t)
			s.Unit = p.inUnit()
		case t.word("range"):
			p.once(s.Range != nil, t)
			p.take()
			s.Range = p.sum()
		case t.is("="):
			if role != "output" {
				p.fail(diag.Syntax, t.span, "its motion is written rate "+s.Name.Name+" = …, a rest value around "+s.Name.Name+" = …", "only an output has an equation of its own")
			}
			p.once(s.Expr != nil, t)
			p.take()
			s.Expr = p.expression()
		default:
			if t.kind == tokenWord && wordHelp[t.text] == "" {
				p.failHere(t, role+" NAME in UNIT range R, …", "%s stands where in, range or the line's end is expected", t.text)
			}
			s.Span = p.from(s.Name.Span.Start)
			return s
		}
	}
}

// around reads around rest, around NAME = VALUE, … find NAME, ….
func (p *parser) around() Item {
	const form = "around rest, around x = VALUE, …, around x = VALUE find u"
	start := p.takeFirst().span.Start
	a := &Around{}
	more := true
	if p.raw(0).word("rest") && !p.raw(1).is("=") {
		p.take()
		a.Rest = true
		more = p.raw(0).is(",")
		if more {
			p.take()
			p.skipLines()
		} else if t := p.raw(0); t.kind == tokenWord && t.text != "find" {
			p.failHere(t, form, "a comma is missing after rest")
		}
	}
	for more && !(p.raw(0).word("find") && !p.raw(1).is("=")) {
		v := AroundValue{Name: p.newName("rest, or the name of a state or an input")}
		p.expect("=", form)
		v.Value = p.expression()
		a.Values = append(a.Values, v)
		if more = p.raw(0).is(","); more {
			p.take()
			p.skipLines()
		}
	}
	if p.raw(0).word("find") {
		p.take()
		a.Find = p.names("the name of a state or an input")
	}
	a.Span = p.from(start)
	return a
}
