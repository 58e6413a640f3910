package numeric

import (
	"context"
	"errors"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// stableProblem draws a stable plant matrix: a graded one, shifted or shrunk
// until every mode decays, some of them slowly.
func stableProblem(random *rand.Rand, n int, sampled bool) *mat.Dense {
	for {
		a := gradedProblem(random, n)
		w, err := Eigenvalues(a)
		if err != nil {
			continue
		}
		edge, size := math.Inf(-1), 0.0
		for _, lambda := range w {
			edge = math.Max(edge, real(lambda))
			size = math.Max(size, math.Hypot(real(lambda), imag(lambda)))
		}
		if size == 0 {
			continue
		}
		margin := math.Pow(10, -5*random.Float64())
		if sampled {
			a.Scale((1-margin)/size, a)
			return a
		}
		for i := range n {
			a.Set(i, i, a.At(i, i)-edge-margin*size)
		}
		return a
	}
}

func bigSquare(b *mat.Dense) bigMatrix { return bigOf(b).times(bigOf(b).transposed()) }

func TestGramiansAndNoiseGainClaimNoDigitsTheyHaveNot(t *testing.T) {
	random := rand.New(rand.NewPCG(41, 1))
	ctx := context.Background()
	for trial := range 200 {
		n, m, p := 1+random.IntN(3), 1+random.IntN(2), 1+random.IntN(2)
		sampled := trial%2 == 1
		a := stableProblem(random, n, sampled)
		b, c := randomDense(random, n, m, 1), randomDense(random, p, n, 1)
		w, certificate, err := ReachabilityGramian(ctx, a, b, sampled)
		if err != nil {
			var refusal *Refusal
			if errors.As(err, &refusal) {
				continue // rounding of the shift
			}
			t.Fatal(err)
		}
		truth := bigOf(a).lyapunov(bigSquare(b), sampled)
		requireHonest(t, "reachability gramian", certificate.Digits, errorAgainst(w, truth))
		seen, certificate, err := ObservabilityGramian(ctx, a, c, sampled)
		if err != nil {
			t.Fatal(err)
		}
		dual := bigOf(a).transposed().lyapunov(bigSquare(transposedCopy(c)), sampled)
		requireHonest(t, "observability gramian", certificate.Digits, errorAgainst(seen, dual))
		gain, certificate, err := NoiseGain(ctx, a, b, c, nil, sampled)
		if err != nil {
			t.Fatal(err)
		}
		power, whole := bigOf(c).times(truth).times(bigOf(c).transposed()), bigFloat(0)
		for i := range p {
			whole.Add(whole, power.entry[i*p+i])
		}
		whole.Sqrt(whole)
		wrong, _ := new(big.Float).Quo(new(big.Float).Sub(bigFloat(gain), whole), whole).Float64()
		requireHonest(t, "noise gain", certificate.Digits, math.Abs(wrong))
		if t.Failed() {
			t.Fatalf("trial %d, sampled %v: %+v\n%v", trial, sampled, certificate, mat.Formatted(a))
		}
	}
}

func TestHankelSingularValuesClaimNoDigitsTheyHaveNot(t *testing.T) {
	random := rand.New(rand.NewPCG(43, 1))
	ctx := context.Background()
	for trial := range 120 {
		n := 1 + random.IntN(4)
		sampled := trial%2 == 1
		a := stableProblem(random, n, sampled)
		b, c := randomDense(random, n, 1, 1), randomDense(random, 1, n, 1)
		h, err := HankelSingularValues(ctx, a, b, c, sampled)
		if err != nil {
			var refusal *Refusal
			if errors.As(err, &refusal) {
				continue
			}
			t.Fatal(err)
		}
		reach := bigOf(a).lyapunov(bigSquare(b), sampled)
		see := bigOf(a).transposed().lyapunov(bigSquare(transposedCopy(c)), sampled)
		squares := reach.times(see).positiveRoots()
		for i, v := range h.Values {
			truth := new(big.Float).Sqrt(new(big.Float).Abs(squares[n-1-i]))
			if truth.Sign() == 0 {
				continue
			}
			wrong, _ := new(big.Float).Quo(new(big.Float).Sub(bigFloat(v), truth), truth).Float64()
			requireHonest(t, "Hankel value", h.Digits[i], math.Abs(wrong))
		}
		if t.Failed() {
			t.Fatalf("trial %d, sampled %v: %v %v\n%v", trial, sampled, h.Values, h.Digits, mat.Formatted(a))
		}
	}
}

func TestGramiansRefuseModesThatDoNotDecay(t *testing.T) {
	ctx := context.Background()
	b := mat.NewDense(2, 1, []float64{0, 1})
	for name, tc := range map[string]struct {
		a       *mat.Dense
		sampled bool
		mode    complex128
	}{
		"unstable":           {mat.NewDense(2, 2, []float64{-1, 1, 0, 0.5}), false, 0.5},
		"integrator":         {mat.NewDense(2, 2, []float64{0, 1, 0, -1}), false, 0},
		"sampled integrator": {mat.NewDense(2, 2, []float64{1, 1, 0, 0.5}), true, 1},
	} {
		_, _, err := ReachabilityGramian(ctx, tc.a, b, tc.sampled)
		var refusal *Refusal
		if !errors.As(err, &refusal) || len(refusal.Modes) != 1 || refusal.Modes[0] != tc.mode {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestGramianOfLargeOrder(t *testing.T) {
	n := 60
	a := benchMatrix(n)
	for i := range n {
		a.Set(i, i, a.At(i, i)-6)
	}
	b := randomDense(rand.New(rand.NewPCG(1, 9)), n, 2, 1)
	w, certificate, err := ReachabilityGramian(context.Background(), a, b, false)
	if err != nil {
		t.Fatal(err)
	}
	var residual, square mat.Dense
	residual.Mul(a, w)
	residual.Add(&residual, residual.T())
	square.Mul(b, b.T())
	residual.Add(&residual, &square)
	if relative := mat.Norm(&residual, 2) / mat.Norm(&square, 2); relative > 1e-13 || certificate.Digits < 11 {
		t.Errorf("residual %.1e, %+v", relative, certificate)
	}
	cancelled, cancel := context.WithCancel(context.Background())
	cancel()
	if _, _, err := ReachabilityGramian(cancelled, a, b, false); !errors.Is(err, context.Canceled) {
		t.Errorf("a cancelled computation returns %v", err)
	}
}
