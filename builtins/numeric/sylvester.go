package numeric

import (
	"context"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// sylvesterProblem is A·X + X·B = C in balanced coordinates, X = D·X̃·E⁻¹.
type sylvesterProblem struct {
	m, n        int
	a, b, c     []float64
	left, right []float64
}

// sylvesterSolver solves it given Schur forms A = U·T·Uᵀ and Bᵀ = V·R·Vᵀ.
type sylvesterSolver struct {
	m, n     int
	t, u     []float64
	r, v     []float64
	equation *triangularEquation
}

// Sylvester solves A·X + X·B = C for A m×m, B n×n, C m×n; X is m×n and new. An
// eigenvalue that A shares with −B, to rounding, is refused with a *Refusal that
// names it. Shapes and finiteness are checked; the context is looked at between
// the O(n³) steps. Empty matrices give an empty X.
//
// R. H. Bartels, G. W. Stewart, Comm. ACM 15, 1972; solved recursively after
// Jonsson and Kågström 2002, refined once, and twice more in doubled precision
// where the error estimate asks for it.
func Sylvester(ctx context.Context, a, b, c *mat.Dense) (*EquationSolution, error) {
	if err := squareAndFinite("A", a); err != nil {
		return nil, err
	}
	if err := squareAndFinite("B", b); err != nil {
		return nil, err
	}
	m, _ := sizeOf(a)
	n, _ := sizeOf(b)
	if m == 0 || n == 0 {
		return &EquationSolution{X: &mat.Dense{}, Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	if err := Shaped("C", c, m, n); err != nil {
		return nil, err
	}
	if err := Finite("C", c); err != nil {
		return nil, err
	}
	p := newSylvesterProblem(a, b, c)
	t, u, wa, err := Schur(mat.NewDense(m, m, append([]float64(nil), p.a...)))
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	r, v, wb, err := Schur(mat.DenseCopyOf(mat.NewDense(n, n, p.b).T()))
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	solver := newSylvesterSolver(m, n, t.RawMatrix().Data, u.RawMatrix().Data, r.RawMatrix().Data, v.RawMatrix().Data)
	return p.solve(ctx, solver, wa, wb)
}

// newSylvesterProblem balances A and B by powers of two.
func newSylvesterProblem(a, b, c *mat.Dense) *sylvesterProblem {
	m, n := c.Dims()
	p := &sylvesterProblem{m: m, n: n, a: entriesOf(a), b: entriesOf(b), c: entriesOf(c), left: make([]float64, m), right: make([]float64, n)}
	kernels.Dgebal(lapack.Scale, m, p.a, m, p.left)
	kernels.Dgebal(lapack.Scale, n, p.b, n, p.right)
	for i := 0; i < m; i++ {
		for j := 0; j < n; j++ {
			p.c[i*n+j] *= p.right[j] / p.left[i]
		}
	}
	return p
}

// newSylvesterSolver keeps the four matrices, which must not change.
func newSylvesterSolver(m, n int, t, u, r, v []float64) *sylvesterSolver {
	return &sylvesterSolver{m: m, n: n, t: t, u: u, r: r, v: v, equation: newTriangularEquation(false, frobenius(t), frobenius(r))}
}

// transposed solves Aᵀ·X + X·Bᵀ = C.
func (s *sylvesterSolver) transposed() *sylvesterSolver {
	flip := func(n int, t, z []float64) (ft, fz []float64) {
		flipped := newLyapunovSolver(n, false, t, z).transposed()
		return flipped.t, flipped.z
	}
	t, u := flip(s.m, s.t, s.u)
	r, v := flip(s.n, s.r, s.v)
	return newSylvesterSolver(s.m, s.n, t, u, r, v)
}

// solve writes the solution for c into x (m×n row-major; may be the same).
func (s *sylvesterSolver) solve(x, c []float64) {
	m, n := s.m, s.n
	first, second := make([]float64, m*n), make([]float64, m*n)
	multiply(blas.Trans, blas.NoTrans, m, n, m, 1, s.u, m, c, n, 0, first, n)
	multiply(blas.NoTrans, blas.NoTrans, m, n, n, 1, first, n, s.v, n, 0, second, n)
	s.equation.solve(m, n, s.t, m, s.r, n, second, n)
	multiply(blas.NoTrans, blas.NoTrans, m, n, m, 1, s.u, m, second, n, 0, first, n)
	multiply(blas.NoTrans, blas.Trans, m, n, n, 1, first, n, s.v, n, 0, x, n)
}

// separation estimates 1/‖Ω⁻¹‖₁ in the Schur bases.
func (s *sylvesterSolver) separation(other *sylvesterSolver) float64 {
	norm := estimateOneNorm(s.m*s.n, func(x []float64) {
		s.equation.solve(s.m, s.n, s.t, s.m, s.r, s.n, x, s.n)
	}, func(x []float64) {
		reverse(x)
		other.equation.solve(s.m, s.n, other.t, s.m, other.r, s.n, x, s.n)
		reverse(x)
	})
	if s.equation.singular {
		return 0
	}
	return 1 / norm
}

// solve runs substitution, refinement and the estimates.
func (p *sylvesterProblem) solve(ctx context.Context, solver *sylvesterSolver, wa, wb []complex128) (*EquationSolution, error) {
	size := p.m * p.n
	other := solver.transposed()
	separation := solver.separation(other)
	norm := frobenius(solver.t) + frobenius(solver.r)
	if !(separation > 16*math.Sqrt(float64(max(p.m, p.n)))*unitRoundoff*norm) {
		return nil, sylvesterRefusal(wa, wb)
	}
	x, step := make([]float64, size), make([]float64, size)
	solver.solve(x, p.c)
	certificate := Certificate{Method: "Schur forms and recursive substitution, one refinement step"}
	var residual, weight []float64
	var estimate float64
	for round := 0; ; round++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		residual = p.residual(x, round > 1)
		solver.solve(step, residual)
		for i := range x {
			x[i] += step[i]
		}
		if round == 0 {
			continue
		}
		residual, weight = p.residual(x, round > 1), p.weight(x)
		estimate = p.errorEstimate(solver, other, residual, weight)
		if round > 1 || max(p.m, p.n) > 100 || estimate < 1e-12*p.size(x) {
			break
		}
		certificate.Method = "Schur forms and recursive substitution, refined in doubled precision"
	}
	certificate.Residual = ratio(largestOf(residual), largestOf(weight))
	certificate.Condition = ratio(estimate, p.size(x)*(certificate.Residual+2*unitRoundoff))
	certificate.Digits = digitsOfError(estimate, p.size(x))
	result := mat.NewDense(p.m, p.n, nil)
	result.Apply(func(i, j int, _ float64) float64 { return x[i*p.n+j] * p.left[i] / p.right[j] }, result)
	return &EquationSolution{X: result, Separation: separation, Certificate: certificate}, nil
}

// residual is C − A·X − X·B.
func (p *sylvesterProblem) residual(x []float64, doubly bool) []float64 {
	m, n := p.m, p.n
	if !doubly {
		r := append([]float64(nil), p.c...)
		multiply(blas.NoTrans, blas.NoTrans, m, n, m, -1, p.a, m, x, n, 1, r, n)
		multiply(blas.NoTrans, blas.NoTrans, m, n, n, -1, x, n, p.b, n, 1, r, n)
		return r
	}
	xm := exactMatrix(m, n, x)
	r := newDoubled(m, n)
	r.addMatrix(1, exactMatrix(m, n, p.c))
	r.addProduct(-1, exactMatrix(m, m, p.a), xm.transpose())
	r.addProduct(-1, xm, exactMatrix(n, n, p.b).transpose())
	return r.rounded()
}

// weight is |C| + |A|·|X| + |X|·|B|.
func (p *sylvesterProblem) weight(x []float64) []float64 {
	w, ax := absolute(p.c), absolute(x)
	multiply(blas.NoTrans, blas.NoTrans, p.m, p.n, p.m, 1, absolute(p.a), p.m, ax, p.n, 1, w, p.n)
	multiply(blas.NoTrans, blas.NoTrans, p.m, p.n, p.n, 1, ax, p.n, absolute(p.b), p.n, 1, w, p.n)
	return w
}

// errorEstimate bounds the largest error of an entry of X, to first order.
func (p *sylvesterProblem) errorEstimate(solver, other *sylvesterSolver, residual, weight []float64) float64 {
	n := p.n
	weigh := func(x []float64) {
		for i := range x {
			x[i] *= math.Abs(residual[i]) + 2*unitRoundoff*weight[i]
		}
	}
	magnify := func(x []float64) {
		for i := range x {
			x[i] *= p.left[i/n] / p.right[i%n]
		}
	}
	return estimateOneNorm(len(weight), func(x []float64) {
		magnify(x)
		other.solve(x, x)
		weigh(x)
	}, func(x []float64) {
		weigh(x)
		solver.solve(x, x)
		magnify(x)
	})
}

// size is the largest entry of X in the caller's coordinates.
func (p *sylvesterProblem) size(x []float64) float64 {
	largest := 0.0
	for i, v := range x {
		largest = math.Max(largest, math.Abs(v*p.left[i/p.n]/p.right[i%p.n]))
	}
	return largest
}

// sylvesterRefusal names the closest pair of eigenvalues of A and −B.
func sylvesterRefusal(wa, wb []complex128) *Refusal {
	best := math.Inf(1)
	var first, second complex128
	for _, a := range wa {
		for _, b := range wb {
			if gap := cmplx.Abs(a + b); gap < best {
				best, first, second = gap, a, b
			}
		}
	}
	return &Refusal{Reason: "the Sylvester equation A X + X B = C has no unique solution: an eigenvalue of A and one of B add up to zero, to rounding",
		Modes: []complex128{first, second}}
}
