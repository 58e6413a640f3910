package exact

import (
	"math/big"
	mathbits "math/bits"
)

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

// smallSize is the number of entries up to which elimination over the integers
// is quicker than Chinese remaindering (measured, see the benchmarks).
const smallSize = 20

// Determinant gives det m of a square matrix; the determinant of the 0×0 matrix is 1.
func (m *Matrix) Determinant() (*big.Rat, error) {
	if m.rows != m.cols {
		return nil, sizeError("the determinant", m, nil)
	}
	if err := m.CheckSize(); err != nil {
		return nil, err
	}
	ints, den := clearRows(m)
	product := big.NewInt(1)
	for i := range den {
		product.Mul(product, &den[i])
	}
	if len(ints) > smallSize {
		system := &squareSystem{n: m.rows, matrix: ints}
		det, _, err := system.cramer()
		if err == ErrSingular {
			return ratZero, nil
		}
		if err != nil {
			return nil, err
		}
		return fraction(det, product), nil
	}
	e := eliminate(m.rows, m.cols, ints, m.cols)
	if len(e.pivots) < m.rows {
		return ratZero, nil
	}
	if e.swaps%2 == 1 {
		e.last.Neg(&e.last)
	}
	return fraction(&e.last, product), nil
}

// CheckSize returns ErrTooLarge when minors of m might need more than
// LargestBits bits. The functions that return no error (Echelon, Kernel, Image,
// CharacteristicPolynomial) panic with ErrTooLarge in that case, so a caller
// with untrusted data asks here first.
func (m *Matrix) CheckSize() error {
	bits := 0
	for _, x := range m.data {
		bits = max(bits, x.Num().BitLen())
	}
	var den big.Int
	order := min(m.rows, m.cols)
	// After clearing denominators a minor of that order is at most ∏ √order·2^bits.
	each := bits + mathbits.Len(uint(max(m.rows, m.cols)))/2 + 3
	if !boundedDenominator(&den, m.data, LargestBits) || order*(each+2*den.BitLen()) > LargestBits {
		return ErrTooLarge
	}
	return nil
}

// Echelon gives the reduced row echelon form (leading ones, zeros above and
// below them) and the columns of its pivots; the rank is their number. It
// panics with ErrTooLarge where [Matrix.CheckSize] says so.
func (m *Matrix) Echelon() (*Matrix, []int) {
	reduced, pivots, err := m.echelon()
	if err != nil {
		panic(err)
	}
	return reduced, pivots
}

func (m *Matrix) echelon() (*Matrix, []int, error) {
	if err := m.CheckSize(); err != nil {
		return nil, nil, err
	}
	ints, _ := clearRows(m)
	if len(ints) > smallSize {
		for attempt := range 3 {
			out, pivots, err := modularEchelon(m.rows, m.cols, ints, primeField(attempt))
			if err != nil || out != nil {
				return out, pivots, err
			}
		}
	}
	out, pivots := fractionFreeEchelon(m.rows, m.cols, ints)
	return out, pivots, nil
}

func fractionFreeEchelon(rows, cols int, ints []big.Int) (*Matrix, []int) {
	e := eliminate(rows, cols, ints, cols)
	out := NewMatrix(rows, cols)
	for i := range e.pivots {
		for j := range cols {
			out.data[i*cols+j] = fraction(&ints[i*cols+j], &e.last)
		}
	}
	return out, e.pivots
}

// Rank gives the rank, decided exactly: full rank modulo a prime is a proof;
// a deficiency modulo two primes is proved over the rationals. It panics like
// [Matrix.Echelon].
func (m *Matrix) Rank() int {
	rank, err := m.rank()
	if err != nil {
		panic(err)
	}
	return rank
}

func (m *Matrix) rank() (int, error) {
	if m.cols > m.rows {
		m = m.Transpose()
	}
	if err := m.CheckSize(); err != nil {
		return 0, err
	}
	ints, _ := clearRows(m)
	for index := range 2 {
		f := primeField(index)
		if r := f.gaussJordan(f.reduceRows(m.rows, m.cols, ints), m.cols, true); len(r.pivots) == m.cols {
			return m.cols, nil
		}
	}
	_, pivots, err := m.echelon()
	return len(pivots), err
}

// Inverse gives m⁻¹ of a square matrix, or ErrSingular.
func (m *Matrix) Inverse() (*Matrix, error) {
	if m.rows != m.cols {
		return nil, sizeError("the inverse", m, nil)
	}
	return m.solveSquare(Identity(m.rows))
}

// solveSquare gives x with m·x = b for a square matrix m, or ErrSingular.
func (m *Matrix) solveSquare(b *Matrix) (*Matrix, error) {
	n, k := m.rows, b.cols
	if must(Augment(m, b)).CheckSize() != nil {
		return nil, ErrTooLarge
	}
	system, matrixScale, rightScale := clearedSystem(m, b)
	det, scaled, err := system.solve()
	if err != nil {
		return nil, err
	}
	x := NewMatrix(n, k)
	var den big.Int
	for i := range n {
		for j := range k {
			if scaled[i*k+j].Sign() != 0 {
				den.Mul(&matrixScale[i], &rightScale[j])
				x.data[i*k+j] = fraction(&scaled[i*k+j], den.Mul(&den, det))
			}
		}
	}
	return x, nil
}

// clearedSystem scales the rows of m·x = b to integers and takes the common
// factors out of m's columns: the unknowns of the system are
// matrixScale[i]·x[i][j]·rightScale[j].
func clearedSystem(m, b *Matrix) (system *squareSystem, matrixScale, rightScale []big.Int) {
	n, k := m.rows, b.cols
	matrix, rowScale := clearRows(m)
	matrix = transposed(n, n, matrix)
	matrixScale = make([]big.Int, n)
	for j := range n {
		column := matrix[j*n : (j+1)*n]
		matrixScale[j].Set(content(column))
		if matrixScale[j].Sign() == 0 {
			matrixScale[j].SetInt64(1) // a zero column: found singular later
		}
		for i := range column {
			column[i].Quo(&column[i], &matrixScale[j])
		}
	}
	scaledRight := NewMatrix(k, n)
	var factor big.Rat
	for i := range n {
		factor.SetInt(&rowScale[i])
		for j := range k {
			scaledRight.data[j*n+i] = ratProduct(b.data[i*k+j], &factor)
		}
	}
	right, rightScale := clearRows(scaledRight)
	return &squareSystem{n, k, transposed(n, n, matrix), transposed(k, n, right)}, matrixScale, rightScale
}

// transposed rearranges a row-major rows×cols array; numbers are shared.
func transposed(rows, cols int, a []big.Int) []big.Int {
	out := make([]big.Int, len(a))
	for i := range rows {
		for j := range cols {
			out[j*rows+i] = a[i*cols+j]
		}
	}
	return out
}

// solve picks the quicker of the two exact methods.
func (s *squareSystem) solve() (det *big.Int, scaled []big.Int, err error) {
	if len(s.matrix) > smallSize {
		return s.cramer()
	}
	width := s.n + s.k
	joined := make([]big.Int, s.n*width)
	for i := range s.n {
		for j := range s.n {
			joined[i*width+j].Set(&s.matrix[i*s.n+j])
		}
		for j := range s.k {
			joined[i*width+s.n+j].Set(&s.right[i*s.k+j])
		}
	}
	e := eliminate(s.n, width, joined, s.n)
	if len(e.pivots) < s.n {
		return nil, nil, ErrSingular
	}
	scaled = make([]big.Int, 0, s.n*s.k)
	for i := range s.n {
		scaled = append(scaled, joined[i*width+s.n:(i+1)*width]...)
	}
	return &e.last, scaled, nil
}

// Solve gives the matrix x with m·x = b when it is unique. It returns
// ErrInconsistent when there is none and a [*UnderdeterminedError] when there
// are several.
func (m *Matrix) Solve(b *Matrix) (*Matrix, error) {
	if m.rows != b.rows {
		return nil, sizeError("solving", m, b)
	}
	if m.rows == m.cols {
		if x, err := m.solveSquare(b); err != ErrSingular {
			return x, err
		}
	}
	reduced, pivots, err := must(Augment(m, b)).echelon()
	if err != nil {
		return nil, err
	}
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

// Kernel gives a basis of {x : m·x = 0} as columns; cols×0 when m has full
// column rank. It panics like [Matrix.Echelon].
func (m *Matrix) Kernel() *Matrix {
	reduced, pivots := m.Echelon()
	return kernelOf(reduced, pivots, m.cols)
}

// kernelOf reads the kernel of the first cols columns off a reduced row echelon form.
func kernelOf(reduced *Matrix, pivots []int, cols int) *Matrix {
	free := complement(pivots, cols)
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

// Image gives a basis of the column space: the first independent columns of
// m. It panics like [Matrix.Echelon].
func (m *Matrix) Image() *Matrix {
	_, pivots := m.Echelon()
	return m.Columns(pivots...)
}
