package exact

import "math/big"

// RealRootsBetween counts the distinct real roots x of p with low < x ≤ high
// (C. Sturm 1829); nil stands for −∞ or +∞. The zero polynomial counts none.
func (p Polynomial) RealRootsBetween(low, high *big.Rat) int {
	if p.Degree() < 1 || low != nil && high != nil && low.Cmp(high) >= 0 {
		return 0
	}
	p = p.quotient(p.Gcd(p.Derivative())) // at a multiple root the whole chain would vanish
	chain := []Polynomial{p, p.Derivative()}
	for {
		_, rest, _ := chain[len(chain)-2].DivMod(chain[len(chain)-1])
		if rest.IsZero() {
			break
		}
		// A positive factor changes no sign and keeps the numbers short.
		chain = append(chain, overDenominator(rest.primitive(), big.NewInt(int64(-rest.Lead().Sign()))))
	}
	return signChanges(chain, low, -1) - signChanges(chain, high, 1)
}

// signChanges counts the changes along the chain at x, or at −∞ or +∞ (direction) for nil.
func signChanges(chain []Polynomial, x *big.Rat, direction int) int {
	changes, last := 0, 0
	for _, p := range chain {
		sign := p.Lead().Sign()
		if x != nil {
			sign = p.Eval(x).Sign()
		} else if direction < 0 && p.Degree()%2 == 1 {
			sign = -sign
		}
		if sign != 0 {
			if last != 0 && sign != last {
				changes++
			}
			last = sign
		}
	}
	return changes
}
