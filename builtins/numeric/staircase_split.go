package numeric

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Split is a system divided by what its inputs move and its outputs see
// (R. E. Kalman, J. SIAM Control 1, 1963; E. G. Gilbert, same volume).
//
// The states x̄ = T·x are ordered: moved and seen, moved only, seen only,
// neither. A = T·A₀·T⁻¹, B = T·B₀, C = C₀·T⁻¹ have zeros where the parts do not
// act on each other.
type Split struct {
	T, Inverse, A, B, C *mat.Dense
	// Sizes and Poles in the order of the parts; PoleError estimates the
	// absolute error of each pole.
	Sizes     [4]int
	Poles     [4][]complex128
	PoleError [4][]float64
	// Threshold counted singular values as zero; Above and Below are the
	// smallest one that counted and the largest that did not, over all
	// decisions, in balanced coordinates.
	Threshold, Above, Below float64
	Certificate             Certificate
}

// KalmanSplit divides the system (a, b, c), n×n, n×m, p×n, into its four parts.
// States, inputs and outputs are balanced first by powers of two; each rank is
// decided on a staircase form with the threshold 1000·(n+m+p)·ε·‖[A B; C 0]‖_F.
// b or c may be nil. The poles come from diagonal blocks of one orthogonal
// transformation; T, which makes the decoupling visible, is as skew as the
// reached and the unseen subspace are close, and the certificate's condition is
// κ₂(T) in balanced coordinates. It errs when shapes do not fit, an entry is not finite, or
// the rank decisions contradict each other.
func KalmanSplit(a, b, c *mat.Dense) (*Split, error) {
	if err := checkPair(a, b); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	_, m := sizeOf(b)
	p, columns := sizeOf(c)
	if p > 0 && columns != n {
		return nil, fmt.Errorf("%s is %d×%d; it must have %d columns", "C", p, columns, n)
	}
	if err := Finite("C", c); err != nil {
		return nil, err
	}
	if n == 0 {
		return &Split{T: &mat.Dense{}, Inverse: &mat.Dense{}, A: &mat.Dense{}, B: &mat.Dense{}, C: &mat.Dense{},
			Above: math.Inf(1), Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	s := stateSpace{n: n, m: m, p: p, a: flatCopy(a), b: flatCopy(b), c: flatCopy(c), d: make([]float64, p*m)}
	scale := s.balanced()
	bases, err := s.splitBases()
	if err != nil {
		return nil, err
	}
	return bases.finish(&s, scale)
}

// splitBases are orthonormal bases found by the staircase forms.
type splitBases struct {
	n, rank, seen int // dimensions: state, reached space, observable quotient
	both          int // moved and seen
	orthogonal    []float64
	unseen        []float64 // n×(n−seen): basis of the unobservable subspace
	threshold     float64
	above, below  float64
}

// minimalPart finds how many states are moved and seen, with the orthogonal q
// whose first columns span the reached space, its seen part first.
func (s *stateSpace) minimalPart(threshold float64) (reach, seen *staircase, q []float64, err error) {
	n, m, p := s.n, s.m, s.p
	reach = newStaircase(n, m, s.a, s.b, p, transposeOf(s.c, p, n), threshold)
	if err = reach.reduce(); err != nil {
		return nil, nil, nil, err
	}
	r := reach.rank
	at := make([]float64, r*r)
	for i := 0; i < r; i++ {
		for j := 0; j < r; j++ {
			at[j*r+i] = reach.a[i*n+j]
		}
	}
	seen = newStaircase(r, p, at, reach.other[:r*p], 0, nil, threshold)
	if err = seen.reduce(); err != nil {
		return nil, nil, nil, err
	}
	q = append([]float64(nil), reach.q...)
	multiplyColumns(q, n, 0, r, seen.q)
	return reach, seen, q, nil
}

// splitBases makes the three decisions: what is reached, what of it is seen,
// and, in the dual system, what is seen without being reached.
func (s *stateSpace) splitBases() (*splitBases, error) {
	n, m, p := s.n, s.m, s.p
	threshold := staircaseThreshold(n, m+p, blocksNorm(s.a, s.b, s.c))
	reach, both, q, err := s.minimalPart(threshold)
	if err != nil {
		return nil, err
	}
	dual := stateSpace{n: n, m: p, p: m, a: transposeOf(s.a, n, n), b: transposeOf(s.c, p, n), c: transposeOf(s.b, n, m)}
	seen, dualBoth, dualQ, err := dual.minimalPart(threshold)
	if err != nil {
		return nil, err
	}
	bases := &splitBases{n: n, rank: reach.rank, seen: seen.rank, both: both.rank, threshold: threshold, above: math.Inf(1)}
	for _, decision := range []*staircase{reach, both, seen, dualBoth} {
		bases.above = math.Min(bases.above, decision.above)
		bases.below = math.Max(bases.below, decision.below)
	}
	if dualBoth.rank != both.rank || n-reach.rank-seen.rank+both.rank < 0 {
		return nil, fmt.Errorf("the split is not decided: %d states are moved and seen by one count, %d by the dual count (singular values down to %.2g counted, up to %.2g did not)",
			both.rank, dualBoth.rank, bases.above, bases.below)
	}
	bases.unseen = columnsOf(seen.q, n, n, seen.rank, n)
	bases.orthogonal = q
	seenOnly := columnsOf(dualQ, n, n, both.rank, seen.rank)
	bases.orderUnreached(seenOnly)
	return bases, nil
}

// orderUnreached turns the last columns of the orthogonal basis so that the
// states seen without being moved (given, orthonormal) come right after the
// reached ones.
func (b *splitBases) orderUnreached(seenOnly []float64) {
	n, r := b.n, b.rank
	width := b.seen - b.both
	rest := n - r
	if rest == 0 || width == 0 {
		return
	}
	inside := make([]float64, rest*width)
	for i := 0; i < rest; i++ {
		for j := 0; j < width; j++ {
			for k := 0; k < n; k++ {
				inside[i*width+j] += b.orthogonal[k*n+r+i] * seenOnly[k*width+j]
			}
		}
	}
	turn := newStaircase(rest, width, make([]float64, rest*rest), inside, 0, nil, 0)
	turn.triangularize(turn.b, width, 0, rest, 0, width)
	multiplyColumns(b.orthogonal, n, r, rest, turn.q)
}

// finish computes poles, the transformation and the certificate.
func (b *splitBases) finish(s *stateSpace, scale systemScaling) (*Split, error) {
	n := b.n
	split := &Split{Threshold: b.threshold, Above: b.above, Below: b.below,
		Sizes: [4]int{b.both, b.rank - b.both, b.seen - b.both, n - b.rank - b.seen + b.both}}
	split.Certificate = Certificate{Method: "staircase forms of the balanced system and of its dual", Digits: mostDigits}
	if b.below > 0 && b.above/b.below < 1e3 {
		split.Certificate.note("the split is not well separated: a singular value of %.2g counted, one of %.2g did not", b.above, b.below)
	}
	if err := split.findPoles(s, b.orthogonal); err != nil {
		return nil, err
	}
	x := b.skewBasis(split.Sizes)
	inverse, condition, err := inverseAndCondition(x)
	if err != nil {
		return nil, err
	}
	split.Certificate.Condition = condition
	split.write(s, x, inverse, scale)
	return split, nil
}

// findPoles takes each part's poles from its diagonal block of QᵀAQ.
func (split *Split) findPoles(s *stateSpace, q []float64) error {
	n := s.n
	var turned mat.Dense
	basis := mat.NewDense(n, n, q)
	turned.Mul(basis.T(), mat.NewDense(n, n, s.a))
	turned.Mul(&turned, basis)
	first := 0
	for part, size := range split.Sizes {
		if size == 0 {
			continue
		}
		system, err := Eigen(mat.DenseCopyOf(turned.Slice(first, first+size, first, first+size)))
		if err != nil {
			return err
		}
		split.Poles[part], split.PoleError[part] = system.Values, system.ErrorOf
		split.Certificate.Digits = math.Min(split.Certificate.Digits, system.Certificate.Digits)
		split.Certificate.Notes = append(split.Certificate.Notes, system.Certificate.Notes...)
		first += size
	}
	return nil
}

// skewBasis puts bases of the four parts side by side: the orthogonal one,
// with its last part replaced by a basis of the unseen subspace taken
// perpendicular to what is moved and unseen.
func (b *splitBases) skewBasis(sizes [4]int) *mat.Dense {
	n, neither := b.n, sizes[3]
	x := mat.NewDense(n, n, append([]float64(nil), b.orthogonal...))
	if neither == 0 {
		return x
	}
	hidden := sizes[1] + neither // dimension of the unseen subspace
	inside := make([]float64, hidden*max(sizes[1], 1))
	for i := 0; i < hidden; i++ {
		for j := 0; j < sizes[1]; j++ {
			for k := 0; k < n; k++ {
				inside[i*sizes[1]+j] += b.unseen[k*hidden+i] * b.orthogonal[k*n+b.both+j]
			}
		}
	}
	turn := newStaircase(hidden, sizes[1], make([]float64, hidden*hidden), inside[:hidden*sizes[1]], 0, nil, 0)
	turn.triangularize(turn.b, sizes[1], 0, hidden, 0, sizes[1])
	for i := 0; i < n; i++ {
		for j := 0; j < neither; j++ {
			sum := 0.0
			for k := 0; k < hidden; k++ {
				sum += b.unseen[i*hidden+k] * turn.q[k*hidden+sizes[1]+j]
			}
			x.Set(i, n-neither+j, sum)
		}
	}
	return x
}

// write forms the transformed system in the caller's coordinates and clears
// what vanishes by construction; the largest cleared entry is the residual.
func (split *Split) write(s *stateSpace, x, inverse *mat.Dense, scale systemScaling) {
	n := s.n
	split.A, split.B, split.C = &mat.Dense{}, &mat.Dense{}, &mat.Dense{}
	split.A.Mul(inverse, mat.NewDense(n, n, s.a))
	split.A.Mul(split.A, x)
	if s.m > 0 {
		split.B.Mul(inverse, mat.NewDense(n, s.m, s.b))
	}
	if s.p > 0 {
		split.C.Mul(mat.NewDense(s.p, n, s.c), x)
	}
	norm := blocksNorm(s.a, s.b, s.c)
	cleared := split.clearZeros(s.m, s.p)
	if norm > 0 {
		split.Certificate.Residual = cleared / norm
	}
	for j, f := range scale.inputs {
		for i := 0; i < n; i++ {
			split.B.Set(i, j, split.B.At(i, j)/f)
		}
	}
	for i, f := range scale.outputs {
		for j := 0; j < n; j++ {
			split.C.Set(i, j, split.C.At(i, j)/f)
		}
	}
	split.T, split.Inverse = mat.DenseCopyOf(inverse), mat.DenseCopyOf(x)
	for i, f := range scale.states {
		for j := 0; j < n; j++ {
			split.T.Set(j, i, inverse.At(j, i)/f)
			split.Inverse.Set(i, j, x.At(i, j)*f)
		}
	}
}

// clearZeros sets the structurally vanishing entries to zero and returns the
// largest of them.
func (split *Split) clearZeros(m, p int) (largest float64) {
	part := make([]int, 0, 8)
	for k, size := range split.Sizes {
		for i := 0; i < size; i++ {
			part = append(part, k)
		}
	}
	// acts[i][j]: the states of part j may act on those of part i.
	acts := [4][4]bool{{true, false, true, false}, {true, true, true, true}, {false, false, true, false}, {false, false, true, true}}
	clearEntry := func(target *mat.Dense, i, j int) {
		largest = math.Max(largest, math.Abs(target.At(i, j)))
		target.Set(i, j, 0)
	}
	for i := range part {
		for j := range part {
			if !acts[part[i]][part[j]] {
				clearEntry(split.A, i, j)
			}
		}
		for j := 0; j < m && part[i] >= 2; j++ {
			clearEntry(split.B, i, j)
		}
		for j := 0; j < p && part[i]%2 == 1; j++ {
			clearEntry(split.C, j, i)
		}
	}
	return largest
}

// inverseAndCondition inverts x and gives κ₂ by its singular values.
func inverseAndCondition(x *mat.Dense) (*mat.Dense, float64, error) {
	values, err := singularValues(x)
	if err != nil {
		return nil, 0, err
	}
	low, high := values[len(values)-1], values[0]
	if low <= high*1e-14 {
		return nil, 0, fmt.Errorf("the split's transformation is singular to working precision (singular values %.2g and %.2g)", high, low)
	}
	var inverse mat.Dense
	_ = inverse.Inverse(x) // a poor condition number is judged above
	return &inverse, high / low, nil
}

// transposeOf transposes a row-major rows×columns block.
func transposeOf(m []float64, rows, columns int) []float64 {
	out := make([]float64, len(m))
	for i := 0; i < rows; i++ {
		for j := 0; j < columns; j++ {
			out[j*rows+i] = m[i*columns+j]
		}
	}
	return out
}

// columnsOf copies columns from … to−1.
func columnsOf(m []float64, rows, columns, from, to int) []float64 {
	out := make([]float64, 0, rows*(to-from))
	for i := 0; i < rows; i++ {
		out = append(out, m[i*columns+from:i*columns+to]...)
	}
	return out
}

// multiplyColumns replaces columns first … first+width−1 of the n×n q by them
// times the width×width turn.
func multiplyColumns(q []float64, n, first, width int, turn []float64) {
	if width == 0 {
		return
	}
	turnColumns(q, n, n, first, width, mat.NewDense(width, width, turn))
}
