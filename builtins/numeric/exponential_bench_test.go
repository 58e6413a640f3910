package numeric

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// benchOrders are the orders of the speed table; testdata/speed_reference.py
// times SciPy on matrices drawn alike.
var benchOrders = []int{4, 5, 10, 20, 50, 100, 200, 400}

// benchMatrix is dense, normally distributed, with 1-norm 10.
func benchMatrix(n int) *mat.Dense {
	random := rand.New(rand.NewPCG(7, uint64(n)))
	a := mat.NewDense(n, n, nil)
	for i := range n {
		for j := range n {
			a.Set(i, j, random.NormFloat64())
		}
	}
	a.Scale(10/mat.Norm(a, 1), a)
	return a
}

func BenchmarkExponential(b *testing.B) {
	for _, n := range benchOrders {
		a := benchMatrix(n)
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				if _, _, err := Exponential(a); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
