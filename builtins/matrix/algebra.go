package matrix

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
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

var builders = []*value.Builtin{
	{
		Name: "identity", Family: "matrix", Params: []value.Param{whole("n", "how many rows and columns")},
		Result: "matrix n×n", Summary: "the identity matrix", Doc: "Exact.",
		Examples: []value.Example{{Input: "identity(2)", Output: "=\n  1   0\n  0   1"}},
		Errors:   []string{"a negative or too large n"}, Source: "definition", SeeAlso: []string{"filled", "diagonal"},
		Func: func(c *value.Call) (value.Value, error) {
			n, err := wholeArg(c, "n")
			if err != nil {
				return nil, err
			}
			if err := sized(n, n, "n"); err != nil {
				return nil, err
			}
			return system.Identity(n), nil
		},
	},
	{
		Name: "filled", Family: "matrix",
		Params: []value.Param{{Name: "x", Shape: value.AReal, Doc: "the entry"},
			{Name: "rows", Shape: value.AWhole, Named: true, Doc: "how many rows"}, {Name: "columns", Shape: value.AWhole, Named: true, Doc: "how many columns"}},
		Result: "matrix", Summary: "a matrix with all entries equal", Doc: "Exact when the entry is.",
		Examples: []value.Example{{Input: "filled(0, rows: 2, columns: 3)", Output: "=\n  0   0   0\n  0   0   0"}},
		Errors:   []string{"a negative or too large size"}, Source: "definition", SeeAlso: []string{"identity"},
		Func: filled,
	},
	{
		Name: "diagonal", Family: "matrix", Params: any1("entries", value.Anything, "a list of numbers or a vector; of a square matrix its diagonal is taken"),
		Result: "matrix n×n, or a list", Summary: "a diagonal matrix of entries, or the diagonal of a matrix", Doc: "Exact when the entries are.",
		Examples: []value.Example{{Input: "diagonal([1, 2])", Output: "=\n  1   0\n  0   2"}},
		Errors:   []string{"entries that are no numbers"}, Source: "definition", SeeAlso: []string{"identity", "trace"},
		Func: diagonal,
	},
	{
		Name: "row", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.AMatrix, Doc: "a matrix"}, whole("i", "from 1")},
		Result: "matrix with one row", Summary: "a row of a matrix", Doc: "Rows are counted from 1.",
		Examples: []value.Example{{Input: "row([[1, 2], [3, 4]], 2)", Output: "=\n  3   4"}},
		Errors:   []string{"a row that is not there"}, Source: "definition", SeeAlso: []string{"column"},
		Func: func(c *value.Call) (value.Value, error) { return slice(c, "i", true) },
	},
	{
		Name: "column", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.AMatrix, Doc: "a matrix"}, whole("j", "from 1")},
		Result: "matrix with one column", Summary: "a column of a matrix", Doc: "Columns are counted from 1.",
		Examples: []value.Example{{Input: "column([[1, 2], [3, 4]], 2)", Output: "=\n  2\n  4"}},
		Errors:   []string{"a column that is not there"}, Source: "definition", SeeAlso: []string{"row"},
		Func: func(c *value.Call) (value.Value, error) { return slice(c, "j", false) },
	},
	{
		Name: "size", Family: "matrix", Params: any1("A", value.Anything, "a matrix, list, plant or transfer function"),
		Result: "list of numbers", Summary: "rows and columns of a matrix, or the length of a list", Doc: "Of a plant: outputs, inputs and states.",
		Examples: []value.Example{{Input: "size([[1, 2, 3]])", Output: "= [1, 3]"}},
		Errors:   []string{"a value without a size"}, Source: "definition", SeeAlso: []string{"row", "column"},
		Func: size,
	},
	{
		Name: "transpose", Family: "matrix", Params: any1("A", value.Anything, "a matrix, a system or a list"),
		Result: "as A", Summary: "the transpose, also written Aᵀ", Doc: "Of a plant the dual system: (Aᵀ, Cᵀ, Bᵀ, Dᵀ).",
		Examples: []value.Example{{Input: "transpose([[1, 2], [3, 4]])", Output: "=\n  1   3\n  2   4"}},
		Errors:   []string{"a value that has no transpose"}, Source: "definition", SeeAlso: []string{"inverse"},
		Func: func(c *value.Call) (value.Value, error) { return value.Transpose(c.Args["A"]) },
	},
	{
		Name: "hadamard", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.AMatrix, Doc: "p×q"}, {Name: "B", Shape: value.AMatrix, Doc: "p×q"}},
		Result: "matrix p×q", Summary: "the product entry by entry", Doc: "A*B is the matrix product; this is the other one.",
		Examples: []value.Example{{Input: "hadamard([[1, 2]], [[3, 4]])", Output: "=\n  3   8"}},
		Errors:   []string{"sizes that differ"}, Source: "definition", SeeAlso: []string{"kronecker"},
		Func: func(c *value.Call) (value.Value, error) {
			a, b := c.Matrix("A"), c.Matrix("B")
			r, k := a.Dims()
			r2, k2 := b.Dims()
			if r != r2 || k != k2 {
				return nil, value.Errf(diag.Shape, "B", "A is %d×%d and B is %d×%d; entry by entry needs equal sizes", r, k, r2, k2)
			}
			return entrywise(r, k, func(i, j int) (value.Value, error) { return value.Multiply(a.At(i, j), b.At(i, j)) })
		},
	},
	{
		Name: "kronecker", Family: "matrix", Params: []value.Param{{Name: "A", Shape: value.AMatrix, Doc: "p×q"}, {Name: "B", Shape: value.AMatrix, Doc: "r×s"}},
		Result: "matrix pr×qs", Summary: "the Kronecker product: blocks a·B for each entry a of A", Doc: "Exact for exact data.",
		Examples: []value.Example{{Input: "kronecker([[1, 2]], [[1], [1]])", Output: "=\n  1   2\n  1   2"}},
		Errors:   []string{"a result that is too large"}, Source: "definition", SeeAlso: []string{"hadamard"},
		Func: func(c *value.Call) (value.Value, error) {
			a, b := c.Matrix("A"), c.Matrix("B")
			p, q := a.Dims()
			r, s := b.Dims()
			if err := sized(p*r, q*s, "B"); err != nil {
				return nil, err
			}
			return entrywise(p*r, q*s, func(i, j int) (value.Value, error) { return value.Multiply(a.At(i/r, j/s), b.At(i%r, j%s)) })
		},
	},
}

// entrywise makes a matrix of numbers given one by one.
func entrywise(r, c int, at func(i, j int) (value.Value, error)) (value.Value, error) {
	if r == 0 || c == 0 {
		return system.Zero(r, c), nil
	}
	rows := make([][]value.Entry, r)
	for i := range r {
		for j := range c {
			x, err := at(i, j)
			if err != nil {
				return nil, err
			}
			rows[i] = append(rows[i], value.Entry{Value: x})
		}
	}
	m, _, err := value.MatrixLiteral(rows)
	return m, err
}

func filled(c *value.Call) (value.Value, error) {
	r, err := wholeArg(c, "rows")
	if err != nil {
		return nil, err
	}
	k, err := wholeArg(c, "columns")
	if err != nil {
		return nil, err
	}
	if err := sized(r, k, "rows"); err != nil {
		return nil, err
	}
	x := c.Number("x")
	if x.IsExact() {
		m := exact.NewMatrix(r, k)
		for i := range r {
			for j := range k {
				m.Set(i, j, x.Exact)
			}
		}
		return value.ExactMatrix(m), nil
	}
	data := make([]float64, r*k)
	for i := range data {
		data[i] = x.F
	}
	return value.FloatMatrix(r, k, data, x.Err), nil
}

func diagonal(c *value.Call) (value.Value, error) {
	v := c.Args["entries"]
	if m, ok := v.(*value.Matrix); ok {
		r, k := m.Dims()
		if r == k && r > 1 {
			l := &value.List{}
			for i := range r {
				l.Items = append(l.Items, m.At(i, i))
			}
			return l, nil
		}
		if r == 1 && k > 1 {
			t, err := system.Transpose(m)
			if err != nil {
				return nil, err
			}
			v = t
		}
	}
	coerced, err := value.Coerce(value.Param{Name: "entries", Shape: value.AVector}, v)
	if err != nil {
		return nil, err
	}
	x := coerced.(*value.Matrix)
	n, _ := x.Dims()
	if err := sized(n, n, "entries"); err != nil {
		return nil, err
	}
	return entrywise(n, n, func(i, j int) (value.Value, error) {
		if i == j {
			return x.At(i, 0), nil
		}
		return value.Int(0), nil
	})
}

func slice(c *value.Call, param string, rows bool) (value.Value, error) {
	m := c.Matrix("A")
	k, err := wholeArg(c, param)
	if err != nil {
		return nil, err
	}
	r, cols := m.Dims()
	what, n := "column", cols
	if rows {
		what, n = "row", r
	}
	if k < 1 || k > n {
		return nil, value.Errf(diag.Shape, param, "there is no %s %d; the matrix is %d×%d", what, k, r, cols)
	}
	if rows {
		return entrywise(1, cols, func(_, j int) (value.Value, error) { return m.At(k-1, j), nil })
	}
	return entrywise(r, 1, func(i, _ int) (value.Value, error) { return m.At(i, k-1), nil })
}

func size(c *value.Call) (value.Value, error) {
	numbers := func(ns ...int) *value.List {
		l := &value.List{}
		for _, n := range ns {
			l.Items = append(l.Items, value.Int(n))
		}
		return l
	}
	switch v := c.Args["A"].(type) {
	case *value.List:
		return numbers(len(v.Items)), nil
	case *value.Matrix:
		r, k := v.Dims()
		return numbers(r, k), nil
	case *value.Gain:
		r, k := v.Values.Dims()
		return numbers(r, k), nil
	case *value.Transfer:
		if len(v.Entries) == 0 {
			return numbers(0, 0), nil
		}
		return numbers(len(v.Entries), len(v.Entries[0])), nil
	case *value.Plant, *value.Model:
		p, err := value.ToPlant(v)
		if err != nil {
			return nil, err
		}
		n, m := system.PlantSize(p)
		outs, _ := p.C.Dims()
		return numbers(outs, m, n), nil
	case value.Number, value.Complex:
		return numbers(1, 1), nil
	}
	return nil, value.Errf(diag.Type, "A", "%s has no size", value.Describe(c.Args["A"]))
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
	rel := float64(n) * (0x1p-52 + relativeOf(m)) * math.Max(1, lu.Cond())
	return value.FloatErr(det, math.Abs(det)*math.Min(rel, 1e30)), nil
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
	return x, nil
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
