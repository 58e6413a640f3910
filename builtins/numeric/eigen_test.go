package numeric

import (
	"math"
	"math/cmplx"
	"math/rand"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// normalMatrix is an n×m matrix of independent normal numbers.
func normalMatrix(r *rand.Rand, n, m int) *mat.Dense {
	d := mat.NewDense(n, m, nil)
	d.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, d)
	return d
}

// spectrumDistance pairs two sets of eigenvalues greedily and gives the largest
// distance.
func spectrumDistance(got, want []complex128) float64 {
	if len(got) != len(want) {
		return math.Inf(1)
	}
	rest := append([]complex128(nil), got...)
	worst := 0.0
	for _, w := range want {
		best := 0
		for i := range rest {
			if cmplx.Abs(rest[i]-w) < cmplx.Abs(rest[best]-w) {
				best = i
			}
		}
		worst = math.Max(worst, cmplx.Abs(rest[best]-w))
		rest = append(rest[:best], rest[best+1:]...)
	}
	return worst
}

func TestSchurIdentity(t *testing.T) {
	r := rand.New(rand.NewSource(1))
	for _, n := range []int{1, 2, 3, 5, 12, 13, 40, 120} {
		for _, size := range []float64{1, 1e-200, 1e250} {
			a := normalMatrix(r, n, n)
			a.Scale(size, a)
			form, z, w, err := Schur(a)
			if err != nil {
				t.Fatal(err)
			}
			var back mat.Dense
			back.Mul(z, form)
			back.Mul(&back, z.T())
			back.Sub(&back, a)
			if e := peakEntry(&back) / peakEntry(a); e > 1e-14*float64(n) {
				t.Errorf("n %d size %g: residual %g", n, size, e)
			}
			values, err := Eigenvalues(a)
			if err != nil {
				t.Fatal(err)
			}
			if e := spectrumDistance(values, w) / peakEntry(a); e > 1e-12*float64(n) {
				t.Errorf("n %d size %g: eigenvalues differ by %g", n, size, e)
			}
		}
	}
}

func peakEntry(m mat.Matrix) float64 {
	rows, columns := sizeOf(m)
	largest := 0.0
	for i := 0; i < rows; i++ {
		for j := 0; j < columns; j++ {
			largest = math.Max(largest, math.Abs(m.At(i, j)))
		}
	}
	return largest
}

func TestReorderSchurKeepsTheMatrix(t *testing.T) {
	r := rand.New(rand.NewSource(2))
	for trial := 0; trial < 50; trial++ {
		n := 1 + r.Intn(14)
		a := normalMatrix(r, n, n)
		form, z, w, err := Schur(a)
		if err != nil {
			t.Fatal(err)
		}
		want := 0
		for _, v := range w {
			if real(v) < 0 {
				want++
			}
		}
		got, err := ReorderSchur(form, z, func(v complex128) bool { return real(v) < 0 })
		if err != nil || got != want {
			t.Fatalf("moved %d of %d: %v", got, want, err)
		}
		diagonalEigenvalues(n, form.RawMatrix().Data, w)
		for i, v := range w {
			if (real(v) < 0) != (i < want) {
				t.Errorf("eigenvalue %v at position %d of %d", v, i, want)
			}
		}
		var back mat.Dense
		back.Mul(z, form)
		back.Mul(&back, z.T())
		back.Sub(&back, a)
		if peakEntry(&back) > 1e-13 {
			t.Errorf("residual %g", peakEntry(&back))
		}
	}
}

func TestEigenvaluesOfHardSmallMatrices(t *testing.T) {
	cases := map[string]struct {
		n    int
		a    []float64
		want []complex128
	}{
		"zero":               {2, []float64{0, 0, 0, 0}, []complex128{0, 0}},
		"double integrator":  {2, []float64{0, 1, 0, 0}, []complex128{0, 0}},
		"cyclic permutation": {4, []float64{0, 0, 0, 1, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1, 0}, []complex128{1, -1, 1i, -1i}},
		"graded":             {2, []float64{1, 1e9, 1e-9, 1}, []complex128{0, 2}},
		"one":                {1, []float64{-3}, []complex128{-3}},
	}
	for name, c := range cases {
		got, err := Eigenvalues(mat.NewDense(c.n, c.n, c.a))
		if err != nil {
			t.Fatal(name, err)
		}
		if e := spectrumDistance(got, c.want); e > 1e-14 {
			t.Errorf("%s: %v, want %v", name, got, c.want)
		}
	}
}

func TestEigenRefusesBadInput(t *testing.T) {
	for name, a := range map[string]*mat.Dense{
		"NaN":      mat.NewDense(2, 2, []float64{0, math.NaN(), 0, 0}),
		"infinite": mat.NewDense(2, 2, []float64{0, 1, math.Inf(1), 0}),
		"oblong":   mat.NewDense(2, 3, nil),
	} {
		if _, err := Eigen(a); err == nil {
			t.Errorf("%s: accepted", name)
		}
		if _, err := Eigenvalues(a); err == nil {
			t.Errorf("%s: accepted", name)
		}
		if _, _, _, err := Schur(a); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	if got, err := Eigenvalues(nil); err != nil || len(got) != 0 {
		t.Errorf("nil: %v %v", got, err)
	}
}

func TestEigenvectorsSatisfyTheirEquations(t *testing.T) {
	r := rand.New(rand.NewSource(3))
	for trial := 0; trial < 40; trial++ {
		n := 1 + r.Intn(15)
		a := normalMatrix(r, n, n)
		if trial%4 == 0 {
			a.Add(a, mat.DenseCopyOf(a.T()))
		}
		s, err := Eigen(a)
		if err != nil {
			t.Fatal(err)
		}
		for j, lambda := range s.Values {
			for i := 0; i < n; i++ {
				var right, left complex128
				for k := 0; k < n; k++ {
					right += complex(a.At(i, k), 0) * s.Right.At(k, j)
					left += cmplx.Conj(s.Left.At(k, j)) * complex(a.At(k, i), 0)
				}
				right -= lambda * s.Right.At(i, j)
				left -= lambda * cmplx.Conj(s.Left.At(i, j))
				if cmplx.Abs(right) > 1e-12 || cmplx.Abs(left) > 1e-12 {
					t.Errorf("n %d value %d: residuals %v %v", n, j, right, left)
				}
			}
		}
	}
}
