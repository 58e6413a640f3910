package numeric

import (
	"math"
	"math/cmplx"
	"sort"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/mat"
)

// nearBoundary is the relative distance from the stability boundary below which
// a closed-loop pole is looked at with suspicion: rounding moves a double
// eigenvalue of the Hamiltonian on the axis by about √u ≈ 1e-8, so a pole at
// −5e-8 may be one at 0.
const nearBoundary = 1e-5

// mostModesTested bounds the number of singular value computations of one
// diagnosis; the modes least moved come first.
const mostModesTested = 24

// smallestSingular computes the smallest singular value of the complex p×q
// matrix re + i·im, p ≥ q, and a unit right singular vector, by QR of its real
// form and inverse iteration.
func smallestSingular(p, q int, re, im []float64) (float64, []complex128) {
	rows, columns := 2*p, 2*q
	m := make([]float64, rows*columns)
	for i := 0; i < p; i++ {
		for j := 0; j < q; j++ {
			m[i*columns+j], m[i*columns+q+j] = re[i*q+j], -im[i*q+j]
			m[(p+i)*columns+j], m[(p+i)*columns+q+j] = im[i*q+j], re[i*q+j]
		}
	}
	tau, work := make([]float64, columns), make([]float64, 64*columns+64*64)
	kernels.Dgeqrf(rows, columns, m, columns, tau, work, len(work))
	floor := math.Max(unitRoundoff*largestOf(m)/8, math.SmallestNonzeroFloat64/machineEpsilon)
	for i := 0; i < columns; i++ {
		if math.Abs(m[i*columns+i]) < floor {
			m[i*columns+i] = math.Copysign(floor, m[i*columns+i])
		}
	}
	v := reflectionVector(columns, 1)
	sigma := math.Inf(1)
	for round := 0; round < 8; round++ {
		products.Dtrsv(blas.Upper, blas.Trans, blas.NonUnit, columns, m, columns, v, 1)
		scaleToUnit(v)
		products.Dtrsv(blas.Upper, blas.NoTrans, blas.NonUnit, columns, m, columns, v, 1)
		growth := scaleToUnit(v)
		if next := 1 / growth; next > 0.99*sigma {
			break
		} else {
			sigma = next
		}
	}
	x := make([]complex128, q)
	for i := range x {
		x[i] = complex(v[i], v[q+i])
	}
	return sigma, x
}

// scaleToUnit divides v by its norm, which it returns; safe against overflow.
func scaleToUnit(v []float64) float64 {
	largest := largestOf(v)
	sum := 0.0
	for _, e := range v {
		sum += (e / largest) * (e / largest)
	}
	norm := largest * math.Sqrt(sum)
	for i := range v {
		v[i] /= norm
	}
	return norm
}

// hiddenMode looks near mu for the λ at which σ_min([F − λI; E]) is smallest, by
// Rayleigh quotients of the null vector; project forces λ onto the stability
// boundary (or leaves it alone). The rows of E are first scaled down to the norm
// of F, which changes no kernel. It returns λ, σ and the size that σ is to be
// compared with.
func hiddenMode(n int, f []float64, e []float64, mu complex128, project func(complex128) complex128) (complex128, float64, float64) {
	norm, rows := frobenius(f), len(e)/n
	p := n + rows
	re, im := make([]float64, p*n), make([]float64, p*n)
	for i := 0; i < rows; i++ {
		row := e[i*n : (i+1)*n]
		factor := 1.0
		if size := frobenius(row); norm > 0 && size > norm {
			factor = norm / size
		}
		for j, v := range row {
			re[(n+i)*n+j] = factor * v
		}
	}
	size := norm + frobenius(re[n*n:])
	best, at := math.Inf(1), mu
	lambda := project(mu)
	for round := 0; round < 5; round++ {
		copy(re, f)
		for i := 0; i < n; i++ {
			re[i*n+i] -= real(lambda)
			im[i*n+i] = -imag(lambda)
		}
		sigma, x := smallestSingular(p, n, re, im)
		if sigma >= 0.5*best {
			if sigma < best {
				best, at = sigma, lambda
			}
			break
		}
		best, at = sigma, lambda
		lambda = project(rayleigh(n, f, x))
	}
	return at, best, size
}

// rayleigh is xᴴFx for a unit vector x.
func rayleigh(n int, f []float64, x []complex128) complex128 {
	var sum complex128
	for i := 0; i < n; i++ {
		var row complex128
		for j := 0; j < n; j++ {
			row += complex(f[i*n+j], 0) * x[j]
		}
		sum += cmplx.Conj(x[i]) * row
	}
	return sum
}

// ontoBoundary projects λ onto the imaginary axis or the unit circle.
func (d *riccatiData) ontoBoundary(lambda complex128) complex128 {
	if !d.sampled {
		return complex(0, imag(lambda))
	}
	if size := cmplx.Abs(lambda); size > 0 {
		return lambda / complex(size, 0)
	}
	return 1
}

// hiddenTolerance is the relative size below which σ_min counts as zero.
func hiddenTolerance(n int) float64 { return 10 * math.Sqrt(float64(n)) * unitRoundoff }

// unstabilizable looks for modes that are not stable and that no input moves, to
// rounding.
func (d *riccatiData) unstabilizable() *Refusal {
	n, m := d.n, d.m
	s, err := Eigen(mat.NewDense(n, n, append([]float64(nil), d.reducedA...)))
	if err != nil {
		return nil
	}
	order := d.suspects(s)
	at, drive := make([]float64, n*n), make([]float64, m*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			at[j*n+i] = d.reducedA[i*n+j]
		}
		for j := 0; j < m; j++ {
			drive[j*n+i] = d.drive[i*m+j]
		}
	}
	var modes []complex128
	tolerance := hiddenTolerance(n)
	for _, i := range order {
		lambda, sigma, size := hiddenMode(n, at, drive, cmplx.Conj(s.Values[i]), func(l complex128) complex128 { return l })
		if sigma <= tolerance*size && d.margin(lambda) <= 4*tolerance*size {
			modes = appendMode(modes, cmplx.Conj(lambda), tolerance*size)
			continue
		}
		if math.Abs(d.margin(s.Values[i])) < nearBoundary*size {
			lambda, sigma, size = hiddenMode(n, at, drive, cmplx.Conj(s.Values[i]), d.ontoBoundary)
			if sigma <= tolerance*size {
				modes = appendMode(modes, cmplx.Conj(lambda), tolerance*size)
			}
		}
	}
	if modes == nil {
		return nil
	}
	return &Refusal{Reason: "no gain stabilises the plant: no input moves the mode", Modes: modes}
}

// suspects gives the indices of modes that are not clearly stable, one of each
// pair, least moved first.
func (d *riccatiData) suspects(s *Eigensystem) []int {
	n, m := d.n, d.m
	moved := make(map[int]float64)
	var order []int
	norm := frobenius(d.reducedA)
	for i, lambda := range s.Values {
		if imag(lambda) < 0 || d.margin(lambda) > nearBoundary*math.Max(norm, 1e-300) {
			continue
		}
		for j := 0; j < m; j++ {
			var product complex128
			for k := 0; k < n; k++ {
				product += cmplx.Conj(s.Left.At(k, i)) * complex(d.drive[k*m+j], 0)
			}
			moved[i] += cmplx.Abs(product)
		}
		order = append(order, i)
	}
	sort.SliceStable(order, func(a, b int) bool { return moved[order[a]] < moved[order[b]] })
	return order[:min(len(order), mostModesTested)]
}

// appendMode adds a mode (and its conjugate) unless it is there already.
func appendMode(modes []complex128, lambda complex128, tolerance float64) []complex128 {
	if math.Abs(imag(lambda)) <= 4*tolerance {
		lambda = complex(real(lambda), 0)
	}
	if math.Abs(real(lambda)) <= 4*tolerance {
		lambda = complex(0, imag(lambda))
	}
	for _, known := range modes {
		if cmplx.Abs(known-lambda) <= 1e-6*(1+cmplx.Abs(lambda)) || cmplx.Abs(known-cmplx.Conj(lambda)) <= 1e-6*(1+cmplx.Abs(lambda)) {
			return modes
		}
	}
	modes = append(modes, lambda)
	if imag(lambda) != 0 {
		modes = append(modes, cmplx.Conj(lambda))
	}
	return modes
}

// unseen looks for modes on the stability boundary, near one of the candidates,
// that the weights do not see, to rounding.
func (d *riccatiData) unseen(candidates []complex128) *Refusal {
	n := d.n
	var modes []complex128
	tolerance := hiddenTolerance(n)
	for _, candidate := range candidates {
		lambda, sigma, size := hiddenMode(n, d.reducedA, d.reducedQ, candidate, d.ontoBoundary)
		if sigma <= tolerance*size {
			modes = appendMode(modes, lambda, tolerance*size)
		}
	}
	if modes == nil {
		return nil
	}
	reason := "no stabilising solution exists: the weights of the states do not see the mode on the imaginary axis"
	if d.sampled {
		reason = "no stabilising solution exists: the weights of the states do not see the mode on the unit circle"
	}
	return &Refusal{Reason: reason, Modes: modes}
}

// boundaryValue is σ_min(H − λI), or σ_min(M − λL) of the symplectic pencil,
// relative to the norm.
func (d *riccatiData) boundaryValue(lambda complex128) float64 {
	n := 2 * d.n
	var re []float64
	im := make([]float64, n*n)
	if d.sampled {
		re = d.symplecticSum(-real(lambda))
		turned, still := d.symplecticSum(imag(lambda)), d.symplecticSum(0)
		for i := range im {
			im[i] = still[i] - turned[i]
		}
	} else {
		re = hamiltonian(d.n, d.reducedA, d.reducedG, d.reducedQ)
		for i := 0; i < n; i++ {
			im[i*n+i] = -imag(lambda)
		}
	}
	sigma, _ := smallestSingular(n, n, re, im)
	return ratio(sigma, frobenius(re))
}

// near is the distance from the stability boundary within which eigenvalues are
// looked at.
func (d *riccatiData) near() float64 {
	if d.sampled {
		return nearBoundary
	}
	return nearBoundary * math.Max(frobenius(d.reducedA), 1e-300)
}

// besideBoundary selects the values within the given distance of the boundary,
// one of each pair.
func (d *riccatiData) besideBoundary(values []complex128, within float64) []complex128 {
	var chosen []complex128
	for _, v := range values {
		if imag(v) >= 0 && math.Abs(d.margin(v)) <= within && len(chosen) < mostModesTested {
			chosen = append(chosen, v)
		}
	}
	return chosen
}

// hidden looks for modes hidden from the inputs or from the weights, the latter
// near the modes of A and the further candidates.
func (d *riccatiData) hidden(candidates []complex128) *Refusal {
	if refusal := d.unstabilizable(); refusal != nil {
		return refusal
	}
	if values, err := Eigenvalues(mat.NewDense(d.n, d.n, append([]float64(nil), d.reducedA...))); err == nil {
		// Clusters on the axis scatter far: look at all within a per mille.
		candidates = append(candidates, d.besideBoundary(values, 100*d.near())...)
	}
	return d.unseen(candidates)
}

// diagnose says why no solution was found, or nothing.
func (d *riccatiData) diagnose() *Refusal {
	if refusal := d.hidden(nil); refusal != nil {
		return refusal
	}
	candidates := d.besideBoundary(d.pencilEigenvalues(), 10*d.near())
	if refusal := d.unseen(candidates); refusal != nil {
		return refusal
	}
	return d.onBoundary(candidates)
}

// onBoundary refuses when the pencil is singular, to rounding, at a candidate.
func (d *riccatiData) onBoundary(candidates []complex128) *Refusal {
	var modes []complex128
	tolerance := hiddenTolerance(2 * d.n)
	for _, candidate := range candidates {
		lambda := d.ontoBoundary(candidate)
		if d.boundaryValue(lambda) <= tolerance {
			modes = appendMode(modes, lambda, tolerance)
		}
	}
	if modes == nil {
		return nil
	}
	reason := "no stabilising solution exists, to rounding: the Hamiltonian matrix has an eigenvalue on the imaginary axis"
	if d.sampled {
		reason = "no stabilising solution exists, to rounding: the symplectic pencil has an eigenvalue on the unit circle"
	}
	return &Refusal{Reason: reason, Modes: modes}
}

// pencilEigenvalues are those of the Hamiltonian, or of the symplectic pencil by
// way of its Cayley transform (an eigenvalue that the transform cannot see is
// left out).
func (d *riccatiData) pencilEigenvalues() []complex128 {
	n := 2 * d.n
	if !d.sampled {
		w, err := Eigenvalues(mat.NewDense(n, n, hamiltonian(d.n, d.reducedA, d.reducedG, d.reducedQ)))
		if err != nil {
			return nil
		}
		return w
	}
	for _, sign := range []float64{1, -1} {
		plus, minus := d.symplecticSum(sign), d.symplecticSum(-sign)
		pivots := make([]int, n)
		if !kernels.Dgetrf(n, n, plus, n, pivots) {
			continue
		}
		kernels.Dgetrs(blas.NoTrans, n, n, plus, n, pivots, minus, n)
		w, err := Eigenvalues(mat.NewDense(n, n, minus))
		if err != nil {
			continue
		}
		for i, mu := range w {
			w[i] = complex(sign, 0) * (1 + mu) / (1 - mu)
		}
		return w
	}
	return nil
}

// doubt examines a solution that looks too weak to be true: reached over a
// nearly vertical subspace, with few digits, or with poles next to the boundary.
func (d *riccatiData) doubt(s *riccatiState) *Refusal {
	if d.flat || s.regularised || !(s.estimate < 1e-6*s.size) {
		if refusal := d.unstabilizable(); refusal != nil {
			return refusal
		}
	}
	within := nearBoundary * (frobenius(s.ac) + frobenius(d.reducedA))
	if d.sampled {
		within = nearBoundary
	}
	var near, singular []complex128
	tolerance := hiddenTolerance(2 * d.n)
	for _, pole := range s.poles {
		if imag(pole) < 0 || d.margin(pole) > within || len(near) == mostModesTested {
			continue
		}
		near = append(near, pole)
		if d.boundaryValue(d.ontoBoundary(pole)) <= tolerance {
			singular = append(singular, pole)
		}
	}
	if len(singular) == 0 {
		return nil
	}
	if !d.weightsSemidefinite() {
		return d.onBoundary(singular)
	}
	// With Q ≥ 0 and G ≥ 0 the pencil is singular on the boundary only where a
	// mode is hidden from the inputs or from the weights, and that is decided
	// without taking square roots of rounding.
	return d.hidden(near)
}
