package matrix

import (
	"fmt"
	"math"
	"math/cmplx"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

func distance(a, b complex128) float64 { return cmplx.Abs(a - b) }

func short(x float64) string { return fmt.Sprintf("%.1e", x) }

// eliminate gives a determinant by elimination with partial pivoting and a first-order error estimate.
func eliminate(n int, a []complex128) (det complex128, err float64) {
	det = 1
	growth := 0.0
	for k := range n {
		p := k
		for i := k; i < n; i++ {
			if cmplx.Abs(a[i*n+k]) > cmplx.Abs(a[p*n+k]) {
				p = i
			}
		}
		if a[p*n+k] == 0 {
			return 0, 0
		}
		if p != k {
			det = -det
			for j := range n {
				a[p*n+j], a[k*n+j] = a[k*n+j], a[p*n+j]
			}
		}
		for i := k + 1; i < n; i++ {
			f := a[i*n+k] / a[k*n+k]
			for j := k; j < n; j++ {
				a[i*n+j] -= f * a[k*n+j]
			}
		}
		growth = math.Max(growth, cmplx.Abs(a[0])/cmplx.Abs(a[k*n+k]))
		det *= a[k*n+k]
	}
	return det, cmplx.Abs(det) * float64(n) * 0x1p-52 * math.Max(1, growth)
}

func rankNote(d *numeric.RankDecision) string {
	text := fmt.Sprintf("floating rank: singular values above %.1e count; smallest counted %.1e", d.Threshold, d.Above)
	if d.Below > 0 {
		text += fmt.Sprintf(", largest not counted %.1e", d.Below)
	}
	return text
}

var spaces = []*value.Builtin{
	{
		Name: "kernel", Family: "matrix", Params: any1("A", value.AMatrix, "p×q"), Result: "matrix q×k", Summary: "a basis of the vectors that A takes to zero, as columns",
		Doc: "Exact by elimination; of a floating matrix orthonormal, with a note on how the rank was decided.", Examples: []value.Example{{Input: "kernel([[1, 2], [2, 4]])", Output: "=\n  -2\n   1"}},
		Errors: []string{"entries that are not finite"}, Source: "Golub & Van Loan 2013, 5.5", SeeAlso: []string{"image", "rank"},
		Func: func(c *value.Call) (value.Value, error) { return basis(c, true) },
	},
	{
		Name: "image", Family: "matrix", Params: any1("A", value.AMatrix, "p×q"), Result: "matrix p×r", Summary: "a basis of the vectors that A reaches, as columns",
		Doc: "Exact: the first independent columns; of a floating matrix orthonormal, with a note on how the rank was decided.", Examples: []value.Example{{Input: "image([[1, 2], [2, 4]])", Output: "=\n  1\n  2"}},
		Errors: []string{"entries that are not finite"}, Source: "Golub & Van Loan 2013, 5.5", SeeAlso: []string{"kernel", "rank"},
		Func: func(c *value.Call) (value.Value, error) { return basis(c, false) },
	},
}

func basis(c *value.Call, kernel bool) (value.Value, error) {
	m := c.Matrix("A")
	if m.IsComplex() {
		return nil, value.Errf(diag.Type, "A", "the matrix must be real")
	}
	if system.AllExact(m) {
		if kernel {
			return value.ExactMatrix(m.Exact().Kernel()), nil
		}
		return value.ExactMatrix(m.Exact().Image()), nil
	}
	p, q := m.Dims()
	find, height := numeric.Image, p
	if kernel {
		find, height = numeric.Kernel, q
	}
	b, d, err := find(m.Dense())
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	c.Note(rankNote(d))
	if b.IsEmpty() {
		return system.Zero(height, 0), nil
	}
	return value.FromDense(b, d.Certificate.Digits), nil
}

var equations = []*value.Builtin{
	{
		Name: "solve", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.AMatrix, Doc: "p×q"}, {Name: "b", Shape: value.AMatrix, Doc: "p×k"}},
		Result: "matrix q×k", Summary: "the solution of A·x = b; says when it is least squares",
		Doc:      "Exact for exact data with a solution; where it is not unique the one with the free unknowns zero is given and a note says so. An exact system without a solution, and every floating one that is not square and regular, is solved in least squares, with a note.",
		Examples: []value.Example{{Input: "solve([[1, 2], [3, 4]], [5, 6])", Output: "=\n  -4\n   4.5"}},
		Errors:   []string{"sizes that do not agree"}, Source: "Higham 2002, Accuracy and Stability of Numerical Algorithms, ch. 12 and 20", SeeAlso: []string{"inverse", "kernel"},
		Func: solve,
	},
	{
		Name: "sylvester", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.ASquare, Doc: "n×n"}, {Name: "B", Shape: value.ASquare, Doc: "m×m"}, {Name: "C", Shape: value.AMatrix, Doc: "n×m"}},
		Result: "matrix n×m", Summary: "the solution X of A·X + X·B = C",
		Doc: "Schur forms and a recursive triangular solve; the error estimate uses the separation of A and −B.", Examples: []value.Example{{Input: "sylvester([[1]], [[2]], [[6]])", Output: "≈\n  2.0000"}},
		Errors: []string{"A and −B with a common eigenvalue, named"}, Source: "Bartels & Stewart 1972; Jonsson & Kågström 2002, ACM TOMS 28", SeeAlso: []string{"lyapunov"},
		Func: func(c *value.Call) (value.Value, error) {
			a, b, q := c.Matrix("A"), c.Matrix("B"), c.Matrix("C")
			n, _ := a.Dims()
			m, _ := b.Dims()
			if r, k := q.Dims(); r != n || k != m {
				return nil, value.Errf(diag.Shape, "C", "A is %d×%d and B is %d×%d: C must be %d×%d and is %d×%d", n, n, m, m, n, m, r, k)
			}
			if err := allReal(a, b, q); err != nil {
				return nil, err
			}
			x, err := numeric.Sylvester(c.Context, a.Dense(), b.Dense(), q.Dense())
			if err != nil {
				return nil, system.Refused(err, "A")
			}
			return certified(c, value.FromDense(x.X, x.Certificate.Digits), x.Certificate, a, b, q), nil
		},
	},
	{
		Name: "lyapunov", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.ASquare, Doc: "n×n"}, {Name: "Q", Shape: value.ASquare, Doc: "n×n"}, {Name: "sampled", Shape: value.ABoolean, Named: true, Optional: true, Default: "false", Doc: "the discrete equation"}},
		Result: "matrix n×n", Summary: "the solution X of A·X + X·Aᵀ + Q = 0, or A·X·Aᵀ − X + Q = 0",
		Doc: "With sampled: true the second. Schur form and a recursive triangular solve; the error estimate uses the separation.", Examples: []value.Example{{Input: "lyapunov([[-1]], [[4]])", Output: "≈\n  2.0000"}},
		Errors: []string{"eigenvalues λ, μ of A with λ + μ = 0 (λ·μ = 1 when sampled), named"}, Source: "Bartels & Stewart 1972; Kitagawa 1977, Int. J. Control 25", SeeAlso: []string{"sylvester", "riccati", "noise_gain"},
		Func: func(c *value.Call) (value.Value, error) {
			a, q := c.Matrix("A"), c.Matrix("Q")
			n, _ := a.Dims()
			if r, _ := q.Dims(); r != n {
				return nil, value.Errf(diag.Shape, "Q", "A is %d×%d and Q is %d×%d", n, n, r, r)
			}
			if err := allReal(a, q); err != nil {
				return nil, err
			}
			x, err := numeric.Lyapunov(c.Context, a.Dense(), q.Dense(), c.Truth("sampled"))
			if err != nil {
				return nil, system.Refused(err, "A")
			}
			return certified(c, value.FromDense(x.X, x.Certificate.Digits), x.Certificate, a, q), nil
		},
	},
}

func allReal(ms ...*value.Matrix) error {
	for _, m := range ms {
		if m.IsComplex() {
			return diag.New(diag.Type, "the matrices must be real")
		}
	}
	return nil
}

// certified passes on the certificate's notes and adds what the data's own uncertainty makes of the result.
func certified(c *value.Call, x *value.Matrix, cert numeric.Certificate, data ...*value.Matrix) *value.Matrix {
	for _, n := range cert.Notes {
		c.Note(n)
	}
	rel := 0.0
	for _, m := range data {
		rel += relativeOf(m)
	}
	if rel > 0 {
		re, _ := x.Floats()
		big := 0.0
		for _, v := range re {
			big = math.Max(big, math.Abs(v))
		}
		x.Err += big * rel * math.Max(1, cert.Condition)
	}
	return x
}

func solve(c *value.Call) (value.Value, error) {
	a, b := c.Matrix("A"), c.Matrix("b")
	p, q := a.Dims()
	r, k := b.Dims()
	if r != p {
		return nil, value.Errf(diag.Shape, "b", "A is %d×%d and b is %d×%d: b needs %d rows", p, q, r, k, p)
	}
	if err := allReal(a, b); err != nil {
		return nil, err
	}
	if system.AllExact(a, b) && q <= 2*system.ExactOrder {
		if x, done, err := exactSolution(c, a, b); done {
			return x, err
		}
	}
	if p == 0 || q == 0 || k == 0 {
		return system.Zero(q, k), nil
	}
	s, err := numeric.Solve(a.Dense(), b.Dense())
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	if s.Kind != "unique" {
		c.Note(fmt.Sprintf("the solution is %s: rank %d of %d unknowns, misfit %.1e of b", s.Kind, s.Rank, q, s.Misfit))
	}
	return certified(c, value.FromDense(s.X, s.Certificate.Digits), s.Certificate, a, b), nil
}
