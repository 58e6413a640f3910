package numeric

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"math/rand"
	"testing"
	"time"

	"gonum.org/v1/gonum/mat"
)

// sigmaMin is the smallest singular value of [A − zI, B] by a full
// decomposition of its real form: the test's own second opinion.
func sigmaMin(t testing.TB, a, b *mat.Dense, z complex128) float64 {
	t.Helper()
	n, m := b.Dims()
	form := mat.NewDense(2*n, 2*(n+m), nil)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			form.Set(i, j, a.At(i, j))
			form.Set(n+i, n+m+j, a.At(i, j))
		}
		form.Set(i, i, a.At(i, i)-real(z))
		form.Set(n+i, n+m+i, a.At(i, i)-real(z))
		form.Set(i, n+m+i, imag(z))
		form.Set(n+i, i, -imag(z))
		for j := 0; j < m; j++ {
			form.Set(i, n+j, b.At(i, j))
			form.Set(n+i, n+m+n+j, b.At(i, j))
		}
	}
	values, err := singularValues(form)
	if err != nil {
		t.Fatal(err)
	}
	return values[len(values)-1]
}

func TestPublishedDistances(t *testing.T) {
	for _, c := range structureCases(t, "distance-") {
		a, b := matrixOf(t, c.Inputs["A"]), matrixOf(t, c.Inputs["B"])
		got, err := DistanceToUnreachable(context.Background(), a, b, 10*time.Second)
		if err != nil {
			t.Fatal(err)
		}
		want := numberOf(t, c.Expect["distance"])
		if math.Abs(got.High-want) > 1e-9*want || got.Low > want*(1+1e-12) || got.Low < 0.9*got.High {
			t.Errorf("%s: [%v, %v], want %v", c.ID, got.Low, got.High, want)
		}
		if s := sigmaMin(t, a, b, got.At); math.Abs(s-got.High) > 1e-12 {
			t.Errorf("%s: σ at %v is %v", c.ID, got.At, s)
		}
	}
}

// Closed forms: a chain of two integrators √3/2, an oscillator √7/4 (in the published
// cases); one state |b|; B of full row rank; a mode that a change of 1e-6 (to first order) decouples.
func TestDistanceClosedForms(t *testing.T) {
	ctx := context.Background()
	for name, c := range map[string]struct {
		a, b *mat.Dense
		want float64
	}{
		"one state":               {mat.NewDense(1, 1, []float64{-3}), mat.NewDense(1, 1, []float64{0.25}), 0.25},
		"one state, two inputs":   {mat.NewDense(1, 1, []float64{7}), mat.NewDense(1, 2, []float64{3, 4}), 5},
		"identity inputs":         {mat.NewDense(2, 2, []float64{0, 0, 0, 0}), mat.NewDense(2, 2, []float64{1, 0, 0, 2}), 1},
		"nearly decoupled":        {mat.NewDense(2, 2, []float64{1, 0, 0, 1000}), mat.NewDense(2, 1, []float64{1, 1e-6}), 1e-6},
		"scaled double chain":     {mat.NewDense(2, 2, []float64{0, 1e-200, 0, 0}), mat.NewDense(2, 1, []float64{0, 1e-200}), 1e-200 * math.Sqrt(3) / 2},
		"large double chain":      {mat.NewDense(2, 2, []float64{0, 1e200, 0, 0}), mat.NewDense(2, 1, []float64{0, 1e200}), 1e200 * math.Sqrt(3) / 2},
		"unreachable, exact":      {mat.NewDense(2, 2, []float64{1, 0, 0, 2}), mat.NewDense(2, 1, []float64{1, 0}), 0},
		"unreachable by rounding": {mat.NewDense(2, 2, []float64{4, 3, -4.5, -3.5}), mat.NewDense(2, 1, []float64{1, -1}), 0},
	} {
		got, err := DistanceToUnreachable(ctx, c.a, c.b, 10*time.Second)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if got.Low > c.want*(1+1e-9) || got.High < c.want*(1-1e-6) || c.want > 0 && got.High > c.want*(1+1e-6) || c.want == 0 && got.High > 1e-13 {
			t.Errorf("%s: [%g, %g], want %g", name, got.Low, got.High, c.want)
		}
	}
	if got, err := DistanceToUnreachable(ctx, nil, nil, 0); err != nil || !math.IsInf(got.Low, 1) {
		t.Errorf("no states: %v, %v", got, err)
	}
	if got, err := DistanceToUnreachable(ctx, mat.NewDense(2, 2, []float64{1, 2, 3, 4}), nil, 0); err != nil || got.Low != 0 {
		t.Errorf("no inputs: %v, %v", got, err)
	}
}

// The bracket against a fine grid with local descent, the value at At, and the invariance
// under orthogonal changes of states, on random pairs.
func TestDistanceBracketsOnRandomPairs(t *testing.T) {
	random := rand.New(rand.NewSource(1984))
	for trial := 0; trial < 12; trial++ {
		n, m := 2+random.Intn(5), 1+random.Intn(2)
		a, b := gaussian(random, n, n), gaussian(random, n, m)
		if trial%3 == 0 { // graded couplings
			for i := 0; i < n; i++ {
				for j := 0; j < n; j++ {
					a.Set(i, j, a.At(i, j)*math.Pow(0.3, float64(i)))
				}
			}
		}
		got, err := DistanceToUnreachable(context.Background(), a, b, 20*time.Second)
		if err != nil {
			t.Fatal(err)
		}
		if got.Low < 0.9*got.High || got.Low > got.High {
			t.Errorf("trial %d: bracket [%g, %g]", trial, got.Low, got.High)
		}
		if s := sigmaMin(t, a, b, got.At); math.Abs(s-got.High) > 1e-12 {
			t.Errorf("trial %d: σ at %v is %g, claimed %g", trial, got.At, s, got.High)
		}
		reach := mat.Norm(a, 2)
		best := math.Inf(1)
		for i := -24; i <= 24; i++ {
			for j := 0; j <= 24; j++ {
				best = math.Min(best, sigmaMin(t, a, b, complex(float64(i)*reach/24, float64(j)*reach/24)))
			}
		}
		if best < got.Low {
			t.Errorf("trial %d: a grid finds σ = %g below the lower bound %g", trial, best, got.Low)
		}
		var qr mat.QR
		qr.Factorize(gaussian(random, n, n))
		var q, turned, input mat.Dense
		qr.QTo(&q)
		turned.Mul(q.T(), a)
		turned.Mul(&turned, &q)
		input.Mul(q.T(), b)
		again, err := DistanceToUnreachable(context.Background(), &turned, &input, 20*time.Second)
		if err != nil || math.Abs(again.High-got.High) > 1e-9*got.High {
			t.Errorf("trial %d: %g, after an orthogonal change %g", trial, got.High, again.High)
		}
	}
}

// The lower bound of a cell holds at random points of it.
func TestCellBoundHolds(t *testing.T) {
	random := rand.New(rand.NewSource(6))
	for trial := 0; trial < 40; trial++ {
		n, m := 2+random.Intn(6), 1+random.Intn(2)
		a, b := gaussian(random, n, n), gaussian(random, n, m)
		reduction := newStaircase(n, m, flatCopy(a), flatCopy(b), 0, nil, 0)
		if err := reduction.reduce(); err != nil {
			t.Fatal(err)
		}
		search := newDistanceSearch(context.Background(), time.Time{}, reduction, 1e-15)
		z := complex(random.NormFloat64(), random.NormFloat64())
		l := search.evaluate(z)
		if s := sigmaMin(t, a, b, z); math.Abs(s-l.first) > 1e-4*s {
			t.Fatalf("inverse iteration finds σ = %g, the decomposition %g", l.first, s)
		}
		for try := 0; try < 25; try++ {
			wide, high := math.Exp(-6*random.Float64()), math.Exp(-6*random.Float64())
			offset := complex(random.NormFloat64(), random.NormFloat64()) * complex(wide, 0)
			bound := l.lowerBound(offset, wide, high)
			w := z + offset + complex(wide*(2*random.Float64()-1), high*(2*random.Float64()-1))
			if s := sigmaMin(t, a, b, w); s < bound*(1-1e-9)-1e-13 {
				t.Fatalf("σ = %g at %v in a cell with bound %g", s, w, bound)
			}
		}
	}
}

func TestDistanceStops(t *testing.T) {
	// (s + 1)²⁰ in companion form: far too close to unreachable to be bracketed fast.
	n := 20
	a, b := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil)
	c := 1.0
	for i := 0; i < n; i++ {
		if i+1 < n {
			a.Set(i, i+1, 1)
		}
		c *= float64(n-i) / float64(i+1)
		a.Set(n-1, n-1-i, -c)
	}
	b.Set(n-1, 0, 1)
	started := time.Now()
	got, err := DistanceToUnreachable(context.Background(), a, b, 200*time.Millisecond)
	if err != nil || time.Since(started) > 5*time.Second {
		t.Fatalf("%v after %v", err, time.Since(started))
	}
	if got.Low < 0 || got.Low > got.High || got.High > 1e-5 || len(got.Certificate.Notes) == 0 {
		t.Errorf("[%g, %g], notes %v", got.Low, got.High, got.Certificate.Notes)
	}
	if s := sigmaMin(t, a, b, got.At); s > got.High*(1+1e-6) {
		t.Errorf("σ at %v is %g, above %g", got.At, s, got.High)
	}
	cancelled, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := DistanceToUnreachable(cancelled, a, b, 0); !errors.Is(err, context.Canceled) {
		t.Errorf("a cancelled context: %v", err)
	}
	if _, err := DistanceToUnreachable(context.Background(), mat.NewDense(1, 1, []float64{math.Inf(1)}), mat.NewDense(1, 1, nil), 0); err == nil {
		t.Error("an infinite entry must be refused")
	}
	if cmplx.IsNaN(got.At) {
		t.Error("the minimiser is not a number")
	}
}
