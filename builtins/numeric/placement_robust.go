package numeric

import (
	"context"
	"math"
	"math/rand"

	"gonum.org/v1/gonum/mat"
)

// Limits of the ascent. A sweep that gains less than smallestGain in
// log|det X| ends it; that many sweeps were never needed in trials except on
// problems whose determinant tends to zero anyhow.
const (
	mostSweeps   = 60
	smallestGain = 1e-4
)

// defectiveCondition is the κ₂(X) from which the eigenvectors are taken for
// dependent and the pole set is assigned by invariant subspaces instead.
const defectiveCondition = 1e9

// clusterTolerance is the relative distance below which poles count as
// repeated when it is asked whether a diagonalizable loop can exist.
const clusterTolerance = 1e-7

// ascent is the search for eigenvectors of the reached part.
type ascent struct {
	n, q    int // states, independent inputs
	wanted  []wantedPole
	spaces  [][]complex128 // n×q orthonormal: the eigenvectors each pole can have
	x       []float64      // eigenvectors as columns; pairs as √2·(real, imaginary)
	inverse []float64
	rows    []float64 // work: 2×n, the new rows of the inverse
	columns []float64 // work: 2×n, the new columns of x
}

// severalInputs chooses the method for two or more independent inputs.
func (t *assignment) severalInputs(ctx context.Context, seed int64) (*reducedGain, error) {
	if t.inputs == t.reached {
		return t.fullFreedom(), nil
	}
	groups := poleGroups(t.wanted, clusterTolerance)
	if len(groups) > 0 && groups[0].count > t.inputs {
		return t.byDeflation(seed)
	}
	search := t.newAscent()
	best, err := search.best(ctx, seed)
	if err != nil {
		return nil, err
	}
	if best == nil {
		return t.byDeflation(seed)
	}
	best.k = search.gain(t.a, best)
	return best, nil
}

// fullFreedom serves as many independent inputs as states: A − B·K becomes the
// block diagonal matrix of the wanted poles, in the declared states when all
// of them are reached, so that κ(X) is 1.
func (t *assignment) fullFreedom() *reducedGain {
	r := t.reached
	block := mat.NewDense(r, r, nil)
	at := 0
	for _, w := range t.wanted {
		re, im := real(w.value), imag(w.value)
		block.Set(at, at, re)
		if w.pair() {
			block.Set(at+1, at+1, re)
			block.Set(at, at+1, im)
			block.Set(at+1, at, -im)
		}
		at += w.count()
	}
	if r == t.form.n {
		q := mat.NewDense(r, r, t.form.q)
		block.Mul(q.T(), block)
		block.Mul(block, q)
	}
	k := append([]float64(nil), t.a...)
	for i, v := range block.RawMatrix().Data {
		k[i] -= v
	}
	return &reducedGain{k: k, method: "as many independent inputs as states: every state gets its own pole"}
}

// newAscent finds the space of possible eigenvectors of each pole: the kernel
// of the rows of A − pI that B does not act on.
func (t *assignment) newAscent() *ascent {
	r, q := t.reached, t.inputs
	s := &ascent{n: r, q: q, wanted: t.wanted, rows: make([]float64, 2*r), columns: make([]float64, 2*r)}
	pencil := newShiftedTrapezoid(r-q, q, t.a[q*r:])
	for _, w := range t.wanted {
		pencil.factor(w.value)
		space := make([]complex128, r*q)
		pencil.kernelBasis(space)
		s.spaces = append(s.spaces, space)
	}
	return s
}

// starts is how many starting points are tried for a size.
func (s *ascent) starts() int {
	switch {
	case s.n <= 12:
		return 8
	case s.n <= 40:
		return 5
	case s.n <= 120:
		return 3
	}
	return 2
}

// best runs the ascent from several starts and keeps the smallest κ₂(X); nil
// when every X is singular to working precision.
func (s *ascent) best(ctx context.Context, seed int64) (*reducedGain, error) {
	random := rand.New(rand.NewSource(seed))
	var found *reducedGain
	lowest := defectiveCondition
	for start := 0; start < s.starts(); start++ {
		if start == 0 {
			s.greedyStart()
		} else {
			s.randomStart(random)
		}
		if !s.invert() {
			continue
		}
		if err := s.climb(ctx); err != nil {
			return nil, err
		}
		s.orthonormalizeRepeated()
		values, err := singularValues(mat.NewDense(s.n, s.n, s.x))
		if err != nil {
			return nil, err
		}
		if condition := values[0] / values[s.n-1]; condition < lowest && s.invert() {
			lowest = condition
			found = &reducedGain{method: "several inputs: coordinate ascent on |det X| over the eigenvectors (Kautsky, Nichols & Van Dooren 1985; Tits & Yang 1996)",
				x: append([]float64(nil), s.x...), condition: condition, sensitivities: s.sensitivities(), order: s.wanted}
		}
	}
	return found, nil
}

// orthonormalizeRepeated makes the eigenvectors of equal poles orthonormal:
// any basis of their space serves the gain, and this one shows κ as it is.
func (s *ascent) orthonormalizeRepeated() {
	n := s.n
	column := func(at int, pair bool) []complex128 {
		v := make([]complex128, n)
		for i := range v {
			v[i] = complex(s.x[i*n+at], 0)
			if pair {
				v[i] = complex(s.x[i*n+at], s.x[i*n+at+1])
			}
		}
		normalizeComplex(v)
		return v
	}
	at := 0
	before := make(map[complex128][][]complex128)
	for _, w := range s.wanted {
		v := column(at, w.pair())
		same := before[w.value]
		for pass := 0; pass < 2 && len(same) > 0; pass++ {
			for _, u := range same {
				f := innerProduct(u, v)
				for i, x := range u {
					v[i] -= f * x
				}
			}
			normalizeComplex(v)
		}
		before[w.value] = append(same, v)
		if len(same) > 0 {
			for i, x := range v {
				s.x[i*n+at] = real(x)
				if w.pair() {
					s.x[i*n+at], s.x[i*n+at+1] = math.Sqrt2*real(x), math.Sqrt2*imag(x)
				}
			}
		}
		at += w.count()
	}
}

// sensitivities are ‖y‖·‖x‖ for each entry of wanted, with yᴴx = 1.
func (s *ascent) sensitivities() []float64 {
	n, at := s.n, 0
	out := make([]float64, len(s.wanted))
	for p, w := range s.wanted {
		out[p] = blocksNorm(s.inverse[at*n:(at+1)*n]) * columnLength(s.x, n, n, at)
		if w.pair() { // x = (c₁ + i·c₂)/√2 and yᴴ = (r₁ − i·r₂)/√2
			out[p] = blocksNorm(s.inverse[at*n:(at+2)*n]) / 2 * math.Hypot(columnLength(s.x, n, n, at), columnLength(s.x, n, n, at+1))
		}
		at += w.count()
	}
	return out
}

// greedyStart takes for each pole the vector that stands out most from those
// taken before.
func (s *ascent) greedyStart() {
	n, q := s.n, s.q
	s.x = make([]float64, n*n)
	var orthonormal [][]float64
	at := 0
	for p, w := range s.wanted {
		rest := append([]complex128(nil), s.spaces[p]...)
		for _, o := range orthonormal {
			for j := 0; j < q; j++ {
				var sum complex128
				for i, v := range o {
					sum += complex(v, 0) * rest[i*q+j]
				}
				for i, v := range o {
					rest[i*q+j] -= sum * complex(v, 0)
				}
			}
		}
		gram, turn := make([]complex128, q*q), make([]complex128, q*q)
		for i := 0; i < n; i++ {
			for a := 0; a < q; a++ {
				conj := complex(real(rest[i*q+a]), -imag(rest[i*q+a]))
				for b := 0; b < q; b++ {
					gram[a*q+b] += conj * rest[i*q+b]
				}
			}
		}
		hermitianJacobi(gram, turn, q)
		s.setVector(at, p, sortedColumns(gram, turn, q)[0])
		for part := 0; part < w.count(); part++ {
			column := make([]float64, n)
			for i := range column {
				column[i] = s.x[i*n+at+part]
			}
			if o := perpendicular(column, orthonormal); o != nil {
				orthonormal = append(orthonormal, o)
			}
		}
		at += w.count()
	}
}

// perpendicular is the unit vector of what column adds to the given ones; nil
// when that is nothing.
func perpendicular(column []float64, orthonormal [][]float64) []float64 {
	for pass := 0; pass < 2; pass++ {
		for _, o := range orthonormal {
			sum := 0.0
			for i, v := range o {
				sum += v * column[i]
			}
			for i, v := range o {
				column[i] -= sum * v
			}
		}
	}
	length := blocksNorm(column)
	if length < 1e-12 {
		return nil
	}
	for i := range column {
		column[i] /= length
	}
	return column
}

// randomStart takes a random vector for each pole.
func (s *ascent) randomStart(random *rand.Rand) {
	at := 0
	coefficients := make([]complex128, s.q)
	for p, w := range s.wanted {
		for j := range coefficients {
			re, im := random.NormFloat64(), random.NormFloat64()
			if !w.pair() {
				im = 0
			}
			coefficients[j] = complex(re, im)
		}
		normalizeComplex(coefficients)
		s.setVector(at, p, coefficients)
		at += w.count()
	}
}

// setVector writes spaces[p]·coefficients into column at (and at+1) of x.
func (s *ascent) setVector(at, p int, coefficients []complex128) {
	n, q := s.n, s.q
	pair := s.wanted[p].pair()
	for i := 0; i < n; i++ {
		var sum complex128
		for j, f := range coefficients {
			sum += s.spaces[p][i*q+j] * f
		}
		if pair {
			s.x[i*n+at], s.x[i*n+at+1] = math.Sqrt2*real(sum), math.Sqrt2*imag(sum)
		} else {
			s.x[i*n+at] = real(sum)
		}
	}
}

// invert computes the inverse of x; false when x is singular to working
// precision.
func (s *ascent) invert() bool {
	var inverse mat.Dense
	err := inverse.Inverse(mat.NewDense(s.n, s.n, s.x))
	if poor, ok := err.(mat.Condition); err != nil && (!ok || float64(poor) > 1e15) {
		return false
	}
	s.inverse = append(s.inverse[:0], inverse.RawMatrix().Data...)
	return true
}

// climb sweeps over the poles until |det X| hardly grows.
func (s *ascent) climb(ctx context.Context) error {
	for sweep := 0; sweep < mostSweeps; sweep++ {
		if err := ctx.Err(); err != nil {
			return err
		}
		gain, at := 0.0, 0
		for p, w := range s.wanted {
			if w.pair() {
				gain += s.improvePair(at, p)
			} else {
				gain += s.improveReal(at, p)
			}
			at += w.count()
		}
		if (sweep%8 == 7 || gain > 3) && !s.invert() {
			return nil
		}
		if gain < smallestGain {
			break
		}
	}
	s.invert()
	return nil
}

// improveReal takes the vector of the space closest to the normal of all other
// columns, which is the row at of the inverse, and returns the growth of log|det X|.
func (s *ascent) improveReal(at, p int) float64 {
	n, q := s.n, s.q
	row := s.inverse[at*n : (at+1)*n]
	coefficients := make([]complex128, q)
	for i, y := range row {
		for j := 0; j < q; j++ {
			coefficients[j] += complex(real(s.spaces[p][i*q+j])*y, 0)
		}
	}
	growth := normalizeComplex(coefficients)
	if growth <= 1 {
		return 0
	}
	s.setVector(at, p, coefficients)
	copy(s.rows[:n], row)
	for i := range row {
		s.rows[i] /= growth
	}
	s.eliminate(at, 1)
	return math.Log(growth)
}

// improvePair maximises the area that the pair's real and imaginary part span
// in the plane perpendicular to all other columns. With q₁, q₂ orthonormal in that
// plane, a = Sᴴq₁ and b = Sᴴq₂, the area of x = S·w is wᴴHw for the Hermitian
// H = (a·bᴴ − b·aᴴ)/2i of rank two, whose eigenvectors lie in the span of a and b.
func (s *ascent) improvePair(at, p int) float64 {
	n, q := s.n, s.q
	first, second, area := planeOf(s.inverse[at*n:(at+1)*n], s.inverse[(at+1)*n:(at+2)*n])
	if second == nil {
		return 0
	}
	a, b := make([]complex128, q), make([]complex128, q)
	for i := 0; i < n; i++ {
		for j := 0; j < q; j++ {
			v := s.spaces[p][i*q+j]
			conj := complex(real(v), -imag(v))
			a[j] += conj * complex(first[i], 0)
			b[j] += conj * complex(second[i], 0)
		}
	}
	coefficients, value := rankTwoMaximizer(a, b)
	// The new columns have area 2·value in the plane, the old ones 1/area.
	growth := 2 * value * area
	if !(growth > 1) {
		return 0
	}
	s.setVector(at, p, coefficients)
	if !s.pairRows(at) {
		return 0
	}
	s.eliminate(at, 2)
	return math.Log(growth)
}

// planeOf gives an orthonormal basis of two rows' span and the area they span.
func planeOf(u, v []float64) (first, second []float64, area float64) {
	first, second = append([]float64(nil), u...), append([]float64(nil), v...)
	length := blocksNorm(first)
	if length == 0 {
		return nil, nil, 0
	}
	for i := range first {
		first[i] /= length
	}
	area = length
	for pass := 0; pass < 2; pass++ {
		sum := 0.0
		for i, x := range first {
			sum += x * second[i]
		}
		for i, x := range first {
			second[i] -= sum * x
		}
	}
	length = blocksNorm(second)
	if length == 0 {
		return nil, nil, 0
	}
	for i := range second {
		second[i] /= length
	}
	return first, second, area * length
}

// rankTwoMaximizer gives the unit w that maximises |wᴴ(a·bᴴ − b·aᴴ)w/2i|, and
// that maximum.
func rankTwoMaximizer(a, b []complex128) (w []complex128, value float64) {
	aa, bb := real(innerProduct(a, a)), real(innerProduct(b, b))
	ab := innerProduct(a, b)
	trace := -imag(ab)
	spread := math.Max(0, aa*bb-real(ab)*real(ab)-imag(ab)*imag(ab))
	root := math.Sqrt(trace*trace + spread)
	lambda := (trace + root) / 2
	if trace < 0 {
		lambda = (trace - root) / 2
	}
	// H·(c₁a + c₂b): two proportional solutions, the larger one is used.
	half := complex(0, -0.5) // 1/2i
	ba := complex(real(ab), -imag(ab))
	c1, c2 := half*complex(bb, 0), complex(lambda, 0)-half*ba
	d1, d2 := -half*ab-complex(lambda, 0), half*complex(aa, 0)
	if absSquare(d1)*aa+absSquare(d2)*bb > absSquare(c1)*aa+absSquare(c2)*bb {
		c1, c2 = d1, d2
	}
	w = make([]complex128, len(a))
	for i := range w {
		w[i] = c1*a[i] + c2*b[i]
	}
	if normalizeComplex(w) == 0 {
		return w, 0
	}
	return w, math.Abs(lambda)
}

func absSquare(x complex128) float64 { return real(x)*real(x) + imag(x)*imag(x) }

// pairRows solves for the two rows of the new inverse: the old ones times the
// inverse of their product with the new columns.
func (s *ascent) pairRows(at int) bool {
	n := s.n
	u, v := s.inverse[at*n:(at+1)*n], s.inverse[(at+1)*n:(at+2)*n]
	var p11, p12, p21, p22 float64
	for i := 0; i < n; i++ {
		x, y := s.x[i*n+at], s.x[i*n+at+1]
		p11, p12, p21, p22 = p11+u[i]*x, p12+u[i]*y, p21+v[i]*x, p22+v[i]*y
	}
	determinant := p11*p22 - p12*p21
	if determinant == 0 {
		return false
	}
	for i := 0; i < n; i++ {
		s.rows[i] = (p22*u[i] - p12*v[i]) / determinant
		s.rows[n+i] = (p11*v[i] - p21*u[i]) / determinant
	}
	return true
}

// eliminate updates the inverse after columns at … at+width−1 of x changed;
// rows holds the new rows. All pivots are at least 1 in size, since the
// determinant grew, so that the update is stable.
func (s *ascent) eliminate(at, width int) {
	n := s.n
	for i := 0; i < n; i++ {
		for part := 0; part < width; part++ {
			s.columns[part*n+i] = s.x[i*n+at+part]
		}
	}
	var factors [2]float64
	for i := 0; i < n; i++ {
		if i >= at && i < at+width {
			continue
		}
		row := s.inverse[i*n : (i+1)*n]
		for part := 0; part < width; part++ {
			sum := 0.0
			column := s.columns[part*n : (part+1)*n]
			for k, v := range row {
				sum += v * column[k]
			}
			factors[part] = sum
		}
		for part := 0; part < width; part++ {
			f := factors[part]
			for k, v := range s.rows[part*n : (part+1)*n] {
				row[k] -= f * v
			}
		}
	}
	for part := 0; part < width; part++ {
		copy(s.inverse[(at+part)*n:(at+part+1)*n], s.rows[part*n:(part+1)*n])
	}
}

// gain computes k, the first rows of A − X·Λ·X⁻¹, and refines it once by the
// residual of (A − [k; 0])·X = X·Λ.
func (s *ascent) gain(a []float64, chosen *reducedGain) []float64 {
	n, q := s.n, s.q
	x := mat.NewDense(n, n, chosen.x)
	var factors mat.LU
	factors.Factorize(x)
	k := mat.NewDense(q, n, nil)
	first := mat.NewDense(q, n, a[:q*n])
	for pass := 0; pass < 2; pass++ {
		var residual, loop, step mat.Dense
		loop.Sub(first, k)
		residual.Mul(&loop, x)
		at := 0
		for _, w := range chosen.order {
			re, im := real(w.value), imag(w.value)
			for i := 0; i < q; i++ {
				u := chosen.x[i*n+at]
				if !w.pair() {
					residual.Set(i, at, residual.At(i, at)-u*re)
					continue
				}
				v := chosen.x[i*n+at+1]
				residual.Set(i, at, residual.At(i, at)-(u*re-v*im))
				residual.Set(i, at+1, residual.At(i, at+1)-(u*im+v*re))
			}
			at += w.count()
		}
		_ = factors.SolveTo(&step, true, residual.T()) // κ(X) was judged before
		k.Add(k, step.T())
	}
	return k.RawMatrix().Data
}
