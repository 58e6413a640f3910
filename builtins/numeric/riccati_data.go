package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/mat"
)

// riccatiData is the problem in balanced coordinates x = D·x̃; all matrices
// row-major. reduced* are A − B·R⁻¹·Nᵀ, B·R⁻¹·Bᵀ and Q − N·R⁻¹·Nᵀ, or what takes
// their place when R is not positive definite: then X = shift + Y and the
// reduced data belong to the equation for Y.
type riccatiData struct {
	n, m          int
	sampled       bool
	a, b, q, r, c []float64
	scale         []float64
	reducedA      []float64
	reducedG      []float64
	reducedQ      []float64
	shift         []float64
	drive         []float64 // B·R^(−1/2) when R is positive definite, else B
	method        string
	flat          bool // whether the start subspace was nearly vertical
	verdict       *bool
}

// newRiccatiData reduces and balances.
func newRiccatiData(p RiccatiProblem) (*riccatiData, error) {
	n, _ := p.A.Dims()
	_, m := p.B.Dims()
	d := &riccatiData{n: n, m: m, sampled: p.Sampled, a: entriesOf(p.A), b: entriesOf(p.B), q: entriesOf(p.Q), r: entriesOf(p.R)}
	if p.N != nil && mat.Norm(p.N, 1) > 0 {
		d.c = entriesOf(p.N)
	}
	makeSymmetric(n, d.q)
	makeSymmetric(m, d.r)
	d.scale = make([]float64, n)
	for i := range d.scale {
		d.scale[i] = 1
	}
	if !d.reduce() {
		if !d.sampled {
			return nil, d.weightRefusal()
		}
		// Without R⁻¹ the unweighted B·Bᵀ stands in for the drive.
		g := make([]float64, n*n)
		multiply(blas.NoTrans, blas.Trans, n, n, m, 1, d.b, m, d.b, m, 0, g, n)
		d.rescale(symplecticBalance(n, d.a, g, d.q))
		return d, d.shiftedReduction()
	}
	d.rescale(symplecticBalance(n, d.reducedA, d.reducedG, d.reducedQ))
	d.reduce()
	return d, nil
}

// rescale goes over to the coordinates x = D·x̃.
func (d *riccatiData) rescale(scale []float64) {
	n, m := d.n, d.m
	d.scale = scale
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			d.a[i*n+j] *= scale[j] / scale[i]
			d.q[i*n+j] *= scale[i] * scale[j]
		}
		for j := 0; j < m; j++ {
			d.b[i*m+j] /= scale[i]
			if d.c != nil {
				d.c[i*m+j] *= scale[i]
			}
		}
	}
}

// reduce removes the cross term and forms G, through the Cholesky factor of R;
// it reports false when R is not positive definite to rounding.
func (d *riccatiData) reduce() bool {
	root, ok := choleskyFactor(d.m, d.r)
	if !ok {
		return false
	}
	d.reduceWith(root, d.a, d.q, d.c)
	d.drive = append([]float64(nil), d.b...)
	rightDivideByFactor(d.n, d.m, d.drive, root)
	return true
}

// reduceWith forms the reduced data from a factor R = L·Lᵀ.
func (d *riccatiData) reduceWith(root, a, q, c []float64) {
	n, m := d.n, d.m
	b := append([]float64(nil), d.b...)
	rightDivideByFactor(n, m, b, root)
	d.reducedA = append([]float64(nil), a...)
	d.reducedQ = append([]float64(nil), q...)
	d.reducedG = make([]float64, n*n)
	multiply(blas.NoTrans, blas.Trans, n, n, m, 1, b, m, b, m, 0, d.reducedG, n)
	makeSymmetric(n, d.reducedG)
	if c != nil {
		w := append([]float64(nil), c...)
		rightDivideByFactor(n, m, w, root)
		multiply(blas.NoTrans, blas.Trans, n, n, m, -1, b, m, w, m, 1, d.reducedA, n)
		multiply(blas.NoTrans, blas.Trans, n, n, m, -1, w, m, w, m, 1, d.reducedQ, n)
		makeSymmetric(n, d.reducedQ)
	}
}

// choleskyFactor gives L (row-major lower) with R = L·Lᵀ, and false unless every
// pivot stands clear of rounding.
func choleskyFactor(m int, r []float64) ([]float64, bool) {
	l := append([]float64(nil), r...)
	for i := 0; i < m; i++ {
		if !(r[i*m+i] > 0) {
			return nil, false
		}
	}
	if !recovered(func() bool { return kernels.Dpotrf(blas.Lower, m, l, m) }) {
		return nil, false
	}
	for i := 0; i < m; i++ {
		if pivot := l[i*m+i]; !(pivot*pivot > 8*float64(m)*unitRoundoff*r[i*m+i]) {
			return nil, false
		}
		clear(l[i*m+i+1 : (i+1)*m])
	}
	return l, true
}

// rightDivideByFactor replaces the rows×m matrix w by w·L⁻ᵀ.
func rightDivideByFactor(rows, m int, w, l []float64) {
	products.Dtrsm(blas.Right, blas.Lower, blas.Trans, blas.NonUnit, rows, m, 1, l, m, w, m)
}

// weightRefusal says what is wrong with R in the continuous equation.
func (d *riccatiData) weightRefusal() *Refusal {
	refusal := &Refusal{Reason: "the weights of the inputs must be positive definite: R is not, to rounding"}
	if s, err := Eigen(mat.NewDense(d.m, d.m, append([]float64(nil), d.r...))); err == nil {
		refusal.Reason = "the weights of the inputs must be positive definite: R has the eigenvalue"
		refusal.Modes = s.Values[:1]
	}
	return refusal
}

// gain computes K for a given X. definite tells whether R (+ BᵀXB) is positive
// definite; ok whether it could be divided by at all.
func (d *riccatiData) gain(x []float64) (k []float64, definite, ok bool) {
	n, m := d.n, d.m
	k = make([]float64, m*n)
	bx := make([]float64, m*n)
	multiply(blas.Trans, blas.NoTrans, m, n, n, 1, d.b, m, x, n, 0, bx, n)
	weight := append([]float64(nil), d.r...)
	if d.sampled {
		multiply(blas.NoTrans, blas.NoTrans, m, n, n, 1, bx, n, d.a, n, 0, k, n)
		multiply(blas.NoTrans, blas.NoTrans, m, m, n, 1, bx, n, d.b, m, 1, weight, m)
		makeSymmetric(m, weight)
	} else {
		copy(k, bx)
	}
	if d.c != nil {
		for i := 0; i < n; i++ {
			for j := 0; j < m; j++ {
				k[j*n+i] += d.c[i*m+j]
			}
		}
	}
	if l, good := choleskyFactor(m, weight); good {
		products.Dtrsm(blas.Left, blas.Lower, blas.NoTrans, blas.NonUnit, m, n, 1, l, m, k, n)
		products.Dtrsm(blas.Left, blas.Lower, blas.Trans, blas.NonUnit, m, n, 1, l, m, k, n)
		return k, true, largestOf(k) < math.Inf(1)
	}
	pivots := make([]int, m)
	if !kernels.Dgetrf(m, m, weight, m, pivots) {
		return nil, false, false
	}
	smallest, largest := math.Inf(1), 0.0
	for i := 0; i < m; i++ {
		v := math.Abs(weight[i*m+i])
		smallest, largest = math.Min(smallest, v), math.Max(largest, v)
	}
	if smallest <= 8*float64(m)*unitRoundoff*largest {
		return nil, false, false
	}
	kernels.Dgetrs(blas.NoTrans, m, n, weight, m, pivots, k, n)
	return k, false, largestOf(k) < math.Inf(1)
}

// closed is A − B·K.
func (d *riccatiData) closed(k []float64) []float64 {
	ac := append([]float64(nil), d.a...)
	multiply(blas.NoTrans, blas.NoTrans, d.n, d.n, d.m, -1, d.b, d.m, k, d.n, 1, ac, d.n)
	return ac
}

// residual is AcᵀX + XAc + Q + KᵀRK − NK − KᵀNᵀ, or AcᵀXAc − X + … when
// sampled: equal to the residual of the equation when K is the gain of X, and
// stationary there, so that rounding in K does not enter to first order.
func (d *riccatiData) residual(x, k, ac []float64) []float64 {
	n, m := d.n, d.m
	res, half := append([]float64(nil), d.q...), make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, x, n, ac, n, 0, half, n)
	if d.sampled {
		multiply(blas.Trans, blas.NoTrans, n, n, n, 1, ac, n, half, n, 1, res, n)
		for i := range res {
			res[i] -= x[i]
		}
		clear(half)
	}
	// half collects what is added together with its transpose: XAc − NK + ½KᵀRK.
	inner := make([]float64, m*n)
	multiply(blas.NoTrans, blas.NoTrans, m, n, m, 0.5, d.r, m, k, n, 0, inner, n)
	multiply(blas.Trans, blas.NoTrans, n, n, m, 1, k, n, inner, n, 1, half, n)
	if d.c != nil {
		multiply(blas.NoTrans, blas.NoTrans, n, n, m, -1, d.c, m, k, n, 1, half, n)
	}
	addWithTranspose(n, res, half)
	return res
}

// addWithTranspose adds h + hᵀ to r.
func addWithTranspose(n int, r, h []float64) {
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			r[i*n+j] += h[i*n+j] + h[j*n+i]
		}
	}
	makeSymmetric(n, r)
}

// doubledResidual is the same with about 32 digits.
func (d *riccatiData) doubledResidual(x, k []float64) []float64 {
	n, m := d.n, d.m
	xm, km := exactMatrix(n, n, x), exactMatrix(m, n, k)
	kt := km.transpose()
	ac := newDoubled(n, n)
	ac.addMatrix(1, exactMatrix(n, n, d.a))
	ac.addProduct(-1, exactMatrix(n, m, d.b), kt)
	act := ac.transpose()
	res := newDoubled(n, n)
	res.addMatrix(1, exactMatrix(n, n, d.q))
	xa := newDoubled(n, n)
	xa.addProduct(1, xm, act)
	if d.sampled {
		res.addProduct(1, act, xa.transpose())
		res.addMatrix(-1, xm)
	} else {
		res.addMatrix(1, xa)
		res.addMatrix(1, xa.transpose())
	}
	rk := newDoubled(n, m)
	rk.addProduct(1, kt, exactMatrix(m, m, d.r))
	res.addProduct(1, rk, kt)
	if d.c != nil {
		nk := newDoubled(n, n)
		nk.addProduct(-1, exactMatrix(n, m, d.c), kt)
		res.addMatrix(1, nk)
		res.addMatrix(1, nk.transpose())
	}
	out := res.rounded()
	makeSymmetric(n, out)
	return out
}

// weight is what a relative change of every datum by 1 may change the residual
// by: |Q| + 2·|Ac|ᵀ|X|(|A| + |B||K|) + |K|ᵀ|R||K| + 2·|N||K|, with the identity
// for Ac in the continuous equation.
func (d *riccatiData) weight(x, k, ac []float64) []float64 {
	n, m := d.n, d.m
	w, ax, ak := absolute(d.q), absolute(x), absolute(k)
	open := absolute(d.a)
	multiply(blas.NoTrans, blas.NoTrans, n, n, m, 1, absolute(d.b), m, ak, n, 1, open, n)
	half := make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, ax, n, open, n, 0, half, n)
	if d.sampled {
		moved := half
		half = make([]float64, n*n)
		multiply(blas.Trans, blas.NoTrans, n, n, n, 1, absolute(ac), n, moved, n, 0, half, n)
		for i := range w {
			w[i] += ax[i]
		}
	}
	inner := make([]float64, m*n)
	multiply(blas.NoTrans, blas.NoTrans, m, n, m, 0.5, absolute(d.r), m, ak, n, 0, inner, n)
	multiply(blas.Trans, blas.NoTrans, n, n, m, 1, ak, n, inner, n, 1, half, n)
	if d.c != nil {
		multiply(blas.NoTrans, blas.NoTrans, n, n, m, 1, absolute(d.c), m, ak, n, 1, half, n)
	}
	addWithTranspose(n, w, half)
	return w
}
