package syntax

import (
	"gainwright/lang/diag"
)

// expression reads EXPR: or, loosest of the operators.
func (p *parser) expression() Expr {
	p.deeper(p.peek().span)
	defer func() { p.depth-- }()
	left := p.conjunction()
	for p.operator("or") {
		left = p.binary(left, "or", p.conjunction)
	}
	return left
}

func (p *parser) conjunction() Expr {
	left := p.negation()
	for p.operator("and") {
		left = p.binary(left, "and", p.negation)
	}
	return left
}

func (p *parser) negation() Expr {
	if !p.peek().word("not") {
		return p.comparison()
	}
	op := p.take()
	p.skipLines()
	p.deeper(op.span)
	x := p.negation()
	p.depth--
	span := p.from(op.span.Start)
	p.grown(span, p.height)
	return &Unary{Op: "not", X: x, At: op.span, Span: span}
}

var comparisons = []string{"==", "!=", "<=", ">=", "<", ">"}

func (p *parser) comparison() Expr {
	left := p.interval()
	op := p.oneOf(comparisons)
	if op == "" {
		return left
	}
	whole := p.binary(left, op, p.interval)
	if second := p.oneOf(comparisons); second != "" {
		at := p.raw(0).span
		a, b := p.written(left.Extent()), p.written(whole.(*Binary).R.Extent())
		c := p.written(p.binary(whole, second, p.interval).(*Binary).R.Extent())
		p.fail(diag.Syntax, at, "write "+a+" "+op+" "+b+" and "+b+" "+second+" "+c, "comparisons are not chained")
	}
	return whole
}

// interval reads L ± R.
func (p *parser) interval() Expr {
	left := p.sum()
	if !p.operator("±") {
		return left
	}
	whole := p.binary(left, "±", p.sum)
	if p.operator("±") {
		p.fail(diag.Syntax, p.raw(0).span, "", "± stands once between two values")
	}
	return whole
}

func (p *parser) sum() Expr {
	left := p.product()
	for {
		op := p.oneOf([]string{"+", "-"})
		if op == "" {
			return left
		}
		left = p.binary(left, op, p.product)
	}
}

func (p *parser) product() Expr {
	left := p.unary()
	for {
		op := p.oneOf([]string{"*", "/"})
		if op == "" {
			return left
		}
		whole := p.binary(left, op, p.unary)
		if op == "/" {
			p.noteDivisor(whole.(*Binary))
		}
		left = whole
	}
}

func (p *parser) unary() Expr {
	if !p.peek().is("-") {
		return p.power(false)
	}
	return p.signed(p.unary)
}

// signed reads a minus sign and what it turns over.
func (p *parser) signed(operand func() Expr) Expr {
	op := p.take()
	p.setRole(roleSign)
	p.skipLines()
	p.deeper(op.span)
	x := operand()
	p.depth--
	span := p.from(op.span.Start)
	p.grown(span, p.height)
	return &Unary{Op: "-", X: x, At: op.span, Span: span}
}

// power reads base^exponent; the exponent may carry a sign and is a power itself.
func (p *parser) power(exponent bool) Expr {
	if exponent && p.peek().is("-") {
		return p.signed(func() Expr { return p.power(true) })
	}
	left := p.postfix()
	if !p.operator("^") {
		return left
	}
	if p.prev.kind == tokenUnit {
		p.fail(diag.Syntax, p.raw(0).span, "m^2 without blanks is a unit; a power of the whole is (2 m)^2", "it is unclear whether ^ belongs to the unit or to the whole quantity")
	}
	p.deeper(p.raw(0).span)
	defer func() { p.depth-- }()
	return p.binary(left, "^", func() Expr { return p.power(true) })
}

// operator tells whether the next token is this binary operator. In a list a line end
// before it is passed, because such a line goes on with the one before.
func (p *parser) operator(op string) bool {
	t := p.peek()
	if t.kind == tokenNewline && p.mode() == modeList {
		t = p.raw(1)
		// A minus that touches what follows is a sign: it begins a new entry.
		if !t.is(op) && !t.word(op) || op == "-" && p.touchesNext(t) {
			return false
		}
		p.skipLines()
		return true
	}
	return t.is(op) || t.word(op)
}

// touchesNext tells whether no blank follows the token.
func (p *parser) touchesNext(t token) bool { return !p.scan.blankAt(t.span.End) }

func (p *parser) oneOf(ops []string) string {
	if t := p.peek(); t.kind != tokenSign && t.kind != tokenNewline {
		return ""
	}
	for _, op := range ops {
		if p.operator(op) {
			return op
		}
	}
	return ""
}

// binary reads the operator and its right side; a line may end after the operator.
func (p *parser) binary(left Expr, op string, operand func() Expr) Expr {
	height := p.height
	at := p.take()
	p.setRole(operatorRole(op))
	p.skipLines()
	right := operand()
	span := left.Extent().Join(right.Extent())
	p.grown(at.span, max(height, p.height))
	return &Binary{Op: op, L: left, R: right, At: at.span, Span: span}
}
