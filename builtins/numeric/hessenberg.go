package numeric

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/blas/cblas128"
	"gonum.org/v1/gonum/mat"
)

// hessenbergPencil is s·I − H with H real upper Hessenberg, ready to be factored
// for one complex s after another.
type hessenbergPencil struct {
	n       int
	minus   []complex128 // −H
	factors []complex128 // row k holds row k of U from its diagonal on
	scale   []complex128 // the multiplier of step k
	swapped []bool
}

// hessenbergOf reduces the n×n row-major a to upper Hessenberg form in place and
// returns the orthogonal Q with A = Q·H·Qᵀ.
func hessenbergOf(n int, a []float64) (q []float64) {
	q = make([]float64, n*n)
	if n == 1 {
		q[0] = 1
		return q
	}
	tau, work := make([]float64, n-1), make([]float64, schurWork(n))
	kernels.Dgehrd(n, 0, n-1, a, n, tau, work, len(work))
	for i := range n {
		copy(q[i*n:i*n+n], a[i*n:i*n+n])
	}
	kernels.Dorghr(n, 0, n-1, q, n, tau, work, len(work))
	for i := 2; i < n; i++ {
		clear(a[i*n : i*n+i-1])
	}
	return q
}

func newHessenbergPencil(n int, h []float64) *hessenbergPencil {
	p := &hessenbergPencil{n: n, minus: make([]complex128, n*n), factors: make([]complex128, n*n),
		scale: make([]complex128, n), swapped: make([]bool, n)}
	for i, v := range h {
		p.minus[i] = complex(-v, 0)
	}
	return p
}

// factor computes P·(s·I − H) = L·U with interchanges of neighbouring rows only
// and tells whether a pivot vanished to working precision, which means that s
// is an eigenvalue as far as binary64 can tell. The test is local: a pivot
// counts as zero when it cancelled to 8 roundings of what it was made of, so a
// small pivot of a badly scaled matrix is not taken for one.
func (p *hessenbergPencil) factor(s complex128) (singular bool) {
	n := p.n
	row := p.factors[:n]
	copy(row, p.minus[:n])
	row[0] += s
	made := absSum(s, p.minus[0])
	for k := range n {
		pivot := p.factors[k*n+k]
		if k == n-1 {
			return singular || oneAbs(pivot) <= 8*machineEpsilon*made || pivot == 0
		}
		row = p.factors[k*n+k : k*n+n]
		next := p.factors[(k+1)*n+k+1 : (k+1)*n+n]
		below := p.minus[(k+1)*n+k : (k+1)*n+n]
		copy(next, below[1:])
		next[0] += s
		diagonal := absSum(s, below[1])
		under := below[0]
		p.swapped[k] = oneAbs(under) > oneAbs(pivot)
		switch {
		case p.swapped[k]:
			multiplier := pivot / under
			p.scale[k] = multiplier
			made = oneAbs(row[1]) + oneAbs(multiplier)*diagonal
			for j, v := range next {
				next[j], row[j+1] = row[j+1], v
			}
			row[0] = under
			axpy(-multiplier, row[1:], next)
		case under == 0:
			singular = singular || oneAbs(pivot) <= 8*machineEpsilon*made
			p.scale[k], made = 0, diagonal
		default:
			multiplier := under / pivot
			p.scale[k] = multiplier
			made = diagonal + oneAbs(multiplier)*oneAbs(row[1])
			axpy(-multiplier, row[1:], next)
		}
	}
	return singular
}

func oneAbs(z complex128) float64 { return math.Abs(real(z)) + math.Abs(imag(z)) }

func absSum(a, b complex128) float64 { return oneAbs(a) + oneAbs(b) }

func axpy(alpha complex128, x, y []complex128) {
	cblas128.Implementation().Zaxpy(len(x), alpha, x, 1, y, 1)
}

// solve overwrites x with (s·I − H)⁻¹·x, and with the conjugate transpose of
// the inverse for solveAdjoint; factor must have been called and found no zero
// pivot.
func (p *hessenbergPencil) solve(x []complex128) {
	n := p.n
	for k := 0; k+1 < n; k++ {
		if p.swapped[k] {
			x[k], x[k+1] = x[k+1], x[k]
		}
		x[k+1] -= p.scale[k] * x[k]
	}
	for k := n - 1; k >= 0; k-- {
		row := p.factors[k*n+k : k*n+n]
		sum := x[k]
		if k+1 < n {
			sum -= cblas128.Implementation().Zdotu(n-k-1, row[1:], 1, x[k+1:], 1)
		}
		x[k] = sum / row[0]
	}
}

func (p *hessenbergPencil) solveAdjoint(x []complex128) {
	n := p.n
	for k := range n {
		row := p.factors[k*n+k : k*n+n]
		x[k] /= cmplx.Conj(row[0])
		for j, v := range row[1:] {
			x[k+1+j] -= cmplx.Conj(v) * x[k]
		}
	}
	for k := n - 2; k >= 0; k-- {
		x[k] -= cmplx.Conj(p.scale[k]) * x[k+1]
		if p.swapped[k] {
			x[k], x[k+1] = x[k+1], x[k]
		}
	}
}

// inverseNorm estimates ‖(s·I − H)⁻¹‖₁ of the factored matrix (N. J. Higham, ACM
// Trans. Math. Softw. 14, 1988, complex form).
func (p *hessenbergPencil) inverseNorm() float64 {
	n := p.n
	x := make([]complex128, n)
	for i := range x {
		x[i] = complex(1/float64(n), 0)
	}
	estimate := 0.0
	for range 5 {
		p.solve(x)
		norm := 0.0
		for _, v := range x {
			norm += cmplx.Abs(v)
		}
		if norm <= estimate {
			break
		}
		estimate = norm
		for i, v := range x {
			if size := cmplx.Abs(v); size > 0 {
				x[i] = v / complex(size, 0)
			} else {
				x[i] = 1
			}
		}
		p.solveAdjoint(x)
		at, largest := 0, 0.0
		for i, v := range x {
			if size := cmplx.Abs(v); size > largest {
				at, largest = i, size
			}
		}
		clear(x)
		x[at] = 1
	}
	return estimate
}

// orthogonalProduct is Qᵀ·B for row-major Q.
func orthogonalProduct(n int, q []float64, b *mat.Dense) *mat.Dense {
	_, m := b.Dims()
	result := mat.NewDense(n, m, nil)
	raw := b.RawMatrix()
	blas64.Implementation().Dgemm(blas.Trans, blas.NoTrans, n, m, n, 1, q, n, raw.Data, raw.Stride, 0, result.RawMatrix().Data, m)
	return result
}
