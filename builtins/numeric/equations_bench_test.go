package numeric

import (
	"context"
	"fmt"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// benchPlant is a benchMatrix shifted to be stable, with two inputs and unit weights.
func benchPlant(n int) (a, b, q, r *mat.Dense) {
	a = benchMatrix(n)
	for i := range n {
		a.Set(i, i, a.At(i, i)-2)
	}
	b, q, r = mat.NewDense(n, 2, nil), mat.NewDense(n, n, nil), mat.NewDense(2, 2, []float64{1, 0, 0, 1})
	for i := range n {
		q.Set(i, i, 1)
		b.Set(i, i%2, 1)
	}
	return a, b, q, r
}

// equationOrders are the orders of testdata/equations_timing.py.
var equationOrders = []int{4, 10, 20, 50, 100, 200, 400}

func BenchmarkRiccati(bench *testing.B) {
	for _, sampled := range []bool{false, true} {
		for _, n := range equationOrders {
			a, b, q, r := benchPlant(n)
			if sampled {
				a.Scale(0.1, a)
			}
			bench.Run(fmt.Sprintf("sampled=%v/n=%d", sampled, n), func(bench *testing.B) {
				for bench.Loop() {
					if _, err := Riccati(context.Background(), RiccatiProblem{A: a, B: b, Q: q, R: r, Sampled: sampled}); err != nil {
						bench.Fatal(err)
					}
				}
			})
		}
	}
}

func BenchmarkLyapunov(bench *testing.B) {
	for _, n := range equationOrders {
		a, _, q, _ := benchPlant(n)
		bench.Run(fmt.Sprintf("n=%d", n), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := Lyapunov(context.Background(), a, q, false); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkEigenvalues(bench *testing.B) {
	for _, n := range equationOrders {
		a := benchMatrix(n)
		bench.Run(fmt.Sprintf("n=%d", n), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := Eigenvalues(a); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}
