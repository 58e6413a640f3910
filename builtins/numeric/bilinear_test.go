package numeric

import (
	"errors"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func TestBilinearIsTheSubstitution(t *testing.T) {
	random := rand.New(rand.NewPCG(71, 1))
	for trial := range 40 {
		n, m, p := 1+random.IntN(4), 1+random.IntN(2), 1+random.IntN(2)
		a, b := gradedProblem(random, n), randomDense(random, n, m, 1)
		c, d := randomDense(random, p, n, 1), randomDense(random, p, m, 1)
		period := math.Pow(10, -4*random.Float64()) / math.Max(mat.Norm(a, 1), 1e-3)
		exactAt, alpha := 0.0, 2/period
		if trial%2 == 1 {
			exactAt = 0.3 / period
			alpha = exactAt / math.Tan(exactAt*period/2)
		}
		ad, bd, cd, dd, certificate, err := Bilinear(a, b, c, d, period, exactAt)
		if err != nil {
			t.Fatal(err)
		}
		z := cmplx.Exp(complex(0.1, 0.7))
		continuous, _ := NewFrequencyResponse(a, b, c, d)
		sampled, _ := NewFrequencyResponse(ad, bd, cd, dd)
		g, err := continuous.At(complex(alpha, 0) * (z - 1) / (z + 1))
		if err != nil {
			t.Fatal(err)
		}
		h, err := sampled.At(z)
		if err != nil {
			t.Fatal(err)
		}
		largest, worst := 0.0, 0.0
		for i := range p {
			for j := range m {
				largest = math.Max(largest, cmplx.Abs(g.At(i, j)))
				worst = math.Max(worst, cmplx.Abs(g.At(i, j)-h.At(i, j)))
			}
		}
		if worst > 1e-11*largest {
			t.Errorf("trial %d: responses differ by %.1e (%+v)", trial, worst/largest, certificate)
		}
		a2, b2, c2, d2, back, err := BilinearInverse(ad, bd, cd, dd, period, exactAt)
		if err != nil {
			t.Fatal(err)
		}
		slack := 1e3 * math.Pow(10, -back.Digits)
		for _, pair := range [][2]*mat.Dense{{a, a2}, {b, b2}, {c, c2}, {d, d2}} {
			var difference mat.Dense
			difference.Sub(pair[0], pair[1])
			if e := mat.Norm(&difference, 2) / mat.Norm(pair[0], 2); e > slack {
				t.Errorf("trial %d: the inverse is off by %.1e, %+v", trial, e, back)
			}
		}
	}
	var refusal *Refusal
	one := mat.NewDense(1, 1, []float64{1})
	if _, _, _, _, _, err := Bilinear(mat.NewDense(1, 1, []float64{4}), one, one, one, 0.5, 0); !errors.As(err, &refusal) || refusal.Modes[0] != 4 {
		t.Errorf("a pole at 2/T: %v", err)
	}
	if _, _, _, _, _, err := BilinearInverse(mat.NewDense(1, 1, []float64{-1}), one, one, one, 0.5, 0); !errors.As(err, &refusal) || refusal.Modes[0] != -1 {
		t.Errorf("a pole at -1: %v", err)
	}
}

// SciPy 1.10.1 on Debian 12, scipy.signal.cont2discrete of ([[0, 1], [-4, -0.4]],
// [[0], [1]], [[1, 0.5]], [[0.25]]) at dt = 0.2; see testdata/sampling_reference.py.
func TestSamplingAgainstReference(t *testing.T) {
	reference := samplingReference(t)
	a, b := mat.NewDense(2, 2, []float64{0, 1, -4, -0.4}), mat.NewDense(2, 1, []float64{0, 1})
	c, d := mat.NewDense(1, 2, []float64{1, 0.5}), mat.NewDense(1, 1, []float64{0.25})
	for method, call := range map[string]func() ([4]*mat.Dense, error){
		"bilinear": func() (r [4]*mat.Dense, err error) {
			r[0], r[1], r[2], r[3], _, err = Bilinear(a, b, c, d, 0.2, 0)
			return r, err
		},
		"foh": func() (r [4]*mat.Dense, err error) {
			r[0], r[1], r[2], r[3], _, err = HoldLine(a, b, c, d, 0.2)
			return r, err
		},
		"zoh": func() (r [4]*mat.Dense, err error) {
			r[0], r[1], _, err = Hold(a, b, 0.2)
			r[2], r[3] = c, d
			return r, err
		},
	} {
		got, err := call()
		if err != nil {
			t.Fatal(err)
		}
		for i, want := range reference[method] {
			if !mat.EqualApprox(got[i], want, 1e-13) {
				t.Errorf("%s, matrix %d: %v, not %v", method, i, mat.Formatted(got[i]), mat.Formatted(want))
			}
		}
	}
}
