package syntax

import (
	"math/big"

	"gainwright/lang/diag"
)

// postfix reads an operand with its calls, subscripts, fields and transpositions.
func (p *parser) postfix() Expr {
	x := p.operand()
	for {
		t := p.peek()
		switch {
		case t.is("(") && callable(x):
			x = p.call(x)
		case t.is("[") && indexable(x):
			x = p.index(x)
		case t.is(".") && indexable(x):
			x = p.field(x)
		case t.is("ᵀ"):
			p.take()
			p.setRole(rolePostfix)
			span := diag.Span{Start: x.Extent().Start, End: t.span.End}
			p.grown(span, p.height)
			x = &Unary{Op: "ᵀ", X: x, At: t.span, Span: span}
		default:
			return x
		}
	}
}

// callable tells whether parentheses after the expression can be a call. After a number
// or a parenthesis they are a product without its sign.
func callable(x Expr) bool {
	switch x.(type) {
	case *Name, *Field, *Index, *Call:
		return true
	}
	return false
}

// indexable tells whether a subscript or a field can follow.
func indexable(x Expr) bool {
	switch x.(type) {
	case *Number, *Text, *Boolean, *If:
		return false
	}
	return true
}

// operand reads a literal, a name, a list, a parenthesis or an if.
func (p *parser) operand() Expr {
	t := p.peek()
	switch {
	case t.kind == tokenNumber:
		return p.number()
	case t.kind == tokenQuote:
		p.take()
		p.grown(t.span, 0)
		return &Text{Value: t.text, Span: t.span}
	case t.is("("):
		return p.parenthesis()
	case t.is("["):
		return p.list()
	case t.word("if"):
		return p.choice()
	case t.word("true"), t.word("false"):
		p.take()
		p.grown(t.span, 0)
		return &Boolean{Value: t.text == "true", Span: t.span}
	case t.kind == tokenWord && !reserved[t.text]:
		p.take()
		p.grown(t.span, 0)
		return &Name{Name: t.text, Span: t.span}
	}
	p.missingOperand(t)
	return nil
}

// number reads a number with what belongs to it: i, per cent, unit.
func (p *parser) number() Expr {
	t := p.take()
	n := &Number{Text: t.text, Value: decimal(t.text), Imaginary: t.imaginary, Span: t.span}
	p.rescan()
	if p.scan.inlineBlank(); p.scan.at("%") {
		p.take()
		p.setRole(rolePercent)
		n.Percent = true
		n.Value = n.Value.Quo(n.Value, big.NewRat(100, 1))
	} else {
		p.rescan()
		n.Unit = p.unit(p.scan.unitAfterNumber())
	}
	n.Span.End = p.prev.span.End
	p.grown(n.Span, 0)
	return n
}

// unit takes a unit that was read on demand as a token.
func (p *parser) unit(unit *Unit) *Unit {
	if unit == nil {
		return nil
	}
	p.prev = token{kind: tokenUnit, text: unit.Text, span: unit.Span, spaceBefore: true}
	if p.logging {
		p.log = append(p.log, placed{token: p.prev})
	}
	return unit
}

// parenthesis reads (EXPR); the parentheses belong to the expression's place.
func (p *parser) parenthesis() Expr {
	start := p.peek().span.Start
	p.enter(modeJoin, insideGroup)
	x := p.expression()
	if t := p.peek(); !t.is(")") {
		p.unexpected(t)
	}
	p.leave()
	return placedAt(x, p.from(start))
}

// placedAt sets an expression's place.
func placedAt(x Expr, span diag.Span) Expr {
	switch e := x.(type) {
	case *Number:
		e.Span = span
	case *Text:
		e.Span = span
	case *Boolean:
		e.Span = span
	case *Name:
		e.Span = span
	case *Unary:
		e.Span = span
	case *Binary:
		e.Span = span
	case *Call:
		e.Span = span
	case *Index:
		e.Span = span
	case *Field:
		e.Span = span
	case *List:
		e.Span = span
	case *ForEach:
		e.Span = span
	case *If:
		e.Span = span
	}
	return x
}

// list reads [A, B, …] or [E for each x of L where C].
func (p *parser) list() Expr {
	start := p.peek().span.Start
	p.enter(modeList, insideList)
	list := &List{}
	height := 0
	p.skipLines()
	for !p.peek().is("]") {
		list.Elements = append(list.Elements, p.expression())
		height = max(height, p.height)
		if len(list.Elements) == 1 && p.nextAfterLines().word("for") {
			return p.comprehension(start, list.Elements[0])
		}
		p.separator("]")
	}
	p.leave()
	list.Span = p.from(start)
	p.grown(list.Span, height)
	return list
}

// nextAfterLines is the next token, line ends aside.
func (p *parser) nextAfterLines() token {
	t := p.raw(0)
	if t.kind == tokenNewline {
		t = p.raw(1)
	}
	return t
}

// separator passes what stands between two elements: a comma or a line end. Before the
// closing bracket nothing has to.
func (p *parser) separator(closing string) {
	t := p.peek()
	if t.kind == tokenNewline {
		p.skipLines()
		if !p.peek().is(",") {
			return
		}
		t = p.peek()
	}
	switch {
	case t.is(","):
		p.take()
		p.skipLines()
	case !t.is(closing):
		p.unexpected(t)
	}
}

// comprehension reads the rest of [E for each x of L where C].
func (p *parser) comprehension(start int, body Expr) Expr {
	height := p.height
	p.open[len(p.open)-1].mode = modeJoin
	p.take()
	p.expectWord("each", "[E for each x of L where C]")
	e := &ForEach{Body: body, Variable: p.newName("the name that runs through the list")}
	p.expectWord("of", "[E for each x of L where C]")
	e.In = p.expression()
	height = max(height, p.height)
	if p.peek().word("where") {
		p.take()
		e.Where = p.expression()
		height = max(height, p.height)
	}
	if t := p.peek(); !t.is("]") {
		p.unexpected(t)
	}
	p.leave()
	e.Span = p.from(start)
	p.grown(e.Span, height)
	return e
}

// choice reads if C { A } else { B }; else if … goes on.
func (p *parser) choice() Expr {
	const form = "if C { A } else { B }"
	t := p.take()
	p.deeper(t.span)
	e := &If{Cond: p.expression()}
	height := p.height
	e.Then = p.branch(form)
	height = max(height, p.height)
	p.expectWord("else", form)
	if p.peek().word("if") {
		e.Else = p.choice()
	} else {
		e.Else = p.branch(form)
	}
	p.depth--
	e.Span = p.from(t.span.Start)
	p.grown(e.Span, max(height, p.height))
	return e
}

func (p *parser) branch(form string) Expr {
	if t := p.peek(); t.is("=") {
		p.unexpected(t)
	}
	p.expectOpen("{", form)
	p.enter(modeJoin, insideChoice)
	x := p.expression()
	if t := p.peek(); !t.is("}") {
		p.unexpected(t)
	}
	p.leave()
	return x
}

// call reads (A, B, name: C).
func (p *parser) call(function Expr) Expr {
	height := p.height
	p.enter(modeJoin, insideCall)
	p.setRole(rolePostfix)
	c := &Call{Function: function}
	named := map[string]bool{}
	for !p.peek().is(")") {
		c.Args = append(c.Args, p.argument(named))
		height = max(height, p.height)
		t := p.peek()
		if t.is(",") {
			p.take()
		} else if !t.is(")") {
			p.unexpected(t)
		}
	}
	p.leave()
	c.Span = p.from(function.Extent().Start)
	p.grown(c.Span, height)
	return c
}

// argument reads VALUE or name: VALUE.
func (p *parser) argument(named map[string]bool) Argument {
	t := p.peek()
	if t.kind == tokenWord && p.isColon() {
		if named[t.text] {
			p.fail(diag.Syntax, t.span, "", "the argument %s is given twice", t.text)
		}
		named[t.text] = true
		p.take()
		p.take()
		p.skipLines()
		return Argument{Name: &Ident{Name: t.text, Span: t.span}, Value: p.expression()}
	}
	value := p.expression()
	if len(named) > 0 {
		p.fail(diag.Syntax, value.Extent(), "name it, or move it to the front", "an argument without a name after named ones")
	}
	return Argument{Value: value}
}

// isColon tells whether a colon follows the next token.
func (p *parser) isColon() bool {
	for i := 1; ; i++ {
		if t := p.raw(i); t.kind != tokenNewline {
			return t.is(":")
		}
	}
}

// index reads [i, j], with ranges i..j.
func (p *parser) index(x Expr) Expr {
	height := p.height
	p.enter(modeList, insideIndex)
	p.setRole(rolePostfix)
	e := &Index{X: x}
	p.skipLines()
	for {
		s := Subscript{Low: p.expression()}
		height = max(height, p.height)
		if p.peek().is("..") {
			p.take()
			p.setRole(roleTight)
			s.High = p.expression()
			height = max(height, p.height)
		}
		e.Subscripts = append(e.Subscripts, s)
		t := p.nextAfterLines()
		if t.is("]") {
			p.skipLines()
			break
		}
		p.separator("]")
	}
	p.leave()
	e.Span = p.from(x.Extent().Start)
	p.grown(e.Span, height)
	return e
}

// field reads .name; every word can be one.
func (p *parser) field(x Expr) Expr {
	p.take()
	p.setRole(roleTight)
	t := p.peek()
	if t.kind != tokenWord {
		p.fail(diag.Syntax, t.span, "as in K.poles", "the name of a field is missing after the point")
	}
	p.take()
	span := p.from(x.Extent().Start)
	p.grown(span, p.height)
	return &Field{X: x, Name: Ident{Name: t.text, Span: t.span}, Span: span}
}
