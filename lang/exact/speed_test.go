package exact

import (
	"fmt"
	"math/big"
	"math/rand/v2"
	"testing"
)

// decimalMatrix has entries with up to three digits, two of them decimals.
func decimalMatrix(r, c int, seed uint64) *Matrix {
	random := rand.New(rand.NewPCG(seed, 99))
	m := NewMatrix(r, c)
	for i := range r {
		for j := range c {
			m.Set(i, j, big.NewRat(random.Int64N(1999)-999, 100))
		}
	}
	return m
}

func decimalPolynomial(degree int, seed uint64) Polynomial {
	random := rand.New(rand.NewPCG(seed, 77))
	p := Constant(ratOne)
	for range degree {
		p = p.Mul(NewPolynomial(ratOne, big.NewRat(random.Int64N(500)+1, 100)))
	}
	return p
}

func BenchmarkExact(b *testing.B) {
	for _, n := range []int{4, 10, 20, 30} {
		a, drive, out := decimalMatrix(n, n, 1), decimalMatrix(n, 1, 2), decimalMatrix(1, n, 3)
		wanted := decimalPolynomial(n, 4)
		d := NewMatrix(1, 1)
		characteristic := a.CharacteristicPolynomial()
		run := func(name string, f func()) {
			b.Run(fmt.Sprintf("%s/n=%d", name, n), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					f()
				}
			})
		}
		run("CharacteristicPolynomial", func() { a.CharacteristicPolynomial() })
		run("Determinant", func() { a.Determinant() })
		run("Rank", func() { a.Rank() })
		run("Inverse", func() { a.Inverse() })
		run("Mul", func() { a.Mul(a) })
		run("ReachableRank", func() { ReachableRank(a, drive) })
		run("BassGura", func() { BassGura(a, drive, wanted) })
		run("Ackermann", func() { Ackermann(a, drive, wanted) })
		run("Transfer", func() { Transfer(a, drive, out, d) })
		run("InvariantZeros", func() { InvariantZeros(a, drive, out, d) })
		run("KalmanSplit", func() { KalmanSplit(a, drive, out) })
		run("Resolvent", func() { Resolvent(a) })
		run("Factorize", func() { characteristic.Factorize() })
		run("Roots", func() { characteristic.Roots(17) })
	}
}
