package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// StaircaseForm is a pair in staircase form, with what decided its rank.
//
// Of a reachability form, A = T·A₀·T⁻¹ has blocks A[i+1, i] of full row rank
// below its diagonal, B = T·B₀ is zero below its first block, and the states
// after the first Rank are moved by no input. Of an observability form the
// same holds for the transposed matrices, with C = C₀·T⁻¹ in the place of Bᵀ:
// the states after the first Rank are seen by no output.
type StaircaseForm struct {
	A, B, C *mat.Dense // in the new coordinates; B or C is nil where not asked for
	// T and Inverse: x̄ = T·x and x = Inverse·x̄.
	T, Inverse *mat.Dense
	// Blocks are the sizes of the steps, falling; their sum is Rank.
	Blocks []int
	// Indices are the controllability (observability) indices, falling, one an
	// input (output); those of superfluous inputs are 0.
	Indices []int
	Rank    int
	// Threshold is the size up to which a singular value counted as zero;
	// Above is the smallest one that counted (+Inf when none did), Below the
	// largest one that did not (0 when there was none). The wider the gap
	// between them, the safer the rank.
	Threshold, Above, Below float64
	// Missing are the eigenvalues of the part that is not reached (not seen),
	// as often as they occur; MissingError estimates their absolute errors.
	Missing      []complex128
	MissingError []float64
	Certificate  Certificate
}

// thresholdFactor sets the default threshold. Rounding in the orthogonal
// transformations alone leaves a few ε·‖[A B]‖; what takes the factor is the
// rounding of the data to binary64, which a skew choice of states multiplies by hundreds
// (seen on exact examples after a change of units).
const thresholdFactor = 1000

// staircaseThreshold is the default threshold for n states and m inputs.
func staircaseThreshold(n, m int, norm float64) float64 {
	return thresholdFactor * float64(n+m) * machineEpsilon * norm
}

// Staircase brings (a, b), n×n and n×m, to reachability staircase form by an
// orthogonal T: no powers of A are formed. Singular values up to
// tol·‖[A B]‖_F count as zero; tol ≤ 0 means 1000·(n+m)·ε. The pair is taken as it
// stands; Reachability balances first. b may be nil (no inputs). It errs when
// shapes do not fit or an entry is not finite.
//
// P. Van Dooren, The generalized eigenstructure problem in linear system
// theory, IEEE Trans. Autom. Control 26, 1981; the ranks by singular values of
// small triangles.
func Staircase(a, b *mat.Dense, tol float64) (*StaircaseForm, error) {
	return staircaseForm(a, b, tol, false)
}

// Reachability is Staircase in balanced coordinates (states and inputs scaled
// by powers of two), so that a change of units hardly moves the verdict. T is
// then an orthogonal matrix times a diagonal one, and Threshold, Above and
// Below belong to the balanced coordinates.
func Reachability(a, b *mat.Dense, tol float64) (*StaircaseForm, error) {
	return staircaseForm(a, b, tol, true)
}

// Observability decides what the outputs c (p×n) see of a, by duality: the
// staircase form of (Aᵀ, Cᵀ) in balanced coordinates.
func Observability(a, c *mat.Dense, tol float64) (*StaircaseForm, error) {
	if err := squareAndFinite("A", a); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	if p, columns := sizeOf(c); p > 0 && columns != n {
		return nil, fmt.Errorf("%s is %d×%d; it must have %d columns", "C", p, columns, n)
	}
	if err := Finite("C", c); err != nil {
		return nil, err
	}
	form, err := staircaseForm(transposed(a), transposed(c), tol, true)
	if err != nil {
		return nil, err
	}
	form.A, form.C, form.B = transposed(form.A), transposed(form.B), nil
	form.T, form.Inverse = transposed(form.Inverse), transposed(form.T)
	return form, nil
}

// staircaseForm is the common body.
func staircaseForm(a, b *mat.Dense, tol float64, balance bool) (*StaircaseForm, error) {
	if err := checkPair(a, b); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	_, m := sizeOf(b)
	form := &StaircaseForm{Above: math.Inf(1), A: &mat.Dense{}, B: &mat.Dense{}, T: &mat.Dense{}, Inverse: &mat.Dense{}}
	if n == 0 {
		form.Certificate = Certificate{Method: "empty", Digits: mostDigits}
		return form, nil
	}
	s := stateSpace{n: n, m: m, a: flatCopy(a), b: flatCopy(b)}
	scale := systemScaling{states: unitScales(n), inputs: unitScales(m)}
	if balance {
		scale = s.balanced()
	}
	norm := blocksNorm(s.a, s.b)
	if tol <= 0 {
		tol = staircaseThreshold(n, m, 1)
	}
	reduction := newStaircase(n, m, s.a, s.b, 0, nil, tol*norm)
	if err := reduction.reduce(); err != nil {
		return nil, err
	}
	form.fill(reduction, scale)
	if err := form.judge(&s, reduction, norm, balance); err != nil {
		return nil, err
	}
	return form, nil
}

// checkPair is the door of every routine on a pair: a square, b with as many
// rows (or nil), all entries finite.
func checkPair(a, b *mat.Dense) error {
	if err := squareAndFinite("A", a); err != nil {
		return err
	}
	n, _ := sizeOf(a)
	if rows, m := sizeOf(b); m > 0 && rows != n {
		return fmt.Errorf("%s is %d×%d; it must have %d rows", "B", rows, m, n)
	}
	return Finite("B", b)
}

// fill writes the reduced pair, the transformation and the sizes.
func (form *StaircaseForm) fill(s *staircase, scale systemScaling) {
	n := s.n
	form.A = mat.NewDense(n, n, append([]float64(nil), s.a...))
	form.B = denseOf(n, s.m, append([]float64(nil), s.b...))
	for j, f := range scale.inputs {
		for i := 0; i < n; i++ {
			form.B.Set(i, j, form.B.At(i, j)/f)
		}
	}
	form.T, form.Inverse = mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			form.T.Set(j, i, s.q[i*n+j]/scale.states[i])
			form.Inverse.Set(i, j, s.q[i*n+j]*scale.states[i])
		}
	}
	form.Blocks, form.Rank = s.blocks, s.rank
	form.Threshold, form.Above, form.Below = s.threshold, s.above, s.below
	form.Indices = make([]int, s.m)
	for _, size := range s.blocks {
		for j := 0; j < size; j++ {
			form.Indices[j]++
		}
	}
}

// judge finds the missing modes and writes the certificate.
func (form *StaircaseForm) judge(s *stateSpace, reduction *staircase, norm float64, balanced bool) error {
	n, rank := s.n, reduction.rank
	form.Certificate = Certificate{Method: "staircase form by orthogonal transformations", Digits: mostDigits}
	if balanced {
		form.Certificate.Method += " in balanced coordinates"
	}
	form.Certificate.Residual = reduction.residual(s, norm)
	if form.Below > 0 && form.Above/form.Below < 1e3 {
		form.Certificate.note("the rank is not well separated: a singular value of %.2g counted, one of %.2g did not", form.Above, form.Below)
	}
	if rank == n {
		return nil
	}
	part := mat.NewDense(n-rank, n-rank, nil)
	for i := rank; i < n; i++ {
		part.SetRow(i-rank, reduction.a[i*n+rank:i*n+n])
	}
	system, err := Eigen(part)
	if err != nil {
		return err
	}
	form.Missing, form.MissingError = system.Values, system.ErrorOf
	form.Certificate.Digits = system.Certificate.Digits
	form.Certificate.Condition = system.Certificate.Condition
	form.Certificate.Notes = append(form.Certificate.Notes, system.Certificate.Notes...)
	return nil
}

// residual is ‖A·Q − Q·Ā‖_F/‖[A B]‖_F with what was set to zero counted.
func (s *staircase) residual(original *stateSpace, norm float64) float64 {
	if norm == 0 {
		return 0
	}
	n := s.n
	q := mat.NewDense(n, n, s.q)
	var left, right mat.Dense
	left.Mul(mat.NewDense(n, n, original.a), q)
	right.Mul(q, mat.NewDense(n, n, s.a))
	left.Sub(&left, &right)
	return mat.Norm(&left, 2) / norm
}

// flatCopy copies a matrix row by row; nil and empty give no entries.
func flatCopy(m *mat.Dense) []float64 {
	rows, columns := sizeOf(m)
	data := make([]float64, 0, rows*columns)
	for i := 0; i < rows; i++ {
		data = append(data, m.RawRowView(i)...)
	}
	return data
}

// denseOf wraps row-major data; without entries the result is empty.
func denseOf(rows, columns int, data []float64) *mat.Dense {
	if rows == 0 || columns == 0 {
		return &mat.Dense{}
	}
	return mat.NewDense(rows, columns, data)
}

// transposed copies mᵀ; nil and empty stay empty.
func transposed(m *mat.Dense) *mat.Dense {
	if rows, columns := sizeOf(m); rows == 0 || columns == 0 {
		return &mat.Dense{}
	}
	return mat.DenseCopyOf(m.T())
}
