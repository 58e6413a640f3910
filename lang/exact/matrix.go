package exact

import (
	"fmt"
	"math"
	"math/big"
)

// Matrix is a rectangular array of rationals. The zero value is the 0×0 matrix.
type Matrix struct {
	rows, cols int
	data       []*big.Rat // row-major; entries are shared between matrices and never modified
}

// Shared constants; every zero entry points to the same number.
var (
	ratZero = new(big.Rat)
	ratOne  = big.NewRat(1, 1)
	intOne  = big.NewInt(1)
)

// NewMatrix gives the r×c zero matrix. Negative sizes count as zero.
func NewMatrix(r, c int) *Matrix {
	r, c = max(r, 0), max(c, 0)
	m := &Matrix{rows: r, cols: c, data: make([]*big.Rat, r*c)}
	for i := range m.data {
		m.data[i] = ratZero
	}
	return m
}

// FromRows copies rows of equal length. Nil entries are refused.
func FromRows(rows [][]*big.Rat) (*Matrix, error) {
	if len(rows) == 0 {
		return NewMatrix(0, 0), nil
	}
	m := NewMatrix(len(rows), len(rows[0]))
	for i, row := range rows {
		if len(row) != m.cols {
			return nil, fmt.Errorf("rows of unequal length: row 1 has %d entries, row %d has %d", m.cols, i+1, len(row))
		}
		for j, x := range row {
			if x == nil {
				return nil, fmt.Errorf("entry [%d, %d] is missing", i+1, j+1)
			}
			m.Set(i, j, x)
		}
	}
	return m, nil
}

// FromFloats takes r·c binary64 numbers, row-major, at their exact values.
// Infinities and not-a-numbers are refused.
func FromFloats(r, c int, data []float64) (*Matrix, error) {
	if r < 0 || c < 0 || len(data) != r*c {
		return nil, fmt.Errorf("%d numbers do not fill a matrix of size %d×%d", len(data), r, c)
	}
	m := NewMatrix(r, c)
	for k, x := range data {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return nil, fmt.Errorf("entry [%d, %d] is not a finite number", k/c+1, k%c+1)
		}
		m.data[k] = tidy(new(big.Rat).SetFloat64(x))
	}
	return m, nil
}

// FromIntegers takes r·c whole numbers, row-major.
func FromIntegers(r, c int, data ...int64) (*Matrix, error) {
	if r < 0 || c < 0 || len(data) != r*c {
		return nil, fmt.Errorf("%d numbers do not fill a matrix of size %d×%d", len(data), r, c)
	}
	m := NewMatrix(r, c)
	for k, x := range data {
		m.data[k] = tidy(new(big.Rat).SetInt64(x))
	}
	return m, nil
}

// Column copies a list of numbers into an n×1 matrix.
func Column(entries ...*big.Rat) *Matrix {
	m := NewMatrix(len(entries), 1)
	for i, x := range entries {
		m.Set(i, 0, x)
	}
	return m
}

// Identity gives the n×n identity matrix.
func Identity(n int) *Matrix {
	m := NewMatrix(n, n)
	for i := range m.rows {
		m.data[i*n+i] = ratOne
	}
	return m
}

// Diagonal gives the square matrix with the given numbers on its diagonal.
func Diagonal(entries ...*big.Rat) *Matrix {
	n := len(entries)
	m := NewMatrix(n, n)
	for i, x := range entries {
		m.Set(i, i, x)
	}
	return m
}

// Dims gives the numbers of rows and columns.
func (m *Matrix) Dims() (rows, columns int) { return m.rows, m.cols }

// At gives the entry in row i and column j, counted from 0. It is shared and
// must not be modified. Indices out of range panic.
func (m *Matrix) At(i, j int) *big.Rat {
	m.check(i, j)
	return m.data[i*m.cols+j]
}

// Set stores a copy of x. It is meant for filling a matrix that nobody else holds yet.
func (m *Matrix) Set(i, j int, x *big.Rat) {
	m.check(i, j)
	m.data[i*m.cols+j] = tidy(new(big.Rat).Set(x))
}

func (m *Matrix) check(i, j int) {
	if i < 0 || i >= m.rows || j < 0 || j >= m.cols {
		panic(fmt.Sprintf("exact: index [%d, %d] outside a matrix of size %d×%d", i+1, j+1, m.rows, m.cols))
	}
}

// tidy replaces the common values by shared constants, so that large sparse
// matrices stay small and comparisons with zero are quick.
func tidy(x *big.Rat) *big.Rat {
	if x.Sign() == 0 {
		return ratZero
	}
	return x
}

// Clone copies the matrix so that Set may be used on the copy.
func (m *Matrix) Clone() *Matrix {
	return &Matrix{m.rows, m.cols, append([]*big.Rat(nil), m.data...)}
}

// Slice copies rows r0 ≤ i < r1 and columns c0 ≤ j < c1. Bounds out of range panic.
func (m *Matrix) Slice(r0, r1, c0, c1 int) *Matrix {
	if r0 < 0 || r1 > m.rows || r0 > r1 || c0 < 0 || c1 > m.cols || c0 > c1 {
		panic(fmt.Sprintf("exact: slice [%d:%d, %d:%d] of a matrix of size %d×%d", r0, r1, c0, c1, m.rows, m.cols))
	}
	s := &Matrix{r1 - r0, c1 - c0, make([]*big.Rat, 0, (r1-r0)*(c1-c0))}
	for i := r0; i < r1; i++ {
		s.data = append(s.data, m.data[i*m.cols+c0:i*m.cols+c1]...)
	}
	return s
}

// Columns copies the columns with the given indices, in the given order.
func (m *Matrix) Columns(indices ...int) *Matrix {
	s := NewMatrix(m.rows, len(indices))
	for i := range m.rows {
		for k, j := range indices {
			s.data[i*s.cols+k] = m.At(i, j)
		}
	}
	return s
}

// Rows copies the rows with the given indices, in the given order.
func (m *Matrix) Rows(indices ...int) *Matrix {
	s := NewMatrix(len(indices), m.cols)
	for k, i := range indices {
		copy(s.data[k*s.cols:(k+1)*s.cols], m.data[i*m.cols:(i+1)*m.cols])
	}
	return s
}

// Float64 gives the entries row-major, each rounded to the nearest binary64
// number; magnitudes beyond the largest one become infinite.
func (m *Matrix) Float64() []float64 {
	out := make([]float64, len(m.data))
	for k, x := range m.data {
		out[k], _ = x.Float64()
	}
	return out
}

// Equal compares shapes and entries.
func (m *Matrix) Equal(other *Matrix) bool {
	if m.rows != other.rows || m.cols != other.cols {
		return false
	}
	for k, x := range m.data {
		if x != other.data[k] && x.Cmp(other.data[k]) != 0 {
			return false
		}
	}
	return true
}

// IsZero tells whether every entry is zero (true for matrices without entries).
func (m *Matrix) IsZero() bool {
	for _, x := range m.data {
		if x.Sign() != 0 {
			return false
		}
	}
	return true
}

// MaxBits gives the largest bit length of a numerator or denominator.
func (m *Matrix) MaxBits() int {
	bits := 0
	for _, x := range m.data {
		bits = max(bits, ratBits(x))
	}
	return bits
}

func ratBits(x *big.Rat) int {
	if x.Sign() == 0 {
		return 1
	}
	return max(x.Num().BitLen(), x.Denom().BitLen())
}

// String shows the fractions, for messages of tests.
func (m *Matrix) String() string {
	s := "["
	for i := range m.rows {
		if i > 0 {
			s += ", "
		}
		s += "["
		for j := range m.cols {
			if j > 0 {
				s += ", "
			}
			s += m.At(i, j).RatString()
		}
		s += "]"
	}
	return s + "]"
}
