package numeric

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// Hold samples x' = A·x + B·u with u held between samples (zero-order hold):
// A_d = e^(A·T) (n×n) and B_d = ∫₀ᵀ e^(A·τ)dτ·B (n×m), the blocks of the
// exponential of [[A, B], [0, 0]]·T. B_d is a sum, never a difference, so it is
// correct relative to itself for any T, and A may be singular. T is in seconds
// and must be positive; b may be empty. The certificate's digits are the fewer
// of the two blocks', each relative to its own largest entry; where A_d underflows, those of B_d.
//
// G. F. Franklin, J. D. Powell, M. L. Workman, Digital Control of Dynamic
// Systems, 3rd edition 1998, section 4.3; C. Van Loan, IEEE Trans. Automat.
// Control 23, 1978.
func Hold(a, b *mat.Dense, period float64) (ad, bd *mat.Dense, certificate Certificate, err error) {
	n, m, err := sampledShapes(a, b, period)
	if err != nil {
		return nil, nil, Certificate{}, err
	}
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, Certificate{Method: "empty", Digits: mostDigits}, nil
	}
	if m == 0 {
		ad, certificate, err = Exponential(scaledCopy(period, a))
		return ad, &mat.Dense{}, certificate, err
	}
	w, err := heldMatrix(n, m, 1, a, b, period)
	if err != nil {
		return nil, nil, Certificate{}, err
	}
	size := n + m
	result, err := exponentialOf(size, w, []columnGroup{{0, n}, {n, size}}, n)
	if err != nil {
		return nil, nil, Certificate{}, err
	}
	ad, bd = blockOf(result.value, size, 0, n, 0, n), blockOf(result.value, size, 0, n, n, size)
	certificate = worse(result.certificate(0), result.certificate(1))
	if mat.Norm(ad, 1) == 0 { // below the smallest number: nothing is known of its digits, and B_d does not need them
		certificate.Digits = result.certificate(1).Digits
	}
	certificate.Method = "exponential of [[A, B], [0, 0]]·T: " + result.method
	return ad, bd, certificate, nil
}

// HoldLine samples x' = A·x + B·u, y = C·x + D·u with u running along straight
// lines from sample to sample (first-order hold). The line towards the next
// sample needs that sample, so the state is ξ = x − Γ₂·u; then A_d = e^(A·T),
// B_d = Γ₁ + (A_d − I)·Γ₂ = φ₁(A·T)·Γ₁, C_d = C, D_d = D + C·Γ₂ with
// Γ₁ = T·φ₁(A·T)·B, Γ₂ = T·φ₂(A·T)·B, φ₁(x) = (eˣ−1)/x, φ₂(x) = (φ₁(x)−1)/x:
// no difference is formed. c is p×n, d p×m.
//
// Franklin, Powell & Workman 1998, section 6.3 ("triangle hold").
func HoldLine(a, b, c, d *mat.Dense, period float64) (ad, bd, cd, dd *mat.Dense, certificate Certificate, err error) {
	n, m, err := sampledShapes(a, b, period)
	if err == nil {
		err = outputShapes(c, d, n, m)
	}
	if err != nil {
		return nil, nil, nil, nil, Certificate{}, err
	}
	if n == 0 || m == 0 {
		ad, bd, certificate, err = Hold(a, b, period)
		return ad, bd, mat.DenseCopyOf(c), mat.DenseCopyOf(d), certificate, err
	}
	w, err := heldMatrix(n, m, 2, a, b, period)
	if err != nil {
		return nil, nil, nil, nil, Certificate{}, err
	}
	size := n + 2*m
	result, err := exponentialOf(size, w, []columnGroup{{0, n}, {n, n + m}, {n + m, size}}, n)
	if err != nil {
		return nil, nil, nil, nil, Certificate{}, err
	}
	ad = blockOf(result.value, size, 0, n, 0, n)
	first := blockOf(result.value, size, 0, n, n, n+m)
	second := blockOf(result.value, size, 0, n, n+m, size)
	first.Scale(1/period, first)
	_, bd, last, err := Hold(a, first, period)
	if err != nil {
		return nil, nil, nil, nil, Certificate{}, err
	}
	dd = mat.DenseCopyOf(d)
	var through mat.Dense
	through.Mul(c, second)
	dd.Add(dd, &through)
	certificate = worse(worse(result.certificate(0), result.certificate(1)), worse(result.certificate(2), last))
	certificate.Method = "exponential of [[A, B, 0], [0, 0, I], [0, 0, 0]]·T: " + result.method
	return ad, bd, mat.DenseCopyOf(c), dd, certificate, nil
}

// LostPair is a pair of eigenvalues that sampling every T seconds (nearly)
// maps to one: First − Second = 2πi·Turns/T up to Offset.
type LostPair struct {
	First, Second complex128
	Turns         int
	Period        float64 // the sampling time nearest to T at which the two coincide
	Offset        float64 // |e^(First·T) − e^(Second·T)| relative to the larger
	Steered       float64 // how independently the inputs still move both, 0 (one direction only) to 1
}

// nearlyLost is the distance of two sampled eigenvalues, relative to their
// size, below which a pair is worth a warning: three digits of the gain go.
const nearlyLost = 1e-3

// LostAtSampling lists the pairs of different eigenvalues of A, with equal real
// parts, whose imaginary parts differ by a multiple k ≠ 0 of 2π/T: their
// sampled eigenvalues coincide, and a single input (or output) can no longer
// tell them apart. Pairs are listed once, conjugates left out; with several
// inputs Steered says what is left of the pair. b may be nil.
//
// R. E. Kalman, Y. C. Ho, K. S. Narendra, Contrib. Differential Equations 1, 1963.
func LostAtSampling(a, b *mat.Dense, period float64) ([]LostPair, error) {
	n, m, err := sampledShapes(a, b, period)
	if err != nil || n == 0 {
		return nil, err
	}
	system, err := Eigen(a)
	if err != nil {
		return nil, err
	}
	var pairs []LostPair
	for i, first := range system.Values {
		for j, second := range system.Values {
			apart := imag(first) - imag(second)
			turns := int(math.Round(math.Min(apart*period/(2*math.Pi), 1e15)))
			if i == j || turns < 1 || imag(first) < -imag(second) {
				continue
			}
			decay := (real(first) - real(second)) * period
			turn := apart*period - 2*math.Pi*float64(turns)
			offset := cmplx.Abs(cmplx.Exp(complex(-math.Abs(decay), turn)) - 1)
			if offset > nearlyLost {
				continue
			}
			pair := LostPair{First: first, Second: second, Turns: turns, Offset: offset,
				Period: 2 * math.Pi * float64(turns) / apart}
			if m > 1 {
				pair.Steered = independence(system.Left, i, j, b)
			}
			pairs = append(pairs, pair)
		}
	}
	return pairs, nil
}

// independence is the sine of the angle between the rows in which the inputs b
// enter two modes, given by columns i and j of the left eigenvectors.
func independence(left *mat.CDense, i, j int, b *mat.Dense) float64 {
	n, m := b.Dims()
	var inner complex128
	squareI, squareJ := 0.0, 0.0
	for k := range m {
		var u, v complex128
		for l := range n {
			u += cmplx.Conj(left.At(l, i)) * complex(b.At(l, k), 0)
			v += cmplx.Conj(left.At(l, j)) * complex(b.At(l, k), 0)
		}
		inner += u * cmplx.Conj(v)
		squareI += real(u)*real(u) + imag(u)*imag(u)
		squareJ += real(v)*real(v) + imag(v)*imag(v)
	}
	if squareI == 0 || squareJ == 0 {
		return 0
	}
	cosine := cmplx.Abs(inner) / math.Sqrt(squareI) / math.Sqrt(squareJ)
	return math.Sqrt(math.Max(0, (1-cosine)*(1+cosine)))
}

// sampledShapes is the door of the sampling routines: A n×n, B n×m or empty,
// T positive, all finite.
func sampledShapes(a, b *mat.Dense, period float64) (n, m int, err error) {
	if err := squareAndFinite("A", a); err != nil {
		return 0, 0, err
	}
	n, _ = sizeOf(a)
	if rows, columns := sizeOf(b); columns > 0 {
		if rows != n {
			return 0, 0, fmt.Errorf("B has %d rows; it must have %d, as A has", rows, n)
		}
		m = columns
	}
	if err := Finite("B", b); err != nil {
		return 0, 0, err
	}
	if !(period > 0) || math.IsInf(period, 0) {
		return 0, 0, fmt.Errorf("the sampling time is %g s; it must be positive and finite", period)
	}
	return n, m, nil
}

// outputShapes checks C p×n and D p×m.
func outputShapes(c, d *mat.Dense, n, m int) error {
	p, _ := sizeOf(d)
	if n > 0 {
		p, _ = sizeOf(c)
		if err := Shaped("C", c, p, n); err != nil {
			return err
		}
	}
	if p == 0 {
		return errors.New("the plant has no output")
	}
	if m > 0 {
		if err := Shaped("D", d, p, m); err != nil {
			return err
		}
	}
	if err := Finite("C", c); err != nil {
		return err
	}
	return Finite("D", d)
}

// heldMatrix is T·[[A, B], [0, 0]], or with order 2 [[A·T, B·T, 0], [0, 0, I],
// [0, 0, 0]], whose unit coupling makes the last block T·φ₂(A·T)·B.
func heldMatrix(n, m, order int, a, b *mat.Dense, period float64) ([]float64, error) {
	size := n + order*m
	w := make([]float64, size*size)
	for i := range n {
		for j := range n {
			w[i*size+j] = a.At(i, j) * period
		}
		for j := range m {
			w[i*size+n+j] = b.At(i, j) * period
		}
	}
	if order == 2 {
		for j := range m {
			w[(n+j)*size+n+m+j] = 1
		}
	}
	if !allFinite(w) {
		return nil, errors.New("A·T or B·T overflows")
	}
	return w, nil
}

// blockOf copies rows i0 … i1−1 and columns j0 … j1−1 of a size×size slice.
func blockOf(w []float64, size, i0, i1, j0, j1 int) *mat.Dense {
	if i1 == i0 || j1 == j0 {
		return &mat.Dense{}
	}
	block := mat.NewDense(i1-i0, j1-j0, nil)
	for i := i0; i < i1; i++ {
		copy(block.RawRowView(i-i0), w[i*size+j0:i*size+j1])
	}
	return block
}

func scaledCopy(factor float64, m *mat.Dense) *mat.Dense {
	var scaled mat.Dense
	scaled.Scale(factor, m)
	return &scaled
}

// worse is the certificate with fewer digits.
func worse(first, second Certificate) Certificate {
	if second.Digits < first.Digits {
		return second
	}
	return first
}

// solveSquare solves M·X = R (M n×n), or Mᵀ·X = R, by LU with partial pivoting
// and one step of refinement, and returns the reciprocal condition number of M;
// a singular M gives 0 and no X.
func solveSquare(m, r *mat.Dense, transposed bool) (x *mat.Dense, reciprocal float64) {
	n, _ := m.Dims()
	lu, pivots := packed(m), make([]int, n)
	norm := oneNorm(n, lu)
	if !kernels.Dgetrf(n, n, lu, n, pivots) {
		return nil, 0
	}
	reciprocal = kernels.Dgecon(lapack.MaxColumnSum, n, lu, n, norm, make([]float64, 4*n), make([]int, n))
	_, columns := r.Dims()
	op, view := blas.NoTrans, mat.Matrix(m)
	if transposed {
		op, view = blas.Trans, m.T()
	}
	x = mat.DenseCopyOf(r)
	kernels.Dgetrs(op, n, columns, lu, n, pivots, x.RawMatrix().Data, columns)
	var residual mat.Dense
	residual.Mul(view, x)
	residual.Sub(r, &residual)
	kernels.Dgetrs(op, n, columns, lu, n, pivots, residual.RawMatrix().Data, columns)
	x.Add(x, &residual)
	return x, reciprocal
}
