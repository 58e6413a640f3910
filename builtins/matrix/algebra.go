package matrix

import (
	"math"
	"math/big"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

func whole(name, doc string) value.Param {
	return value.Param{Name: name, Shape: value.AWhole, Doc: doc}
}

func any1(name string, shape value.Shape, doc string) []value.Param {
	return []value.Param{{Name: name, Shape: shape, Doc: doc}}
}

// entryCap bounds what identity, filled and kronecker make; value.CheckSize decides.
func sized(rows, cols int, param string) error {
	if rows < 0 || cols < 0 {
		return value.Errf(diag.Shape, param, "a size cannot be negative")
	}
	if err := value.CheckSize(rows, cols, true); err != nil {
		if d, ok := err.(*diag.Error); ok {
			return d.For(param)
		}
		return err
	}
	return nil
}

// wholeArg reads a whole number that must fit the machine.
func wholeArg(c *value.Call, name string) (int, error) {
	f := c.Number(name).Float64()
	if math.Abs(f) > 1e9 {
		return 0, value.Errf(diag.Limit, name, "%g is too large", f)
	}
	return int(f), nil
}

var algebra = []*value.Builtin{
	{
		Name: "trace", Family: "matrix", Params: any1("A", value.ASquare, "n×n"), Result: "number", Summary: "the sum of the diagonal entries",
		Doc: "Exact for an exact matrix.", Examples: []value.Example{{Input: "trace([[1, 2], [3, 4]])", Output: "= 5"}},
		Errors: []string{"a matrix that is not square"}, Source: "definition", SeeAlso: []string{"determinant"},
		Func: func(c *value.Call) (value.Value, error) {
			m := c.Matrix("A")
			n, _ := m.Dims()
			var sum value.Value = value.Int(0)
			for i := range n {
				var err error
				if sum, err = value.Add(sum, m.At(i, i)); err != nil {
					return nil, err
				}
			}
			return sum, nil
		},
	},
	{
		Name: "determinant", Family: "matrix", Params: any1("A", value.ASquare, "n×n"), Result: "number", Summary: "the determinant; exact for an exact matrix",
		Doc: "Exact: fraction-free elimination (Bareiss). Floating: LU with the error estimate that the condition gives.", Examples: []value.Example{{Input: "determinant([[1, 2], [3, 4]])", Output: "= -2"}},
		Errors: []string{"a matrix that is not square"}, Source: "Bareiss 1968, Mathematics of Computation 22", SeeAlso: []string{"rank", "inverse"},
		Func: determinant,
	},
	{
		Name: "inverse", Family: "matrix", Params: any1("A", value.Anything, "n×n, or a one-by-one system"), Result: "matrix n×n", Summary: "the inverse, also written A^-1; exact for an exact matrix",
		Doc: "Prefer solve(A, b) where a product with the inverse is wanted.", Examples: []value.Example{{Input: "inverse([[1, 2], [3, 4]])", Output: "=\n  -2      1\n   1.5   -0.5"}},
		Errors: []string{"a singular matrix"}, Source: "Bareiss 1968; Higham 2002, Accuracy and Stability of Numerical Algorithms", SeeAlso: []string{"solve", "determinant"},
		Func: func(c *value.Call) (value.Value, error) { return value.Power(plainValues(c.Args["A"]), value.Int(-1)) },
	},
	{
		Name: "rank", Family: "matrix", Params: any1("A", value.AMatrix, "p×q"), Result: "number; of a floating matrix a note shows the threshold and the gap", Summary: "the rank; exact for an exact matrix",
		Doc: "Floating: singular values above max(p, q)·2⁻⁵²·σ₁ count; the note shows the values on both sides of the threshold.", Examples: []value.Example{{Input: "rank([[1, 2], [2, 4]])", Output: "= 1"}},
		Errors: []string{"entries that are not finite"}, Source: "Bareiss 1968; Golub & Van Loan 2013, Matrix Computations, 5.5", SeeAlso: []string{"kernel", "singular_values"},
		Func: rank,
	},
	{
		Name: "norm", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.AMatrix, Doc: "a matrix or vector"}, {Name: "kind", Shape: value.AChoice, Choices: []string{"1", "2", "infinity", "frobenius"}, Optional: true, Default: "\"2\"", Doc: "which"}},
		Result: "number", Summary: "a norm of a matrix or vector", Doc: "\"1\" largest column sum, \"infinity\" largest row sum (both exact for exact data), \"2\" largest singular value, \"frobenius\" root of the sum of squares.",
		Examples: []value.Example{{Input: "norm([[3], [4]])", Output: "≈ 5.0000"}},
		Errors:   []string{"entries that are not finite"}, Source: "definition", SeeAlso: []string{"condition", "singular_values"},
		Func: norm,
	},
	{
		Name: "condition", Family: "matrix", Params: any1("A", value.AMatrix, "p×q"), Result: "number", Summary: "the condition number σ₁/σₙ; its decades are digits lost",
		Doc: "In the 2-norm. Infinite for a singular matrix.", Examples: []value.Example{{Input: "condition(identity(3))", Output: "≈ 1.0000"}},
		Errors: []string{"entries that are not finite"}, Source: "Golub & Van Loan 2013, 2.6", SeeAlso: []string{"norm", "singular_values"},
		Func: func(c *value.Call) (value.Value, error) {
			k, cert, err := numeric.ConditionNumber(real2(c.Matrix("A")))
			if err != nil {
				return nil, system.Refused(err, "A")
			}
			return value.FloatErr(k, k*math.Pow(10, -cert.Digits)), nil
		},
	},
	{
		Name: "singular_values", Family: "matrix", Params: any1("A", value.AMatrix, "p×q"), Result: "list, largest first", Summary: "the singular values",
		Doc: "Each with the error that rounding the largest makes.", Examples: []value.Example{{Input: "singular_values([[3, 0], [0, 4]])", Output: "≈ [4.0000, 3.0000]"}},
		Errors: []string{"entries that are not finite"}, Source: "Golub & Kahan 1965, SIAM J. Numerical Analysis 2", SeeAlso: []string{"norm", "condition", "rank"},
		Func: singularValues,
	},
	{
		Name: "exponential", Family: "matrix", Params: any1("A", value.ASquare, "n×n"), Result: "matrix n×n", Summary: "the matrix exponential e^A",
		Doc: "Scaling and squaring with bounds from norms of powers; the diagonal of triangular matrices is recomputed. Exact only for a zero or an exactly nilpotent matrix.", Examples: []value.Example{{Input: "exponential([[0, 1], [0, 0]])", Output: "=\n  1   1\n  0   1"}},
		Errors: []string{"a matrix that is not square", "overflow"}, Source: "Al-Mohy & Higham 2009, SIAM J. Matrix Analysis 31", SeeAlso: []string{"exp", "sampled"},
		Func: exponential,
	},
	{
		Name: "eigenvectors", Family: "matrix", Params: any1("A", value.ASquare, "n×n"), Result: "matrix n×n, a column an eigenvalue in the order of eigenvalues(A)", Summary: "unit eigenvectors as columns",
		Doc: "Floating, complex where the eigenvalues are. A note gives the condition of the matrix of vectors: when it is large they are nearly dependent.", Examples: []value.Example{{Input: "abs(eigenvectors([[2, 0], [0, 1]]))", Output: "≈\n  0        1.0000\n  1.0000   0"}},
		Errors: []string{"a matrix that is not square"}, Source: "Francis 1961; conditions: Wilkinson 1965", SeeAlso: []string{"eigenvalues", "modes"},
		Func: eigenvectors,
	},
}

// real2 gives a real matrix, or of a complex one the real matrix of twice the size with the same singular values (each twice).
func real2(m *value.Matrix) *mat.Dense {
	if !m.IsComplex() {
		return m.Dense()
	}
	r, c := m.Dims()
	re, im := m.Floats()
	d := mat.NewDense(2*r, 2*c, nil)
	for i := range r {
		for j := range c {
			x, y := re[i*c+j], im[i*c+j]
			d.Set(i, j, x)
			d.Set(r+i, c+j, x)
			d.Set(i, c+j, -y)
			d.Set(r+i, j, y)
		}
	}
	return d
}

func determinant(c *value.Call) (value.Value, error) {
	m := c.Matrix("A")
	n, _ := m.Dims()
	if n == 0 {
		return value.Int(1), nil
	}
	if system.AllExact(m) {
		d, err := m.Exact().Determinant()
		if err != nil {
			return nil, value.Errf(diag.Limit, "A", "%v", err)
		}
		return value.Rat(d), nil
	}
	if m.IsComplex() {
		return complexDeterminant(m), nil
	}
	var lu mat.LU
	d := m.Dense()
	if err := numeric.Finite("A", d); err != nil {
		return nil, value.Errf(diag.Numerical, "A", "%v", err)
	}
	lu.Factorize(d)
	det := lu.Det()
	// relative error of the determinant: n·(rounding + data)·κ, to first order
	rounding := float64(n) * (0x1p-52 + relativeOf(m))
	size := math.Abs(det)
	switch {
	case math.IsInf(det, 0):
		return nil, value.Errf(diag.Numerical, "A", "the determinant is larger than 1.8e308, the largest floating number")
	case det == 0: // what rounding leaves open, by Hadamard's bound
		size = rounding
		for i := range n {
			size *= mat.Norm(d.RowView(i), 2)
		}
		return value.FloatErr(0, size), nil
	}
	return value.FloatErr(det, size*math.Min(rounding*math.Max(1, lu.Cond()), 1e30)), nil
}

func relativeOf(m *value.Matrix) float64 {
	if m.Err == 0 {
		return 0
	}
	return math.Pow(10, -m.Digits())
}

// complexDeterminant eliminates with partial pivoting.
func complexDeterminant(m *value.Matrix) value.Value {
	n, _ := m.Dims()
	re, im := m.Floats()
	a := make([]complex128, n*n)
	for i := range a {
		a[i] = complex(re[i], im[i])
	}
	det, err := eliminate(n, a)
	return value.Complex{C: det, Err: err + m.Err}
}

func rank(c *value.Call) (value.Value, error) {
	m := c.Matrix("A")
	if system.AllExact(m) {
		return value.Int(m.Exact().Rank()), nil
	}
	half := 1
	if m.IsComplex() {
		half = 2
	}
	d, err := numeric.Rank(real2(m))
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	c.Note(rankNote(d))
	return value.Int(d.Rank / half), nil
}

func norm(c *value.Call) (value.Value, error) {
	m := c.Matrix("A")
	kind := c.Text("kind", "2")
	r, k := m.Dims()
	if kind == "1" || kind == "infinity" {
		outer, inner := k, r
		if kind == "infinity" {
			outer, inner = r, k
		}
		var best value.Value = value.Int(0)
		for i := range outer {
			var sum value.Value = value.Int(0)
			for j := range inner {
				x := m.At(j, i)
				if kind == "infinity" {
					x = m.At(i, j)
				}
				a, err := value.Abs(x)
				if err != nil {
					return nil, err
				}
				if sum, err = value.Add(sum, a); err != nil {
					return nil, err
				}
			}
			var err error
			if best, err = value.Max(best, sum); err != nil {
				return nil, err
			}
		}
		return best, nil
	}
	x, cert, err := numeric.Norm(real2(m), kind)
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	if m.IsComplex() && kind == "frobenius" {
		x /= math.Sqrt2
	}
	return value.FloatErr(x, x*math.Pow(10, -cert.Digits)+m.Err*math.Sqrt(float64(max(r, 1)*max(k, 1)))), nil
}

func singularValues(c *value.Call) (value.Value, error) {
	m := c.Matrix("A")
	s, _, err := numeric.SingularValues(real2(m))
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	r, k := m.Dims()
	step := 1
	if m.IsComplex() {
		step = 2
	}
	l := &value.List{}
	for i := 0; i < len(s); i += step {
		l.Items = append(l.Items, value.FloatErr(s[i], s[0]*0x1p-51*float64(max(r, k))/2+m.Err*math.Sqrt(float64(r*k))))
	}
	return l, nil
}

func exponential(c *value.Call) (value.Value, error) {
	m := c.Matrix("A")
	n, _ := m.Dims()
	if m.IsComplex() {
		return nil, value.Errf(diag.Type, "A", "the exponential of a complex matrix is not offered; use [[real, -imaginary], [imaginary, real]]")
	}
	if m.IsExact() && n <= system.ExactOrder {
		if e := system.NilpotentExponential(m.Exact()); e != nil {
			return value.ExactMatrix(e), nil
		}
	}
	e, cert, err := numeric.Exponential(m.Dense())
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	for _, note := range cert.Notes {
		c.Note(note)
	}
	x := value.FromDense(e, cert.Digits)
	if m.Err > 0 {
		x.Err += mat.Norm(e, 1) * m.Err * float64(n) * math.Max(1, cert.Condition)
	}
	if m.IsExact() {
		x.Err += roundingInExponential(m, e)
	}
	return x, nil
}

// roundingInExponential estimates how far e = exp(A) is off because the exact entries of A were rounded to
// binary64: the same rounding, a thousand times as large, is put on A once more.
func roundingInExponential(m *value.Matrix, e *mat.Dense) float64 {
	const times = 1 << 10
	n, _ := m.Dims()
	a, rounded := m.Dense(), false
	for i := range n {
		for j := range n {
			d := new(big.Rat).SetFloat64(a.At(i, j))
			if d.Sub(m.Exact().At(i, j), d).Sign() != 0 {
				f, _ := d.Float64()
				a.Set(i, j, a.At(i, j)+times*f)
				rounded = true
			}
		}
	}
	if !rounded {
		return 0
	}
	moved, _, err := numeric.Exponential(a)
	if err != nil {
		return 0
	}
	moved.Sub(moved, e)
	return 2 * math.Max(math.Abs(mat.Max(moved)), math.Abs(mat.Min(moved))) / times
}

func eigenvectors(c *value.Call) (value.Value, error) {
	m := c.Matrix("A")
	n, _ := m.Dims()
	if m.IsComplex() {
		return nil, value.Errf(diag.Type, "A", "eigenvectors of complex matrices are not offered")
	}
	if n == 0 {
		return system.Zero(0, 0), nil
	}
	roots, err := system.Eigenvalues(m)
	if err != nil {
		return nil, err
	}
	e, err := numeric.Eigen(m.Dense())
	if err != nil {
		return nil, system.Refused(err, "A")
	}
	used := make([]bool, n)
	re, im := make([]float64, n*n), make([]float64, n*n)
	for j, r := range roots {
		best := -1
		for k, v := range e.Values {
			if !used[k] && (best < 0 || distance(v, r.Value) < distance(e.Values[best], r.Value)) {
				best = k
			}
		}
		used[best] = true
		for i := range n {
			x := e.Right.At(i, best)
			re[i*n+j], im[i*n+j] = real(x), imag(x)
		}
	}
	if e.VectorCondition > 1e4 {
		c.Note("the eigenvectors are nearly dependent: their condition is " + short(e.VectorCondition))
	}
	worst := 0.0
	for i := range e.Condition {
		worst = math.Max(worst, e.Condition[i])
	}
	return value.FloatComplexMatrix(n, n, re, im, math.Min(1, worst*0x1p-50+worst*relativeOf(m))), nil
}
