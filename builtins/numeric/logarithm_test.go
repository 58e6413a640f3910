package numeric

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func TestContinuousClaimsNoDigitsItHasNot(t *testing.T) {
	random := rand.New(rand.NewPCG(21, 22))
	tried := 0
	for trial := 0; tried < 60; trial++ {
		n := 1 + random.IntN(4)
		a, b := gradedProblem(random, n), randomDense(random, n, 1, 1)
		w, err := Eigenvalues(a)
		if err != nil {
			t.Fatal(err)
		}
		fastest := 0.0
		for _, lambda := range w {
			fastest = math.Max(fastest, math.Hypot(real(lambda), imag(lambda)))
		}
		if fastest == 0 {
			continue
		}
		period := 3 * math.Pow(10, -5*random.Float64()) / fastest
		ad, bd, _, err := Hold(a, b, period)
		if err != nil {
			t.Fatal(err)
		}
		gotA, gotB, certificate, err := Continuous(ad, bd, period)
		if err != nil {
			var refusal *Refusal
			if errors.As(err, &refusal) {
				continue
			}
			t.Fatal(err)
		}
		tried++
		logarithm := bigOf(ad).logarithm()
		inverse := bigFloat(period)
		inverse.Quo(bigFloat(1), inverse)
		wrong := errorAgainst(gotA, logarithm.scaled(inverse))
		requireHonest(t, "logarithm", certificate.Digits, wrong)
		block := newBig(n+n, n+n)
		block.put(0, 0, logarithm)
		block.put(0, n, bigIdentity(n).scaled(bigFloat(period)))
		integral := block.exponential().block(0, n, n, 2*n)
		wrongB := errorAgainst(gotB, integral.inverse().times(bigOf(bd)))
		requireHonest(t, "input matrix", certificate.Digits, wrongB)
		if t.Failed() {
			t.Fatalf("trial %d: T = %g, error %.1e and %.1e, %+v\n%v", trial, period, wrong, wrongB, certificate, mat.Formatted(ad))
		}
	}
}

func TestContinuousInvertsTheHoldOfCommonPlants(t *testing.T) {
	for name, a := range map[string]*mat.Dense{
		"double integrator": mat.NewDense(2, 2, []float64{0, 1, 0, 0}),
		"motor":             mat.NewDense(2, 2, []float64{0, 1, 0, -2}),
		"oscillator":        mat.NewDense(2, 2, []float64{0, 1, -4, -0.1}),
		"four states":       mat.NewDense(4, 4, []float64{0, 1, 0, 0, 0, -0.08, 2.9, 0, 0, 0, 0, 1, 0, 0.013, -2.1, 0}),
	} {
		n, _ := a.Dims()
		b := mat.NewDense(n, 1, nil)
		b.Set(n-1, 0, 1)
		ad, bd, _, err := Hold(a, b, 0.1)
		if err != nil {
			t.Fatal(err)
		}
		gotA, gotB, certificate, err := Continuous(ad, bd, 0.1)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if !mat.EqualApprox(a, gotA, 1e-12) || !mat.EqualApprox(b, gotB, 1e-12) || certificate.Digits < 11 {
			t.Errorf("%s: %v %v %+v", name, mat.Formatted(gotA), mat.Formatted(gotB), certificate)
		}
	}
}

func TestContinuousRefuses(t *testing.T) {
	for name, tc := range map[string]struct {
		ad   *mat.Dense
		mode complex128
	}{
		"deadbeat":                      {mat.NewDense(2, 2, []float64{0, 1, 0, 0.5}), 0},
		"negative pole":                 {mat.NewDense(2, 2, []float64{0.5, 1, 0, -0.25}), -0.25},
		"oscillator sampled at its own": {mat.NewDense(2, 2, []float64{-1, 0, 0, -1}), -1},
	} {
		_, _, _, err := Continuous(tc.ad, mat.NewDense(2, 1, []float64{1, 0}), 1)
		var refusal *Refusal
		if !errors.As(err, &refusal) || len(refusal.Modes) == 0 || refusal.Modes[0] != tc.mode {
			t.Errorf("%s: %v", name, err)
		}
	}
}
