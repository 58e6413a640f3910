package exact

import (
	"math/big"
	"strings"
)

// Polynomial is a polynomial in one variable with rational coefficients. The
// zero value is the zero polynomial.
type Polynomial struct {
	c []*big.Rat // lowest power first, the last one non-zero; shared, never modified
}

// NewPolynomial copies coefficients given highest power first; leading zeros are dropped.
func NewPolynomial(highestFirst ...*big.Rat) Polynomial {
	c := make([]*big.Rat, len(highestFirst))
	for k, x := range highestFirst {
		c[len(c)-1-k] = tidy(new(big.Rat).Set(x))
	}
	return trimmed(c)
}

// PolynomialOfIntegers takes whole coefficients, highest power first.
func PolynomialOfIntegers(highestFirst ...int64) Polynomial {
	c := make([]*big.Rat, len(highestFirst))
	for k, x := range highestFirst {
		c[len(c)-1-k] = tidy(big.NewRat(x, 1))
	}
	return trimmed(c)
}

// Constant gives the polynomial of degree 0 (or the zero polynomial) with value x.
func Constant(x *big.Rat) Polynomial { return NewPolynomial(x) }

// trimmed takes ownership of coefficients given lowest power first.
func trimmed(c []*big.Rat) Polynomial {
	n := len(c)
	for n > 0 && c[n-1].Sign() == 0 {
		n--
	}
	return Polynomial{c[:n:n]}
}

// PolynomialWithRoots gives the monic polynomial with the given rational
// roots, as often as they occur.
func PolynomialWithRoots(roots ...*big.Rat) Polynomial {
	p := Constant(ratOne)
	for _, r := range roots {
		p = p.Mul(NewPolynomial(ratOne, new(big.Rat).Neg(r)))
	}
	return p
}

// Coefficients lists the coefficients highest power first; empty for the zero
// polynomial. The numbers are shared and must not be modified.
func (p Polynomial) Coefficients() []*big.Rat {
	out := make([]*big.Rat, len(p.c))
	for k, x := range p.c {
		out[len(out)-1-k] = x
	}
	return out
}

// Coefficient gives the coefficient of the given power (zero outside the
// degree), shared.
func (p Polynomial) Coefficient(power int) *big.Rat {
	if power < 0 || power >= len(p.c) {
		return ratZero
	}
	return p.c[power]
}

// Degree is −1 for the zero polynomial.
func (p Polynomial) Degree() int { return len(p.c) - 1 }

// IsZero tells whether p is the zero polynomial.
func (p Polynomial) IsZero() bool { return len(p.c) == 0 }

// Lead gives the leading coefficient (zero for the zero polynomial), shared.
func (p Polynomial) Lead() *big.Rat { return p.Coefficient(len(p.c) - 1) }

// Equal compares coefficients.
func (p Polynomial) Equal(q Polynomial) bool {
	if len(p.c) != len(q.c) {
		return false
	}
	for k, x := range p.c {
		if x.Cmp(q.c[k]) != 0 {
			return false
		}
	}
	return true
}

// MaxBits gives the largest bit length of a numerator or denominator.
func (p Polynomial) MaxBits() int {
	bits := 0
	for _, x := range p.c {
		bits = max(bits, ratBits(x))
	}
	return bits
}

// Float64 gives the coefficients highest power first, each rounded to the nearest binary64 number.
func (p Polynomial) Float64() []float64 {
	out := make([]float64, len(p.c))
	for k, x := range p.c {
		out[len(out)-1-k], _ = x.Float64()
	}
	return out
}

// String lists the coefficients highest power first, for messages of tests.
func (p Polynomial) String() string {
	parts := make([]string, 0, len(p.c))
	for _, x := range p.Coefficients() {
		parts = append(parts, x.RatString())
	}
	return "(" + strings.Join(parts, ", ") + ")"
}

// Add gives p + q.
func (p Polynomial) Add(q Polynomial) Polynomial {
	c := make([]*big.Rat, max(len(p.c), len(q.c)))
	for k := range c {
		x, y := p.Coefficient(k), q.Coefficient(k)
		switch {
		case x.Sign() == 0:
			c[k] = y
		case y.Sign() == 0:
			c[k] = x
		default:
			c[k] = tidy(new(big.Rat).Add(x, y))
		}
	}
	return trimmed(c)
}

// Sub gives p − q.
func (p Polynomial) Sub(q Polynomial) Polynomial { return p.Add(q.Neg()) }

// Neg gives −p.
func (p Polynomial) Neg() Polynomial {
	c := make([]*big.Rat, len(p.c))
	for k, x := range p.c {
		c[k] = tidy(new(big.Rat).Neg(x))
	}
	return Polynomial{c}
}

// Scale gives factor·p.
func (p Polynomial) Scale(factor *big.Rat) Polynomial {
	c := make([]*big.Rat, len(p.c))
	for k, x := range p.c {
		c[k] = ratProduct(x, factor)
	}
	return trimmed(c)
}

// Mul gives the product p·q, convolved over the integers.
func (p Polynomial) Mul(q Polynomial) Polynomial {
	if p.IsZero() || q.IsZero() {
		return Polynomial{}
	}
	x, xDen := p.integral()
	y, yDen := q.integral()
	out := make([]big.Int, len(x)+len(y)-1)
	var term big.Int
	for i := range x {
		if x[i].Sign() == 0 {
			continue
		}
		for j := range y {
			out[i+j].Add(&out[i+j], term.Mul(&x[i], &y[j]))
		}
	}
	return overDenominator(out, xDen.Mul(xDen, yDen))
}

// integral gives integers and one denominator: p = Σ ints[k]·sᵏ / den.
func (p Polynomial) integral() (ints []big.Int, den *big.Int) {
	ints, den = make([]big.Int, len(p.c)), new(big.Int)
	commonDenominator(den, p.c)
	scaleTo(ints, p.c, den)
	return ints, den
}

// overDenominator gives Σ ints[k]·sᵏ / den.
func overDenominator(ints []big.Int, den *big.Int) Polynomial {
	c := make([]*big.Rat, len(ints))
	for k := range ints {
		c[k] = fraction(&ints[k], den)
	}
	return trimmed(c)
}

// Monic divides by the leading coefficient; the zero polynomial stays.
func (p Polynomial) Monic() Polynomial {
	if p.IsZero() || p.Lead().Cmp(ratOne) == 0 {
		return p
	}
	return p.Scale(new(big.Rat).Inv(p.Lead()))
}

// Derivative gives dp/ds.
func (p Polynomial) Derivative() Polynomial {
	if len(p.c) < 2 {
		return Polynomial{}
	}
	c := make([]*big.Rat, len(p.c)-1)
	for k := range c {
		c[k] = ratProduct(p.c[k+1], big.NewRat(int64(k+1), 1))
	}
	return trimmed(c)
}

// DivMod gives quotient and remainder with p = quotient·q + remainder and
// degree of the remainder below that of q, or ErrZeroDivision.
func (p Polynomial) DivMod(q Polynomial) (quotient, remainder Polynomial, err error) {
	if q.IsZero() {
		return Polynomial{}, Polynomial{}, ErrZeroDivision
	}
	if p.Degree() < q.Degree() {
		return Polynomial{}, p, nil
	}
	rest := make([]*big.Rat, len(p.c))
	for k, x := range p.c {
		rest[k] = new(big.Rat).Set(x)
	}
	inverse := new(big.Rat).Inv(q.Lead())
	out := make([]*big.Rat, len(p.c)-len(q.c)+1)
	var term big.Rat
	for k := len(out) - 1; k >= 0; k-- {
		factor := ratProduct(rest[k+len(q.c)-1], inverse)
		out[k] = factor
		if factor.Sign() == 0 {
			continue
		}
		for j, y := range q.c {
			if y.Sign() != 0 {
				rest[k+j].Sub(rest[k+j], term.Mul(factor, y))
			}
		}
	}
	return trimmed(out), trimmed(rest[:len(q.c)-1]), nil
}
