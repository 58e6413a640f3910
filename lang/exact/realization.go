package exact

import "fmt"

// ImproperError says that an entry of a transfer matrix (counted from 1) has a
// numerator of higher degree than its denominator.
type ImproperError struct {
	Row, Column, NumeratorDegree, DenominatorDegree int
}

// Error shows the degrees.
func (e *ImproperError) Error() string {
	return fmt.Sprintf("entry [%d, %d] has a numerator of degree %d over a denominator of degree %d: no state-space system has it",
		e.Row, e.Column, e.NumeratorDegree, e.DenominatorDegree)
}

// Realize gives a state-space system of least order with the p×m transfer
// matrix g, whose rows have equal length. One input and one output come out in
// controller form; otherwise each column is set up in controller form over its
// common denominator and the part that is not seen is split off exactly.
func Realize(g [][]Rational) (a, b, c, d *Matrix, err error) {
	p, m := len(g), 0
	if p > 0 {
		m = len(g[0])
	}
	d = NewMatrix(p, m)
	for i, row := range g {
		if len(row) != m {
			return nil, nil, nil, nil, fmt.Errorf("rows of unequal length: row 1 has %d entries, row %d has %d", m, i+1, len(row))
		}
		for j, entry := range row {
			if !entry.IsProper() {
				return nil, nil, nil, nil, &ImproperError{i + 1, j + 1, entry.Num.Degree(), entry.Den.Degree()}
			}
			d.data[i*m+j] = entry.Num.Coefficient(entry.Den.Degree())
		}
	}
	a, b, c = NewMatrix(0, 0), NewMatrix(0, m), NewMatrix(p, 0)
	for j := range m {
		column := columnOf(g, d, j)
		a, b, c = appendColumn(a, b, c, column, j)
	}
	if p == 1 && m == 1 {
		return a, b, c, d, nil
	}
	a, b, c, err = MinimalRealization(a, b, c)
	return a, b, c, d, err
}

// controllerColumn is one column of a transfer matrix over its common denominator.
type controllerColumn struct {
	den        Polynomial
	numerators []Polynomial // strictly proper part
}

func columnOf(g [][]Rational, d *Matrix, j int) controllerColumn {
	den := Constant(ratOne)
	for i := range g {
		den = den.Mul(g[i][j].Den.quotient(den.Gcd(g[i][j].Den)))
	}
	out := controllerColumn{den, make([]Polynomial, len(g))}
	for i := range g {
		full := g[i][j].Num.Mul(den.quotient(g[i][j].Den))
		out.numerators[i] = full.Sub(den.Scale(d.At(i, j)))
	}
	return out
}

// appendColumn adds the controller form of one column as a further diagonal block.
func appendColumn(a, b, c *Matrix, column controllerColumn, input int) (*Matrix, *Matrix, *Matrix) {
	n, k := a.rows, column.den.Degree()
	upper := must(Augment(a, NewMatrix(n, k)))
	lower := must(Augment(NewMatrix(k, n), companion(column.den)))
	drive := NewMatrix(k, b.cols)
	if k > 0 {
		drive.data[(k-1)*b.cols+input] = ratOne
	}
	outputs := NewMatrix(c.rows, k)
	for i, num := range column.numerators {
		for power := range k {
			outputs.data[i*k+power] = num.Coefficient(power)
		}
	}
	return must(Stack(upper, lower)), must(Stack(b, drive)), must(Augment(c, outputs))
}
