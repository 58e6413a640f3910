package exact

import (
	"math/big"
	"testing"
)

func TestPrimesAreTheLargestBelowTheirBound(t *testing.T) {
	last := uint64(1 << 62)
	for index := range len(primeOffsets) + 3 {
		last = primeBelow(last)
		if got := primeField(index).p; got != last {
			t.Fatalf("prime %d is %d, want %d", index, got, last)
		}
	}
}

func ints(r, c int, data ...int64) *Matrix {
	m, err := FromIntegers(r, c, data...)
	if err != nil {
		panic(err)
	}
	return m
}

func TestInverseTimesMatrixIsIdentity(t *testing.T) {
	a := ints(3, 3, 1, 2, 3, 4, 5, 6, 7, 8, 10)
	inverse, err := a.Inverse()
	if err != nil {
		t.Fatal(err)
	}
	if !must(a.Mul(inverse)).Equal(Identity(3)) {
		t.Fatalf("a·a⁻¹ = %v", must(a.Mul(inverse)))
	}
	if d, _ := a.Determinant(); d.Cmp(big.NewRat(-3, 1)) != 0 {
		t.Fatalf("determinant %v", d)
	}
}

func TestSquareFreeFactorsMultiplyBack(t *testing.T) {
	p := PolynomialOfIntegers(1, -1).Mul(PolynomialOfIntegers(1, -1)).Mul(PolynomialOfIntegers(3, 2, 5))
	q := Constant(p.Lead())
	for _, f := range p.SquareFree() {
		power, _ := f.Polynomial.Power(f.Multiplicity)
		q = q.Mul(power)
	}
	if !p.Equal(q) {
		t.Fatalf("%v became %v", p, q)
	}
}
