package exact

import (
	"math/big"
	"math/rand/v2"
	"testing"
)

func TestFactorsMultiplyBackAndAreTheOnesPutIn(t *testing.T) {
	random := rand.New(rand.NewPCG(7, 7))
	for range 60 {
		want := map[string]int{}
		p := NewPolynomial(big.NewRat(random.Int64N(9)+1, random.Int64N(9)+1))
		for range 1 + random.IntN(6) {
			var q Polynomial
			switch random.IntN(4) {
			case 0:
				q = NewPolynomial(ratOne, big.NewRat(random.Int64N(41)-20, random.Int64N(7)+1))
			case 1: // (s+a)²+b², irreducible over the rationals
				a, b := big.NewRat(random.Int64N(21)-10, random.Int64N(5)+1), big.NewRat(random.Int64N(9)+1, random.Int64N(5)+1)
				q = NewPolynomial(ratOne, new(big.Rat).Add(a, a), new(big.Rat).Add(new(big.Rat).Mul(a, a), new(big.Rat).Mul(b, b)))
			case 2: // Eisenstein at 3
				q = PolynomialOfIntegers(1, 3*random.Int64N(5), 3*random.Int64N(5), 3).Monic()
			case 3: // s⁴ + 1 splits modulo every prime
				q = PolynomialOfIntegers(1, 0, 0, 0, 1)
			}
			m := 1 + random.IntN(2)
			want[q.String()] += m
			power, _ := q.Power(m)
			p = p.Mul(power)
		}
		factors, complete := p.Factorize()
		product := Constant(p.Lead())
		for _, f := range factors {
			power, _ := f.Polynomial.Power(f.Multiplicity)
			product = product.Mul(power)
			if want[f.Polynomial.String()] != f.Multiplicity {
				t.Errorf("factor %v^%d of %v was not put in", f.Polynomial, f.Multiplicity, p)
			}
		}
		if !complete || len(factors) != len(want) || !product.Equal(p) {
			t.Errorf("%v: factors %v, complete %v, put in %v", p, factors, complete, want)
		}
	}
}
