package numeric

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// Eigensystem holds the eigenvalues of a square matrix with what is needed to
// judge them.
type Eigensystem struct {
	// Values are the eigenvalues; of a complex pair the one with positive
	// imaginary part comes first.
	Values []complex128
	// Right and Left hold unit right and left eigenvectors as columns:
	// A·x = λ·x and yᴴ·A = λ·yᴴ.
	Right, Left *mat.CDense
	// Condition is 1/|yᴴx| for each eigenvalue, in the coordinates of A;
	// +Inf for a defective one.
	Condition []float64
	// ErrorOf estimates the absolute error of each eigenvalue; members of a
	// cluster of k share the cluster's bound, which grows like ε^(1/k).
	ErrorOf []float64
	// Clusters lists the indices of eigenvalues that cannot be told apart;
	// their mean is far better determined than the members.
	Clusters [][]int
	// VectorCondition is κ₂ of the matrix of right eigenvectors.
	VectorCondition float64
	Certificate     Certificate
}

// Eigenvalues computes the eigenvalues of a after balancing (permutation and
// scaling by powers of two), in the order in which they appear on the diagonal
// of the Schur form. a is not changed. It errs as Schur does.
func Eigenvalues(a *mat.Dense) ([]complex128, error) {
	if err := squareAndFinite("the matrix", a); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	w := make([]complex128, n)
	if n == 0 {
		return w, nil
	}
	work := mat.DenseCopyOf(a)
	if n <= kernelLimit {
		var kernel EigenvalueKernel
		if kernel.Eigenvalues(w, work.RawMatrix().Data) {
			return w, nil
		}
		work.Copy(a)
	}
	exponent := scaleToUnitRange(work.RawMatrix().Data)
	if eigenvaluesInPlace(n, work.RawMatrix().Data, w) {
		undoScale(nil, w, exponent)
		return w, nil
	}
	_, _, w, err := Schur(a)
	return w, err
}

// eigenvaluesInPlace destroys the n×n row-major a and fills w.
func eigenvaluesInPlace(n int, a []float64, w []complex128) (ok bool) {
	defer func() {
		if recover() != nil {
			ok = false
		}
	}()
	real, imaginary, tau := make([]float64, n), make([]float64, n), make([]float64, n)
	work := make([]float64, schurWork(n))
	low, high := kernels.Dgebal(lapack.PermuteScale, n, a, n, tau)
	if n > 1 {
		kernels.Dgehrd(n, low, high, a, n, tau[:n-1], work, len(work))
	}
	if kernels.Dhseqr(lapack.EigenvaluesOnly, lapack.SchurNone, n, low, high, a, n, real, imaginary, nil, 1, work, len(work)) > 0 {
		return false
	}
	for i := range w {
		w[i] = complex(real[i], imaginary[i])
		if cmplx.IsNaN(w[i]) {
			return false
		}
	}
	return true
}

// Eigen computes eigenvalues, unit right and left eigenvectors, condition
// numbers and error estimates. a is not changed; a 0×0 (or nil) matrix gives an
// empty system. It errs as Schur does.
//
// The estimates are first-order perturbation theory in the balanced
// coordinates, |y|ᵀ(|E| + 2u|A|)|x|/|yᴴx| with E the residual of the Schur form
// (J. H. Wilkinson, The Algebraic Eigenvalue Problem, 1965, chapter 2); where
// neighbouring estimates overlap the eigenvalues form a cluster.
func Eigen(a *mat.Dense) (*Eigensystem, error) {
	return EigenWithin(a, nil)
}

// EigenWithin is Eigen for a matrix whose entries are known to ±uncertainty
// only: the estimates count it with the rounding, and eigenvalues that it makes
// indistinguishable form a cluster. A nil uncertainty is none.
func EigenWithin(a, uncertainty *mat.Dense) (*Eigensystem, error) {
	if err := squareAndFinite("the matrix", a); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	if n == 0 {
		return &Eigensystem{Right: &mat.CDense{}, Left: &mat.CDense{}, Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	scaled := mat.DenseCopyOf(a)
	exponent := scaleToUnitRange(scaled.RawMatrix().Data)
	var within *mat.Dense
	if uncertainty != nil {
		if r, c := sizeOf(uncertainty); r != n || c != n {
			return nil, fmt.Errorf("the uncertainty is %d×%d; the matrix is %d×%d", r, c, n, n)
		}
		if err := Finite("the uncertainty", uncertainty); err != nil {
			return nil, err
		}
		within = mat.DenseCopyOf(uncertainty)
		within.Apply(func(_, _ int, v float64) float64 { return math.Ldexp(math.Abs(v), -exponent) }, within)
	}
	var system *Eigensystem
	var err error
	if isExactlySymmetric(scaled) {
		system, err = symmetricEigen(scaled, within)
	} else {
		system, err = generalEigen(scaled, within)
	}
	if err != nil {
		return nil, err
	}
	undoScale(system.ErrorOf, system.Values, exponent)
	largest := 0.0
	for _, v := range system.Values {
		largest = math.Max(largest, cmplx.Abs(v))
	}
	worst, condition := 0.0, 1.0
	for i, e := range system.ErrorOf {
		worst = math.Max(worst, e)
		condition = math.Max(condition, system.Condition[i])
	}
	system.Certificate.Condition = condition
	system.Certificate.Digits = digitsOfError(worst, largest)
	for _, cluster := range system.Clusters {
		system.Certificate.note("%d eigenvalues near %s cannot be told apart; each holds to about %.1g",
			len(cluster), modeText(clusterMean(system.Values, cluster)), system.ErrorOf[cluster[0]])
	}
	return system, nil
}

// digitsOfError turns an absolute error and the size of the result into digits.
func digitsOfError(absolute, size float64) float64 {
	if size == 0 {
		if absolute == 0 {
			return mostDigits
		}
		return 0
	}
	return DigitsOf(absolute/size, 1)
}

// clusterMean is the mean of the eigenvalues with the given indices.
func clusterMean(values []complex128, cluster []int) complex128 {
	var sum complex128
	for _, i := range cluster {
		sum += values[i]
	}
	return sum / complex(float64(len(cluster)), 0)
}

// isExactlySymmetric tells whether a equals its transpose bit for bit.
func isExactlySymmetric(a *mat.Dense) bool {
	n, _ := a.Dims()
	raw := a.RawMatrix()
	for i := 0; i < n; i++ {
		for j := 0; j < i; j++ {
			if raw.Data[i*raw.Stride+j] != raw.Data[j*raw.Stride+i] {
				return false
			}
		}
	}
	return true
}

// symmetricEigen uses the symmetric QR iteration, whose vectors are orthogonal
// and whose values err by rounding of the norm only.
func symmetricEigen(a, within *mat.Dense) (*Eigensystem, error) {
	n, _ := a.Dims()
	vectors := mat.DenseCopyOf(a)
	w := make([]float64, n)
	work := make([]float64, 3*n+64*n)
	if !recovered(func() bool {
		return kernels.Dsyev(lapack.EVCompute, blas.Upper, n, vectors.RawMatrix().Data, n, w, work, len(work))
	}) {
		return nil, errNotConverged
	}
	s := &Eigensystem{Values: make([]complex128, n), Right: mat.NewCDense(n, n, nil), Left: mat.NewCDense(n, n, nil),
		Condition: make([]float64, n), ErrorOf: make([]float64, n), VectorCondition: 1}
	norm := math.Max(math.Abs(w[0]), math.Abs(w[n-1]))
	var scaled, residual mat.Dense
	scaled.Mul(vectors, mat.NewDiagDense(n, w))
	residual.Mul(a, vectors)
	residual.Sub(&residual, &scaled)
	backward := mat.Norm(&residual, 2)
	if within != nil {
		backward += mat.Norm(within, 2)
	}
	for j := 0; j < n; j++ {
		s.Values[j] = complex(w[j], 0)
		s.Condition[j] = 1
		s.ErrorOf[j] = backward + 2*unitRoundoff*norm
		for i := 0; i < n; i++ {
			v := complex(vectors.At(i, j), 0)
			s.Right.Set(i, j, v)
			s.Left.Set(i, j, v)
		}
	}
	s.Certificate = Certificate{Method: "symmetric QR iteration", Residual: ratio(backward, norm)}
	return s, nil
}

// ratio is a/b, and 0 when both vanish.
func ratio(a, b float64) float64 {
	if a == 0 {
		return 0
	}
	return a / b
}

// recovered runs f and turns a panic of the library into false.
func recovered(f func() bool) (ok bool) {
	defer func() {
		if recover() != nil {
			ok = false
		}
	}()
	return f()
}
