package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// Exponential computes e^A of a square n×n matrix by scaling and squaring with
// Padé approximants up to degree 13, the scaling chosen from norms of powers of
// A (A. H. Al-Mohy, N. J. Higham, SIAM J. Matrix Anal. Appl. 31, 2009) after a
// scaling of the states by powers of two. Where A is reducible, the diagonal
// and the couplings of neighbouring states are recomputed in closed form at
// each squaring. The digits are the smaller of two estimates: what a second
// computation with half the step differs by, and what the condition number
// leaves of data rounded to binary64.
//
// It errs when A is not square or not finite, and when e^A (or a power on the
// way to it) exceeds the largest binary64 number. The exponential of a 0×0
// matrix is empty.
func Exponential(a *mat.Dense) (*mat.Dense, Certificate, error) {
	if err := squareAndFinite("A", a); err != nil {
		return nil, Certificate{}, err
	}
	n, _ := sizeOf(a)
	if n == 0 {
		return &mat.Dense{}, Certificate{Method: "empty", Digits: mostDigits}, nil
	}
	result, err := exponentialOf(n, entriesFor(a), []columnGroup{{0, n}}, n)
	if err != nil {
		return nil, Certificate{}, err
	}
	return mat.NewDense(n, n, result.value), result.certificate(0), nil
}

// columnGroup is a range of columns of a result whose error is measured
// relative to its own largest entry.
type columnGroup struct{ from, to int }

// exponentialResult is an exponential with what is known of its error.
type exponentialResult struct {
	value     []float64
	errors    []float64 // for each column group, relative to its largest entry
	condition float64
	method    string
}

func (r *exponentialResult) certificate(group int) Certificate {
	digits := math.Min(DigitsOf(r.errors[group], 1), DigitsOf(unitRoundoff, r.condition))
	c := Certificate{Method: r.method, Residual: r.errors[group], Condition: r.condition, Digits: digits}
	if math.IsInf(r.errors[group], 1) {
		c.note("every entry is below the smallest binary64 number and reads 0")
	}
	return c
}

// entriesFor is packed without the copy where the storage has no gaps; the
// result must only be read.
func entriesFor(m *mat.Dense) []float64 {
	if raw := m.RawMatrix(); raw.Stride == raw.Cols {
		return raw.Data[:raw.Rows*raw.Cols]
	}
	return packed(m)
}

// packed copies a matrix to row-major storage without gaps.
func packed(m *mat.Dense) []float64 {
	rows, columns := sizeOf(m)
	data := make([]float64, rows*columns)
	for i := range rows {
		copy(data[i*columns:], m.RawRowView(i))
	}
	return data
}

// doubtfulError is the measured error from which on the unscaled computation is
// tried as well: scaling can hurt where tiny entries tie blocks together
// (D. S. Watkins, Electron. Trans. Numer. Anal. 23, 2006).
const doubtfulError = 1e-11

// exponentialOf computes the exponential of the n×n row-major a, measuring the
// error over the first rows of each column group.
func exponentialOf(n int, a []float64, groups []columnGroup, rows int) (*exponentialResult, error) {
	switch n {
	case 1:
		return exponentialOfScalar(a[0], len(groups))
	case 2:
		if len(groups) == 1 {
			return exponentialOfPair(a)
		}
	}
	c := coupled(n, a, true)
	result, err := squaredExponential(n, a, c, groups, rows)
	if !c.scaled || err == nil && maxOf(result.errors) <= doubtfulError {
		return result, err
	}
	plain, plainErr := squaredExponential(n, a, coupled(n, a, false), groups, rows)
	if plainErr == nil && (err != nil || maxOf(plain.errors) < maxOf(result.errors)) {
		return plain, nil
	}
	return result, err
}

func maxOf(values []float64) float64 {
	largest := math.Inf(-1)
	for _, v := range values {
		largest = math.Max(largest, v)
	}
	return largest
}

func exponentialOfScalar(a float64, groups int) (*exponentialResult, error) {
	value := []float64{math.Exp(a)}
	if math.IsInf(value[0], 0) {
		return nil, overflowError(1, []float64{a})
	}
	r := &exponentialResult{value: value, errors: make([]float64, groups), condition: math.Abs(a), method: "scalar exponential"}
	for g := range r.errors {
		r.errors[g] = relativeError(value[0]*unitRoundoff, value[0], columnGroup{})
	}
	return r, nil
}

func exponentialOfPair(a []float64) (*exponentialResult, error) {
	value := make([]float64, 4)
	expTwo(a[0], a[1], a[2], a[3], value)
	if !allFinite(value) {
		return nil, overflowError(2, a)
	}
	half := math.Abs(a[0]-a[3])/2 + math.Sqrt(math.Abs(a[1]))*math.Sqrt(math.Abs(a[2]))
	condition := math.Max(math.Abs(a[0]+a[3])/2+half, 1)
	largest := math.Max(math.Max(math.Abs(value[0]), math.Abs(value[1])), math.Max(math.Abs(value[2]), math.Abs(value[3])))
	return &exponentialResult{value: value, errors: []float64{relativeError(4*unitRoundoff*largest, largest, columnGroup{})}, condition: condition, method: "closed form of order 2"}, nil
}

// expTwo writes exp([[a, b], [c, d]]) to e, row by row: with μ = (a+d)/2,
// δ = (a−d)/2 and q = δ² + b·c it is e^μ·(cosh √q·I + sinh √q/√q·[[δ, b], [c, −δ]]),
// arranged so that nothing overflows that the result does not.
func expTwo(a, b, c, d float64, e []float64) {
	mu, delta := a/2+d/2, a/2-d/2
	product := math.Sqrt(math.Abs(b)) * math.Sqrt(math.Abs(c))
	negative := (b < 0) != (c < 0)
	var growth, even, odd float64 // e^μ·cosh = growth·even, e^μ·sinh √q/√q = growth·odd
	if negative && product > math.Abs(delta) {
		root := math.Sqrt((product - math.Abs(delta)) * (product + math.Abs(delta)))
		growth, even, odd = math.Exp(mu), math.Cos(root), math.Sin(root)/root
	} else {
		root := math.Hypot(delta, product)
		if negative {
			root = math.Sqrt((math.Abs(delta) - product) * (math.Abs(delta) + product))
		}
		growth = math.Exp(mu + root)
		if product == 0 {
			growth = math.Exp(math.Max(a, d))
		}
		even, odd = (1+math.Exp(-2*root))/2, 1.0
		if root > 0 {
			odd = -math.Expm1(-2*root) / (2 * root)
		}
	}
	e[0] = growth * (even + delta*odd)
	e[1] = growth * odd * b
	e[2] = growth * odd * c
	e[3] = growth * (even - delta*odd)
	if b == 0 && c == 0 || product == 0 {
		e[0], e[3] = math.Exp(a), math.Exp(d)
	}
}

func allFinite(x []float64) bool {
	for _, v := range x {
		if v-v != 0 {
			return false
		}
	}
	return true
}

// overflowError says that the exponential cannot be held, with the pole that
// makes it so where one can be found.
func overflowError(n int, a []float64) error {
	const text = "the exponential overflows: it, or a power on the way to it, exceeds the largest binary64 number 1.8e308"
	w, err := Eigenvalues(mat.NewDense(n, n, append([]float64(nil), a...)))
	if err != nil || len(w) == 0 {
		return fmt.Errorf("%s", text)
	}
	largest := w[0]
	for _, lambda := range w {
		if real(lambda) > real(largest) {
			largest = lambda
		}
	}
	return fmt.Errorf("%s (the eigenvalue of largest real part is %s)", text, modeText(largest))
}

// squaring is one scaling-and-squaring computation in working coordinates; w is
// the working matrix before shifting.
type squaring struct {
	*padeWork
	blocks *coupling
	shift  float64
	step   int // squarings from the approximant to the result
}

// squaredExponential runs scaling and squaring in the coordinates of c and
// compares the result with an independent computation.
func squaredExponential(n int, a []float64, c *coupling, groups []columnGroup, rows int) (*exponentialResult, error) {
	s := &squaring{padeWork: newPadeWork(n), blocks: c}
	defer s.release()
	c.into(n, s.w, a)
	norm := oneNorm(n, s.w)
	copy(s.a, s.w)
	s.shift = s.meanShift(norm)
	degree, step := s.prepare(c.scaled && c.depth > 1)
	s.step = step
	s.approximant(degree)
	growth := s.squareUp(step, true)
	value := make([]float64, n*n)
	c.from(n, value, s.x)
	if !allFinite(value) {
		return nil, overflowError(n, a)
	}
	r := &exponentialResult{value: value, condition: conditionFromGrowth(norm, growth)}
	r.method = fmt.Sprintf("scaling and squaring, Padé degree %d, %d squarings", degree, step)
	if c.scaled {
		r.method += ", states scaled"
	}
	if n > smallOrder && s.spread < float64(n)/6 {
		r.errors = s.probeErrors(value, groups, rows)
	} else {
		r.errors = s.halfStepErrors(degree, value, groups, rows)
	}
	return r, nil
}

// meanShift subtracts the mean of the diagonal from an irreducible working
// matrix when that at least halves its norm, and returns it.
func (s *squaring) meanShift(norm float64) float64 {
	n := s.n
	if len(s.blocks.starts) != 2 {
		return 0
	}
	mean := 0.0
	for i := range n {
		mean += s.a[i*n+i] / float64(n)
	}
	for i := range n {
		s.a[i*n+i] -= mean
	}
	if mean-mean == 0 && oneNorm(n, s.a) <= norm/2 {
		return mean
	}
	copy(s.a, s.w)
	return 0
}

// squareUp squares the approximant in s.x step times, correcting what is known
// in closed form, and returns the 2-norm estimates of e^(W·2^−k), the last the
// result's, when measured. s.u is used as space and ends holding nothing of use.
func (s *squaring) squareUp(step int, measured bool) []float64 {
	if s.shift != 0 {
		scaleSlice(s.x, math.Exp(math.Ldexp(s.shift, -step)))
	}
	growth := make([]float64, 0, min(step, 40)+1)
	for k := step; ; k-- {
		s.correct(k)
		if measured && k < 40 {
			growth = append(growth, s.twoNorm(s.x))
		}
		if k == 0 {
			return growth
		}
		s.square(s.u, s.x)
		s.x, s.u = s.u, s.x
	}
}

// correct overwrites the diagonal blocks of order 1 and 2 of e^(W/2^k), and the
// coupling of two neighbouring blocks of order 1, with their closed forms, and
// clears what is zero by structure (Al-Mohy & Higham 2009, code fragment 2.1,
// extended to blocks).
func (s *squaring) correct(k int) {
	n, starts := s.n, s.blocks.starts
	if len(starts) == 2 && n > 2 {
		return
	}
	scale := math.Ldexp(1, -k)
	var e [4]float64
	for b := 0; b+1 < len(starts); b++ {
		lo, hi := starts[b], starts[b+1]
		for i := lo; i < hi; i++ {
			clear(s.x[i*n : i*n+lo])
		}
		switch {
		case hi-lo == 2:
			expTwo(s.w[lo*n+lo]*scale, s.w[lo*n+lo+1]*scale, s.w[(lo+1)*n+lo]*scale, s.w[(lo+1)*n+lo+1]*scale, e[:])
			s.x[lo*n+lo], s.x[lo*n+lo+1], s.x[(lo+1)*n+lo], s.x[(lo+1)*n+lo+1] = e[0], e[1], e[2], e[3]
		case hi-lo == 1:
			s.x[lo*n+lo] = math.Exp(s.w[lo*n+lo] * scale)
			if hi < n && starts[b+2]-hi == 1 {
				expTwo(s.w[lo*n+lo]*scale, s.w[lo*n+hi]*scale, 0, s.w[hi*n+hi]*scale, e[:])
				s.x[lo*n+hi] = e[1]
			}
		}
	}
}

// twoNorm estimates ‖m‖₂ by three rounds of the power method on mᵀ·m.
func (s *squaring) twoNorm(m []float64) float64 {
	n, v, w := s.n, s.probe, s.image
	for i := range v {
		v[i] = signOf(i) * (1 + float64(i%7)/8)
	}
	norm := 0.0
	for range 3 {
		length := euclidean(v)
		if length == 0 || length-length != 0 {
			return norm
		}
		scaleSlice(v, 1/length)
		blas64.Implementation().Dgemv(blas.NoTrans, n, n, 1, m, n, v, 1, 0, w, 1)
		norm = math.Max(norm, euclidean(w))
		blas64.Implementation().Dgemv(blas.Trans, n, n, 1, m, n, w, 1, 0, v, 1)
	}
	return norm
}

// euclidean is the length of v, without overflow in between.
func euclidean(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x * x
	}
	if sum > 0x1p-900 && sum < 0x1p900 {
		return math.Sqrt(sum)
	}
	return blas64.Implementation().Dnrm2(len(v), v, 1)
}

// signOf is a fixed sequence of signs without a short period.
func signOf(i int) float64 {
	if (uint64(i)*0x9e3779b97f4a7c15)>>63 == 0 {
		return 1
	}
	return -1
}

// conditionFromGrowth bounds ‖A‖·∫‖e^(A(1−t))‖·‖e^(At)‖dt/‖e^A‖ (C. Van Loan,
// SIAM J. Numer. Anal. 14, 1977) from the norms at t = 2^−k, the last at t = 1.
// Norms are taken relative to the exponential through the last one, so that
// plain growth or decay does not count.
func conditionFromGrowth(norm float64, growth []float64) float64 {
	last := len(growth) - 1
	whole := growth[last]
	if whole == 0 || last == 0 {
		return math.Max(norm, 1)
	}
	rate := math.Log(whole)
	excess := func(k int) float64 {
		return math.Max(1, growth[k]/math.Exp(math.Ldexp(rate, k-last)))
	}
	late := excess(last - 1)
	integral, width := 0.0, 0.5
	for k := last - 1; k >= 0; k-- {
		width /= 2
		early := excess(k)
		if k > 0 {
			early = math.Max(early, excess(k-1))
		}
		integral += 2 * width * early * late
	}
	integral += 2 * width * excess(0) * late
	return math.Max(norm, 1) * math.Max(integral, 1)
}
