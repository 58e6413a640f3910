package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// Continuous undoes Hold: the A (n×n) and B (n×m) with A_d = e^(A·T) and
// B_d = ∫₀ᵀ e^(A·τ)dτ·B, by the principal logarithm of A_d, the one whose modes
// stay below the Nyquist frequency π/T. bd may be empty. It refuses, naming
// them, eigenvalues of A_d that are 0 (no continuous plant forgets a state in
// one sample) or real and negative (a pole at the Nyquist frequency, where the
// continuous plant is not unique). Digits count the data's rounding, which
// sampling much faster than the plant's modes amplifies by 1/(|A|·T).
//
// Inverse scaling and squaring on the real Schur form: N. J. Higham, Functions
// of Matrices, 2008, algorithm 11.9; A. H. Al-Mohy, N. J. Higham, SIAM J. Sci.
// Comput. 34, 2012.
func Continuous(ad, bd *mat.Dense, period float64) (a, b *mat.Dense, certificate Certificate, err error) {
	n, m, err := sampledShapes(ad, bd, period)
	if err != nil {
		return nil, nil, Certificate{}, err
	}
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, Certificate{Method: "empty", Digits: mostDigits}, nil
	}
	balance := coupled(n, packed(ad), true)
	w := mat.NewDense(n, n, nil)
	balance.into(n, w.RawMatrix().Data, packed(ad))
	logarithm, roots, err := principalLogarithm(w)
	if err != nil {
		return nil, nil, Certificate{}, err
	}
	a = mat.NewDense(n, n, nil)
	balance.from(n, a.RawMatrix().Data, logarithm.RawMatrix().Data)
	certificate = logarithmCertificate(w, logarithm, balance, a)
	certificate.Method = fmt.Sprintf("logarithm by %d square roots of the real Schur form", roots)
	a.Scale(1/period, a)
	if m == 0 {
		return a, &mat.Dense{}, certificate, nil
	}
	_, integral, held, err := Hold(a, identityDense(n), period)
	if err != nil {
		return nil, nil, Certificate{}, err
	}
	b, reciprocal := solveSquare(integral, bd, false)
	if reciprocal < machineEpsilon {
		return nil, nil, Certificate{}, &Refusal{Reason: "the input matrix before sampling is not unique: an oscillation completes whole turns between samples"}
	}
	// B leans on A through φ₁(A·T), whose relative error is that of A times A·T.
	share := math.Min(1, mat.Norm(a, 1)*period)
	loss := (unitRoundoff + share*math.Pow(10, -certificate.Digits)) / reciprocal
	certificate.Digits = math.Min(certificate.Digits, math.Min(held.Digits, DigitsOf(loss, 1)))
	return a, b, certificate, nil
}

func identityDense(n int) *mat.Dense {
	m := mat.NewDense(n, n, nil)
	for i := range n {
		m.Set(i, i, 1)
	}
	return m
}

// logarithmCertificate measures how the logarithm of w answers to changes of w
// of relative size 2⁻²⁶ (two fixed directions), and what the exponential of the
// logarithm gives back.
func logarithmCertificate(w, logarithm *mat.Dense, balance *coupling, result *mat.Dense) Certificate {
	n, _ := w.Dims()
	c := Certificate{}
	back, exponential, err := Exponential(logarithm)
	if err != nil {
		return c
	}
	back.Sub(back, w)
	c.Residual = mat.Norm(back, 1) / mat.Norm(w, 1)
	const relative = 0x1p-26
	largest := largestEntry(result)
	moved, change := mat.DenseCopyOf(w), mat.NewDense(n, n, nil)
	norm := mat.Norm(w, 2)
	for direction := range 2 {
		for i := range n {
			for j := range n {
				e := relative * norm * signOf(7*direction+i*n+j) / math.Sqrt(float64(n))
				moved.Set(i, j, w.At(i, j)+e)
			}
		}
		other, _, err := principalLogarithm(moved)
		if err != nil { // the change reaches the negative axis
			c.Condition = math.Inf(1)
			return c
		}
		balance.from(n, change.RawMatrix().Data, other.RawMatrix().Data)
		change.Sub(change, result)
		if largest > 0 {
			c.Condition = math.Max(c.Condition, largestEntry(change)/largest/relative)
		} else {
			c.Condition = math.Inf(1)
		}
	}
	backward := math.Max(c.Residual/math.Max(exponential.Condition, 1), 8*unitRoundoff)
	c.Digits = DigitsOf(backward, c.Condition)
	return c
}

func largestEntry(m *mat.Dense) float64 {
	largest := 0.0
	rows, columns := m.Dims()
	for i := range rows {
		for j := range columns {
			largest = math.Max(largest, math.Abs(m.At(i, j)))
		}
	}
	return largest
}

// logarithmReach is the norm of T^(1/2^s) − I below which the [7/7] Padé
// approximant of log(1 + x) has a backward error below 2⁻⁵³ (Higham 2008,
// table 11.1).
const logarithmReach = 0.264

// mostRoots bounds the square roots taken: each halves the distance to I in
// the logarithm, and binary64 spans 2^±1074.
const mostRoots = 100

// principalLogarithm is the logarithm with eigenvalues of imaginary part in
// (−π, π), and the number of square roots taken.
func principalLogarithm(m *mat.Dense) (*mat.Dense, int, error) {
	n, _ := m.Dims()
	form, basis, eigenvalues, err := Schur(m)
	if err != nil {
		return nil, 0, err
	}
	if err := refuseLogarithm(eigenvalues, mat.Norm(m, 1)); err != nil {
		return nil, 0, err
	}
	t := packed(form)
	original := append([]float64(nil), t...)
	roots := 0
	for ; distanceToIdentity(n, t) > logarithmReach; roots++ {
		if roots == mostRoots || !squareRootTriangular(n, t) {
			return nil, 0, fmt.Errorf("the logarithm of the transition matrix did not settle after %d square roots", roots)
		}
	}
	for i := range n {
		t[i*n+i]--
	}
	correctRootMinusIdentity(n, original, t, roots)
	logarithm := padeLogarithm(n, t)
	logarithm.Scale(math.Ldexp(1, roots), logarithm)
	correctLogarithmDiagonal(n, original, logarithm)
	var half, whole mat.Dense
	half.Mul(basis, logarithm)
	whole.Mul(&half, basis.T())
	return &whole, roots, nil
}

// refuseLogarithm names the eigenvalues without a unique real logarithm. An
// eigenvalue within rounding of 0 counts as 0.
func refuseLogarithm(eigenvalues []complex128, norm float64) error {
	var zero, negative []complex128
	for _, z := range eigenvalues {
		size := math.Hypot(real(z), imag(z))
		switch {
		case size <= float64(len(eigenvalues))*machineEpsilon*norm:
			zero = append(zero, 0)
		case real(z) < 0 && math.Abs(imag(z)) <= 4*float64(len(eigenvalues))*machineEpsilon*norm:
			negative = append(negative, complex(real(z), 0))
		}
	}
	if len(zero) > 0 {
		return &Refusal{Reason: "no continuous plant has this sampled form, because its transition matrix is singular: it has the eigenvalue", Modes: zero}
	}
	if len(negative) > 0 {
		return &Refusal{Reason: "the continuous plant is not unique, because the transition matrix has real negative eigenvalues, at the Nyquist frequency", Modes: negative}
	}
	return nil
}

func distanceToIdentity(n int, t []float64) float64 {
	for i := range n {
		t[i*n+i]--
	}
	norm := oneNorm(n, t)
	for i := range n {
		t[i*n+i]++
	}
	return norm
}

// blockEnds tells the size of the diagonal block that begins at i.
func blockSize(n int, t []float64, i int) int {
	if i+1 < n && t[(i+1)*n+i] != 0 {
		return 2
	}
	return 1
}

// squareRootTriangular overwrites the quasi-triangular t with its principal
// square root, column after column (Å. Björck, S. Hammarling, Linear Algebra
// Appl. 52/53, 1983; real blocks: N. J. Higham, Linear Algebra Appl. 88/89, 1987).
func squareRootTriangular(n int, t []float64) bool {
	for j := 0; j < n; {
		q := blockSize(n, t, j)
		if !rootOfBlock(n, t, j, q) {
			return false
		}
		for i := j - 1; i >= 0; {
			p := 1
			if i > 0 && t[i*n+i-1] != 0 {
				p = 2
				i--
			}
			rootCoupling(n, t, i, p, j, q)
			i--
		}
		j += q
	}
	return allFinite(t)
}

// rootOfBlock takes the root of a diagonal block of order 1 or 2.
func rootOfBlock(n int, t []float64, j, q int) bool {
	d := t[j*n+j]
	if q == 1 {
		t[j*n+j] = math.Sqrt(d)
		return d > 0
	}
	// The block is standardised: d ± iω. Its root is α + (block − d)/(2α).
	omega := math.Sqrt(math.Abs(t[j*n+j+1])) * math.Sqrt(math.Abs(t[(j+1)*n+j]))
	modulus := math.Hypot(d, omega)
	var alpha float64
	if d >= 0 {
		alpha = math.Sqrt((modulus + d) / 2)
	} else {
		alpha = omega / (2 * math.Sqrt((modulus-d)/2))
	}
	t[j*n+j+1] /= 2 * alpha
	t[(j+1)*n+j] /= 2 * alpha
	t[j*n+j], t[(j+1)*n+j+1] = alpha, alpha
	return alpha > 0
}

// rootCoupling solves R_ii·X + X·R_jj = T_ij − Σ R_ik·R_kj for the p×q block at
// (i, j), all between being roots already.
func rootCoupling(n int, t []float64, i, p, j, q int) {
	var right [4]float64
	for r := range p {
		for c := range q {
			sum := t[(i+r)*n+j+c]
			for k := i + p; k < j; k++ {
				sum -= t[(i+r)*n+k] * t[k*n+j+c]
			}
			right[r*q+c] = sum
		}
	}
	if p == 1 && q == 1 {
		t[i*n+j] = right[0] / (t[i*n+i] + t[j*n+j])
		return
	}
	size := p * q
	system := make([]float64, size*size)
	for r := range p {
		for c := range q {
			for k := range p {
				system[(r*q+c)*size+k*q+c] += t[(i+r)*n+i+k]
			}
			for k := range q {
				system[(r*q+c)*size+r*q+k] += t[(j+k)*n+j+c]
			}
		}
	}
	pivots := make([]int, size)
	kernels.Dgetrf(size, size, system, size, pivots)
	kernels.Dgetrs(blas.NoTrans, size, 1, system, size, pivots, right[:size], 1)
	for r := range p {
		for c := range q {
			t[(i+r)*n+j+c] = right[r*q+c]
		}
	}
}

// correctRootMinusIdentity overwrites the diagonal blocks of T^(1/2^s) − I, which
// the subtraction left with few digits, by their closed forms
// expm1(log(d)/2^s), and for a pair with log(d ± iω) = ρ ± iθ by
// e^(ρ/2^s)·cos(θ/2^s) − 1.
func correctRootMinusIdentity(n int, original, t []float64, roots int) {
	scale := math.Ldexp(1, -roots)
	for j := 0; j < n; j += blockSize(n, original, j) {
		d := original[j*n+j]
		if blockSize(n, original, j) == 1 {
			t[j*n+j] = math.Expm1(math.Log(d) * scale)
			continue
		}
		b, c := original[j*n+j+1], original[(j+1)*n+j]
		omega := math.Sqrt(math.Abs(b)) * math.Sqrt(math.Abs(c))
		rho, theta := logOfModulus(d, omega)*scale, math.Atan2(omega, d)*scale
		grown := math.Expm1(rho)
		half := math.Sin(theta / 2)
		diagonal := grown - (1+grown)*2*half*half
		turn := (1 + grown) * math.Sin(theta)
		t[j*n+j], t[(j+1)*n+j+1] = diagonal, diagonal
		t[j*n+j+1], t[(j+1)*n+j] = turn*b/omega, turn*c/omega
	}
}

// logOfModulus is log|d + iω|, accurate near modulus 1.
func logOfModulus(d, omega float64) float64 {
	size := math.Hypot(d, omega)
	if size > 0.5 && size < 2 {
		return math.Log1p((math.Abs(d)-1)*(math.Abs(d)+1)+omega*omega) / 2
	}
	return math.Log(size)
}

// correctLogarithmDiagonal overwrites the diagonal blocks of the logarithm.
func correctLogarithmDiagonal(n int, original []float64, logarithm *mat.Dense) {
	for j := 0; j < n; j += blockSize(n, original, j) {
		d := original[j*n+j]
		if blockSize(n, original, j) == 1 {
			logarithm.Set(j, j, math.Log(d))
			continue
		}
		b, c := original[j*n+j+1], original[(j+1)*n+j]
		omega := math.Sqrt(math.Abs(b)) * math.Sqrt(math.Abs(c))
		rho, theta := logOfModulus(d, omega), math.Atan2(omega, d)
		logarithm.Set(j, j, rho)
		logarithm.Set(j+1, j+1, rho)
		logarithm.Set(j, j+1, theta*b/omega)
		logarithm.Set(j+1, j, theta*c/omega)
	}
}

// gaussSeven are the nodes and weights of the Gauss–Legendre rule of order 7 on
// [0, 1], which integrates x/(1 + t·x) to the [7/7] Padé approximant of log(1+x).
// M. Abramowitz, I. A. Stegun 1964, table 25.4, mapped from [−1, 1].
var gaussSeven = func() (rule [7][2]float64) {
	nodes := []float64{0, 0.405845151377397166906606412077, 0.741531185599394439863864773281, 0.949107912342758524526189684048}
	weights := []float64{0.417959183673469387755102040816, 0.381830050505118944950369775489, 0.279705391489276667901467771424, 0.129484966168869693270611432679}
	rule[0] = [2]float64{0.5, weights[0] / 2}
	for k := 1; k < 4; k++ {
		rule[2*k-1] = [2]float64{(1 - nodes[k]) / 2, weights[k] / 2}
		rule[2*k] = [2]float64{(1 + nodes[k]) / 2, weights[k] / 2}
	}
	return rule
}()

// padeLogarithm is Σ w_k·(I + t_k·X)⁻¹·X for a quasi-triangular X of norm at most
// logarithmReach (L. Dieci, B. Morini, A. Papini, SIAM J. Matrix Anal. Appl. 17,
// 1996; N. J. Higham, SIAM J. Matrix Anal. Appl. 22, 2001: partial fractions).
func padeLogarithm(n int, x []float64) *mat.Dense {
	sum := make([]float64, n*n)
	system, solution, pivots := make([]float64, n*n), make([]float64, n*n), make([]int, n)
	for _, rule := range gaussSeven {
		fillScaled(system, rule[0], x)
		for i := range n {
			system[i*n+i]++
		}
		copy(solution, x)
		kernels.Dgetrf(n, n, system, n, pivots)
		kernels.Dgetrs(blas.NoTrans, n, n, system, n, pivots, solution, n)
		blas64.Implementation().Daxpy(n*n, rule[1], solution, 1, sum, 1)
	}
	return mat.NewDense(n, n, sum)
}
