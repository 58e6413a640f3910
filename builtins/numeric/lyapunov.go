package numeric

import (
	"context"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// EquationSolution is the solution of a linear matrix equation.
type EquationSolution struct {
	X *mat.Dense
	// Separation estimates the smallest ‖Ω(Z)‖/‖Z‖ of the equation's linear
	// operator Ω in balanced coordinates: the distance, to a factor n, to an
	// equation without a unique solution.
	Separation  float64
	Certificate Certificate
}

// Lyapunov solves A·X + X·Aᵀ + Q = 0, or A·X·Aᵀ − X + Q = 0 when sampled, for
// symmetric Q (n×n like A); X is symmetric and new. A need not be stable: the
// solution is a gramian only if it is. Eigenvalues λ, μ of A (perhaps the same
// one) with λ + μ = 0, or λ·μ = 1 when sampled, to rounding, are refused with a
// *Refusal that names the closest pair. Shapes and finiteness are checked; the
// context is looked at between the O(n³) steps. 0×0 gives an empty X.
//
// R. H. Bartels, G. W. Stewart, Comm. ACM 15, 1972; G. Kitagawa, Int. J. Control
// 25, 1977; solved recursively after Jonsson and Kågström 2002, with one step of
// refinement, and two more in doubled precision where the estimate asks for it.
func Lyapunov(ctx context.Context, a, q *mat.Dense, sampled bool) (*EquationSolution, error) {
	if err := squareAndFinite("A", a); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	if err := Shaped("Q", q, n, n); err != nil {
		return nil, err
	}
	if err := Finite("Q", q); err != nil {
		return nil, err
	}
	if err := Symmetric("Q", q); err != nil {
		return nil, err
	}
	if n == 0 {
		return &EquationSolution{X: &mat.Dense{}, Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	problem := newLyapunovProblem(a, q, sampled)
	form, basis, w, err := Schur(mat.NewDense(n, n, problem.a))
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	return problem.solve(ctx, newLyapunovSolver(n, sampled, form.RawMatrix().Data, basis.RawMatrix().Data), w)
}

// lyapunovProblem is the equation in balanced coordinates x = D·x̃.
type lyapunovProblem struct {
	n       int
	sampled bool
	a, q    []float64
	scale   []float64
}

// newLyapunovProblem balances A by powers of two.
func newLyapunovProblem(a, q *mat.Dense, sampled bool) *lyapunovProblem {
	n, _ := a.Dims()
	p := &lyapunovProblem{n: n, sampled: sampled, a: entriesOf(a), q: entriesOf(q), scale: make([]float64, n)}
	kernels.Dgebal(lapack.Scale, n, p.a, n, p.scale)
	makeSymmetric(n, p.q)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			p.q[i*n+j] /= p.scale[i] * p.scale[j]
		}
	}
	return p
}

// entriesOf copies a matrix into row-major order without gaps.
func entriesOf(m *mat.Dense) []float64 {
	rows, columns := sizeOf(m)
	out := make([]float64, rows*columns)
	for i := 0; i < rows; i++ {
		copy(out[i*columns:(i+1)*columns], m.RawRowView(i))
	}
	return out
}

// solve runs substitution, refinement and the estimates.
func (p *lyapunovProblem) solve(ctx context.Context, solver *lyapunovSolver, w []complex128) (*EquationSolution, error) {
	n := p.n
	other := solver.transposed()
	separation := solver.separation(other)
	norm := 2 * solver.norm
	if p.sampled {
		norm = 1 + solver.norm*solver.norm
	}
	if !(separation > 16*math.Sqrt(float64(n))*unitRoundoff*norm) {
		return nil, lyapunovRefusal(w, p.sampled)
	}
	x, step := make([]float64, n*n), make([]float64, n*n)
	solver.solve(x, p.q)
	var estimate float64
	certificate := Certificate{Method: "Schur form and recursive substitution, one refinement step"}
	var residual, weight []float64
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
		residual = p.residual(x, round > 1)
		weight = p.weight(x)
		estimate = p.errorEstimate(solver, other, residual, weight)
		// Doubled precision costs some thirty times a product: only where it
		// pays and does not take seconds.
		if round > 1 || n > 100 || estimate < 1e-12*p.size(x) {
			break
		}
		certificate.Method = "Schur form and recursive substitution, refined in doubled precision"
	}
	size := p.size(x)
	backward := largestOf(residual)/math.Max(largestOf(weight), math.SmallestNonzeroFloat64) + 2*unitRoundoff
	certificate.Residual = backward - 2*unitRoundoff
	certificate.Condition = ratio(estimate, size*backward)
	certificate.Digits = digitsOfError(estimate, size)
	return &EquationSolution{X: p.unscaled(x), Separation: separation, Certificate: certificate}, nil
}

// residual is A·X + X·Aᵀ + Q or A·X·Aᵀ − X + Q.
func (p *lyapunovProblem) residual(x []float64, doubly bool) []float64 {
	n := p.n
	if doubly {
		return p.doubledResidual(x)
	}
	r, ax := append([]float64(nil), p.q...), make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a, n, x, n, 0, ax, n)
	if p.sampled {
		multiply(blas.NoTrans, blas.Trans, n, n, n, 1, ax, n, p.a, n, 1, r, n)
		for i := range r {
			r[i] -= x[i]
		}
		makeSymmetric(n, r)
		return r
	}
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			r[i*n+j] += ax[i*n+j] + ax[j*n+i]
		}
	}
	return r
}

// doubledResidual is the same with about 32 digits.
func (p *lyapunovProblem) doubledResidual(x []float64) []float64 {
	n := p.n
	a, xm := exactMatrix(n, n, p.a), exactMatrix(n, n, x)
	r, ax := newDoubled(n, n), newDoubled(n, n)
	ax.addProduct(1, a, xm)
	r.addMatrix(1, exactMatrix(n, n, p.q))
	if p.sampled {
		r.addProduct(1, ax, a)
		r.addMatrix(-1, xm)
	} else {
		r.addMatrix(1, ax)
		r.addMatrix(1, ax.transpose())
	}
	out := r.rounded()
	makeSymmetric(n, out)
	return out
}

// weight is what relative changes of the data by 1 may change the residual by.
func (p *lyapunovProblem) weight(x []float64) []float64 {
	n := p.n
	a, xa, w := absolute(p.a), absolute(x), absolute(p.q)
	product := make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, a, n, xa, n, 0, product, n)
	if p.sampled {
		square := make([]float64, n*n)
		multiply(blas.NoTrans, blas.Trans, n, n, n, 2, product, n, a, n, 0, square, n)
		product = square
		for i := range w {
			w[i] += product[i] + xa[i]
		}
		return w
	}
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			w[i*n+j] += product[i*n+j] + product[j*n+i]
		}
	}
	return w
}

// absolute copies x with its signs dropped.
func absolute(x []float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = math.Abs(v)
	}
	return out
}

// errorEstimate bounds the largest error of an entry of X, to first order, from
// the residual left and from rounding of the data.
func (p *lyapunovProblem) errorEstimate(solver, other *lyapunovSolver, residual, weight []float64) float64 {
	perturbation := make([]float64, len(weight))
	for i := range perturbation {
		perturbation[i] = math.Abs(residual[i]) + 2*unitRoundoff*weight[i]
	}
	return weightedInverseNorm(solver, other, perturbation, p.scale)
}

// size is the largest entry of X in the caller's coordinates.
func (p *lyapunovProblem) size(x []float64) float64 {
	largest := 0.0
	for i := 0; i < p.n; i++ {
		for j := 0; j < p.n; j++ {
			largest = math.Max(largest, math.Abs(x[i*p.n+j]*p.scale[i]*p.scale[j]))
		}
	}
	return largest
}

// unscaled is D·X·D.
func (p *lyapunovProblem) unscaled(x []float64) *mat.Dense {
	m := mat.NewDense(p.n, p.n, nil)
	m.Apply(func(i, j int, _ float64) float64 { return x[i*p.n+j] * p.scale[i] * p.scale[j] }, m)
	return m
}

// lyapunovRefusal names the pair of eigenvalues that makes the operator singular.
func lyapunovRefusal(w []complex128, sampled bool) *Refusal {
	best, first, second := math.Inf(1), 0, 0
	for i := range w {
		for j := 0; j <= i; j++ {
			gap := cmplx.Abs(w[i] + w[j])
			if sampled {
				gap = cmplx.Abs(w[i]*w[j] - 1)
			}
			if gap < best {
				best, first, second = gap, i, j
			}
		}
	}
	refusal := &Refusal{Reason: "the Lyapunov equation has no unique solution: two eigenvalues of A add up to zero, to rounding", Modes: []complex128{w[first], w[second]}}
	if sampled {
		refusal.Reason = "the Lyapunov equation has no unique solution: the product of two eigenvalues of A is one, to rounding"
	}
	if first == second {
		refusal.Modes = refusal.Modes[:1]
	}
	return refusal
}
