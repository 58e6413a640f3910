package exact

import (
	"math/big"
	"math/rand/v2"
	"slices"
)

// subsetCap bounds the combinations of modular factors that are tried once all
// single ones and pairs have been: factorisation is exponential in the worst case.
const subsetCap = 20_000

// Factorize splits p over the rationals into monic irreducible factors (H.
// Zassenhaus, On Hensel factorization I, J. Number Theory 1, 1969), ordered by
// degree, then by coefficients, with p = Lead(p)·∏ factor^multiplicity.
// Irreducible factors of degree 1 and 2 are always found; complete is false
// when a factor of higher degree may still be reducible because the search was
// cut off. The zero polynomial and constants have no factors.
func (p Polynomial) Factorize() (factors []Factor, complete bool) {
	complete = true
	for _, part := range p.SquareFree() {
		found, all := irreducibleFactors(part.Polynomial)
		complete = complete && all
		for _, q := range found {
			factors = append(factors, Factor{q, part.Multiplicity})
		}
	}
	slices.SortStableFunc(factors, func(x, y Factor) int {
		if d := x.Polynomial.Degree() - y.Polynomial.Degree(); d != 0 {
			return d
		}
		for k := x.Polynomial.Degree(); k >= 0; k-- {
			if c := x.Polynomial.Coefficient(k).Cmp(y.Polynomial.Coefficient(k)); c != 0 {
				return c
			}
		}
		return 0
	})
	return factors, complete
}

// RationalRoot is a root and how often it occurs.
type RationalRoot struct {
	Value        *big.Rat
	Multiplicity int
}

// RationalRoots gives all rational roots, ascending.
func (p Polynomial) RationalRoots() []RationalRoot {
	var roots []RationalRoot
	factors, _ := p.Factorize()
	for _, f := range factors {
		if f.Polynomial.Degree() == 1 {
			roots = append(roots, RationalRoot{new(big.Rat).Neg(f.Polynomial.Coefficient(0)), f.Multiplicity})
		}
	}
	slices.SortFunc(roots, func(x, y RationalRoot) int { return x.Value.Cmp(y.Value) })
	return roots
}

// irreducibleFactors splits a monic square-free polynomial of degree ≥ 1.
func irreducibleFactors(p Polynomial) (factors []Polynomial, complete bool) {
	if p.Coefficient(0).Sign() == 0 {
		factors = append(factors, PolynomialOfIntegers(1, 0))
		p = trimmed(p.c[1:])
	}
	switch p.Degree() {
	case 0:
		return factors, true
	case 1:
		return append(factors, p), true
	case 2:
		return append(factors, quadraticFactors(p)...), true
	}
	z := newZassenhaus(p.primitive())
	complete = z.run()
	for _, f := range z.found {
		factors = append(factors, overDenominator(f, intOne).Monic())
	}
	return factors, complete
}

// quadraticFactors splits s² + b·s + c when its discriminant is a square.
func quadraticFactors(p Polynomial) []Polynomial {
	b, c := p.Coefficient(1), p.Coefficient(0)
	discriminant := new(big.Rat).Mul(b, b)
	discriminant.Sub(discriminant, new(big.Rat).Mul(big.NewRat(4, 1), c))
	root, ok := squareRoot(discriminant)
	if !ok {
		return []Polynomial{p}
	}
	half := big.NewRat(1, 2)
	x := new(big.Rat).Sub(b, root)
	y := new(big.Rat).Add(b, root)
	return []Polynomial{NewPolynomial(ratOne, x.Mul(x, half)), NewPolynomial(ratOne, y.Mul(y, half))}
}

// squareRoot gives the square root of a rational where it is rational.
func squareRoot(x *big.Rat) (*big.Rat, bool) {
	if x.Sign() < 0 {
		return nil, false
	}
	root := new(big.Rat).SetFrac(new(big.Int).Sqrt(x.Num()), new(big.Int).Sqrt(x.Denom()))
	return root, new(big.Rat).Mul(root, root).Cmp(x) == 0
}

// zassenhaus factors a primitive square-free integer polynomial of degree ≥ 3
// with a non-zero constant term.
type zassenhaus struct {
	rest   []big.Int   // what is left to factor
	local  [][]big.Int // its monic factors modulo the ring's modulus
	ring   modulusRing
	found  [][]big.Int
	budget int
}

func newZassenhaus(f []big.Int) *zassenhaus {
	return &zassenhaus{rest: f, budget: subsetCap}
}

func (z *zassenhaus) run() (complete bool) {
	field, factors := bestPrime(z.rest)
	if len(factors) > 1 {
		z.lift(field, factors)
		for size := 1; 2*size <= len(z.local); size++ {
			if !z.tryAll(size) {
				z.found = append(z.found, z.rest)
				return false
			}
		}
	}
	z.found = append(z.found, z.rest)
	return true
}

// bestPrime picks, among a few small primes modulo which f keeps its degree and
// stays square-free, one with the fewest irreducible factors.
func bestPrime(f []big.Int) (best residues, factors [][]uint64) {
	const trials = 5
	random := rand.New(rand.NewPCG(1, 2))
	var parts []sameDegree
	count, tried := 0, 0
	for p := uint64(1009); tried < trials && count != 1; p = nextPrime(p) {
		field := residues{p}
		a := trimResidues(field.reduceAll(f))
		if len(a) != len(f) {
			continue
		}
		field.scaleRow(a, field.inverse(a[len(a)-1]))
		derivative := field.derivative(a)
		if len(derivative) == 0 || len(field.gcdOf(a, derivative)) > 1 {
			continue
		}
		tried++
		split := field.distinctDegrees(a)
		number := 0
		for _, part := range split {
			number += (len(part.product) - 1) / part.degree
		}
		if count == 0 || number < count {
			best, parts, count = field, split, number
		}
	}
	for _, part := range parts {
		factors = append(factors, best.equalDegrees(part.product, part.degree, random)...)
	}
	return best, factors
}

func nextPrime(p uint64) uint64 {
	for p += 2; !new(big.Int).SetUint64(p).ProbablyPrime(0); p += 2 {
	}
	return p
}

// lift raises the modular factors until coefficients of true factors, times the
// leading coefficient, are determined (M. Mignotte, An inequality about factors
// of polynomials, Math. Comp. 28, 1974: 2^degree·‖f‖₂).
func (z *zassenhaus) lift(field residues, factors [][]uint64) {
	f := z.rest
	var norm, square big.Int
	for k := range f {
		norm.Add(&norm, square.Mul(&f[k], &f[k]))
	}
	need := len(f) + (norm.BitLen()+1)/2 + f[len(f)-1].BitLen() + 2
	modulus, steps := new(big.Int).SetUint64(field.p), 0
	for modulus.BitLen() <= need {
		modulus.Mul(modulus, modulus)
		steps++
	}
	z.ring = modulusRing{modulus}
	monic := make([]big.Int, len(f))
	inverse := new(big.Int).ModInverse(&f[len(f)-1], modulus)
	for k := range f {
		monic[k].Mul(&f[k], inverse)
	}
	slices.SortFunc(factors, func(a, b []uint64) int { return len(a) - len(b) })
	z.local = liftFactors(z.ring.tidy(monic), factors, field, steps)
}

// tryAll tests every product of size modular factors; false when the budget ran out.
func (z *zassenhaus) tryAll(size int) bool {
	chosen := make([]int, size)
	for k := range chosen {
		chosen[k] = k
	}
	for {
		if size > 2 {
			if z.budget--; z.budget < 0 {
				return false
			}
		}
		if z.try(chosen) {
			if 2*size > len(z.local) {
				return true
			}
			// The first factor of the set just removed was its smallest index; go on from there.
			start := chosen[0]
			if start+size > len(z.local) {
				return true
			}
			for k := range chosen {
				chosen[k] = start + k
			}
			continue
		}
		if !nextSubset(chosen, len(z.local)) {
			return true
		}
	}
}

// nextSubset advances to the next ascending choice below n.
func nextSubset(chosen []int, n int) bool {
	k := len(chosen) - 1
	for k >= 0 && chosen[k] == n-len(chosen)+k {
		k--
	}
	if k < 0 {
		return false
	}
	chosen[k]++
	for j := k + 1; j < len(chosen); j++ {
		chosen[j] = chosen[j-1] + 1
	}
	return true
}

// try tests whether a product of modular factors is a true factor, and splits
// it off if so. The constant term decides most cases cheaply.
func (z *zassenhaus) try(chosen []int) bool {
	lead := &z.rest[len(z.rest)-1]
	constant := new(big.Int).Set(lead)
	for _, k := range chosen {
		constant.Mod(constant.Mul(constant, &z.local[k][0]), z.ring.m)
	}
	z.center(constant)
	target := new(big.Int).Mul(lead, &z.rest[0])
	if constant.Sign() == 0 || target.Rem(target, constant).Sign() != 0 {
		return false
	}
	product := []big.Int{*new(big.Int).Set(lead)}
	for _, k := range chosen {
		product = z.ring.multiply(product, z.local[k])
	}
	for k := range product {
		z.center(&product[k])
	}
	product = primitivePart(product)
	quotient := exactQuotient(z.rest, product)
	if quotient == nil {
		return false
	}
	z.found = append(z.found, product)
	z.rest = quotient
	for k := len(chosen) - 1; k >= 0; k-- {
		z.local = slices.Delete(z.local, chosen[k], chosen[k]+1)
	}
	return true
}

// center moves a residue to between −m/2 and m/2.
func (z *zassenhaus) center(x *big.Int) {
	if new(big.Int).Lsh(x, 1).Cmp(z.ring.m) > 0 {
		x.Sub(x, z.ring.m)
	}
}
