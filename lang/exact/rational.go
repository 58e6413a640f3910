package exact

import "math/big"

// Rational is a quotient of polynomials in lowest terms with a monic
// denominator. The zero value is not valid; use [NewRational] or [RationalOf].
type Rational struct {
	Num, Den Polynomial
}

// NewRational reduces num/den; a zero denominator gives ErrZeroDivision.
func NewRational(num, den Polynomial) (Rational, error) {
	if den.IsZero() {
		return Rational{}, ErrZeroDivision
	}
	return reduced(num, den), nil
}

// RationalOf gives p/1.
func RationalOf(p Polynomial) Rational { return Rational{p, Constant(ratOne)} }

func reduced(num, den Polynomial) Rational {
	if num.IsZero() {
		return Rational{num, Constant(ratOne)}
	}
	if den.Degree() > 0 && num.Degree() > 0 {
		if common := num.Gcd(den); common.Degree() > 0 {
			num, den = num.quotient(common), den.quotient(common)
		}
	}
	if den.Lead().Cmp(ratOne) != 0 {
		inverse := new(big.Rat).Inv(den.Lead())
		num, den = num.Scale(inverse), den.Scale(inverse)
	}
	return Rational{num, den}
}

// Add gives r + q.
func (r Rational) Add(q Rational) Rational {
	if r.Den.Equal(q.Den) {
		return reduced(r.Num.Add(q.Num), r.Den)
	}
	return reduced(r.Num.Mul(q.Den).Add(q.Num.Mul(r.Den)), r.Den.Mul(q.Den))
}

// Sub gives r − q.
func (r Rational) Sub(q Rational) Rational { return r.Add(q.Neg()) }

// Neg gives −r.
func (r Rational) Neg() Rational { return Rational{r.Num.Neg(), r.Den} }

// Mul gives r·q.
func (r Rational) Mul(q Rational) Rational {
	a, b := reduced(r.Num, q.Den), reduced(q.Num, r.Den)
	return Rational{a.Num.Mul(b.Num), a.Den.Mul(b.Den)}
}

// Inv gives 1/r, or ErrZeroDivision.
func (r Rational) Inv() (Rational, error) { return NewRational(r.Den, r.Num) }

// Div gives r/q, or ErrZeroDivision.
func (r Rational) Div(q Rational) (Rational, error) {
	inverse, err := q.Inv()
	if err != nil {
		return Rational{}, err
	}
	return r.Mul(inverse), nil
}

// Power gives rᵏ; negative k of zero gives ErrZeroDivision, a huge one ErrTooLarge.
func (r Rational) Power(k int) (Rational, error) {
	if k < 0 {
		inverse, err := r.Inv()
		if err != nil {
			return Rational{}, err
		}
		if -k < 0 {
			return Rational{}, ErrTooLarge
		}
		r, k = inverse, -k
	}
	num, err := r.Num.Power(k)
	if err != nil {
		return Rational{}, err
	}
	den, err := r.Den.Power(k)
	return Rational{num, den}, err
}

// Eval gives r(x), or ErrZeroDivision at a pole.
func (r Rational) Eval(x *big.Rat) (*big.Rat, error) {
	den := r.Den.Eval(x)
	if den.Sign() == 0 {
		return nil, ErrZeroDivision
	}
	return den.Quo(r.Num.Eval(x), den), nil
}

// EvalComplex gives real and imaginary part of r(re + i·im), or ErrZeroDivision at a pole.
func (r Rational) EvalComplex(re, im *big.Rat) (real, imaginary *big.Rat, err error) {
	a, b := r.Num.EvalComplex(re, im)
	c, d := r.Den.EvalComplex(re, im)
	norm := new(big.Rat).Add(new(big.Rat).Mul(c, c), new(big.Rat).Mul(d, d))
	if norm.Sign() == 0 {
		return nil, nil, ErrZeroDivision
	}
	real = new(big.Rat).Add(new(big.Rat).Mul(a, c), new(big.Rat).Mul(b, d))
	imaginary = new(big.Rat).Sub(new(big.Rat).Mul(b, c), new(big.Rat).Mul(a, d))
	return real.Quo(real, norm), imaginary.Quo(imaginary, norm), nil
}

// Equal compares numerators and denominators.
func (r Rational) Equal(q Rational) bool { return r.Num.Equal(q.Num) && r.Den.Equal(q.Den) }

// IsZero tells whether r is the zero function.
func (r Rational) IsZero() bool { return r.Num.IsZero() }

// IsProper tells whether the numerator's degree is at most the denominator's.
func (r Rational) IsProper() bool { return r.Num.Degree() <= r.Den.Degree() }

// IsStrictlyProper tells whether the numerator's degree is below the denominator's.
func (r Rational) IsStrictlyProper() bool { return r.Num.Degree() < r.Den.Degree() }
