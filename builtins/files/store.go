package files

import (
	"math/big"

	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// store gathers the entries of a matrix: exact while it is small enough for exact work, the
// nearest binary64 numbers above.
type store struct {
	rows, columns    int
	re, im           *exact.Matrix
	floatRe, floatIm []float64
}

func newStore(rows, columns int) (*store, error) {
	s := &store{rows: rows, columns: columns}
	if value.CheckSize(rows, columns, true) == nil {
		s.re, s.im = exact.NewMatrix(rows, columns), exact.NewMatrix(rows, columns)
		return s, nil
	}
	if err := value.CheckSize(rows, columns, false); err != nil {
		return nil, err
	}
	s.floatRe, s.floatIm = make([]float64, rows*columns), make([]float64, rows*columns)
	return s, nil
}

// add adds to an entry (from 0); im may be nil.
func (s *store) add(i, j int, re, im *big.Rat) {
	if im == nil {
		im = new(big.Rat)
	}
	if s.re != nil {
		s.re.Set(i, j, new(big.Rat).Add(s.re.At(i, j), re))
		s.im.Set(i, j, new(big.Rat).Add(s.im.At(i, j), im))
		return
	}
	x, _ := re.Float64()
	y, _ := im.Float64()
	s.floatRe[i*s.columns+j] += x
	s.floatIm[i*s.columns+j] += y
}

// matrix gives the matrix, with a note when it is no longer exact.
func (s *store) matrix(c *value.Call) *value.Matrix {
	if s.re != nil {
		return value.ExactComplexMatrix(s.re, s.im)
	}
	if c.Note != nil {
		c.Note("a matrix of this size is read as binary64 numbers")
	}
	return value.FloatComplexMatrix(s.rows, s.columns, s.floatRe, s.floatIm, 0)
}
