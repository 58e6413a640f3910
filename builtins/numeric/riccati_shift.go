package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/mat"
)

// shiftedReduction handles the sampled equation when R is singular or
// indefinite. With X = S + Y the equation for Y has the data
//
//	Q' = Q + AᵀSA − S,  R' = R + BᵀSB,  N' = N + AᵀSB,
//
// so any S that makes R' positive definite will do. For semidefinite weights S
// is taken from the value iteration X ← Q + AᵀXA − …, which keeps Y ≥ 0; where
// that fails (indefinite Q) a multiple of the identity is used. The balanced
// data must already be in place.
func (d *riccatiData) shiftedReduction() error {
	n, m := d.n, d.m
	d.drive = d.b
	shift := make([]float64, n*n)
	for step := 0; step <= n; step++ {
		if root, ok := d.adoptShift(shift, 1e-6); ok {
			d.finishShift(shift, root)
			return nil
		}
		if !d.valueStep(shift) {
			break
		}
	}
	drive := make([]float64, m*m)
	multiply(blas.Trans, blas.NoTrans, m, m, n, 1, d.b, m, d.b, m, 0, drive, m)
	size := ratio(math.Max(largestOf(d.q), largestOf(d.r)), math.Max(largestOf(drive), math.SmallestNonzeroFloat64))
	for gamma := 1.0; gamma < 1e7; gamma *= 10 {
		clear(shift)
		for i := 0; i < n; i++ {
			shift[i*n+i] = gamma * math.Max(size, largestOf(d.q))
			if shift[i*n+i] == 0 {
				shift[i*n+i] = gamma
			}
		}
		if root, ok := d.adoptShift(shift, 1e-13); ok {
			d.finishShift(shift, root)
			return nil
		}
	}
	return &Refusal{Reason: "the gain is not determined: some combination of inputs has no weight in R and no effect through B"}
}

// shiftedWeight is R + BᵀSB.
func (d *riccatiData) shiftedWeight(shift []float64) []float64 {
	n, m := d.n, d.m
	sb, weight := make([]float64, n*m), append([]float64(nil), d.r...)
	multiply(blas.NoTrans, blas.NoTrans, n, m, n, 1, shift, n, d.b, m, 0, sb, m)
	multiply(blas.Trans, blas.NoTrans, m, m, n, 1, d.b, m, sb, m, 1, weight, m)
	makeSymmetric(m, weight)
	return weight
}

// adoptShift gives the Cholesky factor of R + BᵀSB when that is positive
// definite with pivots above clearance of the largest entry.
func (d *riccatiData) adoptShift(shift []float64, clearance float64) ([]float64, bool) {
	weight := d.shiftedWeight(shift)
	root, ok := choleskyFactor(d.m, weight)
	if !ok {
		return nil, false
	}
	for i := 0; i < d.m; i++ {
		if p := root[i*d.m+i]; p*p < clearance*weight[i*d.m+i] {
			return nil, false
		}
	}
	return root, true
}

// finishShift forms the reduced data of the equation for Y.
func (d *riccatiData) finishShift(shift, root []float64) {
	n, m := d.n, d.m
	d.shift = shift
	sa := make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, shift, n, d.a, n, 0, sa, n)
	q := append([]float64(nil), d.q...)
	for i := range q {
		q[i] -= shift[i]
	}
	multiply(blas.Trans, blas.NoTrans, n, n, n, 1, d.a, n, sa, n, 1, q, n)
	makeSymmetric(n, q)
	c := make([]float64, n*m)
	copy(c, d.c)
	multiply(blas.Trans, blas.NoTrans, n, m, n, 1, sa, n, d.b, m, 1, c, m)
	d.reduceWith(root, d.a, q, c)
}

// valueStep replaces S by Q + AᵀSA − (AᵀSB + N)(R + BᵀSB)⁺(BᵀSA + Nᵀ), and
// reports false when R + BᵀSB has a negative eigenvalue or the numbers grow out
// of hand.
func (d *riccatiData) valueStep(shift []float64) bool {
	n, m := d.n, d.m
	eigen, err := symmetricEigen(mat.NewDense(m, m, d.shiftedWeight(shift)), nil)
	if err != nil {
		return false
	}
	largest := math.Abs(real(eigen.Values[m-1]))
	if real(eigen.Values[0]) < -1e-12*largest {
		return false
	}
	sa, sb := make([]float64, n*n), make([]float64, n*m)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, shift, n, d.a, n, 0, sa, n)
	copy(sb, d.c)
	multiply(blas.Trans, blas.NoTrans, n, m, n, 1, sa, n, d.b, m, 1, sb, m)
	next := append([]float64(nil), d.q...)
	multiply(blas.Trans, blas.NoTrans, n, n, n, 1, d.a, n, sa, n, 1, next, n)
	for j := 0; j < m; j++ {
		value := real(eigen.Values[j])
		if value <= 1e-12*largest {
			continue
		}
		column := make([]float64, n)
		for i := 0; i < n; i++ {
			for l := 0; l < m; l++ {
				column[i] += sb[i*m+l] * real(eigen.Right.At(l, j))
			}
		}
		for i := 0; i < n; i++ {
			for l := 0; l < n; l++ {
				next[i*n+l] -= column[i] * column[l] / value
			}
		}
	}
	makeSymmetric(n, next)
	copy(shift, next)
	return largestOf(shift) < 1e100
}
