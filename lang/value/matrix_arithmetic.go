package value

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// Bounds on the number of entries of a matrix, exact and floating.
const (
	MostExactEntries    = 250_000
	MostFloatingEntries = 4_000_000
)

// largestExactWork bounds the multiplications of numbers of one word that exact matrix
// arithmetic may take (a few seconds); beyond it the result turns floating.
const largestExactWork = 20_000_000

// CheckSize refuses matrices that are too large to hold.
func CheckSize(rows, cols int, isExact bool) error {
	most := MostFloatingEntries
	if isExact {
		most = MostExactEntries
	}
	if rows < 0 || cols < 0 {
		return diag.New(diag.Shape, "a matrix cannot have the size %s", sizeText(rows, cols))
	}
	if cols > 0 && rows > most/cols {
		kind := "floating"
		if isExact {
			kind = "exact"
		}
		return diag.New(diag.Limit, "a matrix of size %s is too large: at most %d %s entries", sizeText(rows, cols), most, kind)
	}
	return nil
}

// exactLimit turns the errors of exact arithmetic into ones for users.
func exactLimit(err error) error {
	switch {
	case err == nil:
		return nil
	case errors.Is(err, exact.ErrTooLarge):
		return tooManyBits()
	case errors.Is(err, exact.ErrZeroDivision):
		return divisionByZero()
	case errors.Is(err, exact.ErrSingular):
		return diag.New(diag.Numerical, "%s", err)
	}
	e := diag.New(diag.Internal, "%s", err)
	e.Cause = err
	return e
}

// imaginary gives the exact imaginary part, a zero matrix for a real one.
func (m *Matrix) imaginary() *exact.Matrix {
	if m.exactIm != nil {
		return m.exactIm
	}
	return exact.NewMatrix(m.rows, m.cols)
}

// bits is the largest bit length of an exact matrix.
func (m *Matrix) bits() int {
	n := m.exactRe.MaxBits()
	if m.exactIm != nil {
		n = max(n, m.exactIm.MaxBits())
	}
	return n
}

// floatsErr gives the entries and the error estimate that rounding them to binary64 adds.
func (m *Matrix) floatsErr() (re, im []float64, err float64) {
	re, im = m.Floats()
	if m.exactRe == nil {
		return re, im, m.Err
	}
	for k, x := range re {
		e := 0.0
		if _, same := m.exactRe.At(k/m.cols, k%m.cols).Float64(); !same {
			e = ulp(x)
		}
		if im != nil {
			e += ulp(im[k])
		}
		err = math.Max(err, e)
	}
	return re, im, err
}

// Floating gives the matrix rounded to binary64, its names kept.
func (m *Matrix) Floating() *Matrix {
	if m.exactRe == nil {
		return m
	}
	re, im, err := m.floatsErr()
	f := FloatComplexMatrix(m.rows, m.cols, re, im, err)
	f.Rows, f.Columns = m.Rows, m.Columns
	return f
}

func largest(data []float64) float64 {
	most := 0.0
	for _, x := range data {
		most = math.Max(most, math.Abs(x))
	}
	return most
}

// settled checks a floating result and adds the rounding of its entries to the error.
func settled(r, c int, re, im []float64, err float64) (*Matrix, error) {
	for _, part := range [...][]float64{re, im} {
		for _, x := range part {
			if math.IsNaN(x) {
				return nil, notANumber()
			}
			if math.IsInf(x, 0) {
				return nil, overflow()
			}
		}
	}
	return FloatComplexMatrix(r, c, re, im, err+ulp(largest(re))+ulp(largest(im))), nil
}

func addMatrices(a, b *Matrix) (*Matrix, error) {
	if a.rows != b.rows || a.cols != b.cols {
		return nil, sizesClash("adding", a, b)
	}
	if a.IsExact() && b.IsExact() {
		if a.bits()+b.bits() > LargestBits {
			return nil, tooManyBits()
		}
		re, err := a.exactRe.Add(b.exactRe)
		if err != nil || a.exactIm == nil && b.exactIm == nil {
			return wrapExact(re, nil, err)
		}
		im, err := a.imaginary().Add(b.imaginary())
		return wrapExact(re, im, err)
	}
	re, im, ea := a.floatsErr()
	re2, im2, eb := b.floatsErr()
	return settled(a.rows, a.cols, addSlices(re, re2), addSlices(im, im2), ea+eb)
}

func wrapExact(re, im *exact.Matrix, err error) (*Matrix, error) {
	if err != nil {
		return nil, exactLimit(err)
	}
	if im == nil {
		return ExactMatrix(re), nil
	}
	return ExactComplexMatrix(re, im), nil
}

// addSlices adds entry by entry; nil counts as zeros.
func addSlices(a, b []float64) []float64 {
	if a == nil {
		return b
	}
	if b == nil {
		return a
	}
	out := make([]float64, len(a))
	for k := range a {
		out[k] = a[k] + b[k]
	}
	return out
}

func negateMatrix(m *Matrix) *Matrix {
	if m.IsExact() {
		if m.exactIm == nil {
			return ExactMatrix(m.exactRe.Neg())
		}
		return ExactComplexMatrix(m.exactRe.Neg(), m.exactIm.Neg())
	}
	return FloatComplexMatrix(m.rows, m.cols, scaleSlice(m.re, -1), scaleSlice(m.im, -1), m.Err)
}

// scaleSlice multiplies; a zero never gets a sign.
func scaleSlice(a []float64, factor float64) []float64 {
	if a == nil {
		return nil
	}
	out := make([]float64, len(a))
	for k, x := range a {
		out[k] = factor*x + 0
	}
	return out
}

func transposeMatrix(m *Matrix) *Matrix {
	var out *Matrix
	switch {
	case m.exactIm != nil:
		out = ExactComplexMatrix(m.exactRe.Transpose(), m.exactIm.Transpose())
	case m.exactRe != nil:
		out = ExactMatrix(m.exactRe.Transpose())
	default:
		out = FloatComplexMatrix(m.cols, m.rows, transposeSlice(m.re, m.rows, m.cols), transposeSlice(m.im, m.rows, m.cols), m.Err)
	}
	out.Rows, out.Columns = m.Columns, m.Rows
	return out
}

func transposeSlice(a []float64, r, c int) []float64 {
	if a == nil {
		return nil
	}
	out := make([]float64, len(a))
	for i := range r {
		for j := range c {
			out[j*r+i] = a[i*c+j]
		}
	}
	return out
}

// exactWork estimates the word multiplications of count products of numbers with the given bits.
func exactWork(count float64, bits int) float64 {
	words := 1 + float64(bits)/64
	return count * math.Pow(words, 1.6)
}

func multiplyMatrices(a, b *Matrix) (*Matrix, error) {
	if a.cols != b.rows {
		return nil, sizesClash("the product", a, b)
	}
	bothExact := a.IsExact() && b.IsExact()
	if err := CheckSize(a.rows, b.cols, bothExact); err != nil {
		return nil, err
	}
	if bothExact {
		if a.bits()+b.bits() > LargestBits {
			return nil, tooManyBits()
		}
		count := float64(a.rows) * float64(a.cols) * float64(b.cols)
		if exactWork(count, max(a.bits(), b.bits())) <= largestExactWork {
			return multiplyExact(a, b)
		}
	}
	out, err := multiplyFloating(a, b)
	if err == nil && bothExact {
		out.FromExact = true
	}
	return out, err
}

func multiplyExact(a, b *Matrix) (*Matrix, error) {
	re, err := a.exactRe.Mul(b.exactRe)
	if err != nil || a.exactIm == nil && b.exactIm == nil {
		return wrapExact(re, nil, err)
	}
	p, err1 := a.imaginary().Mul(b.imaginary())
	q, err2 := a.exactRe.Mul(b.imaginary())
	r, err3 := a.imaginary().Mul(b.exactRe)
	if err := errors.Join(err1, err2, err3); err != nil {
		return nil, exactLimit(err)
	}
	re, err1 = re.Sub(p)
	im, err2 := q.Add(r)
	return wrapExact(re, im, errors.Join(err1, err2))
}

// multiplyFloating bounds the error of the largest entry: |A||δB| + |δA||B| through row
// sums of A and column sums of B, and n+1 roundings of the inner sums (Higham, Accuracy
// and Stability of Numerical Algorithms, 2002, section 3.5).
func multiplyFloating(a, b *Matrix) (*Matrix, error) {
	re, im, ea := a.floatsErr()
	re2, im2, eb := b.floatsErr()
	rowSum := math.Max(largestRowSum(re, a.rows, a.cols), 0) + largestRowSum(im, a.rows, a.cols)
	colSum := largestColumnSum(re2, b.rows, b.cols) + largestColumnSum(im2, b.rows, b.cols)
	most, most2 := largest(re)+largest(im), largest(re2)+largest(im2)
	err := rowSum*eb + colSum*ea + float64(a.cols)*ea*eb
	err += float64(a.cols+1) * 0x1p-53 * math.Min(rowSum*most2, most*colSum)
	product := func(x, y []float64, sign float64, into []float64) []float64 {
		if x == nil || y == nil {
			return into
		}
		if into == nil {
			into = make([]float64, a.rows*b.cols)
		}
		gemm(sign, x, y, into, a.rows, a.cols, b.cols)
		return into
	}
	outRe := product(im, im2, -1, product(re, re2, 1, make([]float64, a.rows*b.cols)))
	outIm := product(im, re2, 1, product(re, im2, 1, nil))
	return settled(a.rows, b.cols, outRe, outIm, err)
}

// gemm adds sign·x·y to out; x is r×n, y is n×c.
func gemm(sign float64, x, y, out []float64, r, n, c int) {
	if r == 0 || n == 0 || c == 0 {
		return
	}
	blas64.Gemm(blas.NoTrans, blas.NoTrans, sign,
		blas64.General{Rows: r, Cols: n, Stride: n, Data: x},
		blas64.General{Rows: n, Cols: c, Stride: c, Data: y}, 1,
		blas64.General{Rows: r, Cols: c, Stride: c, Data: out})
}

func largestRowSum(a []float64, r, c int) float64 {
	most := 0.0
	for i := 0; a != nil && i < r; i++ {
		sum := 0.0
		for _, x := range a[i*c : (i+1)*c] {
			sum += math.Abs(x)
		}
		most = math.Max(most, sum)
	}
	return most
}

func largestColumnSum(a []float64, r, c int) float64 {
	if a == nil {
		return 0
	}
	sums := make([]float64, c)
	for i := range r {
		for j := range c {
			sums[j] += math.Abs(a[i*c+j])
		}
	}
	return largest(sums)
}

// scaleMatrix multiplies by a number, real or complex.
func scaleMatrix(m *Matrix, factor Complex) (*Matrix, error) {
	if m.IsExact() && factor.ExactRe != nil {
		return scaleExact(m, factor)
	}
	re, im, e := m.floatsErr()
	f, ef := factor.approx()
	most := largest(re) + largest(im)
	err := most*ef + (math.Abs(real(f))+math.Abs(imag(f)))*e + e*ef
	outRe, outIm := scaleSlice(re, real(f)), scaleSlice(im, real(f))
	if imag(f) != 0 {
		outIm = addSlices(outIm, scaleSlice(re, imag(f)))
		if im != nil {
			outRe = addSlices(outRe, scaleSlice(im, -imag(f)))
		}
		err += 2 * 0x1p-53 * most * (math.Abs(real(f)) + math.Abs(imag(f)))
	}
	return settled(m.rows, m.cols, outRe, outIm, err)
}

func scaleExact(m *Matrix, factor Complex) (*Matrix, error) {
	if m.bits()+2*complexBits(factor) > LargestBits {
		return nil, tooManyBits()
	}
	re := m.exactRe.Scale(factor.ExactRe)
	if m.exactIm == nil && factor.ExactIm.Sign() == 0 {
		return ExactMatrix(re), nil
	}
	im := m.imaginary()
	re, err1 := re.Sub(im.Scale(factor.ExactIm))
	out, err2 := im.Scale(factor.ExactRe).Add(m.exactRe.Scale(factor.ExactIm))
	return wrapExact(re, out, errors.Join(err1, err2))
}

// IdentityMatrix gives the exact n×n identity.
func IdentityMatrix(n int) *Matrix { return ExactMatrix(exact.Identity(n)) }
