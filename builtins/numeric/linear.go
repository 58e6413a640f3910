package numeric

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// LinearSolution is a solution of A·X = B.
type LinearSolution struct {
	X *mat.Dense
	// Kind is "unique" for a square regular A; "least squares" when ‖A·X − B‖ is
	// smallest but not zero to rounding; "one of many" when A·X = B holds and X
	// is the solution of smallest norm; "least squares, one of many" when both.
	Kind string
	// Rank of A, with the decision behind it when A is not square and regular.
	Rank int
	// Misfit is the Frobenius norm of B − A·X, relative to that of B.
	Misfit      float64
	Certificate Certificate
}

// Solve solves A·X = B for A m×n and B m×k; nothing passed in is changed. A
// square A that is regular to rounding goes through LU with refinement on
// residuals in doubled precision; any other through the singular value
// decomposition, and Kind says what was found. It errs on wrong shapes and on
// entries that are not finite.
//
// N. J. Higham, Accuracy and Stability of Numerical Algorithms, 2002, chapters
// 12 (refinement, componentwise condition) and 20 (least squares).
func Solve(a, b *mat.Dense) (*LinearSolution, error) {
	m, n := sizeOf(a)
	rows, k := sizeOf(b)
	if err := Finite("A", a); err != nil {
		return nil, err
	}
	if err := Finite("B", b); err != nil {
		return nil, err
	}
	if rows != m {
		return nil, fmt.Errorf("A is %d×%d and B is %d×%d; they must have as many rows", m, n, rows, k)
	}
	if m == 0 || n == 0 || k == 0 {
		return &LinearSolution{X: &mat.Dense{}, Kind: "unique", Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	if m == n {
		if s := solveRegular(a, b); s != nil {
			return s, nil
		}
	}
	return solveLeastSquares(a, b)
}

// factored is an LU factorisation of a row- and column-scaled matrix,
// R·A·C = P·L·U, with powers of two in R and C.
type factored struct {
	n            int
	lu           []float64
	pivots       []int
	rows, column []float64
}

// factorSquare scales and factors; ok is false when a pivot vanishes.
func factorSquare(a *mat.Dense) (f *factored, ok bool) {
	n, _ := a.Dims()
	f = &factored{n: n, lu: entriesOf(a), pivots: make([]int, n), rows: make([]float64, n), column: make([]float64, n)}
	for i := 0; i < n; i++ {
		f.rows[i] = powerOfTwoBelow(largestOf(f.lu[i*n : (i+1)*n]))
		for j := 0; j < n; j++ {
			f.lu[i*n+j] *= f.rows[i]
		}
	}
	for j := 0; j < n; j++ {
		largest := 0.0
		for i := 0; i < n; i++ {
			largest = math.Max(largest, math.Abs(f.lu[i*n+j]))
		}
		f.column[j] = powerOfTwoBelow(largest)
		for i := 0; i < n; i++ {
			f.lu[i*n+j] *= f.column[j]
		}
	}
	return f, kernels.Dgetrf(n, n, f.lu, n, f.pivots)
}

// powerOfTwoBelow is the power of two that brings x into [1/2, 1), 1 for 0.
func powerOfTwoBelow(x float64) float64 {
	if x == 0 {
		return 1
	}
	_, e := math.Frexp(x)
	return math.Ldexp(1, -max(min(e, 1000), -1000))
}

// solve overwrites the n×k row-major b with A⁻¹·b, or A⁻ᵀ·b when trans.
func (f *factored) solve(trans bool, k int, b []float64) {
	before, after, op := f.rows, f.column, blas.NoTrans
	if trans {
		before, after, op = f.column, f.rows, blas.Trans
	}
	for i := range b {
		b[i] *= before[i/k]
	}
	kernels.Dgetrs(op, f.n, k, f.lu, f.n, f.pivots, b, k)
	for i := range b {
		b[i] *= after[i/k]
	}
}

// normInverse estimates ‖ |A⁻¹|·w ‖∞ for w ≥ 0.
func (f *factored) normInverse(w []float64) float64 {
	weigh := func(x []float64) {
		for i := range x {
			x[i] *= w[i]
		}
	}
	return estimateOneNorm(f.n, func(x []float64) {
		f.solve(true, 1, x)
		weigh(x)
	}, func(x []float64) {
		weigh(x)
		f.solve(false, 1, x)
	})
}

// solveRegular gives nil when A is singular to rounding.
func solveRegular(a, b *mat.Dense) *LinearSolution {
	n, k := b.Dims()
	f, ok := factorSquare(a)
	if !ok {
		return nil
	}
	entries, right := entriesOf(a), entriesOf(b)
	x := append([]float64(nil), right...)
	f.solve(false, k, x)
	if largestOf(x) == math.Inf(1) || math.IsNaN(largestOf(x)) {
		return nil
	}
	left, previous := exactMatrix(n, n, entries), math.Inf(1)
	var residual []float64
	for round := 0; round < 6; round++ {
		r := newDoubled(n, k)
		r.addMatrix(1, exactMatrix(n, k, right))
		r.addProduct(-1, left, exactMatrix(n, k, x).transpose())
		residual = r.rounded()
		step := append([]float64(nil), residual...)
		f.solve(false, k, step)
		change := ratio(largestOf(step), largestOf(x))
		if !(change < previous/2) {
			if round == 1 || !(change < 0.1) {
				// Not contracting at all: A is singular to rounding.
				if change > 0.1 {
					return nil
				}
			}
			break
		}
		previous = change
		for i := range x {
			x[i] += step[i]
		}
	}
	s := &LinearSolution{X: mat.NewDense(n, k, x), Kind: "unique", Rank: n}
	s.Misfit = ratio(frobenius(residual), frobenius(right))
	weight := absolute(right)
	multiply(blas.NoTrans, blas.NoTrans, n, k, n, 1, absolute(entries), n, absolute(x), k, 1, weight, k)
	s.Certificate = squareCertificate(f, k, x, residual, weight)
	if s.Certificate.Digits == 0 {
		return nil
	}
	return s
}

// squareCertificate estimates the error column by column and keeps the worst.
func squareCertificate(f *factored, k int, x, residual, weight []float64) Certificate {
	n := f.n
	c := Certificate{Method: "LU with refinement in doubled precision", Residual: ratio(largestOf(residual), largestOf(weight))}
	w := make([]float64, n)
	worst := 0.0
	for j := 0; j < k; j++ {
		for i := 0; i < n; i++ {
			w[i] = math.Abs(residual[i*k+j]) + 2*unitRoundoff*weight[i*k+j]
		}
		worst = math.Max(worst, f.normInverse(w))
	}
	size := largestOf(x)
	c.Condition = ratio(worst, size*(c.Residual+2*unitRoundoff))
	c.Digits = digitsOfError(worst, size)
	return c
}

// decomposition is A = U·diag(σ)·Vᵀ, thin, row-major.
type decomposition struct {
	m, n, k int
	sigma   []float64
	u, vt   []float64
}

// decompose computes the thin or full singular value decomposition of a copy.
func decompose(a *mat.Dense, job lapack.SVDJob) (*decomposition, error) {
	m, n := a.Dims()
	d := &decomposition{m: m, n: n, k: min(m, n)}
	work := mat.DenseCopyOf(a)
	exponent := scaleToUnitRange(work.RawMatrix().Data)
	ucols, vrows := d.k, d.k
	if job == lapack.SVDAll {
		ucols, vrows = m, n
	}
	d.sigma, d.u, d.vt = make([]float64, d.k), make([]float64, m*ucols), make([]float64, vrows*n)
	query := make([]float64, 1)
	run := func(space []float64, size int) bool {
		return recovered(func() bool {
			return kernels.Dgesvd(job, job, m, n, work.RawMatrix().Data, n, d.sigma, d.u, ucols, d.vt, n, space, size)
		})
	}
	run(query, -1)
	space := make([]float64, max(int(query[0]), 1))
	if !run(space, len(space)) {
		return nil, errNotConverged
	}
	for i := range d.sigma {
		d.sigma[i] = math.Ldexp(d.sigma[i], exponent)
	}
	return d, nil
}

// solveLeastSquares gives the solution of smallest norm among those of smallest
// residual.
func solveLeastSquares(a, b *mat.Dense) (*LinearSolution, error) {
	m, n := a.Dims()
	_, k := b.Dims()
	d, err := decompose(a, lapack.SVDStore)
	if err != nil {
		return nil, err
	}
	decision := decideRank(m, n, d.sigma)
	r := decision.Rank
	right := entriesOf(b)
	x := make([]float64, n*k)
	if r > 0 {
		coefficients := make([]float64, r*k)
		multiply(blas.Trans, blas.NoTrans, r, k, m, 1, d.u, d.k, right, k, 0, coefficients, k)
		for i := 0; i < r; i++ {
			for j := 0; j < k; j++ {
				coefficients[i*k+j] /= d.sigma[i]
			}
		}
		multiply(blas.Trans, blas.NoTrans, n, k, r, 1, d.vt, n, coefficients, k, 0, x, k)
	}
	residual := newDoubled(m, k)
	residual.addMatrix(1, exactMatrix(m, k, right))
	residual.addProduct(-1, exactMatrix(m, n, entriesOf(a)), exactMatrix(n, k, x).transpose())
	misfit := frobenius(residual.rounded())
	s := &LinearSolution{X: mat.NewDense(n, k, x), Rank: r, Misfit: ratio(misfit, frobenius(right)), Kind: "unique"}
	s.Certificate = Certificate{Method: "singular value decomposition"}
	sizeX, sizeA := frobenius(x), 0.0
	if r > 0 {
		sizeA = d.sigma[0]
	}
	fits := misfit <= 100*float64(m+n)*unitRoundoff*(frobenius(right)+sizeA*sizeX)
	switch {
	case r < n && fits:
		s.Kind = "one of many"
	case r < n:
		s.Kind = "least squares, one of many"
	case !fits:
		s.Kind = "least squares"
	}
	if m == n && r < n {
		s.Certificate.note("A is singular to rounding: its rank is %d of %d", r, n)
	}
	if r > 0 && sizeX > 0 {
		kappa := d.sigma[0] / d.sigma[r-1]
		spread := (frobenius(right) + misfit) / (sizeA * sizeX)
		s.Certificate.Condition = kappa*(1+spread) + kappa*kappa*misfit/(sizeA*sizeX)
		s.Certificate.Digits = DigitsOf(unitRoundoff*math.Sqrt(float64(m+n)), s.Certificate.Condition*sizeX/math.Max(largestOf(x), sizeX/float64(n*k)))
		s.Certificate.Residual = misfit / (frobenius(right) + sizeA*sizeX)
	} else {
		s.Certificate.Digits = mostDigits
	}
	return s, nil
}

// ErrSingular is what Inverse returns for a matrix that is singular to rounding.
var ErrSingular = errors.New("the matrix is singular, to rounding")

// Inverse computes A⁻¹ with refinement; it errs with ErrSingular when A is
// singular to rounding, and on input that is not square or not finite.
func Inverse(a *mat.Dense) (*mat.Dense, Certificate, error) {
	if err := squareAndFinite("the matrix", a); err != nil {
		return nil, Certificate{}, err
	}
	n, _ := sizeOf(a)
	if n == 0 {
		return &mat.Dense{}, Certificate{Method: "empty", Digits: mostDigits}, nil
	}
	identity := mat.NewDense(n, n, nil)
	for i := 0; i < n; i++ {
		identity.Set(i, i, 1)
	}
	s := solveRegular(a, identity)
	if s == nil {
		return nil, Certificate{}, ErrSingular
	}
	return s.X, s.Certificate, nil
}

// Determinant computes det A by LU; 1 for 0×0. It is 0 with no digits when a
// pivot vanishes, and ±Inf or 0 with a note when it leaves the range of
// binary64. The condition number is Σ|A⁻¹|ᵢⱼ|A|ⱼᵢ: what relative changes of the
// entries do to the determinant.
func Determinant(a *mat.Dense) (float64, Certificate, error) {
	if err := squareAndFinite("the matrix", a); err != nil {
		return 0, Certificate{}, err
	}
	n, _ := sizeOf(a)
	c := Certificate{Method: "LU", Digits: mostDigits, Condition: 1}
	if n == 0 {
		return 1, c, nil
	}
	f, ok := factorSquare(a)
	if !ok {
		c.Condition, c.Digits = math.Inf(1), 0
		c.note("the matrix is singular, to rounding")
		return 0, c, nil
	}
	mantissa, exponent := 1.0, 0
	for i := 0; i < n; i++ {
		fraction, e := math.Frexp(f.lu[i*n+i])
		_, er := math.Frexp(f.rows[i])
		_, ec := math.Frexp(f.column[i])
		var carry int
		mantissa, carry = math.Frexp(mantissa * fraction)
		exponent += e + carry - (er - 1) - (ec - 1)
		if f.pivots[i] != i {
			mantissa = -mantissa
		}
	}
	inverse := make([]float64, n*n)
	for i := 0; i < n; i++ {
		inverse[i*n+i] = 1
	}
	f.solve(false, n, inverse)
	sum := 0.0
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			sum += math.Abs(inverse[i*n+j] * a.At(j, i))
		}
	}
	c.Condition = sum
	c.Digits = DigitsOf(unitRoundoff*math.Sqrt(float64(n)), sum)
	value := math.Ldexp(mantissa, exponent)
	if value == 0 || math.IsInf(value, 0) {
		c.note("the determinant is about %.6g·2^%d, beyond the range of binary64", mantissa, exponent)
	}
	return value, c, nil
}
