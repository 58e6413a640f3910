package numeric

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// integralTruth is ∫₀ᵀ e^(Fᵀt)·W·e^(Ft)dt from Van Loan's block exponential, whose
// cancellation 2000 bits cover.
func integralTruth(f, w bigMatrix, period float64) bigMatrix {
	n := f.rows
	block := newBig(2*n, 2*n)
	block.put(0, 0, f.transposed().scaled(bigFloat(-1)))
	block.put(0, n, w)
	block.put(n, n, f)
	e := block.scaled(bigFloat(period)).exponential()
	return e.block(n, 2*n, n, 2*n).transposed().times(e.block(0, n, n, 2*n))
}

func gramOf(random *rand.Rand, n int, size float64) *mat.Dense {
	g := randomDense(random, n, n, size)
	w := mat.NewDense(n, n, nil)
	w.Mul(g, g.T())
	for i := range n {
		for j := range i {
			w.Set(i, j, w.At(j, i))
		}
	}
	return w
}

func TestSampledWeightsClaimNoDigitsTheyHaveNot(t *testing.T) {
	random := rand.New(rand.NewPCG(11, 4))
	tried := 0
	for trial := range 220 {
		n, m := 1+random.IntN(4), 1+random.IntN(2)
		a, b := gradedProblem(random, n), randomDense(random, n, m, math.Pow(10, 4*random.Float64()-2))
		q, r, cross := gramOf(random, n, 1), gramOf(random, m, 10), randomDense(random, n, m, 0.1)
		period := math.Pow(10, -7*random.Float64())
		if mat.Norm(a, 1)*period > 400 { // the truth's own cancellation, e^(2·400), needs its bits
			period = 400 / mat.Norm(a, 1)
		}
		qd, nd, rd, certificate, err := VanLoanCost(a, b, q, cross, r, period)
		if err != nil {
			if strings.Contains(err.Error(), "overflow") {
				continue
			}
			t.Fatal(err)
		}
		tried++
		f, w := newBig(n+m, n+m), newBig(n+m, n+m)
		f.put(0, 0, bigOf(a))
		f.put(0, n, bigOf(b))
		w.put(0, 0, bigOf(q))
		w.put(0, n, bigOf(cross))
		w.put(n, 0, bigOf(cross).transposed())
		w.put(n, n, bigOf(r))
		truth := integralTruth(f, w, period)
		wrong := math.Max(errorAgainst(qd, truth.block(0, n, 0, n)), math.Max(
			errorAgainst(nd, truth.block(0, n, n, n+m)), errorAgainst(rd, truth.block(n, n+m, n, n+m))))
		requireHonest(t, "cost", certificate.Digits, wrong)

		intensity := gramOf(random, n, 1)
		wd, certificate, err := VanLoanNoise(a, intensity, period)
		if err != nil {
			t.Fatal(err)
		}
		truth = integralTruth(bigOf(a).transposed(), bigOf(intensity), period)
		requireHonest(t, "noise", certificate.Digits, errorAgainst(wd, truth))
		if t.Failed() {
			t.Fatalf("trial %d: T = %g, %+v\n%v", trial, period, certificate, mat.Formatted(a))
		}
	}
	if tried < 150 {
		t.Errorf("only %d problems tried", tried)
	}
}

// For white acceleration W_d = q·[[T³/3, T²/2], [T²/2, T]] (C. Van Loan 1978, closed
// form): each entry must be right for any T.
func TestSampledNoiseIsRightForTinyT(t *testing.T) {
	a, w := mat.NewDense(2, 2, []float64{0, 1, 0, 0}), mat.NewDense(2, 2, []float64{0, 0, 0, 3})
	for _, period := range []float64{1e-9, 1e-4, 0.5, 7, 1e5} {
		wd, _, err := VanLoanNoise(a, w, period)
		if err != nil {
			t.Fatal(err)
		}
		want := []float64{period * period * period, 1.5 * period * period, 1.5 * period * period, 3 * period}
		for i, v := range want {
			if got := wd.At(i/2, i%2); math.Abs(got-v) > 1e-14*v {
				t.Errorf("T = %g: entry %d is %v, not %v", period, i, got, v)
			}
		}
	}
}
