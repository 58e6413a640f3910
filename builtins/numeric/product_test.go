//go:build amd64

package numeric

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas"
	blasgonum "gonum.org/v1/gonum/blas/gonum"
)

// Every shape, transposition and stride must agree with gonum's own product to
// rounding, and nothing outside C may be touched.
func TestTiledProductAgainstPlainProduct(t *testing.T) {
	if !wideRegisters() {
		t.Skip("this processor has no AVX2 with FMA")
	}
	random := rand.New(rand.NewPCG(81, 1))
	fill := func(n int) []float64 {
		x := make([]float64, n)
		for i := range x {
			x[i] = random.NormFloat64()
		}
		return x
	}
	for trial := range 300 {
		m, n, k := 1+random.IntN(70), 1+random.IntN(70), 1+random.IntN(70)
		if trial%30 == 0 {
			m, n, k = 130+random.IntN(150), 470+random.IntN(50), 250+random.IntN(300)
		}
		ta, tb := blas.NoTrans, blas.NoTrans
		lda, ldb, ldc := k+random.IntN(3), n+random.IntN(3), n+random.IntN(3)
		aRows, bRows := m, k
		if random.IntN(2) == 0 {
			ta, lda, aRows = blas.Trans, m+random.IntN(3), k
		}
		if random.IntN(2) == 0 {
			tb, ldb, bRows = blas.Trans, k+random.IntN(3), n
		}
		a, b, c := fill(aRows*lda), fill(bRows*ldb), fill(m*ldc)
		alpha, beta := random.NormFloat64(), []float64{0, 1, 0.3}[random.IntN(3)]
		want := append([]float64(nil), c...)
		tiledProducts{}.Dgemm(ta, tb, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
		blasgonum.Implementation{}.Dgemm(ta, tb, m, n, k, alpha, a, lda, b, ldb, beta, want, ldc)
		for i, v := range want {
			inside := i%ldc < n
			if inside && math.Abs(c[i]-v) > 1e-13*float64(k) || !inside && c[i] != v {
				t.Fatalf("%d×%d×%d, %c %c: entry %d is %v, not %v", m, n, k, ta, tb, i, c[i], v)
			}
		}
	}
}

func TestTriangularSolveAgainstPlainSolve(t *testing.T) {
	if !wideRegisters() {
		t.Skip("this processor has no AVX2 with FMA")
	}
	random := rand.New(rand.NewPCG(82, 1))
	for range 300 {
		m, n := 1+random.IntN(90), 1+random.IntN(90)
		side := []blas.Side{blas.Left, blas.Right}[random.IntN(2)]
		uplo := []blas.Uplo{blas.Upper, blas.Lower}[random.IntN(2)]
		trans := []blas.Transpose{blas.NoTrans, blas.Trans}[random.IntN(2)]
		diag := []blas.Diag{blas.NonUnit, blas.Unit}[random.IntN(2)]
		order := n
		if side == blas.Left {
			order = m
		}
		lda, ldb := order+random.IntN(3), n+random.IntN(3)
		a, b := make([]float64, order*lda), make([]float64, m*ldb)
		for i := range a {
			a[i] = random.NormFloat64() / float64(order)
		}
		for i := range order {
			a[i*lda+i] = 2 + random.Float64()
		}
		for i := range b {
			b[i] = random.NormFloat64()
		}
		want, alpha := append([]float64(nil), b...), random.NormFloat64()
		tiledProducts{}.Dtrsm(side, uplo, trans, diag, m, n, alpha, a, lda, b, ldb)
		blasgonum.Implementation{}.Dtrsm(side, uplo, trans, diag, m, n, alpha, a, lda, want, ldb)
		for i, v := range want {
			if math.Abs(b[i]-v) > 1e-13 {
				t.Fatalf("%c %c %c %c %d×%d: entry %d is %v, not %v", side, uplo, trans, diag, m, n, i, b[i], v)
			}
		}
	}
}

func BenchmarkProduct(b *testing.B) {
	for _, n := range []int{16, 32, 100, 400} {
		x, y, z := make([]float64, n*n), make([]float64, n*n), make([]float64, n*n)
		for i := range x {
			x[i], y[i] = 1+float64(i%7), 2-float64(i%5)
		}
		b.Run("n="+string(rune('0'+n/100))+string(rune('0'+n/10%10))+string(rune('0'+n%10)), func(b *testing.B) {
			for b.Loop() {
				multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, x, n, y, n, 0, z, n)
			}
			b.ReportMetric(2*float64(n*n*n)*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
		})
	}
}
