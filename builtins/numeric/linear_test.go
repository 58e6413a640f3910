package numeric

import (
	"errors"
	"math"
	"math/rand"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// hilbert has entries 1/(i + j − 1): not exactly representable, so the reference
// is formed for the rounded matrix by the identity A·A⁻¹ = I only.
func hilbert(n int) *mat.Dense {
	h := mat.NewDense(n, n, nil)
	h.Apply(func(i, j int, _ float64) float64 { return 1 / float64(i+j+1) }, h)
	return h
}

func TestSolveKinds(t *testing.T) {
	cases := map[string]struct {
		rows, columns int
		a, b, x       []float64
		kind          string
		rank          int
	}{
		"square":              {2, 2, []float64{2, 1, 1, 3}, []float64{3, 4}, []float64{1, 1}, "unique", 2},
		"graded":              {2, 2, []float64{1e200, 0, 0, 1e-200}, []float64{1e200, 1e-200}, []float64{1, 1}, "unique", 2},
		"line through points": {3, 2, []float64{1, 0, 1, 1, 1, 2}, []float64{6, 0, 0}, []float64{5, -3}, "least squares", 2},
		"consistent tall":     {3, 2, []float64{1, 0, 0, 1, 1, 1}, []float64{1, 2, 3}, []float64{1, 2}, "unique", 2},
		"wide":                {1, 2, []float64{1, 1}, []float64{4}, []float64{2, 2}, "one of many", 1},
		"singular consistent": {2, 2, []float64{1, 2, 2, 4}, []float64{5, 10}, []float64{1, 2}, "one of many", 1},
		"singular, misfit":    {2, 2, []float64{1, 0, 0, 0}, []float64{3, 4}, []float64{3, 0}, "least squares, one of many", 1},
		"zero":                {2, 2, []float64{0, 0, 0, 0}, []float64{1, 1}, []float64{0, 0}, "least squares, one of many", 0},
	}
	for name, c := range cases {
		s, err := Solve(mat.NewDense(c.rows, c.columns, c.a), mat.NewDense(c.rows, 1, c.b))
		if err != nil {
			t.Fatal(name, err)
		}
		if s.Kind != c.kind || s.Rank != c.rank {
			t.Errorf("%s: %q rank %d, want %q rank %d", name, s.Kind, s.Rank, c.kind, c.rank)
		}
		for i, want := range c.x {
			if math.Abs(s.X.At(i, 0)-want) > 1e-14*(1+math.Abs(want)) {
				t.Errorf("%s: x[%d] = %g, want %g", name, i+1, s.X.At(i, 0), want)
			}
		}
	}
}

func TestSolveRefusesBadInput(t *testing.T) {
	good, bad := mat.NewDense(2, 2, []float64{1, 0, 0, 1}), mat.NewDense(2, 2, []float64{1, 0, 0, math.NaN()})
	if _, err := Solve(bad, good); err == nil {
		t.Error("NaN in A was accepted")
	}
	if _, err := Solve(good, bad); err == nil {
		t.Error("NaN in B was accepted")
	}
	if _, err := Solve(good, mat.NewDense(3, 1, nil)); err == nil {
		t.Error("unequal rows were accepted")
	}
}

func TestInverse(t *testing.T) {
	r := rand.New(rand.NewSource(21))
	for _, n := range []int{1, 2, 5, 30} {
		a := normalMatrix(r, n, n)
		inverse, c, err := Inverse(a)
		if err != nil {
			t.Fatal(err)
		}
		var product mat.Dense
		product.Mul(a, inverse)
		for i := 0; i < n; i++ {
			product.Set(i, i, product.At(i, i)-1)
		}
		if e := peakEntry(&product); e > 1e-12*float64(n) || c.Digits < 10 {
			t.Errorf("n %d: A·A⁻¹ − I is %g, digits %g", n, e, c.Digits)
		}
	}
	for name, a := range map[string]*mat.Dense{
		"zero row": mat.NewDense(2, 2, []float64{1, 2, 0, 0}),
		"rank one": mat.NewDense(3, 3, []float64{1, 2, 3, 4, 5, 6, 7, 8, 9}),
		"rounded":  mat.NewDense(2, 2, []float64{0.1, 0.3, 0.2, 0.6}),
	} {
		if _, _, err := Inverse(a); !errors.Is(err, ErrSingular) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, c, err := Inverse(hilbert(8)); err != nil || c.Digits > 9 || c.Digits < 4 {
		t.Errorf("Hilbert 8: digits %g, %v (the condition number is about 1.5e10)", c.Digits, err)
	}
}

func TestDeterminant(t *testing.T) {
	for name, c := range map[string]struct {
		n    int
		a    []float64
		want float64
	}{
		"one":         {1, []float64{-3}, -3},
		"permutation": {3, []float64{0, 1, 0, 0, 0, 1, 1, 0, 0}, 1},
		"exchange":    {2, []float64{0, 1, 1, 0}, -1},
		"singular":    {2, []float64{1, 2, 2, 4}, 0},
		"large":       {2, []float64{1e200, 0, 0, 1e-190}, 1e10},
	} {
		got, _, err := Determinant(mat.NewDense(c.n, c.n, c.a))
		if err != nil || math.Abs(got-c.want) > 1e-13*math.Abs(c.want) {
			t.Errorf("%s: %g, want %g (%v)", name, got, c.want, err)
		}
	}
	if got, c, err := Determinant(mat.NewDense(2, 2, []float64{1e300, 0, 0, 1e300})); err != nil || !math.IsInf(got, 1) || len(c.Notes) == 0 {
		t.Errorf("overflow: %g %v %v", got, c.Notes, err)
	}
	if got, _, err := Determinant(nil); err != nil || got != 1 {
		t.Errorf("empty: %g %v", got, err)
	}
}

func TestNorms(t *testing.T) {
	a := mat.NewDense(2, 2, []float64{1, -2, 3, 4})
	for kind, want := range map[string]float64{"1": 6, "infinity": 7, "frobenius": math.Sqrt(30), "2": math.Sqrt(15 + math.Sqrt(125))} {
		got, _, err := Norm(a, kind)
		if err != nil || math.Abs(got-want) > 1e-14*want {
			t.Errorf("%s: %.17g, want %.17g (%v)", kind, got, want, err)
		}
	}
	if _, _, err := Norm(a, "maximum"); err == nil {
		t.Error("an unknown norm was accepted")
	}
	if got, _, err := Norm(mat.NewDense(1, 2, []float64{3e200, 4e200}), "frobenius"); err != nil || math.Abs(got/5e200-1) > 1e-14 {
		t.Errorf("large: %g %v", got, err)
	}
	if got, _, err := Norm(mat.NewDense(2, 2, nil), "frobenius"); err != nil || got != 0 {
		t.Errorf("zero: %g %v", got, err)
	}
	// Condition of the Hilbert matrix of order 5 as printed to five digits in
	// G. E. Forsythe, C. B. Moler, Computer Solution of Linear Algebraic Systems,
	// 1967 (from memory).
	if got, c, err := ConditionNumber(hilbert(5)); err != nil || math.Abs(got/4.7661e5-1) > 1e-4 || c.Digits > 11 {
		t.Errorf("Hilbert 5: %g %v", got, err)
	}
	if got, _, err := ConditionNumber(mat.NewDense(2, 2, nil)); err != nil || !math.IsInf(got, 1) {
		t.Errorf("zero: %g %v", got, err)
	}
}

func TestRankKernelImage(t *testing.T) {
	r := rand.New(rand.NewSource(22))
	for trial := 0; trial < 40; trial++ {
		m, n := 1+r.Intn(7), 1+r.Intn(7)
		rank := r.Intn(min(m, n) + 1)
		a := mat.NewDense(m, n, nil)
		if rank > 0 {
			a.Mul(normalMatrix(r, m, rank), normalMatrix(r, rank, n))
		}
		d, err := Rank(a)
		if err != nil || d.Rank != rank {
			t.Errorf("rank %d, want %d (%v)", d.Rank, rank, err)
			continue
		}
		kernel, _, err := Kernel(a)
		if err != nil {
			t.Fatal(err)
		}
		if _, c := sizeOf(kernel); c != n-rank {
			t.Errorf("kernel has %d columns, want %d", c, n-rank)
		}
		var product, gram mat.Dense
		if rank < n {
			product.Mul(a, kernel)
			if peakEntry(&product) > 1e-13*(1+peakEntry(a)) {
				t.Errorf("A·kernel is %g", peakEntry(&product))
			}
		}
		image, _, err := Image(a)
		if err != nil {
			t.Fatal(err)
		}
		if _, c := sizeOf(image); c != rank {
			t.Errorf("image has %d columns, want %d", c, rank)
		}
		if rank > 0 {
			gram.Mul(image.T(), a)
			product.Reset()
			product.Mul(image, &gram)
			product.Sub(&product, a)
			if peakEntry(&product) > 1e-13*(1+peakEntry(a)) {
				t.Errorf("image·imageᵀ·A − A is %g", peakEntry(&product))
			}
		}
	}
	if d, err := Rank(mat.NewDense(2, 2, []float64{1, 0, 0, 1e-15})); err != nil || d.Rank != 2 || len(d.Certificate.Notes) == 0 {
		t.Errorf("a close decision: %+v %v", d, err)
	}
	if d, err := Rank(nil); err != nil || d.Rank != 0 {
		t.Errorf("empty: %+v %v", d, err)
	}
}
