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
