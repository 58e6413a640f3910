package render

import (
	"html"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// mathDocument wraps presentation MathML; every text in it is escaped.
func mathDocument(body string) string {
	return `<math xmlns="http://www.w3.org/1998/Math/MathML">` + body + `</math>`
}

func mathElement(name, text string) string {
	return "<" + name + ">" + html.EscapeString(text) + "</" + name + ">"
}

// mathFigure writes a number without its sign.
func mathFigure(f figure) string {
	text := f.text()
	if num, den, ok := strings.Cut(text, "/"); ok {
		return "<mfrac>" + mathElement("mn", num) + mathElement("mn", den) + "</mfrac>"
	}
	mantissa, exponent, ok := strings.Cut(text, "e")
	if !ok {
		return mathElement("mn", text)
	}
	power := mathElement("mn", strings.TrimPrefix(exponent, "-"))
	if strings.HasPrefix(exponent, "-") {
		power = "<mrow>" + mathElement("mo", "−") + power + "</mrow>"
	}
	return mathElement("mn", mantissa) + mathElement("mo", "·") + "<msup>" + mathElement("mn", "10") + power + "</msup>"
}

// mathPolynomial writes a polynomial with the same digits as its text.
func mathPolynomial(p *value.Polynomial, o Options) string {
	numbers := coefficients(p)
	fractions := p.Exact != nil && (o.Fractions || coefficientsAreShort(numbers, o))
	var b strings.Builder
	for i, n := range numbers {
		f := figureOf(n, o)
		if fractions && (o.Fractions || f.sign == keptExact) {
			f = asFraction(f, n.Exact)
		}
		if f.digits == "0" && len(numbers) > 1 {
			continue
		}
		switch {
		case f.isNegative():
			b.WriteString(mathElement("mo", "−"))
		case b.Len() > 0:
			b.WriteString(mathElement("mo", "+"))
		}
		f.negative = false
		f.fraction = strings.TrimPrefix(f.fraction, "-")
		power := len(numbers) - 1 - i
		if power == 0 || f.sign != exactly || f.text() != "1" {
			b.WriteString(mathFigure(f))
		}
		switch variable := mathElement("mi", p.Variable); {
		case power == 1:
			b.WriteString(variable)
		case power > 1:
			b.WriteString("<msup>" + variable + mathElement("mn", strconv.Itoa(power)) + "</msup>")
		}
	}
	if b.Len() == 0 {
		b.WriteString(mathElement("mn", "0"))
	}
	return "<mrow>" + b.String() + "</mrow>"
}

// mathRatio writes a rational function as a fraction.
func mathRatio(r value.Ratio, o Options) string {
	if den, _ := polynomialText(r.Den, o); den == "1" {
		return mathPolynomial(r.Num, o)
	}
	return "<mfrac>" + mathPolynomial(r.Num, o) + mathPolynomial(r.Den, o) + "</mfrac>"
}
