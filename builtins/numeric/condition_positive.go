package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
)

// dominatingDiagonal gives a diagonal D with −D ≤ E ≤ D (as quadratic forms) for
// what symmetric matrices E with |E_ij| ≤ V_ij and unrelated signs amount to.
// Rows and columns are first scaled by v_i so that graded V does not spread its
// largest entries over the small ones; then the spectral norm of a matrix of
// unrelated entries is about twice the root of a row's sum of squares, and
// rounding errors have a deviation of 1/√3 of their bound: hence 2/√3.
func dominatingDiagonal(n int, v []float64) []float64 {
	scale := make([]float64, n)
	for i := 0; i < n; i++ {
		scale[i] = v[i*n+i]
		for j := 0; j < n; j++ {
			w, other := v[i*n+j], v[j*n+j]
			if w == 0 || j == i {
				continue
			}
			if w < other {
				w *= w / other
			}
			scale[i] = math.Max(scale[i], w)
		}
	}
	d := make([]float64, n)
	for i := 0; i < n; i++ {
		sum := 0.0
		for j := 0; j < n; j++ {
			if w := v[i*n+j]; w != 0 {
				sum += w * w * (scale[i] / scale[j])
			}
		}
		d[i] = 2 / math.Sqrt(3) * math.Sqrt(sum)
	}
	return d
}

// errorEnvelope solves the Lyapunov equation of a stable coefficient for the
// dominating diagonal of V. Because the solution operator keeps quadratic forms
// in order, every error Z of the solution that a perturbation bounded by V
// causes satisfies −P ≤ Z ≤ P, hence |uᵀZw| ≤ √(uᵀPu·wᵀPw): one solution bounds
// the error of every entry and of every linear function of it.
func errorEnvelope(solver *lyapunovSolver, v []float64) []float64 {
	n := solver.n
	p := make([]float64, n*n)
	for i, d := range dominatingDiagonal(n, v) {
		p[i*n+i] = d
	}
	solver.solve(p, p)
	return p
}

// envelopeRoots gives √(r·P·rᵀ) for each row r of the rows×n matrix.
func envelopeRoots(rows, n int, matrix, p []float64) []float64 {
	moved := make([]float64, rows*n)
	multiply(blas.NoTrans, blas.NoTrans, rows, n, n, 1, matrix, n, p, n, 0, moved, n)
	roots := make([]float64, rows)
	for i := range roots {
		sum := 0.0
		for j := 0; j < n; j++ {
			sum += moved[i*n+j] * matrix[i*n+j]
		}
		roots[i] = math.Sqrt(math.Max(sum, 0))
	}
	return roots
}
