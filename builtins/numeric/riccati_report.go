package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/mat"
)

// finish leaves the balanced coordinates and writes the certificate.
func (d *riccatiData) finish(s *riccatiState) (*RiccatiSolution, error) {
	n, m := d.n, d.m
	poles := s.poles
	if s.since > 1e-13 {
		var err error
		if poles, err = Eigenvalues(mat.NewDense(n, n, append([]float64(nil), s.ac...))); err != nil {
			return nil, err
		}
	}
	if !d.allStable(poles) {
		return nil, errNotStabilising
	}
	result := &RiccatiSolution{X: mat.NewDense(n, n, nil), K: mat.NewDense(m, n, nil), Poles: poles, LastNewtonStep: s.step}
	x, k := result.X.RawMatrix().Data, result.K.RawMatrix().Data
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			x[i*n+j] = s.x[i*n+j] / (d.scale[i] * d.scale[j])
		}
		for j := 0; j < m; j++ {
			k[j*n+i] = s.k[j*n+i] / d.scale[i]
		}
	}
	if err := Finite("X", result.X); err != nil {
		return nil, err
	}
	c := &result.Certificate
	c.Method = s.method + ", Newton steps"
	if s.doubled {
		c.Method += " on residuals in doubled precision"
	}
	weight := d.weight(s.x, s.k, s.ac)
	c.Residual = ratio(largestOf(s.residual), largestOf(weight))
	c.Condition = ratio(s.estimate, s.size*(c.Residual+2*unitRoundoff))
	c.Digits = digitsOfError(s.estimate, s.size)
	// A gain that is zero is measured against the terms that cancel in it.
	indirect, direct := d.gainError(s)
	size := largestOf(k)
	if size == 0 {
		size = direct / (2 * unitRoundoff)
	}
	result.GainDigits = digitsOfError(indirect+direct, size)
	if !s.definite {
		c.note("R + BᵀXB is not positive definite: the law is a saddle point of the cost, not its minimum")
	}
	return result, nil
}

// gainError estimates the largest error of an entry of K in the caller's
// coordinates: what the envelope of X passes on through M⁻¹BᵀZ (·Ac when
// sampled), and directly from rounding of B, R, N.
func (d *riccatiData) gainError(s *riccatiState) (indirect, direct float64) {
	n, m := d.n, d.m
	inverse, ok := d.inverseWeight(s.x)
	if !ok {
		return math.Inf(1), math.Inf(1)
	}
	gainMap := make([]float64, m*n)
	multiply(blas.NoTrans, blas.Trans, m, n, m, 1, inverse, m, d.b, m, 0, gainMap, n)
	left := envelopeRoots(m, n, gainMap, s.envelope)
	right := make([]float64, n)
	for j := range right {
		right[j] = math.Sqrt(math.Max(s.envelope[j*n+j], 0))
	}
	if d.sampled {
		columns := make([]float64, n*n)
		for i := 0; i < n; i++ {
			for j := 0; j < n; j++ {
				columns[j*n+i] = s.ac[i*n+j]
			}
		}
		right = envelopeRoots(n, n, columns, s.envelope)
	}
	for j := range right {
		indirect = math.Max(indirect, largestOf(left)*right[j]/d.scale[j])
	}
	if s.gainEstimate < indirect {
		indirect = s.gainEstimate
	}
	return indirect, d.directGainError(s, inverse)
}

// inverseWeight is (R + BᵀXB)⁻¹, or R⁻¹.
func (d *riccatiData) inverseWeight(x []float64) ([]float64, bool) {
	m := d.m
	weight := append([]float64(nil), d.r...)
	if d.sampled {
		weight = d.shiftedWeight(x)
	}
	pivots, inverse := make([]int, m), make([]float64, m*m)
	for i := 0; i < m; i++ {
		inverse[i*m+i] = 1
	}
	if !kernels.Dgetrf(m, m, weight, m, pivots) {
		return nil, false
	}
	kernels.Dgetrs(blas.NoTrans, m, m, weight, m, pivots, inverse, m)
	return inverse, true
}

// directGainError is 2u·|M⁻¹|(|B|ᵀ|X|(|A| + |B||K|) + |R||K| + |N|ᵀ) (with the
// identity for A, and without B·K, in the continuous equation), largest entry in
// the caller's coordinates.
func (d *riccatiData) directGainError(s *riccatiState, inverse []float64) float64 {
	n, m := d.n, d.m
	b, ak := absolute(d.b), absolute(s.k)
	bx, sum := make([]float64, m*n), make([]float64, m*n)
	multiply(blas.Trans, blas.NoTrans, m, n, n, 1, b, m, absolute(s.x), n, 0, bx, n)
	if d.sampled {
		open := absolute(d.a)
		multiply(blas.NoTrans, blas.NoTrans, n, n, m, 1, b, m, ak, n, 1, open, n)
		multiply(blas.NoTrans, blas.NoTrans, m, n, n, 1, bx, n, open, n, 0, sum, n)
	} else {
		copy(sum, bx)
	}
	multiply(blas.NoTrans, blas.NoTrans, m, n, m, 1, absolute(d.r), m, ak, n, 1, sum, n)
	if d.c != nil {
		for i := 0; i < n; i++ {
			for j := 0; j < m; j++ {
				sum[j*n+i] += math.Abs(d.c[i*m+j])
			}
		}
	}
	multiply(blas.NoTrans, blas.NoTrans, m, n, m, 2*unitRoundoff, absolute(inverse), m, sum, n, 0, bx, n)
	largest := 0.0
	for i := 0; i < m; i++ {
		for j := 0; j < n; j++ {
			largest = math.Max(largest, bx[i*n+j]/d.scale[j])
		}
	}
	return largest
}
