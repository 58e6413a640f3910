package model

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// functionDual is a function of one plain number with its slope.
func functionDual(o operation, a *dual) (dual, error) {
	switch o {
	case opSin, opCos, opTan:
		return trigonometricDual(o, a)
	case opAsin, opAcos, opAtan:
		return inverseDual(o, a)
	}
	x, err := a.value.number()
	if err != nil {
		return dual{}, err
	}
	switch o {
	case opExp:
		y, err := real(value.Exp(x))
		if err != nil {
			return dual{}, err
		}
		return a.chain(y, y)
	case opLog, opLog10:
		if x.Sign() <= 0 {
			return dual{}, diag.New(diag.Numerical, "the logarithm of %s at this point", signWord(x))
		}
		return logarithmDual(o, a, x)
	}
	return dual{}, diag.New(diag.Internal, "an operation of an unknown kind in a model")
}

func signWord(x value.Number) string {
	if x.IsZero() {
		return "zero"
	}
	return "a negative number"
}

// real takes the result of a function as an amount.
func real(v value.Value, err error) (amount, error) {
	n, err := numberOf(v, err)
	return amount{n: n}, err
}

func logarithmDual(o operation, a *dual, x value.Number) (dual, error) {
	f := value.Log
	if o == opLog10 {
		f = value.Log10
	}
	y, err := real(f(x))
	if err != nil || len(a.gradient) == 0 {
		return dual{value: y}, err
	}
	slope, err := oneAmount.divide(amount{n: x})
	if err == nil && o == opLog10 {
		ln10, problem := real(value.Log(value.Int(10)))
		if problem != nil {
			return dual{}, problem
		}
		slope, err = slope.divide(ln10)
	}
	if err != nil {
		return dual{}, err
	}
	return a.chain(y, slope)
}

func trigonometricDual(o operation, a *dual) (dual, error) {
	angle, err := a.value.asAngle()
	if err != nil {
		return dual{}, err
	}
	if o == opTan {
		y, err := real(value.Tan(angle))
		if err != nil || len(a.gradient) == 0 {
			return dual{value: y}, err
		}
		square, err := y.multiply(y)
		if err != nil {
			return dual{}, err
		}
		slope, err := square.add(oneAmount)
		if err != nil {
			return dual{}, err
		}
		return a.chain(y, slope)
	}
	sin, err := real(value.Sin(angle))
	if err != nil {
		return dual{}, err
	}
	cos, err := real(value.Cos(angle))
	if err != nil {
		return dual{}, err
	}
	if o == opSin {
		return a.chain(sin, cos)
	}
	return a.chain(cos, sin.negate())
}

func inverseDual(o operation, a *dual) (dual, error) {
	x, err := a.value.number()
	if err != nil {
		return dual{}, err
	}
	f := map[operation]func(value.Value) (value.Value, error){opAsin: value.Asin, opAcos: value.Acos, opAtan: value.Atan}[o]
	y, err := real(f(x))
	if err != nil || len(a.gradient) == 0 {
		return dual{value: y}, err
	}
	square, err := a.value.multiply(a.value)
	if err != nil {
		return dual{}, err
	}
	below := oneAmount
	if o == opAtan {
		if below, err = below.add(square); err != nil {
			return dual{}, err
		}
	} else {
		if below, err = below.subtract(square); err != nil {
			return dual{}, err
		}
		if below.isZero() {
			return dual{}, diag.New(diag.Numerical, "the slope is infinite at this point: the argument is at the end of its range")
		}
		if below, err = below.power(half); err != nil {
			return dual{}, err
		}
	}
	slope, err := oneAmount.divide(below)
	if err != nil {
		return dual{}, err
	}
	if o == opAcos {
		slope = slope.negate()
	}
	return a.chain(y, slope)
}

// powerOfDual is a^b for a b that is no constant: ∇ = b·a^(b−1)·∇a + a^b·ln a·∇b.
func powerOfDual(a, b *dual) (dual, error) {
	x, err := a.value.number()
	if err != nil {
		return dual{}, err
	}
	e, err := b.value.number()
	if err != nil {
		return dual{}, err
	}
	if len(b.gradient) == 0 && e.IsExact() && e.Exact.Num().BitLen() < 40 && e.Exact.Denom().BitLen() < 40 {
		return powerDual(a, e.Exact)
	}
	if x.Sign() <= 0 {
		return dual{}, diag.New(diag.Numerical, "a power with an exponent that is not fixed needs a positive base; at this point it is %s", signWord(x))
	}
	y, err := real(value.Power(x, e))
	if err != nil {
		return dual{}, err
	}
	relative, err := b.value.divide(a.value)
	if err != nil {
		return dual{}, err
	}
	alpha, err := y.multiply(relative)
	if err != nil {
		return dual{}, err
	}
	log, err := real(value.Log(x))
	if err != nil {
		return dual{}, err
	}
	beta, err := y.multiply(log)
	if err != nil {
		return dual{}, err
	}
	return combine(y, a, alpha, b, beta)
}

// atan2Dual has the gradient (x·∇y − y·∇x)/(x² + y²).
func atan2Dual(a, b *dual) (dual, error) {
	if a.value.isZero() && b.value.isZero() {
		return dual{}, diag.New(diag.Numerical, "atan2(0, 0) has no value")
	}
	y, err := a.value.number()
	if err != nil {
		return dual{}, err
	}
	x, err := b.value.number()
	if err != nil {
		return dual{}, err
	}
	angle, err := real(value.Atan2(y, x))
	if err != nil {
		return dual{}, err
	}
	squares := zeroAmount
	for _, part := range [...]amount{a.value, b.value} {
		square, err := part.multiply(part)
		if err != nil {
			return dual{}, err
		}
		if squares, err = squares.add(square); err != nil {
			return dual{}, err
		}
	}
	alpha, err := b.value.divide(squares)
	if err != nil {
		return dual{}, err
	}
	beta, err := a.value.divide(squares)
	if err != nil {
		return dual{}, err
	}
	return combine(angle, a, alpha, b, beta.negate())
}

// cornerDual is abs and sign. At 0 the slope of abs is taken as 0, between its two sides.
func cornerDual(o operation, a *dual) (dual, error) {
	sign, tied, err := a.value.compare(zeroAmount)
	if err != nil {
		return dual{}, err
	}
	step := amount{n: value.Int(sign)}
	remark := ""
	if tied && len(a.gradient) > 0 {
		remark = "sign jumps there; its slope is taken as 0"
	}
	if o == opSign {
		return dual{value: step, remark: remark}, nil
	}
	if remark != "" {
		remark = "abs has a corner there; its slope is taken as 0, between its two sides"
	}
	y := a.value
	if sign < 0 {
		y = y.negate()
	}
	out, err := a.chain(y, step)
	out.remark = remark
	return out, err
}

// extremeDual is min and max; at a tie the first argument counts.
func extremeDual(o operation, a, b *dual) (dual, error) {
	sign, tied, err := a.value.compare(b.value)
	if err != nil {
		return dual{}, err
	}
	out := dual{value: a.value, gradient: a.gradient, taken: 3}
	if o == opMin && sign > 0 || o == opMax && sign < 0 {
		out = dual{value: b.value, gradient: b.gradient, taken: 1}
	}
	if tied && (len(a.gradient) > 0 || len(b.gradient) > 0) {
		out.remark = "both arguments are equal there; the slope is that of the first"
		if out.taken == 1 {
			out.remark = "both arguments are equal there within rounding; the slope is that of the second"
		}
	}
	return out, nil
}

// limitDual holds a between b and c; on a bound the slope is that inside.
func limitDual(a, b, c *dual) (dual, error) {
	order, _, err := b.value.compare(c.value)
	if err != nil {
		return dual{}, err
	}
	if order > 0 {
		return dual{}, diag.New(diag.Numerical, "the lower bound of limit is above the upper one")
	}
	low, onLow, err := a.value.compare(b.value)
	if err != nil {
		return dual{}, err
	}
	high, onHigh, err := a.value.compare(c.value)
	if err != nil {
		return dual{}, err
	}
	out := dual{value: a.value, gradient: a.gradient, taken: 3}
	switch {
	case low < 0:
		out = dual{value: b.value, gradient: b.gradient, taken: 1}
	case high > 0:
		out = dual{value: c.value, gradient: c.gradient, taken: 2}
	}
	if (onLow || onHigh) && len(a.gradient) > 0 {
		out.remark = "the bound of limit is just met there; the slope is that inside the bounds"
	}
	return out, nil
}
