package numeric

import (
	"context"
	"fmt"
	"math/rand"
	"testing"
	"time"

	"gonum.org/v1/gonum/mat"
)

// benchmarkSizes are those of the paired runs with SciPy in
// testdata/structure_timing.py.
var benchmarkSizes = []int{4, 10, 20, 50, 100, 200, 400}

// benchmarkPlant is a random plant with half real, half complex wanted poles.
func benchmarkPlant(n, m int) (a, b, c *mat.Dense, poles []complex128) {
	random := rand.New(rand.NewSource(int64(n)))
	a, b, c = gaussian(random, n, n), gaussian(random, n, m), gaussian(random, m, n)
	for len(poles) < n/2 {
		p := complex(-1-random.Float64(), 0.5+random.Float64())
		poles = append(poles, p, complex(real(p), -imag(p)))
	}
	for len(poles) < n {
		poles = append(poles, complex(-0.5-2*random.Float64(), 0))
	}
	return a, b, c, poles[:n]
}

func BenchmarkPlacementRobust(bench *testing.B) {
	for _, n := range benchmarkSizes {
		m := max(2, n/5)
		a, b, _, poles := benchmarkPlant(n, m)
		bench.Run(fmt.Sprintf("n=%d,m=%d", n, m), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := AssignRobust(context.Background(), a, b, poles, 1); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkPlacementOneInput(bench *testing.B) {
	for _, n := range benchmarkSizes {
		a, b, _, poles := benchmarkPlant(n, 1)
		bench.Run(fmt.Sprintf("n=%d", n), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := AssignOneInput(a, b, poles); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkZeros(bench *testing.B) {
	for _, n := range benchmarkSizes {
		a, b, c, _ := benchmarkPlant(n, 2)
		bench.Run(fmt.Sprintf("n=%d", n), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := TransmissionZeros(context.Background(), a, b, c, nil); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkReachability(bench *testing.B) {
	for _, n := range benchmarkSizes {
		a, b, _, _ := benchmarkPlant(n, 2)
		bench.Run(fmt.Sprintf("n=%d", n), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := Reachability(a, b, 0); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkDistanceToUnreachable(bench *testing.B) {
	for _, n := range []int{4, 10, 20, 30} {
		a, b, _, _ := benchmarkPlant(n, 2)
		bench.Run(fmt.Sprintf("n=%d", n), func(bench *testing.B) {
			for bench.Loop() {
				if _, err := DistanceToUnreachable(context.Background(), a, b, 10*time.Second); err != nil {
					bench.Fatal(err)
				}
			}
		})
	}
}
