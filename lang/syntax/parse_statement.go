package syntax

import "gainwright/lang/diag"

// statements reads to the end of the text.
func (p *parser) statements() {
	for {
		p.skipLines()
		if p.raw(0).kind == tokenEnd {
			return
		}
		p.nodes, p.height = 0, 0
		s := p.statement()
		p.endOfLine()
		if len(p.file.Statements) >= statementCount {
			p.fail(diag.Limit, s.Extent(), "", "the text has more than %d statements", statementCount)
		}
		p.file.Statements = append(p.file.Statements, s)
	}
}

// endOfLine demands that the statement ends here.
func (p *parser) endOfLine() {
	if t := p.raw(0); !t.ends() {
		p.unexpected(t)
	}
}

// forms are the statements by their first word.
var forms = map[string]func(*parser) Statement{
	"require":  (*parser).requirement,
	"claim":    (*parser).claim,
	"define":   (*parser).definition,
	"use":      (*parser).use,
	"model":    (*parser).model,
	"diagram":  (*parser).diagram,
	"study":    (*parser).study,
	"schedule": (*parser).schedule,
}

func (p *parser) statement() Statement {
	t := p.raw(0)
	if t.kind == tokenWord {
		next := p.raw(1)
		if next.is("=") {
			return p.binding()
		}
		if form, ok := forms[t.text]; ok && p.startsForm(t.text, next) {
			return form(p)
		}
	}
	return p.show()
}

// startsForm tells a statement word from a name that is spelled like it, by what follows.
func (p *parser) startsForm(word string, next token) bool {
	switch word {
	case "use":
		return next.kind == tokenQuote
	case "require", "claim":
		return p.startsValue(next)
	}
	if next.kind != tokenWord {
		return false
	}
	after := p.raw(2)
	switch {
	case word == "define" && after.is("("), (word == "model" || word == "diagram") && after.is("{"):
		return true
	case (word == "study" || word == "schedule") && after.is("="):
		return true
	}
	return !reserved[next.text] && next.text != "over"
}

// startsValue tells whether a value begins with the token, rather than an operator on
// the name before it.
func (p *parser) startsValue(t token) bool {
	switch {
	case t.kind == tokenWord:
		return t.text != "and" && t.text != "or" && t.text != "in" && t.text != "is" && t.text != "over"
	case t.kind == tokenNumber, t.kind == tokenQuote, t.is("("):
		return true
	case t.is("["):
		return t.spaceBefore
	case t.is("-"):
		return t.spaceBefore && p.touchesNext(t)
	}
	return false
}

// binding reads NAME = EXPR.
func (p *parser) binding() Statement {
	start := p.raw(0).span.Start
	name := p.newName("a name")
	p.markFirst()
	p.take()
	b := &Binding{Name: name, Expr: p.expression()}
	b.Over = p.overSensitivity(b.Expr)
	if p.raw(0).word("in") {
		p.fail(diag.Syntax, p.raw(0).span, "bind it, then show it: "+name.Name+" in …", "in UNIT is for showing a value")
	}
	b.Span = p.from(start)
	return b
}

// show reads EXPR, EXPR in UNIT.
func (p *parser) show() Statement {
	start := p.raw(0).span.Start
	first := len(p.log)
	s := &Show{Expr: p.expression()}
	if p.logging {
		p.log[first].first = true
	}
	p.refuseAssignment(s.Expr)
	s.Over = p.overSensitivity(s.Expr)
	s.In = p.inUnit()
	s.Span = p.from(start)
	return s
}

// inUnit reads in UNIT if it stands here.
func (p *parser) inUnit() *Unit {
	if !p.raw(0).word("in") {
		return nil
	}
	p.take()
	p.rescan()
	p.scan.inlineBlank()
	unit := p.unit(p.scan.unitAt())
	if unit == nil {
		p.fail(diag.Syntax, p.raw(0).span, "as in 9.81 m/s^2, rad/s or 1/s, without blanks", "a unit is missing after in")
	}
	return unit
}

// requirement reads require COND, "why".
func (p *parser) requirement() Statement {
	start := p.takeFirst().span.Start
	r := &Require{Cond: p.expression()}
	if p.raw(0).is(",") {
		p.take()
		p.skipLines()
		r.Why = p.quoted("the reason in quotes", `require COND, "why"`)
	}
	r.Span = p.from(start)
	return r
}

// claim reads claim EXPR is LITERAL.
func (p *parser) claim() Statement {
	start := p.takeFirst().span.Start
	c := &Claim{Expr: p.interval()}
	p.expectWord("is", "claim EXPR is LITERAL")
	c.Printed = p.expression()
	if odd := notPrinted(c.Printed); odd != nil {
		p.fail(diag.Syntax, odd.Extent(), "a claim compares with numbers, lists, matrices and polynomials as they are printed; two computed values are compared by require", "this is no printed number")
	}
	c.In = p.inUnit()
	c.Span = p.from(start)
	return c
}

// notPrinted gives the part of a claim's right side that no print-out can hold, or nil.
func notPrinted(x Expr) Expr {
	switch e := x.(type) {
	case *Number, *Name:
		return nil
	case *Unary:
		if e.Op == "-" {
			return notPrinted(e.X)
		}
	case *Binary:
		switch e.Op {
		case "+", "-", "*", "/", "^", "±":
			if odd := notPrinted(e.L); odd != nil {
				return odd
			}
			return notPrinted(e.R)
		}
	case *List:
		for _, element := range e.Elements {
			if odd := notPrinted(element); odd != nil {
				return odd
			}
		}
		return nil
	}
	return x
}

// definition reads define f(x, y) = EXPR, "what it gives".
func (p *parser) definition() Statement {
	const form = `define f(x, y) = EXPR, "what it gives"`
	start := p.takeFirst().span.Start
	d := &Define{Name: p.newName("the function's name")}
	p.expectOpen("(", form)
	p.enter(modeJoin, insideCall)
	p.setRole(rolePostfix)
	seen := map[string]bool{}
	for !p.peek().is(")") {
		param := p.newName("a parameter")
		if seen[param.Name] {
			p.fail(diag.Syntax, param.Span, "", "the parameter %s stands twice", param.Name)
		}
		seen[param.Name] = true
		d.Params = append(d.Params, param)
		switch t := p.peek(); {
		case t.is(","):
			p.take()
		case t.is("="):
			p.failHere(t, form, "a parameter has no value of its own")
		case !t.is(")"):
			p.unexpected(t)
		}
	}
	p.leave()
	p.expect("=", form)
	d.Body = p.expression()
	if p.raw(0).is(",") {
		p.take()
		p.skipLines()
		d.Doc = p.quoted("what the function gives, in quotes", form)
	}
	d.Span = p.from(start)
	return d
}

// use reads use "file.gain".
func (p *parser) use() Statement {
	start := p.takeFirst().span.Start
	t := p.take()
	return &Use{Path: t.text, PathSpan: t.span, Span: p.from(start)}
}
