package exact

import (
	"math/big"
	"math/bits"
)

// Add gives m + b.
func (m *Matrix) Add(b *Matrix) (*Matrix, error) {
	if m.rows != b.rows || m.cols != b.cols {
		return nil, sizeError("addition", m, b)
	}
	return m.combine(b, func(x, y *big.Rat) *big.Rat {
		switch {
		case x.Sign() == 0:
			return y
		case y.Sign() == 0:
			return x
		}
		return tidy(new(big.Rat).Add(x, y))
	}), nil
}

// Sub gives m − b.
func (m *Matrix) Sub(b *Matrix) (*Matrix, error) {
	if m.rows != b.rows || m.cols != b.cols {
		return nil, sizeError("subtraction", m, b)
	}
	return m.combine(b, func(x, y *big.Rat) *big.Rat {
		if y.Sign() == 0 {
			return x
		}
		return tidy(new(big.Rat).Sub(x, y))
	}), nil
}

// Hadamard gives the entry-by-entry product.
func (m *Matrix) Hadamard(b *Matrix) (*Matrix, error) {
	if m.rows != b.rows || m.cols != b.cols {
		return nil, sizeError("the entry-by-entry product", m, b)
	}
	if m.MaxBits()+b.MaxBits() > LargestBits {
		return nil, ErrTooLarge
	}
	return m.combine(b, ratProduct), nil
}

func (m *Matrix) combine(b *Matrix, f func(x, y *big.Rat) *big.Rat) *Matrix {
	out := &Matrix{m.rows, m.cols, make([]*big.Rat, len(m.data))}
	for k, x := range m.data {
		out.data[k] = f(x, b.data[k])
	}
	return out
}

func ratProduct(x, y *big.Rat) *big.Rat {
	if x.Sign() == 0 || y.Sign() == 0 {
		return ratZero
	}
	return new(big.Rat).Mul(x, y)
}

// Scale gives factor·m.
func (m *Matrix) Scale(factor *big.Rat) *Matrix {
	return m.combine(m, func(x, _ *big.Rat) *big.Rat { return ratProduct(x, factor) })
}

// Neg gives −m.
func (m *Matrix) Neg() *Matrix {
	return m.combine(m, func(x, _ *big.Rat) *big.Rat {
		if x.Sign() == 0 {
			return x
		}
		return new(big.Rat).Neg(x)
	})
}

// Transpose gives mᵀ.
func (m *Matrix) Transpose() *Matrix {
	t := &Matrix{m.cols, m.rows, make([]*big.Rat, len(m.data))}
	for i := range m.rows {
		for j := range m.cols {
			t.data[j*t.cols+i] = m.data[i*m.cols+j]
		}
	}
	return t
}

// Mul gives the matrix product m·b. Inner sums are formed over the integers,
// rows of m and columns of b cleared of denominators, so that each entry is
// reduced once.
func (m *Matrix) Mul(b *Matrix) (*Matrix, error) {
	if m.cols != b.rows {
		return nil, sizeError("the product", m, b)
	}
	if m.MaxBits()+b.MaxBits() > LargestBits {
		return nil, ErrTooLarge
	}
	if !m.clearable() || !b.Transpose().clearable() {
		return nil, ErrTooLarge
	}
	left, leftDen := clearRows(m)
	right, rightDen := clearRows(b.Transpose())
	out := NewMatrix(m.rows, b.cols)
	var sum, term, den big.Int
	for i := range m.rows {
		x := left[i*m.cols : (i+1)*m.cols]
		for j := range b.cols {
			y := right[j*b.rows : (j+1)*b.rows]
			sum.SetInt64(0)
			for k := range x {
				if len(x[k].Bits()) != 0 && len(y[k].Bits()) != 0 {
					sum.Add(&sum, term.Mul(&x[k], &y[k]))
				}
			}
			out.data[i*b.cols+j] = fraction(&sum, den.Mul(&leftDen[i], &rightDen[j]))
		}
	}
	return out, nil
}

// clearable tells whether rows cleared of their denominators stay within
// LargestBits; short entries need no look at their denominators.
func (m *Matrix) clearable() bool {
	if m.MaxBits()*m.cols <= LargestBits {
		return true
	}
	var den big.Int
	for i := range m.rows {
		if !boundedDenominator(&den, m.data[i*m.cols:(i+1)*m.cols], LargestBits) {
			return false
		}
	}
	return true
}

// fraction copies num/den into a reduced rational.
func fraction(num, den *big.Int) *big.Rat {
	if num.Sign() == 0 {
		return ratZero
	}
	if den.IsInt64() && den.Int64() == 1 {
		return new(big.Rat).SetInt(num)
	}
	return new(big.Rat).SetFrac(num, den)
}

// Trace gives the sum of the diagonal of a square matrix.
func (m *Matrix) Trace() (*big.Rat, error) {
	if m.rows != m.cols {
		return nil, sizeError("the trace", m, nil)
	}
	sum := new(big.Rat)
	for i := range m.rows {
		sum.Add(sum, m.At(i, i))
	}
	return sum, nil
}

// Power gives mᵏ of a square matrix; negative k goes through the inverse and
// may return ErrSingular. m⁰ is the identity.
func (m *Matrix) Power(k int) (*Matrix, error) {
	if m.rows != m.cols {
		return nil, sizeError("a power", m, nil)
	}
	base := m
	exponent := uint64(max(k, 0))
	if k < 0 {
		inverse, err := m.Inverse()
		if err != nil {
			return nil, err
		}
		base, exponent = inverse, uint64(-(int64(k)+1))+1
	}
	result := Identity(m.rows)
	for position := bits.Len64(exponent) - 1; position >= 0; position-- {
		var err error
		if result, err = result.Mul(result); err != nil {
			return nil, err
		}
		if exponent>>uint(position)&1 == 1 {
			if result, err = result.Mul(base); err != nil {
				return nil, err
			}
		}
	}
	return result, nil
}

// Stack puts a above b.
func Stack(a, b *Matrix) (*Matrix, error) {
	if a.cols != b.cols {
		return nil, sizeError("stacking", a, b)
	}
	data := append(append(make([]*big.Rat, 0, len(a.data)+len(b.data)), a.data...), b.data...)
	return &Matrix{a.rows + b.rows, a.cols, data}, nil
}

// Augment puts b to the right of a.
func Augment(a, b *Matrix) (*Matrix, error) {
	if a.rows != b.rows {
		return nil, sizeError("setting side by side", a, b)
	}
	out := &Matrix{a.rows, a.cols + b.cols, make([]*big.Rat, 0, len(a.data)+len(b.data))}
	for i := range a.rows {
		out.data = append(out.data, a.data[i*a.cols:(i+1)*a.cols]...)
		out.data = append(out.data, b.data[i*b.cols:(i+1)*b.cols]...)
	}
	return out, nil
}

// Kronecker gives the Kronecker product m ⊗ b, of size (rows·rows)×(columns·columns).
func (m *Matrix) Kronecker(b *Matrix) (*Matrix, error) {
	if m.MaxBits()+b.MaxBits() > LargestBits || len(m.data)*len(b.data) > 1<<24 {
		return nil, ErrTooLarge
	}
	out := NewMatrix(m.rows*b.rows, m.cols*b.cols)
	for i := range m.rows {
		for j := range m.cols {
			x := m.At(i, j)
			if x.Sign() == 0 {
				continue
			}
			for k := range b.rows {
				for l := range b.cols {
					out.data[(i*b.rows+k)*out.cols+j*b.cols+l] = ratProduct(x, b.At(k, l))
				}
			}
		}
	}
	return out, nil
}

// must is for products and sums whose shapes and sizes the caller has settled.
func must(m *Matrix, err error) *Matrix {
	if err != nil {
		panic(err)
	}
	return m
}
