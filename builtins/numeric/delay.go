package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// mostDelayStates bounds the order of a sampled plant with its delay line.
const mostDelayStates = 4000

// DelayedHold samples x' = A·x + B·u(t − delay), y = C·x + D·u(t − delay) with u
// held between samples. With delay = (l − 1)·T + τ, 0 < τ ≤ T, the states are x
// and the l past inputs, oldest first: (x, u_{k−l}, …, u_{k−1}), n + l·m in all, and
// x_{k+1} = A_d·x_k + Γ₁·u_{k−l} + Γ₀·u_{k−l+1}, Γ₀ = ∫₀^{T−τ} e^{As}ds·B,
// Γ₁ = e^{A(T−τ)}·∫₀^τ e^{As}ds·B. A delay within 1e-12 of a whole number of
// samples is taken as whole. It errs for a negative delay and for one that
// needs more than 4000 states.
//
// K. J. Åström, B. Wittenmark, Computer-Controlled Systems, 3rd edition 1997,
// section 2.3.
func DelayedHold(a, b, c, d *mat.Dense, period, delay float64) (ad, bd, cd, dd *mat.Dense, certificate Certificate, err error) {
	fail := func(err error) (_, _, _, _ *mat.Dense, _ Certificate, _ error) {
		return nil, nil, nil, nil, Certificate{}, err
	}
	n, m, err := sampledShapes(a, b, period)
	if err == nil {
		err = outputShapes(c, d, n, m)
	}
	if err != nil {
		return fail(err)
	}
	if !(delay >= 0) || math.IsInf(delay, 0) {
		return fail(fmt.Errorf("the delay is %g s; it must be finite and not negative", delay))
	}
	samples := delay / period
	whole := math.Round(samples)
	if math.Abs(samples-whole) > 1e-12*math.Max(1, whole) {
		whole = math.Ceil(samples)
	} else {
		samples = whole
	}
	if whole == 0 || m == 0 {
		ad, bd, certificate, err = Hold(a, b, period)
		return ad, bd, denseOrEmpty(c), denseOrEmpty(d), certificate, err
	}
	if float64(n)+whole*float64(m) > mostDelayStates {
		return fail(fmt.Errorf("the delay of %.6g samples would need %.0f states; at most %d are allowed", samples, float64(n)+whole*float64(m), mostDelayStates))
	}
	l := int(whole)
	now, before, transition, certificate, err := delayedInputs(n, m, a, b, period, (whole-samples)*period)
	if err != nil {
		return fail(err)
	}
	return delayLine(n, m, l, transition, now, before, c, d, certificate)
}

func denseOrEmpty(m *mat.Dense) *mat.Dense {
	if rows, columns := sizeOf(m); rows == 0 || columns == 0 {
		return &mat.Dense{}
	}
	return mat.DenseCopyOf(m)
}

// delayedInputs computes Γ₀, Γ₁ and A_d for an input that changes rest seconds
// before the end of each sample; rest may be 0.
func delayedInputs(n, m int, a, b *mat.Dense, period, rest float64) (now, before, transition *mat.Dense, certificate Certificate, err error) {
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, &mat.Dense{}, Certificate{Method: "delay line", Digits: mostDigits}, nil
	}
	if rest == 0 {
		transition, before, certificate, err = Hold(a, b, period)
		return mat.NewDense(n, m, nil), before, transition, certificate, err
	}
	transition, _, certificate, err = Hold(a, nil, period)
	if err != nil {
		return nil, nil, nil, certificate, err
	}
	late, now, lateCertificate, err := Hold(a, b, rest)
	if err != nil {
		return nil, nil, nil, certificate, err
	}
	_, early, earlyCertificate, err := Hold(a, b, period-rest)
	if err != nil {
		return nil, nil, nil, certificate, err
	}
	before = mat.NewDense(n, m, nil)
	before.Mul(late, early)
	return now, before, transition, worse(certificate, worse(lateCertificate, earlyCertificate)), nil
}

// delayLine assembles the sampled plant with l stored inputs.
func delayLine(n, m, l int, transition, now, before, c, d *mat.Dense, certificate Certificate) (ad, bd, cd, dd *mat.Dense, _ Certificate, _ error) {
	size := n + l*m
	p, _ := sizeOf(d)
	ad, bd = mat.NewDense(size, size, nil), mat.NewDense(size, m, nil)
	cd, dd = mat.NewDense(p, size, nil), mat.NewDense(p, m, nil)
	if n > 0 {
		ad.Slice(0, n, 0, n).(*mat.Dense).Copy(transition)
		ad.Slice(0, n, n, n+m).(*mat.Dense).Copy(before)
		if l == 1 {
			bd.Slice(0, n, 0, m).(*mat.Dense).Copy(now)
		} else {
			ad.Slice(0, n, n+m, n+2*m).(*mat.Dense).Copy(now)
		}
		cd.Slice(0, p, 0, n).(*mat.Dense).Copy(c)
	}
	for i := range (l - 1) * m {
		ad.Set(n+i, n+m+i, 1)
	}
	for i := range m {
		bd.Set(n+(l-1)*m+i, i, 1)
	}
	cd.Slice(0, p, n, n+m).(*mat.Dense).Copy(d)
	certificate.Method = "held input with a delay line; " + certificate.Method
	return ad, bd, cd, dd, certificate, nil
}

// mostPadeOrder bounds the approximation of a delay.
const mostPadeOrder = 200

// PadeDelay realises the [n/n] Padé approximant of e^(−s·delay) for one channel:
// A n×n, B n×1, C 1×n, D = (−1)ⁿ. It is the all-pass of the reactance ladder
// coth(z) = 1/z + 1/(3/z + 1/(5/z + …)) cut after n elements, z = s·delay/2: with
// g_k = 2(2k − 1)/delay, b_k = √g_k for k of the parity of n and 0 otherwise, and J
// skew-symmetric, J_kj = −√(g_k·g_j) for such k and j < k of the other parity, it
// is A = J − b·bᵀ, B = b, C = ∓2bᵀ. No polynomial coefficients appear, so any
// order up to 200 is well conditioned; the approximation is exact to order
// s^(2n). delay is in seconds and positive; n = 0 gives D = 1 alone.
//
// Continued fraction: J. H. Lambert 1761; H. S. Wall, Analytic Theory of
// Continued Fractions, 1948, section 91.
func PadeDelay(n int, delay float64) (a, b, c, d *mat.Dense, err error) {
	if n < 0 || n > mostPadeOrder {
		return nil, nil, nil, nil, fmt.Errorf("the order of the delay's approximation is %d; it must lie between 0 and %d", n, mostPadeOrder)
	}
	if !(delay > 0) || math.IsInf(delay, 0) || math.IsInf(1/delay, 0) {
		return nil, nil, nil, nil, fmt.Errorf("the delay is %g s; it must be positive and finite", delay)
	}
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, &mat.Dense{}, mat.NewDense(1, 1, []float64{1}), nil
	}
	sign := float64(1 - 2*(n%2))
	a, b, c, d = mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil), mat.NewDense(1, n, nil), mat.NewDense(1, 1, []float64{sign})
	rate := func(k int) float64 { return 2 * float64(2*k-1) / delay }
	for k := n; k >= 1; k -= 2 {
		b.Set(k-1, 0, math.Sqrt(rate(k)))
		c.Set(0, k-1, -2*sign*math.Sqrt(rate(k)))
		for j := n; j >= 1; j-- {
			coupling := math.Sqrt(rate(k)) * math.Sqrt(rate(j))
			switch {
			case (n-j)%2 == 0:
				a.Set(k-1, j-1, -coupling)
			case j < k:
				a.Set(k-1, j-1, -coupling)
				a.Set(j-1, k-1, coupling)
			}
		}
	}
	return a, b, c, d, nil
}
