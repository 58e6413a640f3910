package numeric

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// largestDifference samples the gain of the difference of two plants.
func largestDifference(t *testing.T, a1, b1, c1, d1, a2, b2, c2, d2 *mat.Dense, sampled bool) float64 {
	t.Helper()
	first, err := NewFrequencyResponse(a1, b1, c1, d1)
	if err != nil {
		t.Fatal(err)
	}
	second, err := NewFrequencyResponse(a2, b2, c2, d2)
	if err != nil {
		t.Fatal(err)
	}
	worst := 0.0
	for k := range 600 {
		s := complex(0, math.Pow(10, float64(k)/100-3))
		if sampled {
			s = cmplx.Exp(complex(0, math.Pi*float64(k+1)/600))
		}
		g, err := first.At(s)
		if err != nil {
			t.Fatal(err)
		}
		h, err := second.At(s)
		if err != nil {
			t.Fatal(err)
		}
		rows, columns := g.Dims()
		sum := 0.0 // a lower bound of the largest singular value: the largest column
		for j := range columns {
			length := 0.0
			for i := range rows {
				length = math.Hypot(length, cmplx.Abs(g.At(i, j)-h.At(i, j)))
			}
			sum = math.Max(sum, length)
		}
		worst = math.Max(worst, sum)
	}
	return worst
}

// B. C. Moore, IEEE Trans. Automat. Control 26, 1981, the example of
// (s+4)/((s+1)(s+3)(s+5)(s+10)), and random plants: the reduced plant keeps its
// Hankel values and the difference stays within the bound.
func TestBalancedTruncationKeepsItsBound(t *testing.T) {
	random := rand.New(rand.NewPCG(51, 1))
	ctx := context.Background()
	for trial := range 30 {
		n := 3 + random.IntN(6)
		sampled := trial%2 == 1
		a := stableProblem(random, n, sampled)
		b, c, d := randomDense(random, n, 2, 1), randomDense(random, 2, n, 1), randomDense(random, 2, 2, 1)
		k := 1 + random.IntN(n-1)
		r, err := BalancedTruncation(ctx, a, b, c, d, k, sampled)
		if err != nil {
			var refusal *Refusal
			if errors.As(err, &refusal) {
				continue
			}
			t.Fatal(err)
		}
		if r.Kept != k && len(r.Certificate.Notes) == 0 {
			t.Errorf("%d states kept of %d asked for", r.Kept, k)
		}
		if difference := largestDifference(t, a, b, c, d, r.A, r.B, r.C, r.D, sampled); difference > r.Bound*(1+1e-6)+1e-9*r.Values[0] {
			t.Errorf("trial %d: the difference %.3e passes the bound %.3e", trial, difference, r.Bound)
		}
		if !sampled && r.Kept == k && k > 0 {
			h, err := HankelSingularValues(ctx, r.A, r.B, r.C, sampled)
			if err != nil {
				t.Fatal(err)
			}
			for i, v := range h.Values {
				if math.Abs(v-r.Values[i]) > 1e-6*r.Values[0] {
					t.Errorf("trial %d: value %d changed from %v to %v", trial, i, r.Values[i], v)
				}
			}
		}
	}
}

func TestBalancedTruncationKeepsModesThatDoNotDecay(t *testing.T) {
	ctx := context.Background()
	a := mat.NewDense(4, 4, []float64{0, 1, 0, 0, 0, -2, 1, 0, 0, 0, -30, 4, 0.1, 0, 2, -50})
	b, c := mat.NewDense(4, 1, []float64{0, 1, 2, 3}), mat.NewDense(1, 4, []float64{1, 0, 1, 0.2})
	a.Set(3, 0, 0)
	r, err := BalancedTruncation(ctx, a, b, c, nil, 3, false)
	if err != nil {
		t.Fatal(err)
	}
	if r.Kept != 3 || len(r.Modes) != 1 || cmplx.Abs(r.Modes[0]) > 1e-14 || len(r.Values) != 3 {
		t.Fatalf("%+v", r)
	}
	if difference := largestDifference(t, a, b, c, nil, r.A, r.B, r.C, r.D, false); difference > r.Bound*(1+1e-9) {
		t.Errorf("the difference %.3e passes the bound %.3e", difference, r.Bound)
	}
	var refusal *Refusal
	if _, err := BalancedTruncation(ctx, a, b, c, nil, 0, false); !errors.As(err, &refusal) {
		t.Errorf("an order below the number of integrators: %v", err)
	}
	if _, err := BalancedTruncation(ctx, a, b, c, nil, 5, false); err == nil {
		t.Error("an order above the plant's is accepted")
	}
}

func TestBalancedTruncationLeavesOutWhatIsNotMoved(t *testing.T) {
	a := mat.NewDense(3, 3, []float64{-1, 0, 0, 0, -2, 0, 0, 0, -3})
	b, c := mat.NewDense(3, 1, []float64{1, 0, 1}), mat.NewDense(1, 3, []float64{1, 1, 1})
	r, err := BalancedTruncation(context.Background(), a, b, c, nil, 3, false)
	if err != nil {
		t.Fatal(err)
	}
	if r.Kept != 2 || r.Bound > 1e-14 || len(r.Certificate.Notes) == 0 {
		t.Errorf("%+v", r)
	}
}
