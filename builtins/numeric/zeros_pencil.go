package numeric

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// systemPencil is the system matrix [A − λI, B; C, D] under reduction.
type systemPencil struct {
	stateSpace
	threshold    float64
	above, below float64
	ranks        []int // rank of D at each step of the pass over the rows
}

func newSystemPencil(s *stateSpace, threshold float64) *systemPencil {
	return &systemPencil{stateSpace: *s, threshold: threshold, above: math.Inf(1)}
}

// count splits singular values, largest first, into those above the threshold
// and the rest, and keeps the gap.
func (z *systemPencil) count(values []float64) (rank int) {
	for _, v := range values {
		if v > z.threshold {
			rank++
			z.above = math.Min(z.above, v)
		} else {
			z.below = math.Max(z.below, v)
		}
	}
	return rank
}

// regular strips everything from the pencil that carries no finite zero: a pass
// over the rows removes zeros at infinity and dependent outputs and leaves D of
// full row rank; the same pass on the transposed system removes what is left of dependent
// inputs. D is then square and invertible, and its size is the normal rank.
//
// A. Emami-Naeini, P. Van Dooren, Automatica 18, 1982.
func (z *systemPencil) regular() error {
	if err := z.fullRowRank(true); err != nil {
		return err
	}
	z.transpose()
	if err := z.fullRowRank(false); err != nil {
		return err
	}
	z.transpose()
	return nil
}

// transpose exchanges inputs and outputs: the dual system.
func (z *systemPencil) transpose() {
	a := transposeOf(z.a, z.n, z.n)
	b, c, d := transposeOf(z.c, z.p, z.n), transposeOf(z.b, z.n, z.m), transposeOf(z.d, z.p, z.m)
	z.a, z.b, z.c, z.d, z.m, z.p = a, b, c, d, z.p, z.m
}

// fullRowRank repeats: compress the rows of D; outputs left without
// feedthrough must vanish, so the states they see, C₂x = 0, are removed and
// their rate equations become outputs of what is left.
func (z *systemPencil) fullRowRank(record bool) error {
	for {
		rank, err := z.compressFeedthrough()
		if err != nil {
			return err
		}
		if record {
			z.ranks = append(z.ranks, rank)
		}
		if rank == z.p {
			return nil
		}
		removed, err := z.removeSeenStates(rank)
		if err != nil {
			return err
		}
		if removed == 0 {
			z.c, z.d, z.p = z.c[:rank*z.n], z.d[:rank*z.m], rank
			return nil
		}
	}
}

// compressFeedthrough turns the outputs so that the last p − rank rows of D vanish.
func (z *systemPencil) compressFeedthrough() (rank int, err error) {
	if z.m == 0 || z.p == 0 {
		return 0, nil
	}
	u, values, err := leftSingular(mat.NewDense(z.p, z.m, append([]float64(nil), z.d...)))
	if err != nil {
		return 0, err
	}
	rank = z.count(values)
	turnRows(z.d, z.m, 0, z.p, u)
	turnRows(z.c, z.n, 0, z.p, u)
	clear(z.d[rank*z.m:])
	return rank, nil
}

// removeSeenStates removes the states that the outputs without feedthrough
// (after the first rank ones) see.
func (z *systemPencil) removeSeenStates(rank int) (removed int, err error) {
	n, m, p := z.n, z.m, z.p
	if n == 0 {
		return 0, nil
	}
	width := m + rank
	carried := make([]float64, n*width) // [B, C₁ᵀ]
	for i := 0; i < n; i++ {
		copy(carried[i*width:], z.b[i*m:(i+1)*m])
		for j := 0; j < rank; j++ {
			carried[i*width+m+j] = z.c[j*n+i]
		}
	}
	blind := transposeOf(z.c[rank*n:], p-rank, n)
	turned := newStaircase(n, p-rank, z.a, blind, width, carried, z.threshold)
	removed, err = turned.compress(turned.b, p-rank, 0, 0, p-rank)
	if err != nil || removed == 0 {
		return 0, err
	}
	z.above, z.below = math.Min(z.above, turned.above), math.Max(z.below, turned.below)
	z.keepRest(turned, removed, rank)
	return removed, nil
}

// keepRest writes the smaller system: states after the removed ones, outputs
// the removed states' rates and then the outputs with feedthrough.
func (z *systemPencil) keepRest(turned *staircase, removed, rank int) {
	n, m, width := z.n, z.m, z.m+rank
	rest, outputs := n-removed, removed+rank
	a, b := make([]float64, 0, rest*rest), make([]float64, 0, rest*m)
	c, d := make([]float64, outputs*rest), make([]float64, outputs*m)
	for i := removed; i < n; i++ {
		a = append(a, turned.a[i*n+removed:(i+1)*n]...)
		b = append(b, turned.other[i*width:i*width+m]...)
	}
	for i := 0; i < removed; i++ {
		copy(c[i*rest:], turned.a[i*n+removed:(i+1)*n])
		copy(d[i*m:], turned.other[i*width:i*width+m])
	}
	for j := 0; j < rank; j++ {
		for i := 0; i < rest; i++ {
			c[(removed+j)*rest+i] = turned.other[(removed+i)*width+m+j]
		}
		copy(d[(removed+j)*m:], z.d[j*m:(j+1)*m])
	}
	z.n, z.p, z.a, z.b, z.c, z.d = rest, outputs, a, b, c, d
}

// infiniteOrders lists the orders of the zeros at infinity, rising: D's rank
// grows by one at step i of the pass over the rows for each of order i.
func (z *systemPencil) infiniteOrders() []int {
	var orders []int
	for i := 1; i < len(z.ranks); i++ {
		for k := z.ranks[i-1]; k < z.ranks[i]; k++ {
			orders = append(orders, i)
		}
	}
	return orders
}

// complexFactors is an LU factorization with row pivoting of a complex matrix.
type complexFactors struct {
	n      int
	m      []complex128
	pivots []int
}

// factorComplex factors m in place; a pivot below floor is replaced by it, so
// that inverse iteration works at an exact eigenvalue.
func factorComplex(n int, m []complex128, floor float64) *complexFactors {
	f := &complexFactors{n: n, m: m, pivots: make([]int, n)}
	for k := 0; k < n; k++ {
		best, at := -1.0, k
		for i := k; i < n; i++ {
			if size := absSquare(m[i*n+k]); size > best {
				best, at = size, i
			}
		}
		f.pivots[k] = at
		if at != k {
			for j := 0; j < n; j++ {
				m[k*n+j], m[at*n+j] = m[at*n+j], m[k*n+j]
			}
		}
		if best <= floor*floor {
			m[k*n+k] = complex(floor, 0)
		}
		pivot := m[k*n+k]
		for i := k + 1; i < n; i++ {
			if m[i*n+k] == 0 {
				continue
			}
			factor := m[i*n+k] / pivot
			m[i*n+k] = factor
			row, top := m[i*n+k+1:(i+1)*n], m[k*n+k+1:(k+1)*n]
			for j, v := range top {
				row[j] -= factor * v
			}
		}
	}
	return f
}

// solve overwrites x with M⁻¹x.
func (f *complexFactors) solve(x []complex128) {
	n := f.n
	for k := 0; k < n; k++ {
		if at := f.pivots[k]; at != k {
			x[k], x[at] = x[at], x[k]
		}
		for j := 0; j < k; j++ {
			x[k] -= f.m[k*n+j] * x[j]
		}
	}
	for k := n - 1; k >= 0; k-- {
		for j := k + 1; j < n; j++ {
			x[k] -= f.m[k*n+j] * x[j]
		}
		x[k] /= f.m[k*n+k]
	}
}

// solveAdjoint overwrites x with M⁻ᴴx.
func (f *complexFactors) solveAdjoint(x []complex128) {
	n := f.n
	conj := func(v complex128) complex128 { return complex(real(v), -imag(v)) }
	for k := 0; k < n; k++ {
		for j := 0; j < k; j++ {
			x[k] -= conj(f.m[j*n+k]) * x[j]
		}
		x[k] /= conj(f.m[k*n+k])
	}
	for k := n - 1; k >= 0; k-- {
		for j := k + 1; j < n; j++ {
			x[k] -= conj(f.m[j*n+k]) * x[j]
		}
	}
	for k := n - 1; k >= 0; k-- {
		if at := f.pivots[k]; at != k {
			x[k], x[at] = x[at], x[k]
		}
	}
}
