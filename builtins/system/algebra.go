package system

import (
	"math"
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// asMatrix unwraps the result of matrix arithmetic whose shapes the caller has checked.
func asMatrix(v value.Value, err error) (*value.Matrix, error) {
	if err != nil {
		return nil, err
	}
	switch v := v.(type) {
	case *value.Matrix:
		return v, nil
	case value.Number:
		return FromNumber(v), nil
	}
	return nil, diag.New(diag.Internal, "matrix arithmetic gave a %s", v.Kind())
}

// Mul is a·b.
func Mul(a, b *value.Matrix) (*value.Matrix, error) { return asMatrix(value.Multiply(a, b)) }

// Add is a + b.
func Add(a, b *value.Matrix) (*value.Matrix, error) { return asMatrix(value.Add(a, b)) }

// Sub is a − b.
func Sub(a, b *value.Matrix) (*value.Matrix, error) { return asMatrix(value.Subtract(a, b)) }

// Neg is −a.
func Neg(a *value.Matrix) (*value.Matrix, error) { return asMatrix(value.Negate(a)) }

// Inverse is a⁻¹; exact for an exact a.
func Inverse(a *value.Matrix) (*value.Matrix, error) {
	return asMatrix(value.Power(a, value.Int(-1)))
}

// Transpose is aᵀ.
func Transpose(a *value.Matrix) (*value.Matrix, error) { return asMatrix(value.Transpose(a)) }

// Chain runs matrix arithmetic and keeps the first error, so that a formula reads as one.
type Chain struct{ Err error }

func (c *Chain) keep(m *value.Matrix, err error) *value.Matrix {
	if c.Err == nil && err != nil {
		c.Err = err
	}
	if m == nil {
		m = Zero(0, 0)
	}
	return m
}

// Mul is the product of all factors.
func (c *Chain) Mul(a *value.Matrix, more ...*value.Matrix) *value.Matrix {
	for _, b := range more {
		if c.Err != nil {
			return a
		}
		a = c.keep(Mul(a, b))
	}
	return a
}

// Add is a + b.
func (c *Chain) Add(a, b *value.Matrix) *value.Matrix {
	if c.Err != nil {
		return a
	}
	return c.keep(Add(a, b))
}

// Sub is a − b.
func (c *Chain) Sub(a, b *value.Matrix) *value.Matrix {
	if c.Err != nil {
		return a
	}
	return c.keep(Sub(a, b))
}

// Neg is −a.
func (c *Chain) Neg(a *value.Matrix) *value.Matrix {
	if c.Err != nil {
		return a
	}
	return c.keep(Neg(a))
}

// Inverse is a⁻¹.
func (c *Chain) Inverse(a *value.Matrix) *value.Matrix {
	if c.Err != nil {
		return a
	}
	return c.keep(Inverse(a))
}

// Transpose is aᵀ.
func (c *Chain) Transpose(a *value.Matrix) *value.Matrix {
	if c.Err != nil {
		return a
	}
	return c.keep(Transpose(a))
}

// Zero is the exact zero matrix.
func Zero(rows, cols int) *value.Matrix { return value.ExactMatrix(exact.NewMatrix(rows, cols)) }

// Identity is the exact identity matrix.
func Identity(n int) *value.Matrix { return value.ExactMatrix(exact.Identity(n)) }

// FromNumber is a 1×1 matrix.
func FromNumber(n value.Number) *value.Matrix {
	if n.IsExact() {
		m := exact.NewMatrix(1, 1)
		m.Set(0, 0, n.Exact)
		return value.ExactMatrix(m)
	}
	return value.FloatMatrix(1, 1, []float64{n.F}, n.Err)
}

// AllExact tells whether all matrices are exact and real.
func AllExact(ms ...*value.Matrix) bool {
	for _, m := range ms {
		if !m.IsExact() || m.IsComplex() {
			return false
		}
	}
	return true
}

// ExactPlant tells whether exact answers are kept for the plant: exact data of at most ExactOrder states.
func ExactPlant(p *value.Plant) bool {
	n, _ := p.A.Dims()
	return n <= ExactOrder && AllExact(p.A, p.B, p.C, p.D)
}

// Block joins real blocks whose sizes agree along rows and columns into one matrix; exact when all are.
func Block(rows [][]*value.Matrix) *value.Matrix {
	height, width := 0, 0
	all := true
	err := 0.0
	for _, row := range rows {
		r, _ := row[0].Dims()
		height += r
		for _, b := range row {
			all = all && AllExact(b)
			err = math.Max(err, b.Err)
		}
	}
	for _, b := range rows[0] {
		_, c := b.Dims()
		width += c
	}
	if all {
		m := exact.NewMatrix(height, width)
		place(rows, func(i, j int, b *value.Matrix, k, l int) { m.Set(i, j, b.Exact().At(k, l)) })
		return value.ExactMatrix(m)
	}
	data := make([]float64, height*width)
	place(rows, func(i, j int, b *value.Matrix, k, l int) {
		re, _ := b.Floats()
		_, c := b.Dims()
		data[i*width+j] = re[k*c+l]
	})
	return value.FloatMatrix(height, width, data, err)
}

// place visits every entry of a block matrix.
func place(rows [][]*value.Matrix, set func(i, j int, b *value.Matrix, k, l int)) {
	i0 := 0
	for _, row := range rows {
		h, _ := row[0].Dims()
		j0 := 0
		for _, b := range row {
			_, w := b.Dims()
			for k := range h {
				for l := range w {
					set(i0+k, j0+l, b, k, l)
				}
			}
			j0 += w
		}
		i0 += h
	}
}

// Columns picks columns (from 0) of a real matrix.
func Columns(m *value.Matrix, picks ...int) *value.Matrix {
	r, _ := m.Dims()
	return pick(m, seq(r), picks)
}

// RowsOf picks rows (from 0) of a real matrix.
func RowsOf(m *value.Matrix, picks ...int) *value.Matrix {
	_, c := m.Dims()
	return pick(m, picks, seq(c))
}

func seq(n int) []int {
	s := make([]int, n)
	for i := range s {
		s[i] = i
	}
	return s
}

func pick(m *value.Matrix, rows, cols []int) *value.Matrix {
	if AllExact(m) {
		x := exact.NewMatrix(len(rows), len(cols))
		for i, r := range rows {
			for j, c := range cols {
				x.Set(i, j, m.Exact().At(r, c))
			}
		}
		return value.ExactMatrix(x)
	}
	re, _ := m.Floats()
	_, width := m.Dims()
	data := make([]float64, 0, len(rows)*len(cols))
	for _, r := range rows {
		for _, c := range cols {
			data = append(data, re[r*width+c])
		}
	}
	return value.FloatMatrix(len(rows), len(cols), data, m.Err)
}

// Slice is the block of rows [r0, r1) and columns [c0, c1) of a real matrix.
func Slice(m *value.Matrix, r0, r1, c0, c1 int) *value.Matrix {
	rows, cols := make([]int, 0, r1-r0), make([]int, 0, c1-c0)
	for i := r0; i < r1; i++ {
		rows = append(rows, i)
	}
	for j := c0; j < c1; j++ {
		cols = append(cols, j)
	}
	return pick(m, rows, cols)
}

// Rational gives a real matrix over the rationals; binary64 entries are taken as what they are.
func Rational(m *value.Matrix) (*exact.Matrix, error) {
	if m.IsComplex() {
		return nil, diag.New(diag.Type, "the matrix must be real")
	}
	if m.IsExact() {
		return m.Exact(), nil
	}
	r, c := m.Dims()
	re, _ := m.Floats()
	x, err := exact.FromFloats(r, c, re)
	if err != nil {
		return nil, diag.New(diag.Numerical, "%v", err)
	}
	return x, nil
}

// NilpotentExponential is e^A by its finite series, or nil when A is not nilpotent.
func NilpotentExponential(a *exact.Matrix) *exact.Matrix {
	n, _ := a.Dims()
	p := a.CharacteristicPolynomial()
	for _, x := range p.Coefficients()[1:] {
		if x.Sign() != 0 {
			return nil
		}
	}
	sum, term := exact.Identity(n), exact.Identity(n)
	for k := 1; k <= n; k++ {
		next, err := term.Mul(a)
		if err != nil {
			return nil
		}
		if next.IsZero() {
			return sum
		}
		term = next.Scale(big.NewRat(1, int64(k)))
		if sum, err = sum.Add(term); err != nil {
			return nil
		}
	}
	return sum
}
