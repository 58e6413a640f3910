package numeric

import (
	"context"
	"math"
	"time"

	"gonum.org/v1/gonum/mat"
)

// Distance brackets the distance of a pair (A, B) to the unreachable pairs: the
// smallest spectral norm of a (possibly complex) change of [A B] that leaves a
// mode no input moves.
type Distance struct {
	// Low ≤ distance ≤ High.
	Low, High float64
	// At is a minimiser: the mode that a change of size High unreaches; its
	// conjugate does as well.
	At          complex128
	Certificate Certificate
}

// distanceRatio is how close Low comes to High before the search ends.
const distanceRatio = 0.93

// mostCells bounds the memory of the search.
const mostCells = 2_000_000

// DistanceToUnreachable computes the minimum over complex z of σ_min([A − zI, B])
// for a n×n and b n×m (R. Eising, Systems & Control Letters 4, 1984). Real
// and complex minimisers are found alike: the upper half of the region around
// the field of values of A that can hold one is divided best first, each cell's lower
// bound coming from |σ(z) − σ(w)| ≤ |z − w| and, sharper, from the two smallest
// singular values with the first left vector. A rounding floor of n·ε·‖[A B]‖ is subtracted
// from Low and added to High. The two end within 10 % of each other unless the
// time cap was met (≤ 0: no cap) or the distance drowns in the floor; then the
// bracket reached is returned with a note. The data are taken as they stand:
// scale by the ranges of states and inputs first. A 0×0 pair is at +Inf; b nil
// means no inputs, distance 0. It errs on misfitting shapes, entries that are not
// finite, and a cancelled context.
func DistanceToUnreachable(ctx context.Context, a, b *mat.Dense, cap time.Duration) (*Distance, error) {
	if err := checkPair(a, b); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	_, m := sizeOf(b)
	if n == 0 {
		return &Distance{Low: math.Inf(1), High: math.Inf(1), Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	flatA, flatB := flatCopy(a), flatCopy(b)
	exponent := distanceScale(flatA, flatB)
	norm := blocksNorm(flatA, flatB)
	reduction := newStaircase(n, m, flatA, flatB, 0, nil, 0)
	if err := reduction.reduce(); err != nil {
		return nil, err
	}
	floor := float64(n) * machineEpsilon * norm
	if reduction.rank < n {
		return exactlyUnreachable(reduction, floor, exponent)
	}
	var deadline time.Time
	if cap > 0 {
		deadline = time.Now().Add(cap)
	}
	search := newDistanceSearch(ctx, deadline, reduction, floor)
	if err := search.prepare(flatA); err != nil {
		return nil, err
	}
	if err := search.run(); err != nil {
		return nil, err
	}
	search.polish()
	return search.result(exponent), nil
}

// distanceScale scales both blocks in place by 2^−exponent to entries below 1.
func distanceScale(blocks ...[]float64) (exponent int) {
	size := blocksNorm(blocks...)
	if size == 0 || math.IsInf(size, 0) {
		size = 0
		for _, block := range blocks {
			for _, v := range block {
				size = math.Max(size, math.Abs(v))
			}
		}
		if size == 0 {
			return 0
		}
	}
	_, exponent = math.Frexp(size)
	for _, block := range blocks {
		for i := range block {
			block[i] = math.Ldexp(block[i], -exponent)
		}
	}
	return exponent
}

// exactlyUnreachable answers when the reduction met an exact zero block.
func exactlyUnreachable(s *staircase, floor float64, exponent int) (*Distance, error) {
	n, rank := s.n, s.rank
	part := mat.NewDense(n-rank, n-rank, nil)
	for i := rank; i < n; i++ {
		part.SetRow(i-rank, s.a[i*n+rank:i*n+n])
	}
	modes, err := Eigenvalues(part)
	if err != nil {
		return nil, err
	}
	d := &Distance{Low: 0, High: math.Ldexp(floor, exponent), At: modes[0] * complex(math.Ldexp(1, exponent), 0)}
	d.Certificate = Certificate{Method: "staircase form", Digits: mostDigits, Notes: []string{"the pair is unreachable as it stands"}}
	return d, nil
}
