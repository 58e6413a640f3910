package numeric

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
	lapackgonum "gonum.org/v1/gonum/lapack/gonum"
	"gonum.org/v1/gonum/mat"
)

// kernels is gonum's LAPACK, called directly because package mat hides the
// routines on quasi-triangular matrices.
var kernels lapackgonum.Implementation

// products is the BLAS in use, for the same reason.
var products = blas64.Implementation()

// errNotConverged is what a failed QR iteration becomes.
var errNotConverged = errors.New("the QR iteration for the eigenvalues did not converge")

// Schur computes the real Schur form A = Z·T·Zᵀ: T upper quasi-triangular with
// standardised 2×2 blocks (equal diagonal entries, off-diagonal entries of
// opposite sign) for complex pairs, Z orthogonal; w holds the eigenvalues in
// their order along the diagonal, of a pair the one with positive imaginary
// part first. a is not changed; t and z are new. For a 0×0 matrix (or nil) the
// results are empty. It errs when a is not square, not finite, or when the QR
// iteration fails thrice (a is then turned by a fixed reflection and tried
// again).
//
// Hessenberg reduction and multishift QR with aggressive early deflation:
// K. Braman, R. Byers, R. Mathias, SIAM J. Matrix Anal. Appl. 23, 2002.
func Schur(a *mat.Dense) (t, z *mat.Dense, w []complex128, err error) {
	if err := squareAndFinite("the matrix", a); err != nil {
		return nil, nil, nil, err
	}
	n, _ := sizeOf(a)
	if n == 0 {
		return &mat.Dense{}, &mat.Dense{}, nil, nil
	}
	scaled := mat.DenseCopyOf(a)
	exponent := scaleToUnitRange(scaled.RawMatrix().Data)
	t, z = mat.DenseCopyOf(scaled), mat.NewDense(n, n, nil)
	w = make([]complex128, n)
	converged := schurInPlace(n, 0, n-1, t.RawMatrix().Data, z.RawMatrix().Data, w)
	for attempt := 1; attempt <= 2 && !converged; attempt++ {
		v := reflectionVector(n, attempt)
		t.Copy(scaled)
		reflectBothSides(t, v)
		converged = schurInPlace(n, 0, n-1, t.RawMatrix().Data, z.RawMatrix().Data, w)
		reflectRows(z, v)
	}
	if !converged {
		return nil, nil, nil, errNotConverged
	}
	undoScale(t.RawMatrix().Data, w, exponent)
	return t, z, w, nil
}

// scaleToUnitRange multiplies the entries by a power of two when the largest
// lies outside 2^±300, where squares would overflow or vanish, and returns the
// exponent to undo it with.
func scaleToUnitRange(entries []float64) (exponent int) {
	largest := 0.0
	for _, v := range entries {
		largest = math.Max(largest, math.Abs(v))
	}
	if largest == 0 {
		return 0
	}
	if _, exponent = math.Frexp(largest); exponent > -300 && exponent < 300 {
		return 0
	}
	for i, v := range entries {
		entries[i] = math.Ldexp(v, -exponent)
	}
	return exponent
}

// undoScale multiplies entries and eigenvalues by 2^exponent.
func undoScale(entries []float64, w []complex128, exponent int) {
	if exponent == 0 {
		return
	}
	for i, v := range entries {
		entries[i] = math.Ldexp(v, exponent)
	}
	for i, v := range w {
		w[i] = complex(math.Ldexp(real(v), exponent), math.Ldexp(imag(v), exponent))
	}
}

// schurInPlace overwrites the n×n row-major a with T, fills z and w, and tells
// whether the iteration converged. A panic inside the library counts as no
// convergence: Dhseqr can slice out of range after a Dlahqr failure. Outside
// rows and columns low … high a must already be upper triangular.
func schurInPlace(n, low, high int, a, z []float64, w []complex128) (ok bool) {
	defer func() {
		if recover() != nil {
			ok = false
		}
	}()
	tau := make([]float64, n+2*n)
	wr, wi := tau[n:2*n], tau[2*n:3*n]
	tau = tau[:n]
	work := make([]float64, schurWork(n))
	if n > 1 {
		kernels.Dgehrd(n, low, high, a, n, tau[:n-1], work, len(work))
	}
	for i := 0; i < n; i++ {
		copy(z[i*n:i*n+n], a[i*n:i*n+n])
	}
	if n > 1 {
		kernels.Dorghr(n, low, high, z, n, tau[:n-1], work, len(work))
	} else {
		z[0] = 1
	}
	for i := 2; i < n; i++ {
		clear(a[i*n : i*n+i-1])
	}
	if kernels.Dhseqr(lapack.EigenvaluesAndSchur, lapack.SchurOrig, n, low, high, a, n, wr, wi, z, n, work, len(work)) > 0 {
		return false
	}
	for i := 1; i < n; i++ {
		if a[i*n+i-1] == 0 || wi[i] == 0 || wi[i-1] == 0 {
			a[i*n+i-1] = 0
		}
		clear(a[i*n : i*n+i-1])
	}
	for i := range w {
		w[i] = complex(wr[i], wi[i])
		if math.IsNaN(wr[i]) || math.IsNaN(wi[i]) {
			return false
		}
	}
	return true
}

// schurWork is the length of the scratch space that Dgehrd, Dorghr and Dhseqr
// run well in: 64 columns is the widest block they use, and below order 64 they
// use none.
func schurWork(n int) int {
	if n < 64 {
		return 4 * n
	}
	return n*64 + 65*64
}

// reflectionVector is a fixed unit vector without zero entries, different for
// each attempt, for the reflection that restarts a failed iteration.
func reflectionVector(n, attempt int) []float64 {
	v := make([]float64, n)
	sum := 0.0
	for i := range v {
		v[i] = 1 + math.Sin(float64(attempt)*(1.7*float64(i)+0.3))/2
		sum += v[i] * v[i]
	}
	for i := range v {
		v[i] /= math.Sqrt(sum)
	}
	return v
}

// reflectRows replaces m by (I − 2·v·vᵀ)·m.
func reflectRows(m *mat.Dense, v []float64) {
	u := mat.NewVecDense(len(v), v)
	var product mat.VecDense
	product.MulVec(m.T(), u)
	m.RankOne(m, -2, u, &product)
}

// reflectBothSides replaces m by P·m·P with P = I − 2·v·vᵀ.
func reflectBothSides(m *mat.Dense, v []float64) {
	reflectRows(m, v)
	u := mat.NewVecDense(len(v), v)
	var product mat.VecDense
	product.MulVec(m, u)
	m.RankOne(m, -2, &product, u)
}

// diagonalEigenvalues reads the eigenvalues off a standardised real Schur form.
func diagonalEigenvalues(n int, t []float64, w []complex128) {
	for i := 0; i < n; i++ {
		if i+1 < n && t[(i+1)*n+i] != 0 {
			im := math.Sqrt(math.Abs(t[i*n+i+1])) * math.Sqrt(math.Abs(t[(i+1)*n+i]))
			w[i], w[i+1] = complex(t[i*n+i], im), complex(t[i*n+i], -im)
			i++
			continue
		}
		w[i] = complex(t[i*n+i], 0)
	}
}

// ReorderSchur moves the eigenvalues of a real Schur form for which keep holds
// to its top by orthogonal transformations, updating t and z in place so that
// Z·T·Zᵀ stays what it was, and returns how many there are. keep is asked once
// for each real eigenvalue and once for each complex pair (with the member of
// positive imaginary part). It errs when two blocks are too close to be
// swapped; t and z are then still a Schur form.
//
// Z. Bai, J. W. Demmel, On swapping diagonal blocks in real Schur form, Linear
// Algebra Appl. 186, 1993.
func ReorderSchur(t, z *mat.Dense, keep func(complex128) bool) (count int, err error) {
	n, c := sizeOf(t)
	if n == 0 {
		return 0, nil
	}
	if zr, zc := sizeOf(z); n != c || zr != n || zc != n {
		return 0, fmt.Errorf("the Schur form is %d×%d and its basis %d×%d; both must be square and alike", n, c, zr, zc)
	}
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("the Schur form could not be reordered: %v", r)
		}
	}()
	rt, rz := t.RawMatrix(), z.RawMatrix()
	work := make([]float64, n)
	for i := 0; i < n; i++ {
		size := 1
		lambda := complex(rt.Data[i*rt.Stride+i], 0)
		if i+1 < n && rt.Data[(i+1)*rt.Stride+i] != 0 {
			size = 2
			lambda = complex(real(lambda), math.Sqrt(math.Abs(rt.Data[i*rt.Stride+i+1]))*
				math.Sqrt(math.Abs(rt.Data[(i+1)*rt.Stride+i])))
		}
		if keep(lambda) {
			if i != count {
				if _, _, ok := kernels.Dtrexc(lapack.UpdateSchur, n, rt.Data, rt.Stride, rz.Data, rz.Stride, i, count, work); !ok {
					return count, errors.New("two eigenvalues are too close to be reordered")
				}
			}
			count += size
		}
		i += size - 1
	}
	return count, nil
}

// multiply computes C ← α·op(A)·op(B) + β·C on row-major storage, op(A) m×k and
// op(B) k×n, with leading dimensions given.
func multiply(ta, tb blas.Transpose, m, n, k int, alpha float64, a []float64, lda int, b []float64, ldb int, beta float64, c []float64, ldc int) {
	if m == 0 || n == 0 {
		return
	}
	products.Dgemm(ta, tb, m, n, k, alpha, a, lda, b, ldb, beta, c, ldc)
}
