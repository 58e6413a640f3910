package exact

import "math/big"

// fractionFree is the state of a Gauss–Jordan elimination over the integers
// (E. H. Bareiss, Sylvester's identity and multistep integer-preserving
// Gaussian elimination, Math. Comp. 22, 1968): every division is exact.
type fractionFree struct {
	rows, cols int
	a          []big.Int
	pivots     []int   // pivot columns, in order
	last       big.Int // the common value of all pivots
	swaps      int
}

// eliminate reduces the first limit columns. Afterwards row k holds last in
// column pivots[k] and zero in the other pivot columns.
func eliminate(rows, cols int, a []big.Int, limit int) *fractionFree {
	e := &fractionFree{rows: rows, cols: cols, a: a}
	e.last.SetInt64(1)
	for col := 0; col < limit && len(e.pivots) < rows; col++ {
		rank := len(e.pivots)
		at := e.smallestPivot(rank, col)
		if at < 0 {
			continue
		}
		if at != rank {
			e.swap(rank, at)
		}
		e.clearColumn(rank, col)
		e.last.Set(&a[rank*cols+col])
		e.pivots = append(e.pivots, col)
	}
	return e
}

func (e *fractionFree) smallestPivot(from, col int) int {
	best := -1
	for i := from; i < e.rows; i++ {
		x := &e.a[i*e.cols+col]
		if x.Sign() != 0 && (best < 0 || x.CmpAbs(&e.a[best*e.cols+col]) < 0) {
			best = i
		}
	}
	return best
}

func (e *fractionFree) swap(i, k int) {
	for j := range e.cols {
		e.a[i*e.cols+j], e.a[k*e.cols+j] = e.a[k*e.cols+j], e.a[i*e.cols+j]
	}
	e.swaps++
}

func (e *fractionFree) clearColumn(rank, col int) {
	pivotRow := e.a[rank*e.cols : (rank+1)*e.cols]
	pivot := &pivotRow[col]
	divide := !(e.last.IsInt64() && e.last.Int64() == 1)
	var factor, product big.Int
	for i := range e.rows {
		if i == rank {
			continue
		}
		row := e.a[i*e.cols : (i+1)*e.cols]
		factor.Set(&row[col])
		for j := range row {
			if row[j].Sign() == 0 && (factor.Sign() == 0 || pivotRow[j].Sign() == 0) {
				continue
			}
			product.Mul(&row[j], pivot)
			if factor.Sign() != 0 && pivotRow[j].Sign() != 0 {
				row[j].Mul(&factor, &pivotRow[j])
				product.Sub(&product, &row[j])
			}
			if divide {
				row[j].Quo(&product, &e.last)
			} else {
				row[j].Set(&product)
			}
		}
	}
}

// Determinant gives det m of a square matrix; the determinant of the 0×0 matrix is 1.
func (m *Matrix) Determinant() (*big.Rat, error) {
	if m.rows != m.cols {
		return nil, sizeError("the determinant", m, nil)
	}
	ints, den := clearRows(m)
	e := eliminate(m.rows, m.cols, ints, m.cols)
	if len(e.pivots) < m.rows {
		return new(big.Rat), nil
	}
	if e.swaps%2 == 1 {
		e.last.Neg(&e.last)
	}
	product := big.NewInt(1)
	for i := range den {
		product.Mul(product, &den[i])
	}
	return fraction(&e.last, product), nil
}

// Echelon gives the reduced row echelon form (leading ones, zeros above and
// below them) and the columns of its pivots; the rank is their number.
func (m *Matrix) Echelon() (*Matrix, []int) {
	ints, _ := clearRows(m)
	e := eliminate(m.rows, m.cols, ints, m.cols)
	out := NewMatrix(m.rows, m.cols)
	for i := range e.pivots {
		for j := range m.cols {
			out.data[i*m.cols+j] = fraction(&ints[i*m.cols+j], &e.last)
		}
	}
	return out, e.pivots
}

// Rank gives the rank, decided exactly.
func (m *Matrix) Rank() int {
	_, pivots := m.Echelon()
	return len(pivots)
}

// Inverse gives m⁻¹ of a square matrix, or ErrSingular.
func (m *Matrix) Inverse() (*Matrix, error) {
	if m.rows != m.cols {
		return nil, sizeError("the inverse", m, nil)
	}
	n := m.rows
	reduced, pivots := must(Augment(m, Identity(n))).Echelon()
	if n > 0 && (len(pivots) < n || pivots[n-1] >= n) {
		return nil, ErrSingular
	}
	return reduced.Slice(0, n, n, 2*n), nil
}

// Solve gives the matrix x with m·x = b when it is unique. It returns
// ErrInconsistent when there is none and a [*UnderdeterminedError] when there
// are several.
func (m *Matrix) Solve(b *Matrix) (*Matrix, error) {
	if m.rows != b.rows {
		return nil, sizeError("solving", m, b)
	}
	reduced, pivots := must(Augment(m, b)).Echelon()
	rank := len(pivots)
	if rank > 0 && pivots[rank-1] >= m.cols {
		return nil, ErrInconsistent
	}
	x := NewMatrix(m.cols, b.cols)
	for i, j := range pivots {
		copy(x.data[j*b.cols:(j+1)*b.cols], reduced.data[i*reduced.cols+m.cols:(i+1)*reduced.cols])
	}
	if rank < m.cols {
		return nil, &UnderdeterminedError{Particular: x, Kernel: kernelOf(reduced, pivots, m.cols)}
	}
	return x, nil
}

// Kernel gives a basis of {x : m·x = 0} as columns; cols×0 when m has full column rank.
func (m *Matrix) Kernel() *Matrix {
	reduced, pivots := m.Echelon()
	return kernelOf(reduced, pivots, m.cols)
}

func kernelOf(reduced *Matrix, pivots []int, cols int) *Matrix {
	free := make([]int, 0, cols)
	next := 0
	for j := range cols {
		if next < len(pivots) && pivots[next] == j {
			next++
			continue
		}
		free = append(free, j)
	}
	kernel := NewMatrix(cols, len(free))
	for k, j := range free {
		kernel.data[j*kernel.cols+k] = ratOne
		for i, p := range pivots {
			if x := reduced.At(i, j); x.Sign() != 0 {
				kernel.data[p*kernel.cols+k] = new(big.Rat).Neg(x)
			}
		}
	}
	return kernel
}

// Image gives a basis of the column space: the first independent columns of m.
func (m *Matrix) Image() *Matrix {
	_, pivots := m.Echelon()
	return m.Columns(pivots...)
}
