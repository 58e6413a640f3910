package numeric

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// hardExponentials are published test matrices for exponentials; the entries
// are quoted from memory, the truth is computed here from those entries.
func hardExponentials() map[string]*mat.Dense {
	forsythe := mat.NewDense(10, 10, nil)
	for i := range 9 {
		forsythe.Set(i, i+1, 1)
	}
	forsythe.Set(9, 0, 1e-10)
	return map[string]*mat.Dense{
		// R. C. Ward, SIAM J. Numer. Anal. 14, 1977, tests 1 to 4.
		"Ward 1": mat.NewDense(3, 3, []float64{4, 2, 0, 1, 4, 1, 1, 1, 4}),
		"Ward 2": mat.NewDense(3, 3, []float64{29.87942128909879, 0.7815750847907159, -2.289519314033932,
			0.7815750847907159, 25.72656945571064, 8.680737820540137, -2.289519314033932, 8.680737820540137, 34.39400925519054}),
		"Ward 3": mat.NewDense(3, 3, []float64{-131, 19, 18, -390, 56, 54, -387, 57, 52}),
		"Ward 4": forsythe,
		// C. Moler, C. Van Loan, SIAM Review 45, 2003: Taylor's failure.
		"Moler and Van Loan": mat.NewDense(2, 2, []float64{-49, 24, -64, 31}),
		// T. C. Fung, Int. J. Numer. Meth. Eng. 59, 2004 style: one huge coupling.
		"huge coupling": mat.NewDense(2, 2, []float64{1, 1e8, 0, -1}),
		// C. S. Kenney, A. J. Laub, SIAM J. Matrix Anal. Appl. 19, 1998.
		"Kenney and Laub": mat.NewDense(4, 4, []float64{0, 30, 1, 1, -100, 0, 1, 1, 0, 0, 0, -6, 0, 0, 500, 0}),
		// L. Dieci, A. Papini, SIAM J. Matrix Anal. Appl. 22, 2000 style.
		"Dieci and Papini":     mat.NewDense(2, 2, []float64{0, 1e6, 0, 1e-6}),
		"nilpotent, far apart": mat.NewDense(4, 4, []float64{0, 1e26, 0, 0, 0, 0, 1e-26, 0, 0, 0, 0, 1e13, 0, 0, 0, 0}),
		"non-normal":           mat.NewDense(3, 3, []float64{-1, 1e6, 0, 0, -2, 1e6, 1e-9, 0, -3}),
		"stiff":                mat.NewDense(3, 3, []float64{-1e5, 3, 1, 2, -1, 4, 1, 1, -1000}),
	}
}

func TestExponentialOfPublishedMatrices(t *testing.T) {
	for name, a := range hardExponentials() {
		t.Run(name, func(t *testing.T) {
			e, certificate, err := Exponential(a)
			if err != nil {
				t.Fatal(err)
			}
			wrong := errorAgainst(e, bigOf(a).exponential())
			t.Logf("error %.1e, claimed digits %.2f, condition %.1e (%s)", wrong, certificate.Digits, certificate.Condition, certificate.Method)
			requireHonest(t, name, certificate.Digits, wrong)
			if bound := 20 * unitRoundoff * math.Max(certificate.Condition, 1); wrong > bound {
				t.Errorf("error %.2e, above %.2e", wrong, bound)
			}
		})
	}
}

// gradedProblem draws a random matrix of one of several shapes and conditionings.
func gradedProblem(random *rand.Rand, n int) *mat.Dense {
	a := mat.NewDense(n, n, nil)
	kind := random.IntN(6)
	size := math.Pow(10, 4*random.Float64()-2)
	for i := range n {
		for j := range n {
			v := random.NormFloat64() * size
			switch kind {
			case 1: // badly scaled states
				v *= math.Pow(10, 3*float64(i-j)/float64(n))
			case 2: // triangular, far from normal
				if i > j {
					v = 0
				} else if i < j {
					v *= 1e3
				}
			case 3: // stiff
				if i == j {
					v = -math.Abs(v) * math.Pow(10, 4*random.Float64())
				}
			case 4: // nearly reducible
				if i > j {
					v *= 1e-8
				}
			case 5: // sparse
				if random.IntN(3) > 0 {
					v = 0
				}
			}
			a.Set(i, j, v)
		}
	}
	if kind == 3 || random.IntN(2) == 0 { // keep most results inside binary64
		for i := range n {
			a.Set(i, i, a.At(i, i)-2*size)
		}
	}
	return a
}

func TestExponentialClaimsNoDigitsItHasNot(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 20))
	tried, modest := 0, 0
	for trial := range 260 {
		a := gradedProblem(random, 1+random.IntN(6))
		e, certificate, err := Exponential(a)
		if err != nil {
			if !strings.Contains(err.Error(), "overflow") {
				t.Fatal(err)
			}
			continue
		}
		if e.At(0, 0) == 0 && mat.Max(e) == 0 {
			if certificate.Digits != 0 {
				t.Errorf("an exponential that underflows claims %v digits", certificate.Digits)
			}
			continue
		}
		tried++
		wrong := errorAgainst(e, bigOf(a).exponential())
		requireHonest(t, "random", certificate.Digits, wrong)
		if t.Failed() {
			t.Fatalf("trial %d: error %.1e, %+v\n%v", trial, wrong, certificate, mat.Formatted(a))
		}
		if -math.Log10(math.Max(wrong, 1e-16)) > certificate.Digits+4 {
			modest++
		}
	}
	t.Logf("%d matrices, %d claimed more than four digits too few", tried, modest)
	if tried < 200 || modest > tried/4 {
		t.Errorf("%d tried, %d with far too modest claims", tried, modest)
	}
}
