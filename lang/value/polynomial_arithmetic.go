package value

import (
	"math"
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// Bounds on the degrees that arithmetic may reach.
const (
	LargestDegree      = 2000
	LargestRatioDegree = 500 // of a transfer function's numerator and denominator
)

// ExactPolynomial wraps an exact polynomial.
func ExactPolynomial(variable string, p exact.Polynomial) *Polynomial {
	return &Polynomial{Variable: variable, Exact: &p}
}

// FloatPolynomial takes coefficients highest power first, with an absolute error estimate
// of the largest; leading zeros are dropped. The data must not change afterwards.
func FloatPolynomial(variable string, highestFirst []float64, err float64) *Polynomial {
	for len(highestFirst) > 0 && highestFirst[0] == 0 {
		highestFirst = highestFirst[1:]
	}
	return &Polynomial{Variable: variable, F: highestFirst, Err: err}
}

// ConstantPolynomial gives the polynomial of degree 0 with a number's value.
func ConstantPolynomial(variable string, n Number) *Polynomial {
	if n.Exact != nil {
		return ExactPolynomial(variable, exact.Constant(n.Exact))
	}
	return FloatPolynomial(variable, []float64{n.F}, n.Err)
}

// PolynomialOf takes numbers, highest power first: exact when all are.
func PolynomialOf(variable string, highestFirst []Number) (*Polynomial, error) {
	rats := make([]*big.Rat, len(highestFirst))
	floats := make([]float64, len(highestFirst))
	err, isExact := 0.0, true
	for k, n := range highestFirst {
		rats[k] = n.Exact
		isExact = isExact && n.Exact != nil
		f, e := n.approx()
		if math.IsNaN(f) || math.IsInf(f, 0) {
			return nil, overflow()
		}
		floats[k], err = f, math.Max(err, e)
	}
	if len(highestFirst) > LargestDegree+1 {
		return nil, degreeLimit()
	}
	if isExact {
		return ExactPolynomial(variable, exact.NewPolynomial(rats...)), nil
	}
	return FloatPolynomial(variable, floats, err), nil
}

// IsExact tells whether the coefficients are exact.
func (p *Polynomial) IsExact() bool { return p.Exact != nil }

// Degree is −1 for the zero polynomial.
func (p *Polynomial) Degree() int {
	if p.Exact != nil {
		return p.Exact.Degree()
	}
	return len(p.F) - 1
}

// IsZero tells whether every coefficient is zero.
func (p *Polynomial) IsZero() bool { return p.Degree() < 0 }

// Floats gives the coefficients rounded to binary64, highest power first, and an absolute error estimate of the largest.
func (p *Polynomial) Floats() (f []float64, err float64) {
	if p.Exact == nil {
		return p.F, p.Err
	}
	coefficients := p.Exact.Coefficients()
	f = make([]float64, len(coefficients))
	for k, c := range coefficients {
		x, e := Rat(c).approx()
		f[k], err = x, math.Max(err, e)
	}
	return f, err
}

// Coefficients gives the coefficients, highest power first; empty for the zero polynomial.
func (p *Polynomial) Coefficients() []Number {
	out := make([]Number, 0, p.Degree()+1)
	if p.Exact != nil {
		for _, c := range p.Exact.Coefficients() {
			out = append(out, Rat(c))
		}
		return out
	}
	for _, c := range p.F {
		out = append(out, FloatErr(c, p.Err))
	}
	return out
}

func degreeLimit() error {
	return diag.New(diag.Limit, "a polynomial of degree above %d is too large", LargestDegree)
}

// mergeVariables gives the variable that two operands share; a constant has any.
func mergeVariables(a, b string, aConstant, bConstant bool) (string, error) {
	switch {
	case a == b || b == "" || bConstant && a != "":
		return a, nil
	case a == "" || aConstant:
		return b, nil
	}
	return "", diag.New(diag.Type, "a function of %s and a function of %s cannot be combined", a, b)
}

func (p *Polynomial) sharedVariable(q *Polynomial) (string, error) {
	return mergeVariables(p.Variable, q.Variable, p.Degree() < 1, q.Degree() < 1)
}

func addPolynomials(p, q *Polynomial) (*Polynomial, error) {
	variable, err := p.sharedVariable(q)
	if err != nil {
		return nil, err
	}
	if p.Exact != nil && q.Exact != nil {
		if p.Exact.MaxBits()+q.Exact.MaxBits() > LargestBits {
			return nil, tooManyBits()
		}
		return ExactPolynomial(variable, p.Exact.Add(*q.Exact)), nil
	}
	x, ex := p.Floats()
	y, ey := q.Floats()
	if len(x) < len(y) {
		x, y = y, x
	}
	sum := append([]float64(nil), x...)
	for k, c := range y {
		sum[len(x)-len(y)+k] += c
	}
	return settledPolynomial(variable, sum, ex+ey)
}

// settledPolynomial checks floating coefficients and adds their rounding to the error.
func settledPolynomial(variable string, f []float64, err float64) (*Polynomial, error) {
	m, problem := settled(1, len(f), f, nil, err)
	if problem != nil {
		return nil, problem
	}
	return FloatPolynomial(variable, f, m.Err), nil
}

func negatePolynomial(p *Polynomial) *Polynomial {
	if p.Exact != nil {
		return ExactPolynomial(p.Variable, p.Exact.Neg())
	}
	return &Polynomial{Variable: p.Variable, F: scaleSlice(p.F, -1), Err: p.Err}
}

func multiplyPolynomials(p, q *Polynomial) (*Polynomial, error) {
	variable, err := p.sharedVariable(q)
	if err != nil {
		return nil, err
	}
	if p.Degree()+q.Degree() > LargestDegree {
		return nil, degreeLimit()
	}
	if p.Exact != nil && q.Exact != nil {
		bits := p.Exact.MaxBits() + q.Exact.MaxBits()
		count := float64(p.Degree()+2) * float64(q.Degree()+2)
		if bits > LargestBits || exactWork(count, bits) > largestExactWork*4 {
			return nil, tooManyBits()
		}
		return ExactPolynomial(variable, p.Exact.Mul(*q.Exact)), nil
	}
	x, ex := p.Floats()
	y, ey := q.Floats()
	if len(x) == 0 || len(y) == 0 {
		return ExactPolynomial(variable, exact.Polynomial{}), nil
	}
	product := make([]float64, len(x)+len(y)-1)
	for i, a := range x {
		for j, b := range y {
			product[i+j] += a * b
		}
	}
	sumX, sumY := sumOfSizes(x), sumOfSizes(y)
	terms := float64(min(len(x), len(y)))
	e := sumX*ey + sumY*ex + terms*ex*ey
	e += terms * 0x1p-53 * math.Min(sumX*largest(y), sumY*largest(x))
	return settledPolynomial(variable, product, e)
}

func sumOfSizes(a []float64) float64 {
	sum := 0.0
	for _, x := range a {
		sum += math.Abs(x)
	}
	return sum
}

// scalePolynomial multiplies by a number.
func scalePolynomial(p *Polynomial, n Number) (*Polynomial, error) {
	return multiplyPolynomials(p, ConstantPolynomial(p.Variable, n))
}

// monic divides by the leading coefficient, which it returns; p is not zero.
func (p *Polynomial) monic() (*Polynomial, Number, error) {
	if p.Exact != nil {
		return ExactPolynomial(p.Variable, p.Exact.Monic()), Rat(p.Exact.Lead()), nil
	}
	lead := FloatErr(p.F[0], p.Err)
	if lead.F == 1 {
		return p, lead, nil
	}
	f := make([]float64, len(p.F))
	for k, x := range p.F {
		f[k] = x / lead.F
	}
	relative := p.Err / math.Abs(lead.F)
	out, err := settledPolynomial(p.Variable, f, relative*(1+largest(f)))
	return out, lead, err
}

func powerPolynomial(p *Polynomial, k int) (*Polynomial, error) {
	if p.Degree() > 0 && k > LargestDegree/p.Degree() {
		return nil, degreeLimit()
	}
	if p.Degree() == 0 {
		n, err := powerWhole(p.Coefficients()[0], big.NewInt(int64(k)))
		if err != nil {
			return nil, err
		}
		return ConstantPolynomial(p.Variable, n), nil
	}
	result := ConstantPolynomial(p.Variable, Int(1))
	if p.IsZero() && k > 0 {
		return p, nil
	}
	for base := p; k > 0; k >>= 1 {
		var err error
		if k&1 == 1 {
			if result, err = multiplyPolynomials(result, base); err != nil {
				return nil, err
			}
		}
		if k > 1 {
			if base, err = multiplyPolynomials(base, base); err != nil {
				return nil, err
			}
		}
	}
	return result, nil
}
