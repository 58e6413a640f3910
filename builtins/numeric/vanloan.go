package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/mat"
)

// VanLoanCost turns the running cost ∫(xᵀQx + 2xᵀNu + uᵀRu)dt of x' = A·x + B·u
// with u held over T seconds into the sampled cost Σ(xᵀQ_d·x + 2xᵀN_d·u + uᵀR_d·u):
// with Φ(t) = exp([[A, B], [0, 0]]·t), the blocks of ∫₀ᵀ Φᵀ·[[Q, N], [Nᵀ, R]]·Φ dt.
// a n×n, b n×m, q n×n symmetric, cross n×m or nil, r m×m symmetric; T in seconds,
// positive. Units are those of the running cost times seconds.
//
// The integrals are C. Van Loan's (IEEE Trans. Automat. Control 23, 1978); his
// exponential of the Hamiltonian-like matrix mixes e^(AT) with e^(−AT), so here
// the integral over a short step is summed as a Taylor series and then doubled,
// W(2t) = W(t) + Φ(t)ᵀ·W(t)·Φ(t), which for weights that are not negative adds
// only terms of one sign.
func VanLoanCost(a, b, q, cross, r *mat.Dense, period float64) (qd, nd, rd *mat.Dense, certificate Certificate, err error) {
	n, m, err := sampledShapes(a, b, period)
	if err != nil {
		return nil, nil, nil, Certificate{}, err
	}
	if err := weightShapes(n, m, q, cross, r); err != nil {
		return nil, nil, nil, Certificate{}, err
	}
	if n == 0 || m == 0 {
		return nil, nil, nil, Certificate{}, fmt.Errorf("a sampled cost needs a state and an input; A is %d×%d and there are %d inputs", n, n, m)
	}
	size := n + m
	w, err := heldMatrix(n, m, 1, a, b, period)
	if err != nil {
		return nil, nil, nil, Certificate{}, err
	}
	weight := make([]float64, size*size)
	for i := range n {
		for j := range n {
			weight[i*size+j] = period * (q.At(i, j) + q.At(j, i)) / 2
		}
		for j := range m {
			if _, columns := sizeOf(cross); columns > 0 {
				weight[i*size+n+j] = period * cross.At(i, j)
				weight[(n+j)*size+i] = weight[i*size+n+j]
			}
		}
	}
	for i := range m {
		for j := range m {
			weight[(n+i)*size+n+j] = period * (r.At(i, j) + r.At(j, i)) / 2
		}
	}
	parts := [][4]int{{0, n, 0, n}, {0, n, n, size}, {n, size, n, size}}
	integral, certificate, err := doubledIntegral(size, w, weight, parts)
	if err != nil {
		return nil, nil, nil, Certificate{}, err
	}
	blocks := make([]*mat.Dense, 3)
	for i, p := range parts {
		blocks[i] = blockOf(integral, size, p[0], p[1], p[2], p[3])
	}
	return blocks[0], blocks[1], blocks[2], certificate, nil
}

// VanLoanNoise turns white noise of intensity W (n×n, symmetric) that drives
// x' = A·x + w into the covariance it adds over one sample of T seconds,
// W_d = ∫₀ᵀ e^(At)·W·e^(Aᵀt)dt. The method is that of VanLoanCost.
func VanLoanNoise(a, intensity *mat.Dense, period float64) (*mat.Dense, Certificate, error) {
	n, _, err := sampledShapes(a, nil, period)
	if err != nil {
		return nil, Certificate{}, err
	}
	if err := Shaped("W", intensity, n, n); err != nil {
		return nil, Certificate{}, err
	}
	if err := Finite("W", intensity); err != nil {
		return nil, Certificate{}, err
	}
	if err := Symmetric("W", intensity); err != nil {
		return nil, Certificate{}, err
	}
	if n == 0 {
		return &mat.Dense{}, Certificate{Method: "empty", Digits: mostDigits}, nil
	}
	w, weight := make([]float64, n*n), make([]float64, n*n)
	for i := range n {
		for j := range n {
			w[i*n+j] = a.At(j, i) * period
			weight[i*n+j] = period * (intensity.At(i, j) + intensity.At(j, i)) / 2
		}
	}
	integral, certificate, err := doubledIntegral(n, w, weight, [][4]int{{0, n, 0, n}})
	if err != nil {
		return nil, Certificate{}, err
	}
	return mat.NewDense(n, n, integral), certificate, nil
}

// weightShapes checks Q n×n and R m×m, symmetric, and N n×m where given.
func weightShapes(n, m int, q, cross, r *mat.Dense) error {
	if err := Shaped("Q", q, n, n); err != nil {
		return err
	}
	if err := Shaped("R", r, m, m); err != nil {
		return err
	}
	if _, columns := sizeOf(cross); columns > 0 {
		if err := Shaped("N", cross, n, m); err != nil {
			return err
		}
	}
	for _, named := range []struct {
		name string
		m    *mat.Dense
	}{{"Q", q}, {"R", r}, {"N", cross}} {
		if err := Finite(named.name, named.m); err != nil {
			return err
		}
	}
	if err := Symmetric("Q", q); err != nil {
		return err
	}
	return Symmetric("R", r)
}

// doubledIntegral computes ∫₀¹ e^(Fᵀt)·W·e^(Ft)dt for the n×n row-major f and
// the symmetric w, and estimates the digits of the parts (rows and columns from
// and to) by doing it again with half the step.
func doubledIntegral(n int, f, w []float64, parts [][4]int) ([]float64, Certificate, error) {
	if !allFinite(f) || !allFinite(w) {
		return nil, Certificate{}, fmt.Errorf("a weight or A times T overflows")
	}
	c := coupled(n, f, true)
	scaled, weight := make([]float64, n*n), make([]float64, n*n)
	c.into(n, scaled, f)
	congruence(n, c, weight, w)
	steps := 0
	if norm := oneNorm(n, scaled); norm > 0.5 {
		steps = int(math.Ceil(math.Log2(norm))) + 1
	}
	var results [2][]float64
	for k := range results {
		integral := integrated(n, scaled, weight, steps+k, max(c.depth+1, min(n, smallOrder)))
		results[k] = make([]float64, n*n)
		undoCongruence(n, c, results[k], integral)
		if !allFinite(results[k]) {
			return nil, Certificate{}, overflowError(n, f)
		}
	}
	certificate := Certificate{Method: fmt.Sprintf("Taylor series of the integral and %d doublings", steps),
		Condition: math.Max(1, oneNorm(n, scaled)), Digits: mostDigits}
	for _, p := range parts {
		largest, difference := 0.0, 0.0
		for i := p[0]; i < p[1]; i++ {
			for j := p[2]; j < p[3]; j++ {
				largest = math.Max(largest, math.Abs(results[0][i*n+j]))
				difference = math.Max(difference, math.Abs(results[0][i*n+j]-results[1][i*n+j]))
			}
		}
		if largest == 0 && difference == 0 {
			continue
		}
		relative := relativeError(errorMargin*difference, largest, columnGroup{})
		certificate.Residual = math.Max(certificate.Residual, relative)
	}
	certificate.Digits = math.Min(DigitsOf(certificate.Residual, 1), DigitsOf(unitRoundoff, certificate.Condition))
	return results[0], certificate, nil
}

// congruence writes D·Pᵀ·w·P·D, the weight in the coordinates of c, and
// undoCongruence undoes it.
func congruence(n int, c *coupling, dst, w []float64) {
	for i := range n {
		for j := range n {
			dst[i*n+j] = math.Ldexp(w[c.order[i]*n+c.order[j]], c.exponent[i]+c.exponent[j])
		}
	}
}

func undoCongruence(n int, c *coupling, dst, w []float64) {
	for i := range n {
		for j := range n {
			dst[c.order[i]*n+c.order[j]] = math.Ldexp(w[i*n+j], -c.exponent[i]-c.exponent[j])
		}
	}
}

// integrated sums the series over 2^−steps, at least the given number of terms,
// and doubles steps times.
func integrated(n int, f, w []float64, steps, terms int) []float64 {
	step := math.Ldexp(1, -steps)
	integral, transition := make([]float64, n*n), make([]float64, n*n)
	term, power, space := make([]float64, n*n), make([]float64, n*n), make([]float64, n*n)
	fillScaled(term, step, w)
	copy(integral, term)
	for i := range n {
		transition[i*n+i], power[i*n+i] = 1, 1
	}
	// Terms shrink at least like 1/k!. Entries differ widely in size in scaled
	// coordinates and each must settle by itself; those that need a path of many
	// couplings first appear late, hence the least number of terms.
	for k := 1; k <= terms+40; k++ {
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, step/float64(k), power, n, f, n, 0, space, n)
		power, space = space, power
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, step/float64(k+1), term, n, f, n, 0, space, n)
		settled := addSymmetric(n, term, space, integral)
		for i, v := range power {
			transition[i] += v
			settled = settled && math.Abs(v) <= math.Abs(transition[i])*unitRoundoff/8
		}
		if k >= terms && settled {
			break
		}
	}
	for range steps {
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, integral, n, transition, n, 0, space, n)
		multiply(blas.Trans, blas.NoTrans, n, n, n, 1, transition, n, space, n, 0, term, n)
		for i, v := range term {
			integral[i] += v
		}
		symmetrise(n, integral)
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, transition, n, transition, n, 0, space, n)
		transition, space = space, transition
	}
	return integral
}

// addSymmetric sets term = x + xᵀ, adds it to sum, and tells whether it no
// longer matters to any entry.
func addSymmetric(n int, term, x, sum []float64) (settled bool) {
	settled = true
	for i := range n {
		for j := range n {
			v := x[i*n+j] + x[j*n+i]
			term[i*n+j] = v
			sum[i*n+j] += v
			settled = settled && math.Abs(v) <= math.Abs(sum[i*n+j])*unitRoundoff/8
		}
	}
	return settled
}

func symmetrise(n int, x []float64) {
	for i := range n {
		for j := i + 1; j < n; j++ {
			mean := x[i*n+j]/2 + x[j*n+i]/2
			x[i*n+j], x[j*n+i] = mean, mean
		}
	}
}
