package numeric

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// generalEigen balances, computes the Schur form and both sets of vectors.
func generalEigen(a, within *mat.Dense) (*Eigensystem, error) {
	n, _ := a.Dims()
	balanced := mat.DenseCopyOf(a)
	scale := make([]float64, n)
	low, high := kernels.Dgebal(lapack.PermuteScale, n, balanced.RawMatrix().Data, n, scale)
	t, z := mat.DenseCopyOf(balanced), mat.NewDense(n, n, nil)
	w := make([]complex128, n)
	if !schurInPlace(n, low, high, t.RawMatrix().Data, z.RawMatrix().Data, w) {
		var err error
		if t, z, w, err = Schur(balanced); err != nil {
			return nil, err
		}
	}
	// |E| + 2u|A|: what the computation and the rounding of the data may have
	// changed in each entry.
	var product, change mat.Dense
	product.Mul(z, t)
	change.Mul(&product, z.T())
	change.Sub(balanced, &change)
	residual, norm := mat.Norm(&change, 2), mat.Norm(balanced, 2)
	change.Apply(func(i, j int, v float64) float64 {
		return math.Abs(v) + 2*unitRoundoff*math.Abs(balanced.At(i, j))
	}, &change)

	right, left := mat.DenseCopyOf(z), mat.DenseCopyOf(z)
	work := make([]float64, n+2*n*64)
	if !recovered(func() bool {
		kernels.Dtrevc3(lapack.EVBoth, lapack.EVAllMulQ, nil, n, t.RawMatrix().Data, n, left.RawMatrix().Data, n, right.RawMatrix().Data, n, n, work, len(work))
		return true
	}) {
		return nil, errNotConverged
	}
	s := &Eigensystem{Values: w, Condition: make([]float64, n), ErrorOf: make([]float64, n)}
	balancedRight, balancedLeft := complexColumns(right, w), complexColumns(left, w)
	firstOrderErrors(s.ErrorOf, &change, balancedRight, balancedLeft)
	kernels.Dgebak(lapack.PermuteScale, lapack.EVRight, n, low, high, scale, n, right.RawMatrix().Data, n)
	kernels.Dgebak(lapack.PermuteScale, lapack.EVLeft, n, low, high, scale, n, left.RawMatrix().Data, n)
	s.Right, s.Left = complexColumns(right, w), complexColumns(left, w)
	for j := range w {
		s.Condition[j] = 1 / cmplx.Abs(columnProduct(s.Left, s.Right, j))
	}
	level := unitRoundoff
	if within != nil {
		level += ratio(mat.Norm(within, 2), mat.Norm(a, 2))
		passed := make([]float64, n)
		firstOrderErrors(passed, within, s.Right, s.Left)
		for j, e := range passed {
			s.ErrorOf[j] += e
		}
	}
	s.clusterErrors(norm, math.Min(level, 1))
	s.VectorCondition = vectorCondition(right, w)
	s.Certificate = Certificate{Method: "balanced real Schur form, back substitution for the vectors", Residual: ratio(residual, norm)}
	return s, nil
}

// complexColumns expands the packed real and imaginary columns of a real
// eigenvector matrix into unit complex columns.
func complexColumns(packed *mat.Dense, w []complex128) *mat.CDense {
	n, _ := packed.Dims()
	v := mat.NewCDense(n, n, nil)
	for j := 0; j < n; j++ {
		pair := imag(w[j]) != 0 && j+1 < n
		norm := 0.0
		for i := 0; i < n; i++ {
			norm = math.Hypot(norm, packed.At(i, j))
			if pair {
				norm = math.Hypot(norm, packed.At(i, j+1))
			}
		}
		for i := 0; i < n; i++ {
			if !pair {
				v.Set(i, j, complex(packed.At(i, j)/norm, 0))
				continue
			}
			x := complex(packed.At(i, j)/norm, packed.At(i, j+1)/norm)
			v.Set(i, j, x)
			v.Set(i, j+1, cmplx.Conj(x))
		}
		if pair {
			j++
		}
	}
	return v
}

// columnProduct is yᴴx for column j of both matrices.
func columnProduct(left, right *mat.CDense, j int) complex128 {
	n, _ := left.Dims()
	var sum complex128
	for i := 0; i < n; i++ {
		sum += cmplx.Conj(left.At(i, j)) * right.At(i, j)
	}
	return sum
}

// firstOrderErrors sets e_j = |y_j|ᵀ·change·|x_j| / |y_jᴴx_j|.
func firstOrderErrors(e []float64, change *mat.Dense, right, left *mat.CDense) {
	n := len(e)
	absolute := func(v *mat.CDense) *mat.Dense {
		m := mat.NewDense(n, n, nil)
		m.Apply(func(i, j int, _ float64) float64 { return cmplx.Abs(v.At(i, j)) }, m)
		return m
	}
	x, y := absolute(right), absolute(left)
	var moved mat.Dense
	moved.Mul(change, x)
	for j := range e {
		sum := 0.0
		for i := 0; i < n; i++ {
			sum += y.At(i, j) * moved.At(i, j)
		}
		e[j] = sum / cmplx.Abs(columnProduct(left, right, j))
		if math.IsNaN(e[j]) {
			e[j] = 0
		}
	}
}

// clusterErrors joins eigenvalues whose error discs nearly touch. Around a
// defective eigenvalue of multiplicity k the computed ones lie on a circle of
// radius δ, their first-order estimates are δ/k and their spacing 2πδ/k: hence
// the factors π and k. Where the estimate breaks down altogether (vectors
// orthogonal to rounding) ‖A‖·level^(1/k) takes its place, with level the relative
// size of the perturbation.
func (s *Eigensystem) clusterErrors(norm, level float64) {
	n := len(s.Values)
	radius := make([]float64, n)
	for i, e := range s.ErrorOf {
		radius[i] = e
		if !(e <= 0.1*norm) {
			radius[i] = norm * math.Sqrt(level)
		}
	}
	group := make([]int, n)
	for i := range group {
		group[i] = i
	}
	find := func(i int) int {
		for group[i] != i {
			i = group[i]
		}
		return i
	}
	for i := 0; i < n; i++ {
		for j := 0; j < i; j++ {
			// Well-conditioned neighbours (a multiple but not defective
			// eigenvalue) are left alone: each is as good as its estimate.
			if cmplx.Abs(s.Values[i]-s.Values[j]) <= math.Pi*(radius[i]+radius[j]) && math.Max(radius[i], radius[j]) > 1e3*unitRoundoff*norm {
				group[find(i)] = find(j)
			}
		}
	}
	members := make([][]int, n)
	for i := range group {
		members[find(i)] = append(members[find(i)], i)
	}
	for _, cluster := range members {
		if len(cluster) > 1 {
			s.Clusters = append(s.Clusters, cluster)
		}
		worst := 0.0
		for _, i := range cluster {
			worst = math.Max(worst, s.memberError(i, cluster, norm, level))
		}
		for _, i := range cluster {
			s.ErrorOf[i] = worst
		}
	}
}

// memberError bounds the error of eigenvalue i in its cluster of k: k·e, or where
// the computed members lie closer together than that, k·(e·Π|λᵢ − λⱼ|)^(1/k), since
// the product of the gaps divides e. Members that coincide were kept 2⁻⁵²·|λ| apart
// when their vectors were computed.
func (s *Eigensystem) memberError(i int, cluster []int, norm, level float64) float64 {
	k := float64(len(cluster))
	e := s.ErrorOf[i]
	if k == 1 {
		return e
	}
	if math.IsInf(e, 0) {
		return norm * math.Pow(level, 1/k)
	}
	root := math.Pow(e, 1/k)
	for _, j := range cluster {
		if j != i {
			gap := math.Max(cmplx.Abs(s.Values[i]-s.Values[j]), machineEpsilon*math.Max(cmplx.Abs(s.Values[i]), level*norm))
			root *= math.Pow(gap, 1/k)
		}
	}
	return k * math.Min(e, root)
}

// vectorCondition is κ₂ of the unit eigenvectors. A pair of columns v, v̄ spans
// what √2·Re v, √2·Im v spans, up to a unitary factor, so the singular values
// of a real matrix serve.
func vectorCondition(packed *mat.Dense, w []complex128) float64 {
	n, _ := packed.Dims()
	m := mat.DenseCopyOf(packed)
	for j := 0; j < n; j++ {
		width, gain := 1, 1.0
		if imag(w[j]) != 0 && j+1 < n {
			width, gain = 2, math.Sqrt2
		}
		norm := mat.Norm(m.Slice(0, n, j, j+width), 2)
		for i := 0; i < n; i++ {
			for k := j; k < j+width; k++ {
				m.Set(i, k, m.At(i, k)*gain/norm)
			}
		}
		j += width - 1
	}
	values, err := singularValues(m)
	if err != nil {
		return math.Inf(1)
	}
	return values[0] / values[n-1]
}

// singularValues computes the singular values of a copy of m, largest first.
func singularValues(m *mat.Dense) ([]float64, error) {
	rows, columns := m.Dims()
	work := mat.DenseCopyOf(m)
	values := make([]float64, min(rows, columns))
	query := make([]float64, 1)
	kernels.Dgesvd(lapack.SVDNone, lapack.SVDNone, rows, columns, work.RawMatrix().Data, columns, values, nil, 1, nil, 1, query, -1)
	space := make([]float64, int(query[0]))
	if !recovered(func() bool {
		return kernels.Dgesvd(lapack.SVDNone, lapack.SVDNone, rows, columns, work.RawMatrix().Data, columns, values, nil, 1, nil, 1, space, len(space))
	}) {
		return nil, errNotConverged
	}
	return values, nil
}
