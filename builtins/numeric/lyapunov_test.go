package numeric

import (
	"context"
	"errors"
	"math"
	"math/rand"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// lyapunovResidual is ‖A·X + X·Aᵀ + Q‖ (or the sampled form), relative.
func lyapunovResidual(a, q, x *mat.Dense, sampled bool) float64 {
	var r, s mat.Dense
	r.Mul(a, x)
	if sampled {
		r.Mul(&r, a.T())
		r.Sub(&r, x)
	} else {
		s.CloneFrom(r.T())
		r.Add(&r, &s)
	}
	r.Add(&r, q)
	return peakEntry(&r) / (peakEntry(q) + peakEntry(a)*peakEntry(x))
}

func TestLyapunovIdentity(t *testing.T) {
	r := rand.New(rand.NewSource(4))
	for _, sampled := range []bool{false, true} {
		for _, n := range []int{1, 2, 3, 4, 5, 7, 11, 23, 24, 25, 26, 49, 50, 51, 77, 120} {
			a, q := normalMatrix(r, n, n), normalMatrix(r, n, n)
			q.Add(q, mat.DenseCopyOf(q.T()))
			got, err := Lyapunov(context.Background(), a, q, sampled)
			if err != nil {
				t.Fatal(n, sampled, err)
			}
			if e := lyapunovResidual(a, q, got.X, sampled); e > 1e-14*float64(n) {
				t.Errorf("n %d sampled %v: residual %g (%+v)", n, sampled, e, got.Certificate)
			}
		}
	}
}

func TestLyapunovRefusals(t *testing.T) {
	identity := mat.NewDense(2, 2, []float64{1, 0, 0, 1})
	cases := map[string]struct {
		a       []float64
		sampled bool
	}{
		"integrator":        {[]float64{-1, 0, 0, 0}, false},
		"double integrator": {[]float64{3, -1, 9, -3}, false},
		"oscillator":        {[]float64{0, 2, -2, 0}, false},
		"mirror images":     {[]float64{0.3, 0, 0, -0.3}, false},
		"on the circle":     {[]float64{0.6, 0.8, -0.8, 0.6}, true},
		"reciprocal":        {[]float64{4, 0, 1, 0.25}, true},
	}
	for name, c := range cases {
		_, err := Lyapunov(context.Background(), mat.NewDense(2, 2, c.a), identity, c.sampled)
		var refusal *Refusal
		if !errors.As(err, &refusal) || len(refusal.Modes) == 0 {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := Lyapunov(context.Background(), identity, mat.NewDense(2, 2, []float64{1, 2, 3, 4}), false); err == nil {
		t.Error("an asymmetric Q was accepted")
	}
	if _, err := Lyapunov(context.Background(), identity, mat.NewDense(2, 2, []float64{1, 0, 0, math.NaN()}), false); err == nil {
		t.Error("NaN was accepted")
	}
}
