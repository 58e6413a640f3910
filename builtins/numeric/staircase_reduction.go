package numeric

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// errSingularValues is what a failed singular value iteration becomes.
var errSingularValues = errors.New("the iteration for the singular values did not converge")

// reflector turns v into the Householder vector (leading entry 1) of the
// reflection H = I − tau·v·vᵀ with H·v = alpha·e₁.
func reflector(v []float64) (tau, alpha float64) {
	if len(v) == 0 {
		return 0, 0
	}
	tail := blocksNorm(v[1:])
	if tail == 0 {
		alpha = v[0]
		v[0] = 1
		return 0, alpha
	}
	alpha = -math.Copysign(math.Hypot(v[0], tail), v[0])
	tau = (alpha - v[0]) / alpha
	lead := v[0] - alpha
	for i := range v[1:] {
		v[i+1] /= lead
	}
	v[0] = 1
	return tau, alpha
}

// reflectLeft applies H = I − tau·v·vᵀ to rows first … first+len(v)−1, columns
// from … to−1 of the row-major m with the given number of columns.
func reflectLeft(m []float64, columns, first, from, to int, v []float64, tau float64, work []float64) {
	if tau == 0 || to <= from {
		return
	}
	sum := work[:to-from]
	clear(sum)
	for i, vi := range v {
		row := m[(first+i)*columns+from : (first+i)*columns+to]
		for j, x := range row {
			sum[j] += vi * x
		}
	}
	for i, vi := range v {
		f := tau * vi
		row := m[(first+i)*columns+from : (first+i)*columns+to]
		for j := range row {
			row[j] -= f * sum[j]
		}
	}
}

// reflectRight applies H = I − tau·v·vᵀ from the right to columns first …
// first+len(v)−1 of rows from … to−1.
func reflectRight(m []float64, columns, first, from, to int, v []float64, tau float64) {
	if tau == 0 {
		return
	}
	for i := from; i < to; i++ {
		row := m[i*columns+first : i*columns+first+len(v)]
		sum := 0.0
		for j, x := range row {
			sum += v[j] * x
		}
		sum *= tau
		for j := range row {
			row[j] -= sum * v[j]
		}
	}
}

// staircase is a pair under reduction: a (n×n) and b (n×m) become QᵀAQ and QᵀB,
// other (n×p transposed output map, optional) becomes Qᵀ·other.
type staircase struct {
	n, m, p     int
	a, b, q     []float64
	other       []float64
	blocks      []int
	rank        int
	threshold   float64
	above       float64 // smallest singular value counted as nonzero, +Inf when none
	below       float64 // largest singular value counted as zero
	vector      []float64
	work        []float64
	blockValues []float64
}

// newStaircase copies the pair; p columns of other follow the transformation.
func newStaircase(n, m int, a, b []float64, p int, other []float64, threshold float64) *staircase {
	s := &staircase{n: n, m: m, p: p, threshold: threshold, above: math.Inf(1)}
	s.a = append([]float64(nil), a...)
	s.b = append([]float64(nil), b...)
	s.other = append([]float64(nil), other...)
	s.q = make([]float64, n*n)
	for i := 0; i < n; i++ {
		s.q[i*n+i] = 1
	}
	s.vector = make([]float64, n)
	s.work = make([]float64, max(n, m, p)+1)
	return s
}

// reduce brings the pair to block upper Hessenberg form. Each block on the
// subdiagonal has full row rank and is upper trapezoidal; what is counted as
// zero is set to zero.
func (s *staircase) reduce() error {
	if s.n == 0 || s.m == 0 {
		return nil
	}
	block, columns, from, width := s.b, s.m, 0, s.m
	for s.rank < s.n {
		rank, err := s.compress(block, columns, s.rank, from, width)
		if err != nil {
			return err
		}
		if rank == 0 {
			return nil
		}
		s.blocks = append(s.blocks, rank)
		block, columns, from, width = s.a, s.n, s.rank, rank
		s.rank += rank
	}
	return nil
}

// compress works on the block of rows first … n−1 and columns from … from+width−1
// of m: Householder QR, then the singular values of the small triangle decide
// the rank, and a last QR makes the rows that stay upper trapezoidal.
func (s *staircase) compress(m []float64, columns, first, from, width int) (rank int, err error) {
	s.triangularize(m, columns, first, s.n, from, width)
	height := min(s.n-first, width)
	if width == 1 {
		s.blockValues = append(s.blockValues[:0], math.Abs(m[first*columns+from]))
	} else if err = s.rotateToSingular(m, columns, first, from, width, height); err != nil {
		return 0, err
	}
	for _, value := range s.blockValues {
		if value > s.threshold {
			rank++
			s.above = math.Min(s.above, value)
		} else {
			s.below = math.Max(s.below, value)
		}
	}
	for i := first + rank; i < s.n; i++ {
		clear(m[i*columns+from : i*columns+from+width])
	}
	if rank > 0 && width > 1 {
		s.triangularize(m, columns, first, first+rank, from, width)
	}
	return rank, nil
}

// triangularize makes rows first … last−1 of the block upper trapezoidal.
func (s *staircase) triangularize(m []float64, columns, first, last, from, width int) {
	for j := 0; j < width && first+j < last-1; j++ {
		row := first + j
		v := s.vector[:last-row]
		for i := range v {
			v[i] = m[(row+i)*columns+from+j]
		}
		tau, alpha := reflector(v)
		s.apply(row, v, tau)
		m[row*columns+from+j] = alpha
		for i := row + 1; i < last; i++ {
			m[i*columns+from+j] = 0
		}
	}
}

// apply carries one reflection of the state to a, b, q and other.
func (s *staircase) apply(first int, v []float64, tau float64) {
	if tau == 0 {
		return
	}
	reflectLeft(s.a, s.n, first, 0, s.n, v, tau, s.work)
	reflectLeft(s.b, s.m, first, 0, s.m, v, tau, s.work)
	reflectLeft(s.other, s.p, first, 0, s.p, v, tau, s.work)
	reflectRight(s.a, s.n, first, 0, s.n, v, tau)
	reflectRight(s.q, s.n, first, 0, s.n, v, tau)
}

// rotateToSingular turns the height rows from first by the left singular
// vectors of the small upper trapezoidal block, largest value first.
func (s *staircase) rotateToSingular(m []float64, columns, first, from, width, height int) (err error) {
	small := mat.NewDense(height, width, nil)
	for i := 0; i < height; i++ {
		small.SetRow(i, m[(first+i)*columns+from:(first+i)*columns+from+width])
	}
	u, values, err := leftSingular(small)
	if err != nil {
		return err
	}
	s.blockValues = values
	turnRows(m, columns, first, height, u)
	if &m[0] != &s.b[0] {
		turnRows(s.b, s.m, first, height, u)
	}
	if &m[0] != &s.a[0] {
		turnRows(s.a, s.n, first, height, u)
	}
	turnRows(s.other, s.p, first, height, u)
	turnColumns(s.a, s.n, s.n, first, height, u)
	turnColumns(s.q, s.n, s.n, first, height, u)
	return nil
}

// leftSingular gives all left singular vectors (columns) and the singular
// values, largest first, of a small finite matrix.
func leftSingular(small *mat.Dense) (u *mat.Dense, values []float64, err error) {
	defer func() {
		if recover() != nil {
			err = errSingularValues
		}
	}()
	rows, columns := small.Dims()
	copied := mat.DenseCopyOf(small).RawMatrix()
	values = make([]float64, min(rows, columns))
	u = mat.NewDense(rows, rows, nil)
	work := []float64{0}
	kernels.Dgesvd(lapack.SVDAll, lapack.SVDNone, rows, columns, copied.Data, copied.Stride, values, u.RawMatrix().Data, rows, nil, 1, work, -1)
	work = make([]float64, int(work[0]))
	if !kernels.Dgesvd(lapack.SVDAll, lapack.SVDNone, rows, columns, copied.Data, copied.Stride, values, u.RawMatrix().Data, rows, nil, 1, work, len(work)) {
		return nil, nil, errSingularValues
	}
	return u, values, nil
}

// turnRows replaces height rows of m from first by uᵀ times them.
func turnRows(m []float64, columns, first, height int, u *mat.Dense) {
	if columns == 0 {
		return
	}
	old := append([]float64(nil), m[first*columns:(first+height)*columns]...)
	for i := 0; i < height; i++ {
		row := m[(first+i)*columns : (first+i+1)*columns]
		clear(row)
		for k := 0; k < height; k++ {
			f := u.At(k, i)
			for j, x := range old[k*columns : (k+1)*columns] {
				row[j] += f * x
			}
		}
	}
}

// turnColumns replaces height columns of m from first by them times u.
func turnColumns(m []float64, rows, columns, first, height int, u *mat.Dense) {
	old := make([]float64, height)
	for i := 0; i < rows; i++ {
		row := m[i*columns+first : i*columns+first+height]
		copy(old, row)
		for j := range row {
			sum := 0.0
			for k, x := range old {
				sum += x * u.At(k, j)
			}
			row[j] = sum
		}
	}
}
