package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
)

// estimateOneNorm estimates the 1-norm of a linear map on ℝ^size from a few
// applications of it and of its transpose; both overwrite their argument. The
// estimate is a lower bound, nearly always within a factor 3.
//
// N. J. Higham, FORTRAN codes for estimating the one-norm of a real or complex
// matrix, ACM Trans. Math. Softw. 14, 1988.
func estimateOneNorm(size int, apply, applyTransposed func(x []float64)) float64 {
	if size == 0 {
		return 0
	}
	v, x, signs := make([]float64, size), make([]float64, size), make([]int, size)
	var state [3]int
	estimate, request := 0.0, 0
	for {
		estimate, request = kernels.Dlacn2(size, v, x, signs, estimate, request, &state)
		switch request {
		case 0:
			if math.IsNaN(estimate) {
				return math.Inf(1)
			}
			return estimate
		case 1:
			apply(x)
		default:
			applyTransposed(x)
		}
		for _, value := range x {
			if value-value != 0 {
				return math.Inf(1)
			}
		}
	}
}

// lyapunovSolver solves A·X + X·Aᵀ + Q = 0 (or A·X·Aᵀ − X + Q = 0 when sampled)
// for symmetric Q, given the Schur form of A, again and again.
type lyapunovSolver struct {
	n        int
	sampled  bool
	t, z     []float64
	norm     float64
	singular bool
	equation *triangularEquation
	first    []float64
	second   []float64
}

// newLyapunovSolver keeps t and z (n×n, row-major), which must not change.
func newLyapunovSolver(n int, sampled bool, t, z []float64) *lyapunovSolver {
	norm := frobenius(t)
	return &lyapunovSolver{n: n, sampled: sampled, t: t, z: z, norm: norm,
		equation: newTriangularEquation(sampled, norm, norm),
		first:    make([]float64, n*n), second: make([]float64, n*n)}
}

// transposed gives the solver for Aᵀ: reversing the order of the basis turns Tᵀ
// into an upper quasi-triangular matrix again.
func (s *lyapunovSolver) transposed() *lyapunovSolver {
	n := s.n
	t, z := make([]float64, n*n), make([]float64, n*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			t[i*n+j] = s.t[(n-1-j)*n+n-1-i]
			z[i*n+j] = s.z[i*n+n-1-j]
		}
	}
	return newLyapunovSolver(n, s.sampled, t, z)
}

// solve writes the solution for q into x; both are n×n row-major and may be the
// same slice.
func (s *lyapunovSolver) solve(x, q []float64) {
	n := s.n
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, -1, q, n, s.z, n, 0, s.first, n)
	multiply(blas.Trans, blas.NoTrans, n, n, n, 1, s.z, n, s.first, n, 0, s.second, n)
	s.equation.solveSymmetric(n, s.t, n, s.second, n)
	s.singular = s.singular || s.equation.singular
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, s.z, n, s.second, n, 0, s.first, n)
	multiply(blas.NoTrans, blas.Trans, n, n, n, 1, s.first, n, s.z, n, 0, x, n)
	makeSymmetric(n, x)
}

// weightedInverseNorm estimates max_ij out_ij·(|Ω⁻¹|·weight)_ij, where Ω is the
// Lyapunov operator: what errors of size weight in the right side can do to the
// entries of the solution, magnified by out = scale·scaleᵀ. other solves with
// the transposed coefficient.
func weightedInverseNorm(solver, other *lyapunovSolver, weight, scale []float64) float64 {
	n := solver.n
	full := make([]float64, n*n)
	// The map on packed upper triangles is diag(weight)·Ω⁻ᵀ·diag(out), whose
	// 1-norm is the wanted ∞-norm of its transpose.
	spread := func(x []float64, half float64, factor func(i, j int) float64) {
		k := 0
		for i := 0; i < n; i++ {
			for j := i; j < n; j++ {
				v := x[k] * factor(i, j)
				if i != j {
					v *= half
				}
				full[i*n+j], full[j*n+i] = v, v
				k++
			}
		}
	}
	gather := func(x []float64, twice float64, factor func(i, j int) float64) {
		k := 0
		for i := 0; i < n; i++ {
			for j := i; j < n; j++ {
				v := full[i*n+j] * factor(i, j)
				if i != j {
					v *= twice
				}
				x[k] = v
				k++
			}
		}
	}
	weigh := func(i, j int) float64 { return weight[i*n+j] }
	out := func(i, j int) float64 { return scale[i] * scale[j] }
	return estimateOneNorm(n*(n+1)/2, func(x []float64) {
		spread(x, 0.5, out)
		other.solve(full, full)
		gather(x, 2, weigh)
	}, func(x []float64) {
		spread(x, 1, weigh)
		solver.solve(full, full)
		gather(x, 1, out)
	})
}

// separation estimates the smallest ‖Ω(Z)‖/‖Z‖ over symmetric Z (1-norms of the
// entries in the Schur basis, good within a factor n of the Frobenius norm).
func (s *lyapunovSolver) separation(other *lyapunovSolver) float64 {
	n := s.n
	apply := func(solver *lyapunovSolver) func(x []float64) {
		return func(x []float64) {
			makeSymmetric(n, x)
			solver.equation.solveSymmetric(n, solver.t, n, x, n)
		}
	}
	reversed := func(x []float64) {
		// other works in the reversed basis.
		reverse(x)
		apply(other)(x)
		reverse(x)
	}
	norm := estimateOneNorm(n*n, apply(s), reversed)
	if s.equation.singular {
		s.singular = true
		return 0
	}
	return 1 / norm
}

// reverse turns a row-major square matrix by half a revolution.
func reverse(x []float64) {
	for i, j := 0, len(x)-1; i < j; i, j = i+1, j-1 {
		x[i], x[j] = x[j], x[i]
	}
}

// makeSymmetric replaces the row-major n×n x by (x + xᵀ)/2.
func makeSymmetric(n int, x []float64) {
	for i := 0; i < n; i++ {
		for j := 0; j < i; j++ {
			v := x[i*n+j]/2 + x[j*n+i]/2
			x[i*n+j], x[j*n+i] = v, v
		}
	}
}

// frobenius is the square root of the sum of squares, safe against overflow for
// entries up to 1e150.
func frobenius(x []float64) float64 {
	sum := 0.0
	for _, v := range x {
		sum += v * v
	}
	return math.Sqrt(sum)
}

// largestOf is the largest absolute entry.
func largestOf(x []float64) float64 {
	largest := 0.0
	for _, v := range x {
		if a := math.Abs(v); a > largest || a != a {
			largest = a
		}
	}
	return largest
}
