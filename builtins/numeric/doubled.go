package numeric

import "math"

// doubled is an unevaluated sum high + low with about 106 bits: residuals of
// ill-conditioned problems are formed in it, so that a correction step still
// sees the error it must remove.
//
// T. J. Dekker, A floating-point technique for extending the available
// precision, Numer. Math. 18, 1971; T. Ogita, S. M. Rump, S. Oishi, Accurate sum
// and dot product, SIAM J. Sci. Comput. 26, 2005.
type doubled struct{ high, low float64 }

// addProduct adds a·b to d.
func (d *doubled) addProduct(a, b float64) {
	p := a * b
	e := math.FMA(a, b, -p)
	s := d.high + p
	v := s - d.high
	d.low += (d.high - (s - v)) + (p - v) + e
	d.high = s
}

// add adds a to d.
func (d *doubled) add(a float64) {
	s := d.high + a
	v := s - d.high
	d.low += (d.high - (s - v)) + (a - v)
	d.high = s
}

// doubledMatrix is a row-major matrix of doubled numbers; low may be nil.
type doubledMatrix struct {
	rows, columns int
	high, low     []float64
}

// exactMatrix views binary64 entries as a doubledMatrix.
func exactMatrix(rows, columns int, entries []float64) doubledMatrix {
	return doubledMatrix{rows, columns, entries, nil}
}

// newDoubled is a zero matrix with room for low parts.
func newDoubled(rows, columns int) doubledMatrix {
	return doubledMatrix{rows, columns, make([]float64, rows*columns), make([]float64, rows*columns)}
}

// transpose gives a transposed copy.
func (m doubledMatrix) transpose() doubledMatrix {
	t := doubledMatrix{m.columns, m.rows, make([]float64, len(m.high)), nil}
	if m.low != nil {
		t.low = make([]float64, len(m.low))
	}
	for i := 0; i < m.rows; i++ {
		for j := 0; j < m.columns; j++ {
			t.high[j*m.rows+i] = m.high[i*m.columns+j]
			if m.low != nil {
				t.low[j*m.rows+i] = m.low[i*m.columns+j]
			}
		}
	}
	return t
}

// addMatrix adds sign·a entry by entry.
func (m doubledMatrix) addMatrix(sign float64, a doubledMatrix) {
	for i := range m.high {
		d := doubled{m.high[i], m.low[i]}
		d.add(sign * a.high[i])
		if a.low != nil {
			d.low += sign * a.low[i]
		}
		m.setAt(i, d)
	}
}

// setAt stores d, renormalised.
func (m doubledMatrix) setAt(i int, d doubled) {
	s := d.high + d.low
	m.low[i] = d.low - (s - d.high)
	m.high[i] = s
}

// addProduct adds sign·a·bᵀ; both factors are traversed by rows.
func (m doubledMatrix) addProduct(sign float64, a, bTransposed doubledMatrix) {
	inner := a.columns
	for i := 0; i < m.rows; i++ {
		ah := a.high[i*inner : (i+1)*inner]
		for j := 0; j < m.columns; j++ {
			bh := bTransposed.high[j*inner : (j+1)*inner]
			d := doubled{m.high[i*m.columns+j], m.low[i*m.columns+j]}
			for k, v := range ah {
				d.addProduct(sign*v, bh[k])
			}
			if a.low != nil {
				for k, v := range a.low[i*inner : (i+1)*inner] {
					d.low += sign * v * bh[k]
				}
			}
			if bTransposed.low != nil {
				for k, v := range bTransposed.low[j*inner : (j+1)*inner] {
					d.low += sign * ah[k] * v
				}
			}
			m.setAt(i*m.columns+j, d)
		}
	}
}

// rounded gives the entries rounded to binary64.
func (m doubledMatrix) rounded() []float64 {
	out := make([]float64, len(m.high))
	for i := range out {
		out[i] = m.high[i] + m.low[i]
	}
	return out
}
