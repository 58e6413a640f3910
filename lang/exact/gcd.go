package exact

import "math/big"

// Gcd gives the monic greatest common divisor; gcd(0, 0) is 0.
//
// It is found modulo word-sized primes and put together by Chinese
// remaindering (W. S. Brown, On Euclid's algorithm and the computation of
// polynomial greatest common divisors, J. ACM 18, 1971); trial division over
// the integers proves each candidate.
func (p Polynomial) Gcd(q Polynomial) Polynomial {
	switch {
	case p.IsZero():
		return q.Monic()
	case q.IsZero():
		return p.Monic()
	case p.Degree() == 0 || q.Degree() == 0:
		return Constant(ratOne)
	}
	f, g := p.primitive(), q.primitive()
	var lead big.Int
	lead.GCD(nil, nil, new(big.Int).Abs(&f[len(f)-1]), new(big.Int).Abs(&g[len(g)-1]))
	var sum *remaindering
	degree := min(len(f), len(g))
	for index := 0; ; index++ {
		field := primeField(index)
		leadMod := field.reduce(&lead)
		if leadMod == 0 {
			continue
		}
		common := field.polynomialGcd(field.reduceAll(f), field.reduceAll(g))
		switch d := len(common) - 1; {
		case d == 0:
			return Constant(ratOne)
		case d > degree:
			continue // this prime divides a resultant: its divisor is too large
		case d < degree || sum == nil:
			degree, sum = d, newRemaindering(d+1)
		}
		for k := range common {
			common[k] = field.mul(common[k], leadMod)
		}
		if sum.add(common, field) { // changed: not yet settled
			continue
		}
		candidate := primitivePart(sum.lift())
		if exactQuotient(f, candidate) != nil && exactQuotient(g, candidate) != nil {
			return overDenominator(candidate, intOne).Monic()
		}
	}
}

// primitive gives integer coefficients without a common factor, lowest power
// first, the leading one positive.
func (p Polynomial) primitive() []big.Int {
	ints, _ := p.integral()
	return primitivePart(ints)
}

func primitivePart(ints []big.Int) []big.Int {
	if len(ints) == 0 {
		return ints
	}
	g := content(ints)
	if ints[len(ints)-1].Sign() < 0 {
		g.Neg(g)
	}
	if g.IsInt64() && g.Int64() == 1 {
		return ints
	}
	for k := range ints {
		ints[k].Quo(&ints[k], g)
	}
	return ints
}

// exactQuotient divides integer polynomials; nil when the division leaves a
// remainder or a fraction.
func exactQuotient(f, g []big.Int) []big.Int {
	if len(f) < len(g) {
		return nil
	}
	rest := make([]big.Int, len(f))
	for k := range f {
		rest[k].Set(&f[k])
	}
	quotient := make([]big.Int, len(f)-len(g)+1)
	top := len(g) - 1
	var remainder, term big.Int
	for k := len(quotient) - 1; k >= 0; k-- {
		quotient[k].QuoRem(&rest[k+top], &g[top], &remainder)
		if remainder.Sign() != 0 {
			return nil
		}
		if quotient[k].Sign() == 0 {
			continue
		}
		for j := range top {
			rest[k+j].Sub(&rest[k+j], term.Mul(&quotient[k], &g[j]))
		}
	}
	for k := range top {
		if rest[k].Sign() != 0 {
			return nil
		}
	}
	return quotient
}

// Factor is a polynomial and how often it divides another one.
type Factor struct {
	Polynomial   Polynomial
	Multiplicity int
}

// SquareFree splits p into monic, square-free, pairwise coprime factors with
// p = Lead(p)·∏ factor^multiplicity, by multiplicity ascending; factors of
// degree 0 are left out (D. Y. Y. Yun, On square-free decomposition
// algorithms, SYMSAC 1976). The zero polynomial and constants have none.
func (p Polynomial) SquareFree() []Factor {
	var factors []Factor
	if p.Degree() < 1 {
		return nil
	}
	p = p.Monic()
	derivative := p.Derivative()
	common := p.Gcd(derivative)
	b, c := p.quotient(common), derivative.quotient(common)
	d := c.Sub(b.Derivative())
	for multiplicity := 1; b.Degree() > 0; multiplicity++ {
		a := b.Gcd(d)
		if a.Degree() > 0 {
			factors = append(factors, Factor{a, multiplicity})
		}
		b, c = b.quotient(a), d.quotient(a)
		d = c.Sub(b.Derivative())
	}
	return factors
}

// quotient is for divisions by a non-zero polynomial that leave no remainder.
func (p Polynomial) quotient(q Polynomial) Polynomial {
	if q.Degree() == 0 && q.Lead().Cmp(ratOne) == 0 {
		return p
	}
	out, _, err := p.DivMod(q)
	if err != nil {
		panic(err)
	}
	return out
}
