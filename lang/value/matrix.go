package value

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/lang/exact"
)

// Matrix is a matrix of numbers, real or complex, exact or floating. Zero-sized shapes
// are legal. Rows and Columns name them for display; either may be nil.
type Matrix struct {
	rows, cols int
	exactRe    *exact.Matrix // nil when floating
	exactIm    *exact.Matrix // nil when real or floating
	re, im     []float64     // row-major; of an exact matrix filled on first use of Floats
	Err        float64       // absolute error estimate of the largest entry; 0 when exact
	FromExact  bool          // floating only because exact numbers would have grown too large
	Rows       []string
	Columns    []string
}

// Kind tells the kind.
func (*Matrix) Kind() Kind { return KMatrix }

// ExactMatrix wraps an exact real matrix; m must not change afterwards.
func ExactMatrix(m *exact.Matrix) *Matrix {
	r, c := m.Dims()
	return &Matrix{rows: r, cols: c, exactRe: m}
}

// ExactComplexMatrix wraps an exact complex matrix given by its real and imaginary parts of equal size.
func ExactComplexMatrix(re, im *exact.Matrix) *Matrix {
	m := ExactMatrix(re)
	if !im.IsZero() {
		m.exactIm = im
	}
	return m
}

// FloatMatrix wraps row-major data with an absolute error estimate; data must not change afterwards.
func FloatMatrix(r, c int, data []float64, err float64) *Matrix {
	return &Matrix{rows: r, cols: c, re: data, Err: err}
}

// FloatComplexMatrix wraps row-major real and imaginary parts; an all-zero im makes the matrix real.
func FloatComplexMatrix(r, c int, re, im []float64, err float64) *Matrix {
	m := FloatMatrix(r, c, re, err)
	for _, x := range im {
		if x != 0 {
			m.im = im
			break
		}
	}
	return m
}

// FromDense copies a gonum matrix; digits is how many significant digits of the largest entry hold.
func FromDense(d mat.Matrix, digits float64) *Matrix {
	r, c := d.Dims()
	data := make([]float64, r*c)
	largest := 0.0
	for i := range r {
		for j := range c {
			v := d.At(i, j)
			data[i*c+j] = v
			largest = math.Max(largest, math.Abs(v))
		}
	}
	return FloatMatrix(r, c, data, largest*math.Pow(10, -digits))
}

// Dims gives the numbers of rows and columns.
func (m *Matrix) Dims() (rows, cols int) { return m.rows, m.cols }

// IsExact tells whether the entries are exact.
func (m *Matrix) IsExact() bool { return m.exactRe != nil }

// IsComplex tells whether an imaginary part is not zero.
func (m *Matrix) IsComplex() bool { return m.exactIm != nil || m.im != nil }

// Exact gives the exact real part, or nil for a floating matrix.
func (m *Matrix) Exact() *exact.Matrix { return m.exactRe }

// ExactImaginary gives the exact imaginary part, or nil.
func (m *Matrix) ExactImaginary() *exact.Matrix { return m.exactIm }

// Floats gives the nearest binary64 entries, row-major; im is nil for a real matrix. They must not be changed.
func (m *Matrix) Floats() (re, im []float64) {
	re, im = m.re, m.im
	if m.exactRe != nil {
		re = m.exactRe.Float64()
		if m.exactIm != nil {
			im = m.exactIm.Float64()
		}
	}
	return re, im
}

// Dense copies the real part into a gonum matrix; an empty matrix gives an empty *mat.Dense.
func (m *Matrix) Dense() *mat.Dense {
	if m.rows == 0 || m.cols == 0 {
		return &mat.Dense{}
	}
	re, _ := m.Floats()
	return mat.NewDense(m.rows, m.cols, append([]float64(nil), re...))
}

// At gives an entry (from 0) as a Number or a Complex.
func (m *Matrix) At(i, j int) Value {
	k := i*m.cols + j
	switch {
	case m.exactIm != nil && m.exactIm.At(i, j).Sign() != 0:
		return Complex{ExactRe: m.exactRe.At(i, j), ExactIm: m.exactIm.At(i, j)}
	case m.exactRe != nil:
		return Rat(m.exactRe.At(i, j))
	case m.im != nil && m.im[k] != 0:
		return Complex{C: complex(m.re[k], m.im[k]), Err: m.Err}
	}
	return FloatErr(m.re[k], m.Err)
}

// Digits is how many significant digits of the largest entry hold; +Inf when exact.
func (m *Matrix) Digits() float64 {
	if m.exactRe != nil {
		return math.Inf(1)
	}
	largest := 0.0
	for k := range m.re {
		largest = math.Max(largest, math.Abs(m.re[k]))
		if m.im != nil {
			largest = math.Max(largest, math.Abs(m.im[k]))
		}
	}
	return digits(largest, m.Err)
}
