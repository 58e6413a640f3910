package numeric

import (
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/blas"
)

// How many perturbations of the data are tried, and by how much their largest effect is
// taken to fall short of the largest of all.
const (
	triedPerturbations = 4
	perturbationSafety = 10
)

// sharpen replaces the error bound of X, which adds up the largest effect that every datum
// could have, where a few perturbations of all data by one rounding each show that it is
// far too wide (C. S. Kenney, A. J. Laub, SIAM J. Sci. Comput. 15, 1994). It takes X to be
// refined on residuals in doubled precision, the last correction being left, whose size
// bounds what the refinement leaves; the residuals' own rounding is the envelope's at that
// precision. The same for what X passes on to K.
func (d *riccatiData) sharpen(s *riccatiState, left []float64) {
	n, m := d.n, d.m
	inverse, ok := d.inverseWeight(s.x)
	if !ok {
		return
	}
	gainMap := make([]float64, m*n)
	multiply(blas.NoTrans, blas.Trans, m, n, m, 1, inverse, m, d.b, m, 0, gainMap, n)
	effect := func(dx []float64) (x, k float64) {
		for i := 0; i < n; i++ {
			for j := 0; j < n; j++ {
				x = math.Max(x, math.Abs(dx[i*n+j])/(d.scale[i]*d.scale[j]))
			}
		}
		dk := make([]float64, m*n)
		multiply(blas.NoTrans, blas.NoTrans, m, n, n, 1, gainMap, n, dx, n, 0, dk, n)
		if d.sampled {
			moved := make([]float64, m*n)
			multiply(blas.NoTrans, blas.NoTrans, m, n, n, 1, dk, n, s.ac, n, 0, moved, n)
			dk = moved
		}
		for i := 0; i < m; i++ {
			for j := 0; j < n; j++ {
				k = math.Max(k, math.Abs(dk[i*n+j])/d.scale[j])
			}
		}
		return x, k
	}
	random := rand.New(rand.NewPCG(uint64(n), uint64(m)))
	dx := make([]float64, n*n)
	var x, k float64
	for range triedPerturbations {
		s.solver.solve(dx, d.perturbedResidual(s, random))
		if s.solver.singular {
			return
		}
		ex, ek := effect(dx)
		x, k = math.Max(x, ex), math.Max(k, ek)
	}
	lx, lk := effect(left)
	const doubledRoundoff = 0x1p-50
	estimate := perturbationSafety*x + 4*lx + unitRoundoff*s.size + doubledRoundoff*s.estimate
	if math.IsNaN(estimate) || math.IsNaN(k+lk) {
		return
	}
	s.estimate = math.Min(s.estimate, estimate)
	s.gainEstimate = perturbationSafety*k + 4*lk
}

// perturbedResidual is what a rounding of every datum that was rounded, of random sign, does
// to the residual, to first order: AcᵀX·Z + (…)ᵀ + δQ − δN·K − (…)ᵀ + KᵀδR·K with Z = δA − δB·K, without Acᵀ
// in the continuous equation.
func (d *riccatiData) perturbedResidual(s *riccatiState, random *rand.Rand) []float64 {
	n, m := d.n, d.m
	signed := func(v []float64) []float64 {
		out := make([]float64, len(v))
		for i, x := range v {
			sign := float64(random.Uint64()&1)*2 - 1
			if !isShort(x) {
				out[i] = sign * unitRoundoff * x
			}
		}
		return out
	}
	z := signed(d.a)
	multiply(blas.NoTrans, blas.NoTrans, n, n, m, -1, signed(d.b), m, s.k, n, 1, z, n)
	half := make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, s.x, n, z, n, 0, half, n)
	if d.sampled {
		moved := half
		half = make([]float64, n*n)
		multiply(blas.Trans, blas.NoTrans, n, n, n, 1, s.ac, n, moved, n, 0, half, n)
	}
	weight := signed(d.r)
	makeSymmetric(m, weight)
	inner := make([]float64, m*n)
	multiply(blas.NoTrans, blas.NoTrans, m, n, m, 0.5, weight, m, s.k, n, 0, inner, n)
	multiply(blas.Trans, blas.NoTrans, n, n, m, 1, s.k, n, inner, n, 1, half, n)
	if d.c != nil {
		multiply(blas.NoTrans, blas.NoTrans, n, n, m, -1, signed(d.c), m, s.k, n, 1, half, n)
	}
	res := signed(d.q)
	makeSymmetric(n, res)
	addWithTranspose(n, res, half)
	return res
}

// isShort tells whether a number has at most 26 binary digits: then it is what was typed,
// such as 3 or 0.25, and no rounding stands behind it.
func isShort(x float64) bool {
	fraction, _ := math.Frexp(x)
	scaled := fraction * (1 << 26)
	return scaled == math.Trunc(scaled)
}
