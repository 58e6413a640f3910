package numeric

import (
	"errors"
	"math"
	"math/big"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// responseTruth evaluates C·(sI − A)⁻¹·B + D through the real system of twice the
// order, as real and imaginary parts.
func responseTruth(a, b, c, d *mat.Dense, s complex128) (re, im bigMatrix) {
	n, m := b.Dims()
	system, right := newBig(2*n, 2*n), newBig(2*n, m)
	minus := bigOf(a).scaled(bigFloat(-1))
	diagonal := minus.plus(bigIdentity(n).scaled(bigFloat(real(s))))
	turn := bigIdentity(n).scaled(bigFloat(imag(s)))
	system.put(0, 0, diagonal)
	system.put(n, n, diagonal)
	system.put(0, n, turn.scaled(bigFloat(-1)))
	system.put(n, 0, turn)
	right.put(0, 0, bigOf(b))
	x := system.inverse().times(right)
	re = bigOf(c).times(x.block(0, n, 0, m)).plus(bigOf(d))
	im = bigOf(c).times(x.block(n, 2*n, 0, m))
	return re, im
}

func responseError(got *mat.CDense, re, im bigMatrix) float64 {
	worst, largest := 0.0, 0.0
	for i, r := range re.entry {
		g := got.At(i/re.columns, i%re.columns)
		dr, _ := new(big.Float).Sub(bigFloat(real(g)), r).Float64()
		di, _ := new(big.Float).Sub(bigFloat(imag(g)), im.entry[i]).Float64()
		tr, _ := r.Float64()
		ti, _ := im.entry[i].Float64()
		worst, largest = math.Max(worst, math.Hypot(dr, di)), math.Max(largest, math.Hypot(tr, ti))
	}
	return worst / largest
}

func TestFrequencyResponseClaimsNoDigitsItHasNot(t *testing.T) {
	random := rand.New(rand.NewPCG(31, 1))
	for trial := range 250 {
		n, m, p := 1+random.IntN(5), 1+random.IntN(3), 1+random.IntN(3)
		a, b, c, d := gradedProblem(random, n), randomDense(random, n, m, 1), randomDense(random, p, n, 1), randomDense(random, p, m, 1e-3)
		response, err := NewFrequencyResponse(a, b, c, d)
		if err != nil {
			t.Fatal(err)
		}
		s := complex(0, math.Pow(10, 6*random.Float64()-3))
		if trial%5 == 0 { // close to a pole
			w, _ := Eigenvalues(a)
			if w[0] == 0 {
				continue
			}
			s = w[0] * complex(1+1e-7, 1e-9)
		}
		got, err := response.At(s)
		if err != nil {
			t.Fatal(err)
		}
		certificate, err := response.Certify(s)
		if err != nil {
			t.Fatal(err)
		}
		re, im := responseTruth(a, b, c, d, s)
		requireHonest(t, "response", certificate.Digits, responseError(got, re, im))
		if certificate.Residual > 1e-14 {
			t.Errorf("residual %.1e", certificate.Residual)
		}
		if t.Failed() {
			t.Fatalf("trial %d, s = %v: %+v\n%v", trial, s, certificate, mat.Formatted(a))
		}
	}
}

func TestFrequencyResponseAtPoles(t *testing.T) {
	// 1/s² from the first input, 1/(s + 1) from the second, both to both outputs' own.
	a := mat.NewDense(3, 3, []float64{0, 1, 0, 0, 0, 0, 0, 0, -1})
	b := mat.NewDense(3, 2, []float64{0, 0, 1, 0, 0, 1})
	c := mat.NewDense(2, 3, []float64{1, 0, 0, 0, 0, 1})
	response, err := NewFrequencyResponse(a, b, c, nil)
	if err != nil {
		t.Fatal(err)
	}
	g, err := response.At(0)
	if !errors.Is(err, ErrAtPole) || !cmplx.IsInf(g.At(0, 0)) || cmplx.IsInf(g.At(1, 1)) || cmplx.Abs(g.At(1, 1)-1) > 1e-5 {
		t.Errorf("at 0: %v %v", g, err)
	}
	oscillator, err := NewFrequencyResponse(mat.NewDense(2, 2, []float64{0, 1, -4, 0}), mat.NewDense(2, 1, []float64{0, 1}), mat.NewDense(1, 2, []float64{1, 0}), nil)
	if err != nil {
		t.Fatal(err)
	}
	if g, err := oscillator.At(2i); !errors.Is(err, ErrAtPole) || !cmplx.IsInf(g.At(0, 0)) {
		t.Errorf("at 2i: %v %v", g, err)
	}
	if g, err := oscillator.At(1i); err != nil || cmplx.Abs(g.At(0, 0)-complex(1.0/3, 0)) > 1e-15 {
		t.Errorf("at i: %v %v", g, err)
	}
	if _, err := oscillator.At(cmplx.Inf()); err == nil {
		t.Error("a point at infinity is accepted")
	}
}

// A fast pole at 1e9 must not make points between slow poles look singular.
func TestFrequencyResponseOfFarApartPoles(t *testing.T) {
	a := mat.NewDense(3, 3, []float64{-1e9, 1, 2, 3, -1e-7, 1e-7, 1, 2e-8, -1e-6})
	b, c, d := mat.NewDense(3, 1, []float64{1, 1, 1}), mat.NewDense(1, 3, []float64{1, 1, 1}), mat.NewDense(1, 1, nil)
	response, err := NewFrequencyResponse(a, b, c, d)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range []float64{1e-9, 1e-8, 1e-7, 1, 1e9} {
		g, err := response.At(complex(0, w))
		if err != nil {
			t.Fatal(err)
		}
		re, im := responseTruth(a, b, c, d, complex(0, w))
		if wrong := responseError(g, re, im); wrong > 1e-12 {
			t.Errorf("ω = %g: off by %.1e", w, wrong)
		}
	}
}

func TestFrequencyResponseAllocatesNothing(t *testing.T) {
	n := 12
	response, err := NewFrequencyResponse(benchMatrix(n), randomDense(rand.New(rand.NewPCG(1, 1)), n, 2, 1), randomDense(rand.New(rand.NewPCG(1, 2)), 2, n, 1), nil)
	if err != nil {
		t.Fatal(err)
	}
	dst := mat.NewCDense(2, 2, nil)
	if count := testing.AllocsPerRun(20, func() { _ = response.AtInto(dst, 2i) }); count > 0 {
		t.Errorf("%v allocations a point", count)
	}
}

func BenchmarkSweep500(b *testing.B) {
	for _, n := range benchOrders {
		random := rand.New(rand.NewPCG(3, uint64(n)))
		a, in, out := benchMatrix(n), randomDense(random, n, 2, 1), randomDense(random, 2, n, 1)
		b.Run("n="+big.NewInt(int64(n)).String(), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				response, err := NewFrequencyResponse(a, in, out, nil)
				if err != nil {
					b.Fatal(err)
				}
				dst := mat.NewCDense(2, 2, nil)
				for k := range 500 {
					if err := response.AtInto(dst, complex(0, math.Pow(10, float64(k)/100-2))); err != nil {
						b.Fatal(err)
					}
				}
			}
		})
	}
}
