package render

import (
	"fmt"
	"math"
	"math/big"

	"gainwright/lang/value"
)

// layNumber lays a real number out, with a unit after it when unit is not empty.
func layNumber(n value.Number, unit string, o Options) laid {
	f := figureOf(n, o)
	l := laid{sign: f.sign}
	if n.Exact != nil && unit == "" && !n.Exact.IsInt() {
		switch {
		case o.Fractions:
			f = f.withFraction(n.Exact)
			l.sign = exactly
		case f.sign == keptExact && isShortFraction(n.Exact):
			l.sign = exactly
			l.inline = n.Exact.RatString() + " ≈ " + f.text()
			return l
		}
	}
	l.inline = withUnit(f.text(), unit)
	l.remarks = floatRemarks(n, o)
	return l
}

func withUnit(text, unit string) string {
	if unit == "" {
		return text
	}
	return text + " " + unit
}

// floatRemarks says what a reader must know of a floating number's digits.
func floatRemarks(n value.Number, o Options) []string {
	if n.Exact != nil || n.Err == 0 || math.IsInf(n.F, 0) || math.IsNaN(n.F) {
		return nil
	}
	if math.Abs(n.F) <= n.Err {
		return []string{"smaller than its own uncertainty, " + floatFigure(n.Err, 0, 2).text()}
	}
	return digitRemark(holding(n.F, n.Err), o)
}

// digitRemark says how many digits hold where that is fewer than asked for.
func digitRemark(hold int, o Options) []string {
	switch {
	case hold >= o.digits():
		return nil
	case hold <= 0:
		return []string{"not one digit is certain"}
	case hold == 1:
		return []string{"1 digit holds"}
	}
	return []string{fmt.Sprintf("%d digits hold", hold)}
}

// complexFigures cuts both parts of a complex number.
func complexFigures(c value.Complex, o Options) (re, im figure) {
	if c.ExactRe != nil {
		re, im = exactFigure(c.ExactRe, o.digits()), exactFigure(c.ExactIm, o.digits())
		if o.Fractions {
			re, im = asFraction(re, c.ExactRe), asFraction(im, c.ExactIm)
		}
		return re, im
	}
	return floatFigure(real(c.C), c.Err, o.digits()), floatFigure(imag(c.C), c.Err, o.digits())
}

func asFraction(f figure, r *big.Rat) figure {
	if r.IsInt() {
		return f
	}
	return f.withFraction(r)
}

// imaginaryText is the imaginary part without its sign, in a form that reads back.
func (f figure) imaginaryText() string {
	f.negative = false
	if f.fraction != "" {
		if f.fraction[0] == '-' {
			f.fraction = f.fraction[1:]
		}
		return f.fraction + "*1i"
	}
	return f.text() + "i"
}

func (f figure) isNegative() bool {
	if f.fraction != "" {
		return f.fraction[0] == '-'
	}
	return f.negative
}

func complexText(re, im figure) string {
	operator := " + "
	if im.isNegative() {
		operator = " - "
	}
	if re.word == "" && re.fixed() == "0" && re.sign == exactly {
		if im.isNegative() {
			return "-" + im.imaginaryText()
		}
		return im.imaginaryText()
	}
	return re.text() + operator + im.imaginaryText()
}

func layComplex(c value.Complex, o Options) laid {
	re, im := complexFigures(c, o)
	l := laid{sign: re.sign.both(im.sign), inline: complexText(re, im)}
	if !c.IsExact() {
		size := math.Hypot(real(c.C), imag(c.C))
		l.remarks = digitRemark(holding(size, c.Err), o)
	}
	return l
}

// pairText writes two conjugates as re ± im i.
func pairText(c value.Complex, o Options) (string, sign) {
	re, im := complexFigures(c, o)
	return re.text() + " ± " + im.imaginaryText(), re.sign.both(im.sign)
}

// areConjugates tells whether two values are a conjugate pair.
func areConjugates(a, b value.Value) (value.Complex, bool) {
	x, ok1 := a.(value.Complex)
	y, ok2 := b.(value.Complex)
	if !ok1 || !ok2 || x.IsExact() != y.IsExact() {
		return x, false
	}
	if x.IsExact() {
		opposite := new(big.Rat).Neg(y.ExactIm)
		return x, x.ExactRe.Cmp(y.ExactRe) == 0 && x.ExactIm.Cmp(opposite) == 0 && x.ExactIm.Sign() != 0
	}
	return x, real(x.C) == real(y.C) && imag(x.C) == -imag(y.C) && imag(x.C) != 0
}
