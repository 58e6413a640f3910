package numeric

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// heldTruth is the exponential of [[A, B], [0, 0]]·T with the product by T not
// rounded, as A_d and B_d.
func heldTruth(a, b *mat.Dense, period float64) (ad, bd bigMatrix) {
	n, m := b.Dims()
	w := newBig(n+m, n+m)
	w.put(0, 0, bigOf(a))
	w.put(0, n, bigOf(b))
	e := w.scaled(bigFloat(period)).exponential()
	return e.block(0, n, 0, n), e.block(0, n, n, n+m)
}

func randomDense(random *rand.Rand, rows, columns int, size float64) *mat.Dense {
	m := mat.NewDense(rows, columns, nil)
	for i := range rows {
		for j := range columns {
			m.Set(i, j, size*random.NormFloat64())
		}
	}
	return m
}

func TestHoldClaimsNoDigitsItHasNot(t *testing.T) {
	random := rand.New(rand.NewPCG(2, 3))
	tried := 0
	for trial := range 250 {
		n, m := 1+random.IntN(5), 1+random.IntN(2)
		a := gradedProblem(random, n)
		b := randomDense(random, n, m, math.Pow(10, 12*random.Float64()-6))
		period := math.Pow(10, -6*random.Float64())
		ad, bd, certificate, err := Hold(a, b, period)
		if err != nil {
			if !strings.Contains(err.Error(), "overflow") {
				t.Fatal(err)
			}
			continue
		}
		tried++
		adTruth, bdTruth := heldTruth(a, b, period)
		wrong := math.Max(errorAgainst(ad, adTruth), errorAgainst(bd, bdTruth))
		if mat.Max(ad) == 0 && mat.Min(ad) == 0 {
			continue
		}
		requireHonest(t, "hold", certificate.Digits, wrong)
		if t.Failed() {
			t.Fatalf("trial %d, T = %g: error %.1e, %+v\n%v\n%v", trial, period, wrong, certificate, mat.Formatted(a), mat.Formatted(b))
		}
	}
	if tried < 200 {
		t.Errorf("only %d problems tried", tried)
	}
}

// Every single entry of B_d must be right for tiny T, where small entries are
// high powers of T, and for couplings of 1e26 and 1e-26 in one matrix.
func TestHoldIsRightEntryByEntry(t *testing.T) {
	chain := func(n int, coupling func(i int) float64) (*mat.Dense, *mat.Dense) {
		a, b := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil)
		for i := range n - 1 {
			a.Set(i, i+1, coupling(i))
		}
		b.Set(n-1, 0, 1)
		return a, b
	}
	one := func(int) float64 { return 1 }
	loop, loopInput := chain(6, one)
	for j := range 6 {
		loop.Set(5, j, -[]float64{1, 3, 7, 9, 8, 2}[j])
	}
	longChain, longInput := chain(12, one)
	wild, wildInput := chain(4, func(i int) float64 { return []float64{1e26, 1e-26, 1e13}[i] })
	units := mat.NewDense(3, 3, []float64{-1, 1e26, 0, -1e-26, -2, 1e20, 1e-48, -1e-22, -3})
	for _, tc := range []struct {
		name   string
		a, b   *mat.Dense
		period float64
	}{
		{"six states in a loop, T = 1 µs", loop, loopInput, 1e-6},
		{"six states in a loop, T = 1 ps", loop, loopInput, 1e-12},
		{"twelve integrators, T = 10 µs", longChain, longInput, 1e-5},
		{"twelve integrators, T = 3 s", longChain, longInput, 3},
		{"couplings 1e26 and 1e-26, T = 1 ms", wild, wildInput, 1e-3},
		{"couplings 1e26 and 1e-26, T = 1 s", wild, wildInput, 1},
		{"states in units 1e26 apart", units, mat.NewDense(3, 1, []float64{0, 1e-26, 1e-40}), 0.25},
		{"huge input", mat.NewDense(2, 2, []float64{0, 1, -1, -0.2}), mat.NewDense(2, 2, []float64{0, 1e26, 1e-26, 3}), 0.1},
	} {
		ad, bd, certificate, err := Hold(tc.a, tc.b, tc.period)
		if err != nil {
			t.Fatalf("%s: %v", tc.name, err)
		}
		adTruth, bdTruth := heldTruth(tc.a, tc.b, tc.period)
		ea, eb := entryErrorAgainst(ad, adTruth), entryErrorAgainst(bd, bdTruth)
		t.Logf("%s: A_d %.1e, B_d %.1e, %s", tc.name, ea, eb, certificate.Method)
		// An entry at the end of a chain is a product of up to twelve couplings.
		if ea > 1e-12 || eb > 1e-12 {
			t.Errorf("%s: an entry of A_d is off by %.1e and one of B_d by %.1e", tc.name, ea, eb)
		}
	}
}

func TestHoldLineAgainstTruth(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 8))
	for range 60 {
		n, m := 1+random.IntN(4), 1+random.IntN(2)
		a, b := gradedProblem(random, n), randomDense(random, n, m, 1)
		c, d := randomDense(random, 2, n, 1), randomDense(random, 2, m, 1)
		period := math.Pow(10, -5*random.Float64())
		ad, bd, cd, dd, certificate, err := HoldLine(a, b, c, d, period)
		if err != nil {
			if strings.Contains(err.Error(), "overflow") {
				continue
			}
			t.Fatal(err)
		}
		w := newBig(n+2*m, n+2*m)
		w.put(0, 0, bigOf(a).scaled(bigFloat(period)))
		w.put(0, n, bigOf(b).scaled(bigFloat(period)))
		w.put(n, n+m, bigIdentity(m))
		e := w.exponential()
		transition, first, second := e.block(0, n, 0, n), e.block(0, n, n, n+m), e.block(0, n, n+m, n+2*m)
		minus := bigFloat(-1)
		bdTruth := first.plus(transition.times(second)).plus(second.scaled(minus))
		ddTruth := bigOf(d).plus(bigOf(c).times(second))
		wrong := math.Max(errorAgainst(ad, transition), errorAgainst(bd, bdTruth))
		requireHonest(t, "line hold", certificate.Digits, wrong)
		if wrong := errorAgainst(dd, ddTruth); wrong > math.Pow(10, 1.5-certificate.Digits) {
			t.Errorf("D_d is off by %.1e", wrong)
		}
		if !mat.Equal(c, cd) {
			t.Error("C_d is not C")
		}
	}
}

func TestLostAtSampling(t *testing.T) {
	oscillator, b := mat.NewDense(2, 2, []float64{0, 1, -1, 0}), mat.NewDense(2, 1, []float64{0, 1})
	for _, tc := range []struct {
		period float64
		turns  int
	}{{math.Pi, 1}, {2 * math.Pi, 2}, {3, 0}, {math.Pi * 1.0001, 1}, {0.01, 0}} {
		pairs, err := LostAtSampling(oscillator, b, tc.period)
		if err != nil {
			t.Fatal(err)
		}
		if (len(pairs) > 0) != (tc.turns > 0) || len(pairs) > 0 && (pairs[0].Turns != tc.turns || math.Abs(pairs[0].Period-math.Pi*float64(tc.turns)) > 1e-12) {
			t.Errorf("T = %g: %+v", tc.period, pairs)
		}
	}
	// Two oscillators, frequencies 1 and 3 rad/s, share a sampled mode at T = π
	// (difference 2) whichever inputs there are; with an input for each oscillator
	// both stay steered.
	double := mat.NewDense(4, 4, []float64{0, 1, 0, 0, -1, 0, 0, 0, 0, 0, 0, 1, 0, 0, -9, 0})
	inputs := mat.NewDense(4, 2, []float64{0, 0, 1, 0, 0, 0, 0, 1})
	pairs, err := LostAtSampling(double, inputs, math.Pi)
	if err != nil {
		t.Fatal(err)
	}
	cross := 0
	for _, p := range pairs {
		if math.Abs(imag(p.First)) != math.Abs(imag(p.Second)) {
			cross++
			if p.Steered < 0.99 {
				t.Errorf("separate inputs steer both modes, not %v", p.Steered)
			}
		} else if p.Steered > 1e-6 {
			t.Errorf("one oscillator with one input is lost, not %v", p.Steered)
		}
	}
	if cross == 0 || len(pairs) != cross+2 {
		t.Errorf("pairs: %+v", pairs)
	}
}

func TestSamplingRefusesBadArguments(t *testing.T) {
	a, b := mat.NewDense(2, 2, nil), mat.NewDense(2, 1, nil)
	for name, call := range map[string]func() error{
		"T = 0":        func() error { _, _, _, err := Hold(a, b, 0); return err },
		"T < 0":        func() error { _, _, _, err := Hold(a, b, -1); return err },
		"T = NaN":      func() error { _, _, _, err := Hold(a, b, math.NaN()); return err },
		"T = Inf":      func() error { _, _, _, err := Hold(a, b, math.Inf(1)); return err },
		"rows of B":    func() error { _, _, _, err := Hold(a, mat.NewDense(3, 1, nil), 1); return err },
		"A not square": func() error { _, _, _, err := Hold(mat.NewDense(2, 3, nil), b, 1); return err },
		"NaN in B":     func() error { _, _, _, err := Hold(a, mat.NewDense(2, 1, []float64{0, math.NaN()}), 1); return err },
		"overflow": func() error {
			_, _, _, err := Hold(mat.NewDense(1, 1, []float64{800}), mat.NewDense(1, 1, []float64{1}), 1)
			return err
		},
		"exact above Nyquist": func() error {
			_, _, _, _, _, err := Bilinear(a, b, mat.NewDense(1, 2, nil), nil, 1, 4)
			return err
		},
		"delay < 0": func() error {
			_, _, _, _, _, err := DelayedHold(a, b, mat.NewDense(1, 2, nil), mat.NewDense(1, 1, nil), 1, -1)
			return err
		},
		"long delay": func() error {
			_, _, _, _, _, err := DelayedHold(a, b, mat.NewDense(1, 2, nil), mat.NewDense(1, 1, nil), 1, 1e9)
			return err
		},
	} {
		if call() == nil {
			t.Errorf("%s: accepted", name)
		}
	}
}
