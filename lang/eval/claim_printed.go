package eval

import (
	"math/big"
	"strconv"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
)

// printed is what stands after is: a number with the interval its digits leave, or a
// structure of them.
type printed interface{ place() diag.Span }

type (
	// printedNumber is a real number. Half is half a unit of its last place, zero where
	// equality is demanded; unit is the last place itself.
	printedNumber struct {
		text       string
		value      *big.Rat
		half, last *big.Rat
		unit       *syntax.Unit
		implied    bool // not written: the 1 before s^k, the 0 of a power that is left out
		span       diag.Span
	}
	printedComplex struct {
		re, im printedNumber
		span   diag.Span
	}
	printedList struct {
		items []printed
		span  diag.Span
	}
	// printedPolynomial holds coefficients by power; a power that is not written has none.
	printedPolynomial struct {
		variable string
		terms    map[int]printedNumber
		span     diag.Span
	}
	printedRatio struct {
		num, den printedPolynomial
		span     diag.Span
	}
)

func (p printedNumber) place() diag.Span     { return p.span }
func (p printedComplex) place() diag.Span    { return p.span }
func (p printedList) place() diag.Span       { return p.span }
func (p printedPolynomial) place() diag.Span { return p.span }
func (p printedRatio) place() diag.Span      { return p.span }

// highest power that a printed polynomial may have
const highestPrintedPower = 10_000

// exactly is a printed number that demands equality.
func exactly(v *big.Rat, span diag.Span, text string) printedNumber {
	return printedNumber{text: text, value: v, half: new(big.Rat), last: new(big.Rat), span: span}
}

// implied is a coefficient that a printed polynomial leaves out. A floating coefficient
// that has the value by the way the polynomial was made meets it.
func implied(v *big.Rat, span diag.Span, text string) printedNumber {
	p := exactly(v, span, text)
	p.implied = true
	return p
}

// interval reads a number literal: half a unit of the last written digit to either side.
// A bare 0 demands equality.
func interval(n *syntax.Number) printedNumber {
	p := exactly(n.Value, n.Span, n.Text)
	p.unit = n.Unit
	digits := strings.TrimRight(n.Text, "i% \t")
	if digits == "0" {
		return p
	}
	exponent := 0
	if at := strings.IndexAny(digits, "eE"); at >= 0 {
		exponent, _ = strconv.Atoi(digits[at+1:])
		digits = digits[:at]
	}
	if at := strings.IndexByte(digits, '.'); at >= 0 {
		exponent -= len(digits) - at - 1
	}
	if n.Percent {
		exponent -= 2
	}
	p.last = tenTo(exponent)
	p.half = new(big.Rat).Quo(p.last, big.NewRat(2, 1))
	return p
}

func tenTo(exponent int) *big.Rat {
	power := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(max(exponent, -exponent))), nil)
	if exponent < 0 {
		return new(big.Rat).SetFrac(big.NewInt(1), power)
	}
	return new(big.Rat).SetInt(power)
}

func (p printedNumber) negated() printedNumber {
	p.value = new(big.Rat).Neg(p.value)
	if strings.HasPrefix(p.text, "-") {
		p.text = p.text[1:]
	} else {
		p.text = "-" + p.text
	}
	return p
}

// readPrinted reads the right side of a claim.
func readPrinted(e syntax.Expr) (printed, *diag.Error) {
	if list, ok := e.(*syntax.List); ok {
		return readPrintedList(list)
	}
	if n, ok := readReal(e); ok {
		return n, nil
	}
	if c, ok := readComplex(e); ok {
		return c, nil
	}
	if p, ok := readPolynomial(e); ok {
		return p, nil
	}
	if b, ok := e.(*syntax.Binary); ok && b.Op == "/" {
		num, ok := readPolynomial(b.L)
		den, ok2 := readPolynomial(b.R)
		if ok && ok2 {
			return printedRatio{num, den, b.Span}, nil
		}
	}
	return nil, diag.New(diag.Syntax, "this cannot be read as a printed number, list, matrix or polynomial").At(e.Extent()).
		WithHelp("a polynomial is printed as a sum of powers; two computed values are compared by require A == B")
}

func readPrintedList(e *syntax.List) (printed, *diag.Error) {
	out := printedList{span: e.Span}
	for _, x := range e.Elements {
		if b, ok := x.(*syntax.Binary); ok && b.Op == "±" {
			pair, err := readPair(b)
			if err != nil {
				return nil, err
			}
			out.items = append(out.items, pair...)
			continue
		}
		item, err := readPrinted(x)
		if err != nil {
			return nil, err
		}
		out.items = append(out.items, item)
	}
	return out, nil
}

// readPair reads a ± bi as its two members.
func readPair(b *syntax.Binary) ([]printed, *diag.Error) {
	re, ok := readReal(b.L)
	im, ok2 := readImaginary(b.R)
	if !ok || !ok2 {
		return nil, diag.New(diag.Syntax, "a printed pair looks like -2 ± 3i").At(b.Span)
	}
	return []printed{printedComplex{re, im, b.Span}, printedComplex{re, im.negated(), b.Span}}, nil
}

// readReal reads a real literal: digits with a sign, or a quotient of two, which demands equality.
func readReal(e syntax.Expr) (printedNumber, bool) {
	switch e := e.(type) {
	case *syntax.Number:
		if e.Imaginary {
			return printedNumber{}, false
		}
		return interval(e), true
	case *syntax.Unary:
		if e.Op == "-" {
			n, ok := readReal(e.X)
			if !ok {
				return n, false
			}
			n.span = e.Span
			return n.negated(), true
		}
	case *syntax.Binary:
		if e.Op == "/" {
			a, ok := readReal(e.L)
			b, ok2 := readReal(e.R)
			if !ok || !ok2 || b.value.Sign() == 0 || a.unit != nil {
				return printedNumber{}, false
			}
			q := exactly(new(big.Rat).Quo(a.value, b.value), e.Span, a.text+"/"+b.text)
			q.unit = b.unit
			return q, true
		}
	}
	return printedNumber{}, false
}

func readImaginary(e syntax.Expr) (printedNumber, bool) {
	switch e := e.(type) {
	case *syntax.Number:
		return interval(e), e.Imaginary
	case *syntax.Unary:
		if n, ok := readImaginary(e.X); ok && e.Op == "-" {
			return n.negated(), true
		}
	case *syntax.Binary:
		if e.Op == "/" {
			a, ok := readImaginary(e.L)
			b, ok2 := readReal(e.R)
			if ok && ok2 && b.value.Sign() != 0 {
				return exactly(new(big.Rat).Quo(a.value, b.value), e.Span, a.text+"/"+b.text), true
			}
		}
	}
	return printedNumber{}, false
}

func readComplex(e syntax.Expr) (printedComplex, bool) {
	if im, ok := readImaginary(e); ok {
		return printedComplex{exactly(new(big.Rat), e.Extent(), "0"), im, e.Extent()}, true
	}
	b, ok := e.(*syntax.Binary)
	if !ok || b.Op != "+" && b.Op != "-" {
		return printedComplex{}, false
	}
	re, ok := readReal(b.L)
	im, ok2 := readImaginary(b.R)
	if !ok || !ok2 {
		return printedComplex{}, false
	}
	if b.Op == "-" {
		im = im.negated()
	}
	return printedComplex{re, im, b.Span}, true
}

// readPolynomial reads a sum of terms c*s^k.
func readPolynomial(e syntax.Expr) (printedPolynomial, bool) {
	p := printedPolynomial{terms: map[int]printedNumber{}, span: e.Extent()}
	ok := p.read(e, false)
	return p, ok
}

// read adds the terms of a sum, walking its left side in a loop because sums are long.
func (p *printedPolynomial) read(e syntax.Expr, negative bool) bool {
	for {
		switch x := e.(type) {
		case *syntax.Binary:
			if x.Op == "+" || x.Op == "-" {
				if !p.term(x.R, negative != (x.Op == "-")) {
					return false
				}
				e = x.L
				continue
			}
		case *syntax.Unary:
			if x.Op == "-" {
				if _, isReal := readReal(x); !isReal {
					return p.term(x.X, !negative)
				}
			}
		}
		return p.term(e, negative)
	}
}

func (p *printedPolynomial) term(e syntax.Expr, negative bool) bool {
	coefficient, power, ok := p.monomial(e)
	if !ok {
		return false
	}
	if negative {
		coefficient = coefficient.negated()
	}
	if _, twice := p.terms[power]; twice {
		return false
	}
	p.terms[power] = coefficient
	return true
}

// monomial reads c, s^k or c*s^k.
func (p *printedPolynomial) monomial(e syntax.Expr) (c printedNumber, power int, ok bool) {
	if n, ok := readReal(e); ok {
		return n, 0, n.unit == nil
	}
	one := implied(ratOne, e.Extent(), "1")
	switch e := e.(type) {
	case *syntax.Unary:
		if e.Op == "-" {
			if c, power, ok = p.monomial(e.X); !ok {
				return c, 0, false
			}
			return c.negated(), power, true
		}
	case *syntax.Name:
		if variables[e.Name] == nil || p.variable != "" && p.variable != e.Name {
			return one, 0, false
		}
		p.variable = e.Name
		return one, 1, true
	case *syntax.Binary:
		switch e.Op {
		case "^":
			n, isNumber := e.R.(*syntax.Number)
			if _, isName := e.L.(*syntax.Name); !isName || !isNumber {
				return one, 0, false
			}
			if _, _, ok := p.monomial(e.L); !ok || !n.Value.IsInt() || n.Value.Sign() < 0 || n.Value.Cmp(big.NewRat(highestPrintedPower, 1)) > 0 {
				return one, 0, false
			}
			return one, int(n.Value.Num().Int64()), true
		case "*":
			factor, isReal := readReal(e.L)
			_, power, ok = p.monomial(e.R)
			return factor, power, ok && isReal && factor.unit == nil && power > 0
		}
	}
	return one, 0, false
}
