package exact

import (
	"fmt"
	"math/big"
	"math/rand/v2"
	"testing"
)

// randomRational mixes zeros, whole numbers and fractions.
func randomRational(random *rand.Rand) *big.Rat {
	switch random.IntN(4) {
	case 0:
		return new(big.Rat)
	case 1:
		return big.NewRat(random.Int64N(19)-9, 1)
	}
	return big.NewRat(random.Int64N(199)-99, random.Int64N(12)+1)
}

func randomMatrix(random *rand.Rand, r, c int) *Matrix {
	m := NewMatrix(r, c)
	for i := range r {
		for j := range c {
			m.Set(i, j, randomRational(random))
		}
	}
	return m
}

// randomInvertible has small entries and determinant ±1.
func randomInvertible(random *rand.Rand, n int) *Matrix {
	lower, upper := Identity(n), Identity(n)
	for i := range n {
		for j := range i {
			lower.Set(i, j, big.NewRat(random.Int64N(3)-1, 1))
			upper.Set(j, i, big.NewRat(random.Int64N(3)-1, 1))
		}
	}
	return must(lower.Mul(upper))
}

// berkowitz is a second way to the characteristic polynomial, without division
// (S. J. Berkowitz, On computing the determinant in small parallel time using a
// small number of processors, Inform. Process. Lett. 18, 1984).
func berkowitz(m *Matrix) Polynomial {
	n := m.rows
	vector := Column(ratOne)
	for k := n - 1; k >= 0; k-- {
		// The trailing block is [a, r; c, rest]; its Toeplitz matrix extends the vector of rest.
		size := n - k
		r, c := m.Slice(k, k+1, k+1, n), m.Slice(k+1, n, k, k+1)
		rest := m.Slice(k+1, n, k+1, n)
		first := []*big.Rat{ratOne, new(big.Rat).Neg(m.At(k, k))}
		for power := c; len(first) < size+1; power = must(rest.Mul(power)) {
			first = append(first, new(big.Rat).Neg(must(r.Mul(power)).At(0, 0)))
		}
		toeplitz := NewMatrix(size+1, size)
		for i := range size + 1 {
			for j := 0; j < size && j <= i; j++ {
				toeplitz.Set(i, j, first[i-j])
			}
		}
		vector = must(toeplitz.Mul(vector))
	}
	return NewPolynomial(vector.data...)
}

func TestCharacteristicPolynomialHasASecondOpinion(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 1))
	for n := range 13 {
		for range 4 {
			m := randomMatrix(random, n, n)
			p := m.CharacteristicPolynomial()
			if q := berkowitz(m); !p.Equal(q) {
				t.Fatalf("%v: %v, Berkowitz %v", m, p, q)
			}
			value, err := p.EvalMatrix(m)
			if err != nil || !value.IsZero() {
				t.Fatalf("%v does not satisfy its characteristic polynomial: %v %v", m, value, err)
			}
			d, err := m.Determinant()
			if err != nil {
				t.Fatal(err)
			}
			if n%2 == 1 {
				d = new(big.Rat).Neg(d)
			}
			if d.Cmp(p.Coefficient(0)) != 0 {
				t.Fatalf("determinant %v, polynomial %v", d, p)
			}
		}
	}
}

func TestModularEchelonAgreesWithFractionFreeElimination(t *testing.T) {
	random := rand.New(rand.NewPCG(2, 2))
	for range 200 {
		r, c := 1+random.IntN(9), 1+random.IntN(9)
		inner := 1 + random.IntN(min(r, c))
		m := must(randomMatrix(random, r, inner).Mul(randomMatrix(random, inner, c)))
		cleared, _ := clearRows(m)
		modular, pivots, err := modularEchelon(r, c, cleared, primeField(0))
		if err != nil || modular == nil {
			t.Fatalf("%v: %v %v", m, modular, err)
		}
		plain, want := fractionFreeEchelon(r, c, cleared)
		if !modular.Equal(plain) || fmt.Sprint(pivots) != fmt.Sprint(want) {
			t.Fatalf("%v: %v %v, fraction-free %v %v", m, modular, pivots, plain, want)
		}
		if kernel := m.Kernel(); !must(m.Mul(kernel)).IsZero() || kernel.cols != c-len(pivots) || kernel.Rank() != kernel.cols {
			t.Fatalf("%v: kernel %v", m, kernel)
		}
		if image := m.Image(); image.Rank() != len(pivots) || must(Augment(image, m)).Rank() != len(pivots) {
			t.Fatalf("%v: image %v", m, image)
		}
	}
}

// A prime that divides a minor must not change a verdict.
func TestAMisleadingPrimeIsNoticed(t *testing.T) {
	p := new(big.Rat).SetInt(new(big.Int).SetUint64(primeField(0).p))
	m := Identity(6)
	m.Set(2, 2, p)
	m.Set(5, 5, new(big.Rat).Mul(p, p))
	if m.Rank() != 6 {
		t.Errorf("rank %d of a diagonal matrix without zeros", m.Rank())
	}
	if reduced, _ := m.Echelon(); !reduced.Equal(Identity(6)) {
		t.Errorf("echelon form %v", reduced)
	}
	if d, err := m.Determinant(); err != nil || d.Cmp(new(big.Rat).Mul(p, new(big.Rat).Mul(p, p))) != 0 {
		t.Errorf("determinant %v %v", d, err)
	}
	inverse, err := m.Inverse()
	if err != nil || !must(m.Mul(inverse)).Equal(Identity(6)) {
		t.Errorf("inverse %v %v", inverse, err)
	}
	a := companion(PolynomialOfIntegers(1, 0, 0, 0, 0, 0, 0))
	b := NewMatrix(6, 1)
	b.Set(5, 0, p)
	if rank, err := ReachableRank(a, b); err != nil || rank != 6 {
		t.Errorf("reachable rank %d %v", rank, err)
	}
	f := NewPolynomial(ratOne, ratZero)
	g := NewPolynomial(ratOne, p) // equal to f modulo the prime
	if common := f.Mul(PolynomialOfIntegers(1, 1)).Gcd(g.Mul(PolynomialOfIntegers(1, 1))); !common.Equal(PolynomialOfIntegers(1, 1)) {
		t.Errorf("common divisor %v", common)
	}
}

func TestSolveTellsItsThreeOutcomesApart(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 3))
	counts := map[string]int{}
	for range 300 {
		r, c, k := 1+random.IntN(6), 1+random.IntN(6), 1+random.IntN(3)
		inner := 1 + random.IntN(min(r, c))
		m := must(randomMatrix(random, r, inner).Mul(randomMatrix(random, inner, c)))
		b := randomMatrix(random, r, k)
		if random.IntN(2) == 0 {
			b = must(m.Mul(randomMatrix(random, c, k)))
		}
		x, err := m.Solve(b)
		joined := must(Augment(m, b)).Rank()
		switch free := (*UnderdeterminedError)(nil); {
		case err == nil:
			counts["unique"]++
			if !must(m.Mul(x)).Equal(b) || m.Rank() != c {
				t.Fatalf("%v·x = %v: x = %v", m, b, x)
			}
		case err == ErrInconsistent:
			counts["none"]++
			if joined == m.Rank() {
				t.Fatalf("%v·x = %v has a solution", m, b)
			}
		default:
			free, _ = err.(*UnderdeterminedError)
			counts["several"]++
			if free == nil || !must(m.Mul(free.Particular)).Equal(b) || !must(m.Mul(free.Kernel)).IsZero() || free.Kernel.cols != c-m.Rank() {
				t.Fatalf("%v·x = %v: %v", m, b, err)
			}
		}
	}
	for _, outcome := range []string{"unique", "none", "several"} {
		if counts[outcome] < 20 {
			t.Errorf("only %d systems with outcome %q", counts[outcome], outcome)
		}
	}
}

func TestMatrixIdentities(t *testing.T) {
	random := rand.New(rand.NewPCG(4, 4))
	for range 50 {
		n, m := 1+random.IntN(6), 1+random.IntN(4)
		a, b, c := randomMatrix(random, n, n), randomMatrix(random, n, n), randomMatrix(random, n, m)
		if !must(must(a.Add(b)).Mul(c)).Equal(must(must(a.Mul(c)).Add(must(b.Mul(c))))) {
			t.Fatal("(a + b)·c ≠ a·c + b·c")
		}
		if !must(a.Mul(b)).Transpose().Equal(must(b.Transpose().Mul(a.Transpose()))) {
			t.Fatal("(a·b)ᵀ ≠ bᵀ·aᵀ")
		}
		if !must(must(a.Kronecker(c)).Mul(must(b.Kronecker(Identity(m))))).Equal(must(must(a.Mul(b)).Kronecker(c))) {
			t.Fatal("(a ⊗ c)·(b ⊗ I) ≠ a·b ⊗ c")
		}
		p := randomInvertible(random, n)
		if !must(must(p.Power(-3)).Mul(must(p.Power(3)))).Equal(Identity(n)) {
			t.Fatal("p⁻³·p³ ≠ I")
		}
		if !must(a.Sub(b)).Equal(must(a.Add(b.Neg()))) || !must(a.Hadamard(b)).Equal(must(b.Hadamard(a))) {
			t.Fatal("a − b ≠ a + (−b) or the entry-by-entry product depends on the order")
		}
		left, _ := must(a.Mul(b)).Trace()
		right, _ := must(b.Mul(a)).Trace()
		if left.Cmp(right) != 0 {
			t.Fatal("trace of a·b and of b·a differ")
		}
	}
}

func TestPolynomialIdentities(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 5))
	some := func() Polynomial {
		c := make([]*big.Rat, 1+random.IntN(6))
		for k := range c {
			c[k] = randomRational(random)
		}
		return NewPolynomial(c...)
	}
	for range 300 {
		p, q, x, y := some(), some(), randomRational(random), randomRational(random)
		composed, err := p.Compose(q)
		if err != nil || composed.Eval(x).Cmp(p.Eval(q.Eval(x))) != 0 {
			t.Fatalf("p(q(x)): %v %v", composed, err)
		}
		if p.Mul(q).Eval(x).Cmp(new(big.Rat).Mul(p.Eval(x), q.Eval(x))) != 0 {
			t.Fatal("(p·q)(x) ≠ p(x)·q(x)")
		}
		if !p.Mul(q).Derivative().Equal(p.Derivative().Mul(q).Add(p.Mul(q.Derivative()))) {
			t.Fatal("product rule")
		}
		re, im := p.EvalComplex(x, y)
		block, _ := FromRows([][]*big.Rat{{x, new(big.Rat).Neg(y)}, {y, x}}) // stands for x + i·y
		value, _ := p.EvalMatrix(block)
		if value.At(0, 0).Cmp(re) != 0 || value.At(1, 0).Cmp(im) != 0 {
			t.Fatalf("p(x + i·y) = %v + i·%v, by matrices %v", re, im, value)
		}
		if !q.IsZero() {
			quotient, rest, err := p.DivMod(q)
			if err != nil || rest.Degree() >= q.Degree() || !quotient.Mul(q).Add(rest).Equal(p) {
				t.Fatalf("%v divided by %v: %v, %v, %v", p, q, quotient, rest, err)
			}
		}
		common := p.Gcd(q)
		for _, f := range []Polynomial{p, q} {
			if _, rest, err := f.DivMod(common); err == nil && !rest.IsZero() {
				t.Fatalf("%v does not divide %v", common, f)
			}
		}
		cube, err := p.Power(3)
		if err != nil || !cube.Equal(p.Mul(p).Mul(p)) {
			t.Fatalf("p³ = %v %v", cube, err)
		}
	}
}

func TestRationalFunctionIdentities(t *testing.T) {
	random := rand.New(rand.NewPCG(6, 6))
	some := func() Rational {
		num := NewPolynomial(randomRational(random), randomRational(random), randomRational(random))
		den := NewPolynomial(big.NewRat(random.Int64N(3)+1, 2), randomRational(random), randomRational(random))
		r, err := NewRational(num, den)
		if err != nil {
			t.Fatal(err)
		}
		return r
	}
	for range 200 {
		p, q, r := some(), some(), some()
		if !p.Add(q).Mul(r).Equal(p.Mul(r).Add(q.Mul(r))) {
			t.Fatal("(p + q)·r ≠ p·r + q·r")
		}
		if !p.Sub(p).IsZero() {
			t.Fatal("p − p ≠ 0")
		}
		if quotient, err := p.Div(q); q.IsZero() != (err == ErrZeroDivision) || err == nil && !quotient.Mul(q).Equal(p) {
			t.Fatalf("p/q = %v %v", quotient, err)
		}
		sum := p.Add(q)
		if sum.Num.Gcd(sum.Den).Degree() > 0 || sum.Den.Lead().Cmp(ratOne) != 0 {
			t.Fatalf("%v is not in lowest terms", sum)
		}
		x := big.NewRat(random.Int64N(100)+1, 7)
		a, err1 := p.Eval(x)
		b, err2 := q.Eval(x)
		c, err3 := p.Mul(q).Eval(x)
		if err1 == nil && err2 == nil && (err3 != nil || c.Cmp(new(big.Rat).Mul(a, b)) != 0) {
			t.Fatal("(p·q)(x) ≠ p(x)·q(x)")
		}
	}
}

func TestPowersAndComplexValuesOfRationalFunctions(t *testing.T) {
	s := RationalOf(PolynomialOfIntegers(1, 0))
	r, err := RationalOf(PolynomialOfIntegers(1)).Div(s.Add(RationalOf(PolynomialOfIntegers(1)))) // 1/(s + 1)
	if err != nil || !r.IsStrictlyProper() || s.IsProper() {
		t.Fatal(r, err)
	}
	back, err := r.Power(-2)
	if err != nil || !back.Equal(RationalOf(PolynomialOfIntegers(1, 2, 1))) {
		t.Errorf("r⁻² = %v %v", back, err)
	}
	if _, err := s.Sub(s).Power(-1); err != ErrZeroDivision {
		t.Errorf("0⁻¹: %v", err)
	}
	if _, err := PolynomialOfIntegers(1, 1).Power(-1); err != ErrNegativePower {
		t.Errorf("a negative power: %v", err)
	}
	re, im, err := r.EvalComplex(ratZero, ratOne) // 1/(1 + i) = (1 − i)/2
	if err != nil || re.Cmp(big.NewRat(1, 2)) != 0 || im.Cmp(big.NewRat(-1, 2)) != 0 {
		t.Errorf("r(i) = %v + %v·i, %v", re, im, err)
	}
	if _, _, err := r.EvalComplex(big.NewRat(-1, 1), ratZero); err != ErrZeroDivision {
		t.Errorf("at the pole: %v", err)
	}
	if _, err := r.Eval(big.NewRat(-1, 1)); err != ErrZeroDivision {
		t.Errorf("at the pole: %v", err)
	}
	if f := NewPolynomial(big.NewRat(1, 4), ratZero, big.NewRat(-3, 1)).Float64(); fmt.Sprint(f) != "[0.25 0 -3]" {
		t.Errorf("as binary64: %v", f)
	}
}
