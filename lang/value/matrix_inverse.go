package value

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// Bounds within which an inverse stays exact.
const (
	largestExactInverse = 30
	largestInverseBits  = 60_000 // size × bits of an entry
)

// InvertMatrix gives m⁻¹: exact for an exact matrix up to 30×30, else by LU factorization
// after scaling rows and columns by powers of two. A singular matrix is a Numerical error
// with its rank or its condition number.
func InvertMatrix(m *Matrix) (*Matrix, error) {
	if m.rows != m.cols {
		return nil, diag.New(diag.Shape, "only a square matrix has an inverse; this one is %s", sizeText(m.rows, m.cols))
	}
	n := m.rows
	if n == 0 {
		return m, nil
	}
	if !m.IsExact() {
		return invertFloating(m)
	}
	if n > largestExactInverse || n*m.bits() > largestInverseBits {
		out, err := invertFloating(m.Floating())
		if err == nil {
			out.FromExact = true
		}
		return out, err
	}
	return invertExact(m)
}

func invertExact(m *Matrix) (*Matrix, error) {
	n := m.rows
	whole := m
	if m.exactIm != nil {
		whole = realForm(m)
	}
	inverse, err := whole.exactRe.Inverse()
	if err != nil {
		rank := whole.exactRe.Rank()
		if m.exactIm != nil {
			rank /= 2
		}
		return nil, diag.New(diag.Numerical, "the matrix is singular: its determinant is exactly 0 (rank %d of %d)", rank, n)
	}
	if m.exactIm == nil {
		return ExactMatrix(inverse), nil
	}
	return ExactComplexMatrix(inverse.Slice(0, n, 0, n), inverse.Slice(n, 2*n, 0, n)), nil
}

// realForm gives [[Re, −Im], [Im, Re]], whose inverse has the same form.
func realForm(m *Matrix) *Matrix {
	n := m.rows
	if m.IsExact() {
		wide, negative := exact.NewMatrix(2*n, 2*n), m.exactIm.Neg()
		for i := range n {
			for j := range n {
				wide.Set(i, j, m.exactRe.At(i, j))
				wide.Set(n+i, n+j, m.exactRe.At(i, j))
				wide.Set(n+i, j, m.exactIm.At(i, j))
				wide.Set(i, n+j, negative.At(i, j))
			}
		}
		return ExactMatrix(wide)
	}
	data := make([]float64, 4*n*n)
	for i := range n {
		for j := range n {
			data[i*2*n+j], data[(n+i)*2*n+n+j] = m.re[i*n+j], m.re[i*n+j]
			data[(n+i)*2*n+j], data[i*2*n+n+j] = m.im[i*n+j], -m.im[i*n+j]
		}
	}
	return FloatMatrix(2*n, 2*n, data, m.Err)
}

// invertFloating estimates the error of the largest entry from the condition number κ in
// scaled coordinates: ‖δX‖ ≤ ‖X‖ κ (n u + ‖δA‖/‖A‖) to first order.
func invertFloating(m *Matrix) (*Matrix, error) {
	if m.im != nil {
		wide, err := invertFloating(realForm(m))
		if err != nil {
			return nil, err
		}
		n := m.rows
		re, im := make([]float64, n*n), make([]float64, n*n)
		for i := range n {
			copy(re[i*n:(i+1)*n], wide.re[i*2*n:i*2*n+n])
			copy(im[i*n:(i+1)*n], wide.re[(n+i)*2*n:(n+i)*2*n+n])
		}
		return FloatComplexMatrix(n, n, re, im, wide.Err), nil
	}
	n := m.rows
	if _, err := settled(n, n, m.re, nil, 0); err != nil {
		return nil, err
	}
	rows, cols := equilibrate(m.re, n)
	scaled := make([]float64, n*n)
	relative := 0.0
	for i := range n {
		for j := range n {
			scaled[i*n+j] = math.Ldexp(m.re[i*n+j], rows[i]+cols[j])
			relative = math.Max(relative, math.Ldexp(m.Err, rows[i]+cols[j]))
		}
	}
	norm := largestColumnSum(scaled, n, n)
	var lu mat.LU
	lu.Factorize(mat.NewDense(n, n, scaled))
	condition := lu.Cond()
	backward := float64(n)*0x1p-53 + float64(n)*relative/math.Max(norm, math.SmallestNonzeroFloat64)
	if math.IsNaN(condition) || condition*0x1p-53*4 >= 1 || condition*backward >= 1 && m.Err > 0 {
		return nil, singular(condition)
	}
	inverse := mat.NewDense(n, n, nil)
	if err := lu.SolveTo(inverse, false, identityDense(n)); err != nil {
		if _, ok := err.(mat.Condition); !ok {
			return nil, singular(condition)
		}
	}
	out, worst, size := make([]float64, n*n), math.MinInt, 0.0
	for i := range n {
		for j := range n {
			x := inverse.At(i, j)
			size = math.Max(size, math.Abs(x))
			out[i*n+j] = math.Ldexp(x, cols[i]+rows[j])
			if x != 0 {
				worst = max(worst, cols[i]+rows[j])
			}
		}
	}
	return settled(n, n, out, nil, math.Ldexp(size*condition*backward, worst))
}

func singular(condition float64) error {
	if math.IsInf(condition, 1) || math.IsNaN(condition) {
		return diag.New(diag.Numerical, "the matrix is singular: its condition number is infinite")
	}
	return diag.New(diag.Numerical, "the matrix is singular within its rounding: its condition number is %.2g", condition)
}

func identityDense(n int) *mat.Dense {
	d := mat.NewDense(n, n, nil)
	for i := range n {
		d.Set(i, i, 1)
	}
	return d
}

// equilibrate gives powers of two for rows and columns that bring their largest entries near 1.
func equilibrate(a []float64, n int) (rows, cols []int) {
	rows, cols = make([]int, n), make([]int, n)
	for i := range n {
		if most := largest(a[i*n : (i+1)*n]); most > 0 {
			rows[i] = -math.Ilogb(most)
		}
	}
	for j := range n {
		most := 0.0
		for i := range n {
			most = math.Max(most, math.Ldexp(math.Abs(a[i*n+j]), rows[i]))
		}
		if most > 0 {
			cols[j] = -math.Ilogb(most)
		}
	}
	return rows, cols
}

// powerMatrix gives mᵏ by squaring.
func powerMatrix(m *Matrix, k int) (*Matrix, error) {
	if m.rows != m.cols {
		return nil, diag.New(diag.Shape, "only a square matrix has powers; this one is %s", sizeText(m.rows, m.cols))
	}
	if k < 0 {
		inverse, err := InvertMatrix(m)
		if err != nil || k == -1 {
			return inverse, err
		}
		if k == math.MinInt {
			return nil, diag.New(diag.Limit, "the exponent is too large")
		}
		m, k = inverse, -k
	}
	result := IdentityMatrix(m.rows)
	for base := m; k > 0; k >>= 1 {
		var err error
		if k&1 == 1 {
			if result, err = multiplyMatrices(result, base); err != nil {
				return nil, err
			}
		}
		if k > 1 {
			if base, err = multiplyMatrices(base, base); err != nil {
				return nil, err
			}
		}
	}
	return result, nil
}
