package matrix

import (
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

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
