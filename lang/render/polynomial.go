package render

import (
	"math"
	"math/big"
	"strconv"
	"strings"

	"gainwright/lang/value"
)

// coefficients gives a polynomial's coefficients, highest power first, at least one.
func coefficients(p *value.Polynomial) []value.Number {
	var out []value.Number
	if p.Exact != nil {
		for _, c := range p.Exact.Coefficients() {
			out = append(out, value.Rat(c))
		}
	} else {
		for _, c := range p.F {
			out = append(out, value.Number{F: c, Err: p.Err})
		}
	}
	if len(out) == 0 {
		out = append(out, value.Rat(new(big.Rat)))
	}
	return out
}

// polynomialText writes a polynomial in the form the language reads back.
func polynomialText(p *value.Polynomial, o Options) (string, sign) {
	numbers := coefficients(p)
	figures := make([]figure, len(numbers))
	s := unsigned
	fractions := p.Exact != nil && (o.Fractions || coefficientsAreShort(numbers, o))
	for i, n := range numbers {
		figures[i] = figureOf(n, o)
		if fractions && (o.Fractions || figures[i].sign == keptExact) {
			figures[i] = asFraction(figures[i], n.Exact)
		}
		s = s.both(figures[i].sign)
	}
	var b strings.Builder
	for i, f := range figures {
		power := len(figures) - 1 - i
		if f.digits == "0" && len(figures) > 1 {
			continue
		}
		writeTerm(&b, f, power, p.Variable)
	}
	if b.Len() == 0 {
		b.WriteString("0")
	}
	return b.String(), s
}

// coefficientsAreShort tells whether some coefficients are cut and each that is would be a short fraction.
func coefficientsAreShort(numbers []value.Number, o Options) bool {
	some := false
	for _, n := range numbers {
		if exactFigure(n.Exact, o.digits()).sign == keptExact {
			if !isShortFraction(n.Exact) {
				return false
			}
			some = true
		}
	}
	return some
}

func writeTerm(b *strings.Builder, f figure, power int, variable string) {
	negative := f.isNegative()
	switch {
	case b.Len() > 0 && negative:
		b.WriteString(" - ")
	case b.Len() > 0:
		b.WriteString(" + ")
	case negative:
		b.WriteString("-")
	}
	f.negative = false
	f.fraction = strings.TrimPrefix(f.fraction, "-")
	factor := ""
	switch power {
	case 0:
	case 1:
		factor = variable
	default:
		factor = variable + "^" + strconv.Itoa(power)
	}
	isOne := f.sign == exactly && f.text() == "1"
	switch {
	case factor == "":
		b.WriteString(f.text())
	case isOne:
		b.WriteString(factor)
	default:
		b.WriteString(f.text() + "*" + factor)
	}
}

func layPolynomial(p *value.Polynomial, o Options) laid {
	text, s := polynomialText(p, o)
	l := laid{sign: s, inline: text}
	if p.Exact == nil {
		l.remarks = digitRemark(polynomialDigits(p), o)
	}
	return l
}

// polynomialDigits is how many digits of the largest coefficient hold.
func polynomialDigits(p *value.Polynomial) int {
	largest := 0.0
	for _, c := range p.F {
		largest = math.Max(largest, math.Abs(c))
	}
	if largest == 0 {
		return 17
	}
	return holding(largest, p.Err)
}

// ratioText is a rational function on one line, in the form the language reads back.
func ratioText(r value.Ratio, o Options) (string, sign) {
	num, s := polynomialText(r.Num, o)
	den, t := polynomialText(r.Den, o)
	if den == "1" {
		return num, s.both(t)
	}
	// A product above needs no brackets, since * and / are read from the left.
	if strings.Contains(num, " ") {
		num = "(" + num + ")"
	}
	return num + "/" + factorText(den), s.both(t)
}

// factorText puts brackets around a sum or a product.
func factorText(text string) string {
	if strings.ContainsAny(text, " */") || strings.HasPrefix(text, "-") {
		return "(" + text + ")"
	}
	return text
}

// overRule writes a fraction as numerator, rule and denominator.
func overRule(r value.Ratio, o Options) ([]string, sign) {
	num, s := polynomialText(r.Num, o)
	den, t := polynomialText(r.Den, o)
	above := breakAfterOperators("", num, o.width())
	below := breakAfterOperators("", den, o.width())
	w := max(widest(above), widest(below))
	center := func(lines []string) []string {
		indent := (w - widest(lines)) / 2
		return indentAll(lines, indent)
	}
	lines := center(above)
	lines = append(lines, strings.Repeat("─", w))
	return append(lines, center(below)...), s.both(t)
}

// a transfer function longer than this share of the width is set over a rule
const oneLineShare = 0.6

func layTransfer(g *value.Transfer, o Options) laid {
	l := laid{sign: unsigned, notes: g.Notes}
	if g.Every != nil {
		l.title = everyText(*g.Every)
	}
	single := len(g.Entries) == 1 && len(g.Entries[0]) == 1
	digits := 17
	for i, row := range g.Entries {
		for j, r := range row {
			digits = min(digits, ratioDigits(r))
			text, s := ratioText(r, o)
			l.sign = l.sign.both(s)
			fits := float64(cells(text)) <= oneLineShare*float64(o.width())
			if single && fits && g.Every == nil {
				l.inline = text
				break
			}
			head := ""
			if !single {
				head = channelName(g, i, j)
			}
			l.lines = append(l.lines, layRatio(head, r, text, fits, o)...)
		}
	}
	if len(l.lines) == 0 && l.inline == "" {
		l.inline = "a transfer function without channels"
	}
	l.remarks = digitRemark(digits, o)
	return l
}

func ratioDigits(r value.Ratio) int {
	digits := 17
	for _, p := range []*value.Polynomial{r.Num, r.Den} {
		if p.Exact == nil {
			digits = min(digits, polynomialDigits(p))
		}
	}
	return digits
}

func layRatio(head string, r value.Ratio, text string, fits bool, o Options) []string {
	if fits {
		if head == "" {
			return []string{text}
		}
		return []string{head + "   " + text}
	}
	lines, _ := overRule(r, o.narrower(4))
	if head == "" {
		return lines
	}
	return append([]string{head}, indentAll(lines, 2)...)
}

func channelName(g *value.Transfer, i, j int) string {
	name := func(signals []value.Signal, k int, fallback string) string {
		if k < len(signals) && signals[k].Name != "" {
			return signalHead(signals[k])
		}
		return fallback + " " + strconv.Itoa(k+1)
	}
	return name(g.Outputs, i, "output") + " from " + name(g.Inputs, j, "input") + ":"
}

func inlineNumber(n value.Number, o Options) string { return figureOf(n, o).text() }
