package numeric

import (
	"math"
	"slices"
)

// coupling splits a square matrix into irreducible blocks and scales its states
// by powers of two, so that no rounding happens on the way in or out. The
// working matrix is W = D⁻¹·Pᵀ·A·P·D, block upper triangular.
type coupling struct {
	order    []int // row k of W is row order[k] of A
	exponent []int // D = diag(2^exponent)
	starts   []int // first index of each block of W, n appended
	depth    int   // the longest chain of blocks that feed one another
	scaled   bool  // some exponent is not 0
}

// exponentLimit keeps the powers of two of a scaling, and their ratios, inside
// the exponents of binary64.
const exponentLimit = 480

// depthLimit is the longest chain of blocks whose couplings may be scaled down:
// beyond it the degree-13 approximant no longer resolves the product of so many
// couplings relative to itself (ℓ!·C(27, ℓ)·|c₂₇| passes 2⁻⁵³ at ℓ = 18).
const depthLimit = 17

// coupled finds the blocks of the n×n row-major a and, when scale is set, the
// scaling: inside a block it balances rows against columns (B. N. Parlett,
// C. Reinsch, Numer. Math. 13, 1969) and is kept only when it lowers the norm;
// between blocks it shrinks couplings to the level of the blocks themselves,
// which any similarity may do to a reducible matrix.
func coupled(n int, a []float64, scale bool) *coupling {
	c := &coupling{exponent: make([]int, n)}
	c.findBlocks(n, a)
	chain := make([]int, len(c.starts))
	for q := 1; q+1 < len(c.starts); q++ {
		for p := 0; p < q; p++ {
			if chain[p] >= chain[q] && c.feeds(n, a, p, q) {
				chain[q] = chain[p] + 1
			}
		}
		c.depth = max(c.depth, chain[q])
	}
	if !scale {
		return c
	}
	level := 0.0
	for b := 0; b+1 < len(c.starts); b++ {
		level = math.Max(level, c.balanceBlock(n, a, c.starts[b], c.starts[b+1]))
	}
	if c.depth > 0 && c.depth <= depthLimit {
		c.shrinkCouplings(n, a, level)
	}
	for _, e := range c.exponent {
		c.scaled = c.scaled || e != 0
	}
	return c
}

// findBlocks orders the strongly connected components of the graph with an edge
// i → j for each a[i, j] ≠ 0 so that W is block upper triangular (R. Tarjan,
// SIAM J. Comput. 1, 1972, which yields them last first).
func (c *coupling) findBlocks(n int, a []float64) {
	visit, low := make([]int, n), make([]int, n)
	open := make([]bool, n)
	stack := make([]int, 0, n)
	components := make([]int, 0, n) // members, component after component
	ends := make([]int, 0, n)
	clock := 0
	var walk func(i int)
	walk = func(i int) {
		clock++
		visit[i], low[i], open[i] = clock, clock, true
		stack = append(stack, i)
		for j, v := range a[i*n : i*n+n] {
			if v == 0 || i == j {
				continue
			}
			if visit[j] == 0 {
				walk(j)
				low[i] = min(low[i], low[j])
			} else if open[j] {
				low[i] = min(low[i], visit[j])
			}
		}
		if low[i] != visit[i] {
			return
		}
		begin := slices.Index(stack, i)
		for _, j := range stack[begin:] {
			open[j] = false
		}
		components = append(components, stack[begin:]...)
		stack = stack[:begin]
		ends = append(ends, len(components))
	}
	for i := n - 1; i >= 0; i-- {
		if visit[i] == 0 {
			walk(i)
		}
	}
	c.order = make([]int, 0, n)
	c.starts = make([]int, 1, len(ends)+1)
	for b := len(ends) - 1; b >= 0; b-- {
		begin := 0
		if b > 0 {
			begin = ends[b-1]
		}
		members := components[begin:ends[b]]
		slices.Sort(members)
		c.order = append(c.order, members...)
		c.starts = append(c.starts, len(c.order))
	}
}

// feeds tells whether block p of W has a nonzero coupling to block q.
func (c *coupling) feeds(n int, a []float64, p, q int) bool {
	for i := c.starts[p]; i < c.starts[p+1]; i++ {
		row := a[c.order[i]*n : c.order[i]*n+n]
		for j := c.starts[q]; j < c.starts[q+1]; j++ {
			if row[c.order[j]] != 0 {
				return true
			}
		}
	}
	return false
}

// balanceBlock sets the exponents of rows lo … hi−1 and returns the block's
// 1-norm in the coordinates chosen.
func (c *coupling) balanceBlock(n int, a []float64, lo, hi int) float64 {
	size := hi - lo
	if size == 1 {
		return math.Abs(a[c.order[lo]*n+c.order[lo]])
	}
	if sums := c.offDiagonalSums(n, a, lo, hi); balancedAlready(sums[:size], sums[size:]) {
		largest := 0.0
		for j, sum := range sums[:size] {
			i := c.order[lo+j]
			largest = math.Max(largest, sum+math.Abs(a[i*n+i]))
		}
		return largest
	}
	w := make([]float64, size*size)
	for i := range size {
		for j := range size {
			w[i*size+j] = a[c.order[lo+i]*n+c.order[lo+j]]
		}
	}
	before := oneNorm(size, w)
	exponent := balancingExponents(size, w)
	after := oneNorm(size, w)
	if after >= before {
		return before
	}
	copy(c.exponent[lo:hi], exponent)
	return after
}

// offDiagonalSums are the column sums, then the row sums, of a block's absolute
// values without its diagonal.
func (c *coupling) offDiagonalSums(n int, a []float64, lo, hi int) []float64 {
	size := hi - lo
	sums := make([]float64, 2*size)
	for i := range size {
		row, sum := a[c.order[lo+i]*n:c.order[lo+i]*n+n], 0.0
		for j, at := range c.order[lo:hi] {
			if i != j {
				v := math.Abs(row[at])
				sums[j] += v
				sum += v
			}
		}
		sums[size+i] = sum
	}
	return sums
}

// balancedAlready tells whether no power of two brings a column and its row closer.
func balancedAlready(columns, rows []float64) bool {
	for i, column := range columns {
		if row := rows[i]; column > 2*row || row > 2*column {
			return false
		}
	}
	return true
}

// balancingExponents balances w in place, off-diagonal row sums against column
// sums, and returns the exponents of two: w ← D⁻¹·w·D.
func balancingExponents(n int, w []float64) []int {
	exponent := make([]int, n)
	for round, moved := 0, true; moved && round < 40; round++ {
		moved = false
		for i := range n {
			column, row := 0.0, 0.0
			for k := range n {
				if k != i {
					column += math.Abs(w[k*n+i])
					row += math.Abs(w[i*n+k])
				}
			}
			if column == 0 || row == 0 {
				continue
			}
			shift := int(math.Round(math.Log2(row/column) / 2))
			shift = min(max(shift, -exponentLimit/2-exponent[i]), exponentLimit/2-exponent[i])
			if shift == 0 {
				continue
			}
			up, down := math.Ldexp(1, shift), math.Ldexp(1, -shift)
			if column*up+row*down >= 0.95*(column+row) {
				continue
			}
			moved = true
			exponent[i] += shift
			for k := range n {
				w[k*n+i] *= up
				w[i*n+k] *= down
			}
		}
	}
	return exponent
}

// shrinkCouplings lowers the exponents of whole blocks until each column sum
// of what lies above them is at most a quarter of level.
func (c *coupling) shrinkCouplings(n int, a []float64, level float64) {
	if level == 0 {
		level = 1
	}
	for b := 1; b+1 < len(c.starts); b++ {
		lo, hi := c.starts[b], c.starts[b+1]
		largest := math.Inf(-1)
		for j := lo; j < hi; j++ {
			for i := 0; i < lo; i++ {
				if v := a[c.order[i]*n+c.order[j]]; v != 0 {
					bits := math.Log2(math.Abs(v)) + float64(c.exponent[j]-c.exponent[i])
					largest = math.Max(largest, bits)
				}
			}
		}
		room := math.Log2(level/4) - math.Log2(float64(lo))
		if largest <= room {
			continue
		}
		shift := int(math.Floor(room - largest))
		for j := lo; j < hi; j++ {
			c.exponent[j] = max(c.exponent[j]+shift, -exponentLimit)
		}
	}
}

// into writes W for a, and from writes A for a w that is alike, both n×n.
func (c *coupling) into(n int, w, a []float64) {
	for i := range n {
		row := a[c.order[i]*n : c.order[i]*n+n]
		for j := range n {
			v := row[c.order[j]]
			if e := c.exponent[j] - c.exponent[i]; e != 0 && v != 0 {
				v = math.Ldexp(v, e)
			}
			w[i*n+j] = v
		}
	}
}

func (c *coupling) from(n int, a, w []float64) {
	for i := range n {
		row := a[c.order[i]*n : c.order[i]*n+n]
		for j := range n {
			v := w[i*n+j]
			if e := c.exponent[i] - c.exponent[j]; e != 0 && v != 0 {
				v = math.Ldexp(v, e)
			}
			row[c.order[j]] = v
		}
	}
}

// oneNorm is the largest column sum of the n×n row-major a; NaN entries make it
// NaN or infinite.
func oneNorm(n int, a []float64) float64 {
	var few [32]float64
	sums := few[:]
	if n > len(few) {
		sums = make([]float64, n)
	}
	for i := range n {
		for j, v := range a[i*n : i*n+n] {
			sums[j] += math.Abs(v)
		}
	}
	largest := 0.0
	for _, sum := range sums {
		if !(sum <= largest) { // true for NaN too
			largest = sum
		}
	}
	return largest
}
