package numeric

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// Resonance of ω²/(s² + 2ζω·s + ω²): the peak is 1/(2ζ√(1−ζ²)) at ω√(1−2ζ²)
// (any text on second-order systems).
func TestLargestGainOfResonances(t *testing.T) {
	for _, zeta := range []float64{0.5, 0.1, 1e-2, 1e-4, 1e-6} {
		for _, omega := range []float64{1e-3, 1, 1e4} {
			a := mat.NewDense(2, 2, []float64{0, 1, -omega * omega, -2 * zeta * omega})
			b, c := mat.NewDense(2, 1, []float64{0, omega * omega}), mat.NewDense(1, 2, []float64{1, 0})
			peak, err := LargestGain(context.Background(), a, b, c, nil, 0)
			if err != nil {
				t.Fatal(err)
			}
			want := 1 / (2 * zeta * math.Sqrt(1-zeta*zeta))
			at := omega * math.Sqrt(1-2*zeta*zeta)
			wrong := math.Abs(peak.Low-want) / want
			if want > peak.High*(1+1e-9) || wrong > 1e-9 || math.Abs(peak.Frequency-at) > 1e-6*at {
				t.Errorf("ζ = %g, ω = %g: [%v, %v] at %v, not %v at %v", zeta, omega, peak.Low, peak.High, peak.Frequency, want, at)
			}
			requireHonest(t, "largest gain", peak.Certificate.Digits, wrong)
		}
	}
}

func TestLargestGainOfPlainPlants(t *testing.T) {
	ctx := context.Background()
	one := func(v float64) *mat.Dense { return mat.NewDense(1, 1, []float64{v}) }
	for name, tc := range map[string]struct {
		a, b, c, d *mat.Dense
		period     float64
		gain, at   float64
	}{
		"lag, largest at rest":        {one(-2), one(3), one(1), nil, 0, 1.5, 0},
		"lead, largest at infinity":   {one(-2), one(1), one(-1), one(1), 0, 1, math.Inf(1)},
		"all-pass":                    {one(-1), one(1), one(-2), one(1), 0, 1, math.NaN()},
		"nothing moved":               {one(-1), one(0), one(1), nil, 0, 0, math.NaN()},
		"constant":                    {nil, nil, nil, mat.NewDense(2, 2, []float64{3, 0, 0, -4}), 0, 4, 0},
		"sampled lag":                 {one(0.5), one(1), one(1), nil, 0.1, 2, 0},
		"sampled, largest at Nyquist": {one(-0.5), one(1), one(1), nil, 0.1, 2, math.Pi / 0.1},
	} {
		peak, err := LargestGain(ctx, tc.a, tc.b, tc.c, tc.d, tc.period)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if math.Abs(peak.Low-tc.gain) > 1e-9*math.Max(tc.gain, 1) || peak.High < tc.gain*(1-1e-15) {
			t.Errorf("%s: [%v, %v], not %v", name, peak.Low, peak.High, tc.gain)
		}
		if !math.IsNaN(tc.at) && peak.Frequency != tc.at && math.Abs(peak.Frequency-tc.at) > 1e-9 {
			t.Errorf("%s: at %v, not %v", name, peak.Frequency, tc.at)
		}
	}
	var refusal *Refusal
	if _, err := LargestGain(ctx, one(1), one(1), one(1), nil, 0); !errors.As(err, &refusal) || refusal.Modes[0] != 1 {
		t.Errorf("an unstable plant: %v", err)
	}
	if _, err := LargestGain(ctx, one(0), one(1), one(1), nil, 0); !errors.As(err, &refusal) {
		t.Errorf("an integrator: %v", err)
	}
}

// No point of a dense sweep may pass the bracket, and one must nearly reach it.
func TestLargestGainBoundsASweep(t *testing.T) {
	random := rand.New(rand.NewPCG(61, 1))
	for trial := range 60 {
		n := 1 + random.IntN(8)
		sampled := trial%2 == 1
		a := stableProblem(random, n, sampled)
		b, c, d := randomDense(random, n, 2, 1), randomDense(random, 2, n, 1), randomDense(random, 2, 2, 0.1)
		period := 0.0
		if sampled {
			period = 0.5
		}
		peak, err := LargestGain(context.Background(), a, b, c, d, period)
		if err != nil {
			var refusal *Refusal
			if errors.As(err, &refusal) {
				continue
			}
			t.Fatal(err)
		}
		search, err := newGainSearch(a, b, c, d, period)
		if err != nil {
			t.Fatal(err)
		}
		for k := range 3000 {
			w := math.Pow(10, float64(k)/250-6)
			if g := search.gain(w); g > peak.High*(1+1e-9) {
				t.Fatalf("trial %d: gain %v at %v passes the bracket [%v, %v]", trial, g, w, peak.Low, peak.High)
			}
		}
		if peak.High > peak.Low*(1+1e-9) {
			t.Errorf("trial %d: the bracket [%v, %v] is wide", trial, peak.Low, peak.High)
		}
	}
}

// The H₂ norm of b/(s + a) is b/√(2a); sampled b/(z − a): b/√(1 − a²).
func TestNoiseGainOfFirstOrder(t *testing.T) {
	ctx := context.Background()
	one := func(v float64) *mat.Dense { return mat.NewDense(1, 1, []float64{v}) }
	gain, _, err := NoiseGain(ctx, one(-2), one(3), one(1), nil, false)
	if err != nil || math.Abs(gain-1.5) > 1e-15 {
		t.Errorf("%v %v", gain, err)
	}
	gain, _, err = NoiseGain(ctx, one(0.6), one(4), one(1), one(12), true)
	if err != nil || math.Abs(gain-13) > 1e-14 {
		t.Errorf("%v %v", gain, err)
	}
	gain, _, err = NoiseGain(ctx, one(-2), one(3), one(1), one(1), false)
	if err != nil || !math.IsInf(gain, 1) {
		t.Errorf("%v %v", gain, err)
	}
}
