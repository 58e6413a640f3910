package numeric

import (
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// A held input passes the delay as u(t − delay); simulating the continuous plant
// exactly between the instants at which its input changes must give the same
// outputs as the sampled plant with its delay line.
func TestDelayedHoldAgainstExactSimulation(t *testing.T) {
	a, b := mat.NewDense(2, 2, []float64{0, 1, -4, -0.4}), mat.NewDense(2, 2, []float64{0, 0.3, 1, 0})
	c, d := mat.NewDense(1, 2, []float64{1, 0.5}), mat.NewDense(1, 2, []float64{0.25, -1})
	const period = 0.2
	input := func(k int) []float64 {
		if k < 0 {
			return []float64{0, 0}
		}
		return []float64{math.Sin(float64(3*k + 1)), math.Cos(float64(5 * k))}
	}
	for _, samples := range []float64{0, 0.25, 1, 1.5, 2, 3.75} {
		delay := samples * period
		ad, bd, cd, dd, certificate, err := DelayedHold(a, b, c, d, period, delay)
		if err != nil {
			t.Fatal(err)
		}
		states := int(math.Ceil(samples))*2 + 2
		if n, _ := ad.Dims(); n != states || certificate.Digits < 14 {
			t.Errorf("%g samples: %d states, not %d; %+v", samples, n, states, certificate)
		}
		x, truth := mat.NewDense(states, 1, nil), mat.NewDense(2, 1, nil)
		for k := range 12 {
			u := mat.NewDense(2, 1, input(k))
			delayed := mat.NewDense(2, 1, input(int(math.Floor(float64(k)-samples))))
			var y, direct, want mat.Dense
			y.Mul(cd, x)
			direct.Mul(dd, u)
			y.Add(&y, &direct)
			want.Mul(c, truth)
			direct.Mul(d, delayed)
			want.Add(&want, &direct)
			if math.Abs(y.At(0, 0)-want.At(0, 0)) > 1e-13 {
				t.Errorf("%g samples, instant %d: %v, not %v", samples, k, y.At(0, 0), want.At(0, 0))
			}
			// The delayed input changes once inside the sample, after the fraction.
			fraction := samples - math.Floor(samples)
			truth = heldFor(t, a, b, truth, delayed, fraction*period)
			after := delayed
			if fraction > 0 {
				after = mat.NewDense(2, 1, input(int(math.Floor(float64(k)-samples))+1))
			}
			truth = heldFor(t, a, b, truth, after, (1-fraction)*period)
			next := mat.NewDense(states, 1, nil)
			next.Mul(ad, x)
			var moved mat.Dense
			moved.Mul(bd, u)
			next.Add(next, &moved)
			x = next
		}
	}
}

// heldFor moves x on by duration seconds with the input u held.
func heldFor(t *testing.T, a, b, x, u *mat.Dense, duration float64) *mat.Dense {
	t.Helper()
	if duration == 0 {
		return x
	}
	ad, bd, _, err := Hold(a, b, duration)
	if err != nil {
		t.Fatal(err)
	}
	next, moved := mat.NewDense(2, 1, nil), mat.NewDense(2, 1, nil)
	next.Mul(ad, x)
	moved.Mul(bd, u)
	next.Add(next, moved)
	return next
}

// The approximant is p(−s)/p(s) with p(s) = Σ (2n−k)!·n!/((2n)!·k!·(n−k)!)·(s·delay)^k
// (H. Padé 1892).
func TestPadeDelayIsThePadeApproximant(t *testing.T) {
	for n := range 13 {
		const delay = 0.3
		a, b, c, d, err := PadeDelay(n, delay)
		if err != nil {
			t.Fatal(err)
		}
		response, err := NewFrequencyResponse(a, b, c, d)
		if err != nil {
			t.Fatal(err)
		}
		for _, s := range []complex128{1i, 7i, 30i, 0.4 + 2i} {
			x := s * delay
			var below, above complex128
			coefficient, power := 1.0, complex(1, 0)
			for k := range n + 1 {
				below += complex(coefficient, 0) * power
				above += complex(coefficient*float64(1-2*(k%2)), 0) * power
				coefficient *= float64(n-k) / float64((2*n-k)*(k+1))
				power *= x
			}
			g, err := response.At(s)
			if err != nil {
				t.Fatal(err)
			}
			if want := above / below; cmplx.Abs(g.At(0, 0)-want) > 1e-12*cmplx.Abs(want) {
				t.Errorf("n = %d, s = %v: %v, not %v", n, s, g.At(0, 0), want)
			}
		}
	}
	// Of high order it must still be an all-pass, and e^(−s·delay) at low frequency.
	a, b, c, d, err := PadeDelay(150, 2)
	if err != nil {
		t.Fatal(err)
	}
	response, _ := NewFrequencyResponse(a, b, c, d)
	for _, w := range []float64{0.1, 10, 60} {
		g, err := response.At(complex(0, w))
		if err != nil {
			t.Fatal(err)
		}
		if want := cmplx.Exp(complex(0, -2*w)); cmplx.Abs(g.At(0, 0)-want) > 1e-11 {
			t.Errorf("order 150 at %g: %v, not %v", w, g.At(0, 0), want)
		}
	}
	if _, _, _, _, err := PadeDelay(-1, 1); err == nil {
		t.Error("a negative order is accepted")
	}
	if _, _, _, _, err := PadeDelay(2, 0); err == nil {
		t.Error("no delay is accepted")
	}
}
