package numeric

import (
	"context"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/mat"
)

// hamiltonianStart takes X from the stable invariant subspace of the balanced
// Hamiltonian matrix.
func (d *riccatiData) hamiltonianStart(context.Context) ([]float64, error) {
	d.method = "ordered Schur form of the Hamiltonian"
	return d.stableSubspace(hamiltonian(d.n, d.reducedA, d.reducedG, d.reducedQ))
}

// hamiltonian is [A −G; −Q −Aᵀ].
func hamiltonian(n int, a, g, q []float64) []float64 {
	h := make([]float64, 4*n*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			h[i*2*n+j] = a[i*n+j]
			h[i*2*n+n+j] = -g[i*n+j]
			h[(n+i)*2*n+j] = -q[i*n+j]
			h[(n+i)*2*n+n+j] = -a[j*n+i]
		}
	}
	return h
}

// stableSubspace orders the Schur form of the 2n×2n matrix h, left half plane
// first, and solves X·U₁ = U₂ for its basis [U₁; U₂].
func (d *riccatiData) stableSubspace(h []float64) ([]float64, error) {
	n := d.n
	t, z, w, err := Schur(mat.NewDense(2*n, 2*n, h))
	if err != nil {
		return nil, err
	}
	stable := 0
	for _, v := range w {
		if real(v) < 0 {
			stable++
		}
	}
	if stable != n {
		return nil, errNoStart
	}
	if _, err := ReorderSchur(t, z, func(v complex128) bool { return real(v) < 0 }); err != nil {
		return nil, err
	}
	basis := z.RawMatrix().Data
	// U₁ᵀ·X = U₂ᵀ because X is symmetric.
	top, x := make([]float64, n*n), make([]float64, n*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			top[j*n+i] = basis[i*2*n+j]
			x[j*n+i] = basis[(n+i)*2*n+j]
		}
	}
	if !d.solveNoting(top, x) {
		return nil, errNoStart
	}
	makeSymmetric(n, x)
	return x, nil
}

// solveNoting overwrites x with top⁻¹·x (both n×n, top destroyed) and remembers
// in flat whether top was singular to about half the digits.
func (d *riccatiData) solveNoting(top, x []float64) bool {
	n := d.n
	pivots := make([]int, n)
	if !kernels.Dgetrf(n, n, top, n, pivots) {
		d.flat = true
		return false
	}
	smallest, largest := math.Inf(1), 0.0
	for i := 0; i < n; i++ {
		v := math.Abs(top[i*n+i])
		smallest, largest = math.Min(smallest, v), math.Max(largest, v)
	}
	d.flat = d.flat || smallest < 1e-8*largest
	kernels.Dgetrs(blas.NoTrans, n, n, top, n, pivots, x, n)
	return largestOf(x) < math.Inf(1)
}

// doublingStart runs the doubling algorithm on the sampled equation, or on the
// continuous one after the Cayley transform z = (s + γ)/(s − γ), which maps the
// stable half plane into the circle and keeps X.
func (d *riccatiData) doublingStart(ctx context.Context) ([]float64, error) {
	a := append([]float64(nil), d.reducedA...)
	g := append([]float64(nil), d.reducedG...)
	h := append([]float64(nil), d.reducedQ...)
	if !d.sampled {
		var ok bool
		if a, g, h, ok = d.transformedTriple(); !ok {
			return nil, errNoStart
		}
	}
	d.method = "structure-preserving doubling"
	h, err := d.double(ctx, a, g, h)
	if err != nil {
		return nil, err
	}
	d.addShift(h)
	return h, nil
}

// mostDoublings suffices for poles within 1e-15 of the circle; beyond, there is
// no telling them from poles on it.
const mostDoublings = 50

// double runs the structure-preserving doubling algorithm
//
//	A ← A·W⁻¹·A,  G ← G + A·W⁻¹·G·Aᵀ,  H ← H + Aᵀ·H·W⁻¹·A,  W = I + G·H,
//
// whose H tends to X quadratically, linearly with ratio 1/2 when a closed-loop
// pole lies on the circle. The arguments are destroyed.
func (d *riccatiData) double(ctx context.Context, a, g, h []float64) ([]float64, error) {
	n := d.n
	w, work := make([]float64, n*n), make([]float64, n*n)
	wa, wg := make([]float64, n*n), make([]float64, n*n)
	pivots := make([]int, n)
	for step := 0; step < mostDoublings; step++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, g, n, h, n, 0, w, n)
		for i := 0; i < n; i++ {
			w[i*n+i]++
		}
		if !kernels.Dgetrf(n, n, w, n, pivots) {
			return nil, errNoStart
		}
		copy(wa, a)
		kernels.Dgetrs(blas.NoTrans, n, n, w, n, pivots, wa, n)
		copy(wg, g)
		kernels.Dgetrs(blas.NoTrans, n, n, w, n, pivots, wg, n)
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, h, n, wa, n, 0, work, n)
		multiply(blas.Trans, blas.NoTrans, n, n, n, 1, a, n, work, n, 0, w, n)
		makeSymmetric(n, w)
		for i := range h {
			h[i] += w[i]
		}
		change, size := largestOf(w), largestOf(h)
		if !(size < 1e280) {
			return nil, errNoStart
		}
		// Newton's steps square the error that is left.
		if change <= 1e-9*size {
			d.flat = d.flat || largestOf(d.reducedG)*size > 1e12*(1+largestOf(d.reducedA))
			return h, nil
		}
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, a, n, wg, n, 0, work, n)
		multiply(blas.NoTrans, blas.Trans, n, n, n, 1, work, n, a, n, 1, g, n)
		makeSymmetric(n, g)
		copy(work, a)
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, work, n, wa, n, 0, a, n)
	}
	return nil, errNoStart
}

// transformedTriple gives the start of the doubling for the continuous equation
// (Chu, Fan, Lin 2005, section 2): with S = A − γI and V = Sᵀ + Q·S⁻¹·G
//
//	A₀ = I + 2γ·V⁻ᵀ,  G₀ = 2γ·S⁻¹·G·V⁻¹,  H₀ = 2γ·V⁻¹·Q·S⁻¹.
//
// γ is the root mean square of what the eigenvalues of the Hamiltonian can be,
// moved on while S is nearly singular.
func (d *riccatiData) transformedTriple() (a, g, h []float64, ok bool) {
	n := d.n
	size := frobenius(d.reducedA)
	gq := make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, d.reducedG, n, d.reducedQ, n, 0, gq, n)
	gamma := math.Sqrt((size*size + frobenius(gq)) / float64(n))
	if !(gamma > 0) || gamma > 1e150 {
		return nil, nil, nil, false
	}
	pivots := make([]int, n)
	for try := 0; try < 4; try++ {
		s := append([]float64(nil), d.reducedA...)
		for i := 0; i < n; i++ {
			s[i*n+i] -= gamma
		}
		if clear := factorClear(n, s, pivots); clear > 1e-4 {
			return d.tripleFor(gamma, s, pivots)
		}
		gamma *= 1.37
	}
	return nil, nil, nil, false
}

// factorClear factors s in place and gives the ratio of the smallest to the
// largest pivot.
func factorClear(n int, s []float64, pivots []int) float64 {
	if !kernels.Dgetrf(n, n, s, n, pivots) {
		return 0
	}
	smallest, largest := math.Inf(1), 0.0
	for i := 0; i < n; i++ {
		v := math.Abs(s[i*n+i])
		smallest, largest = math.Min(smallest, v), math.Max(largest, v)
	}
	return smallest / largest
}

// tripleFor computes the triple given γ and the factored S.
func (d *riccatiData) tripleFor(gamma float64, s []float64, pivots []int) (a, g, h []float64, ok bool) {
	n := d.n
	solve := func(trans blas.Transpose, lu []float64, pivots []int, right []float64) []float64 {
		x := append([]float64(nil), right...)
		kernels.Dgetrs(trans, n, n, lu, n, pivots, x, n)
		return x
	}
	sg := solve(blas.NoTrans, s, pivots, d.reducedG) // S⁻¹G
	sq := solve(blas.Trans, s, pivots, d.reducedQ)   // S⁻ᵀQ = (Q·S⁻¹)ᵀ
	v := make([]float64, n*n)
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, d.reducedQ, n, sg, n, 0, v, n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			v[i*n+j] += d.reducedA[j*n+i]
		}
		v[i*n+i] -= gamma
	}
	vp := make([]int, n)
	if factorClear(n, v, vp) < 1e-10 {
		return nil, nil, nil, false
	}
	identity := make([]float64, n*n)
	for i := 0; i < n; i++ {
		identity[i*n+i] = 2 * gamma
	}
	a = solve(blas.Trans, v, vp, identity)
	g = solve(blas.Trans, v, vp, transposeEntries(n, sg)) // (S⁻¹G·V⁻¹)ᵀ, symmetric
	h = solve(blas.NoTrans, v, vp, transposeEntries(n, sq))
	for i := 0; i < n; i++ {
		a[i*n+i]++
	}
	for i := range g {
		g[i] *= 2 * gamma
		h[i] *= 2 * gamma
	}
	makeSymmetric(n, g)
	makeSymmetric(n, h)
	return a, g, h, true
}

// transposeEntries copies the transposed n×n matrix.
func transposeEntries(n int, x []float64) []float64 {
	t := make([]float64, n*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			t[j*n+i] = x[i*n+j]
		}
	}
	return t
}

// addShift goes from Y to X = shift + Y.
func (d *riccatiData) addShift(y []float64) {
	for i, v := range d.shift {
		y[i] += v
	}
}

// cayleyStart maps the symplectic pencil M − λL, M = [A 0; −Q I], L = [I G; 0 Aᵀ],
// by μ = (λ − σ)/(λ + σ), σ = ±1, to a matrix whose left half plane holds the
// images of |λ| < 1, and takes its invariant subspace; of the two signs the one
// whose M + σL is farther from singular.
func (d *riccatiData) cayleyStart(context.Context) ([]float64, error) {
	n := d.n
	d.method = "ordered Schur form of the Cayley transform of the symplectic pencil"
	var best []float64
	quality := 0.0
	for _, sign := range []float64{1, -1} {
		plus, minus := d.symplecticSum(sign), d.symplecticSum(-sign)
		pivots := make([]int, 2*n)
		if !kernels.Dgetrf(2*n, 2*n, plus, 2*n, pivots) {
			continue
		}
		smallest, largest := math.Inf(1), 0.0
		for i := 0; i < 2*n; i++ {
			v := math.Abs(plus[i*2*n+i])
			smallest, largest = math.Min(smallest, v), math.Max(largest, v)
		}
		if smallest/largest > quality {
			quality = smallest / largest
			kernels.Dgetrs(blas.NoTrans, 2*n, 2*n, plus, 2*n, pivots, minus, 2*n)
			best = minus
		}
	}
	if best == nil {
		return nil, errNoStart
	}
	y, err := d.stableSubspace(best)
	if err != nil {
		return nil, err
	}
	d.addShift(y)
	return y, nil
}

// symplecticSum is M + sign·L of the symplectic pencil.
func (d *riccatiData) symplecticSum(sign float64) []float64 {
	n := d.n
	s := make([]float64, 4*n*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			s[i*2*n+j] = d.reducedA[i*n+j]
			s[i*2*n+n+j] = sign * d.reducedG[i*n+j]
			s[(n+i)*2*n+j] = -d.reducedQ[i*n+j]
			s[(n+i)*2*n+n+j] = sign * d.reducedA[j*n+i]
		}
		s[i*2*n+i] += sign
		s[(n+i)*2*n+n+i]++
	}
	return s
}

// regularisedStart solves the problem with Q + δI instead of Q, whose closed
// loop is well inside the stability region; for Q ≥ 0 Newton's iteration from
// its solution descends to the stabilising one (Kleinman 1968).
func (d *riccatiData) regularisedStart(ctx context.Context) ([]float64, error) {
	if !d.weightsSemidefinite() {
		return nil, errNoStart
	}
	n := d.n
	rounded := *d
	rounded.reducedQ = append([]float64(nil), d.reducedQ...)
	delta := 0.01 * (largestOf(d.reducedQ) + largestOf(d.reducedA))
	for i := 0; i < n; i++ {
		rounded.reducedQ[i*n+i] += delta
	}
	x, err := rounded.doublingStart(ctx)
	if err != nil && !d.sampled {
		x, err = rounded.hamiltonianStart(ctx)
	}
	d.method = "Newton steps down from the solution for larger weights"
	return x, err
}

// weightsSemidefinite tells whether the reduced Q has no eigenvalue that is
// negative beyond rounding.
func (d *riccatiData) weightsSemidefinite() bool {
	if d.verdict == nil {
		s, err := symmetricEigen(mat.NewDense(d.n, d.n, append([]float64(nil), d.reducedQ...)), nil)
		holds := err == nil
		if holds {
			smallest, largest := real(s.Values[0]), math.Abs(real(s.Values[d.n-1]))
			holds = smallest >= -8*float64(d.n)*unitRoundoff*math.Max(largest, -smallest)
		}
		d.verdict = &holds
	}
	return *d.verdict
}
