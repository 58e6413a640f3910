package exact

import "math/big"

// Resolvent gives (s·I − a)⁻¹ of an n×n matrix as numerators[i][j]/denominator:
// the adjugate and the characteristic polynomial, nothing cancelled. The
// coefficients of the adjugate follow Faddeev's recursion (D. K. Faddeev and
// V. N. Faddeeva 1963) with the characteristic polynomial known beforehand.
func Resolvent(a *Matrix) (numerators [][]Polynomial, denominator Polynomial, err error) {
	denominator, err = a.characteristic()
	if err != nil {
		return nil, Polynomial{}, err
	}
	columns, err := adjugateTimes(a, Identity(a.rows), denominator)
	if err != nil {
		return nil, Polynomial{}, err
	}
	return assemble(columns, a.rows, a.rows), denominator, nil
}

// adjugateTimes gives the coefficient matrices, lowest power first, of
// adj(s·I − a)·b: H[n−1] = b, H[k−1] = a·H[k] + c[k]·b.
func adjugateTimes(a, b *Matrix, characteristic Polynomial) ([]*Matrix, error) {
	n := a.rows
	coefficients := make([]*Matrix, n)
	for k := n - 1; k >= 0; k-- {
		if k == n-1 {
			coefficients[k] = b
			continue
		}
		next, err := a.Mul(coefficients[k+1])
		if err != nil {
			return nil, err
		}
		coefficients[k] = must(next.Add(b.Scale(characteristic.Coefficient(k + 1))))
	}
	return coefficients, nil
}

// assemble turns coefficient matrices, lowest power first, into a matrix of polynomials.
func assemble(coefficients []*Matrix, rows, cols int) [][]Polynomial {
	out := make([][]Polynomial, rows)
	for i := range out {
		out[i] = make([]Polynomial, cols)
		for j := range out[i] {
			c := make([]*big.Rat, len(coefficients))
			for k, m := range coefficients {
				c[k] = m.At(i, j)
			}
			out[i][j] = trimmed(c)
		}
	}
	return out
}

// checkPlant compares the shapes of a (n×n), b (n×m), c (p×n) and d (p×m); b, c and d may be nil.
func checkPlant(a, b, c, d *Matrix) error {
	switch {
	case a.rows != a.cols:
		return sizeError("a state matrix", a, nil)
	case b != nil && b.rows != a.rows:
		return sizeError("state matrix and input matrix", a, b)
	case c != nil && c.cols != a.cols:
		return sizeError("state matrix and output matrix", a, c)
	case d != nil && b != nil && d.cols != b.cols:
		return sizeError("input matrix and feedthrough", b, d)
	case d != nil && c != nil && d.rows != c.rows:
		return sizeError("output matrix and feedthrough", c, d)
	}
	return nil
}

// Numerators gives the transfer matrix c·(s·I − a)⁻¹·b + d over the common
// denominator det(s·I − a), nothing cancelled.
func Numerators(a, b, c, d *Matrix) (numerators [][]Polynomial, denominator Polynomial, err error) {
	if err = checkPlant(a, b, c, d); err != nil {
		return nil, Polynomial{}, err
	}
	if denominator, err = a.characteristic(); err != nil {
		return nil, Polynomial{}, err
	}
	states, err := adjugateTimes(a, b, denominator)
	if err != nil {
		return nil, Polynomial{}, err
	}
	outputs := make([]*Matrix, len(states))
	for k, h := range states {
		if outputs[k], err = c.Mul(h); err != nil {
			return nil, Polynomial{}, err
		}
	}
	numerators = assemble(outputs, c.rows, b.cols)
	for i := range numerators {
		for j := range numerators[i] {
			if x := d.At(i, j); x.Sign() != 0 {
				numerators[i][j] = numerators[i][j].Add(denominator.Scale(x))
			}
		}
	}
	return numerators, denominator, nil
}

// Transfer gives the p×m transfer matrix c·(s·I − a)⁻¹·b + d, each entry in lowest terms.
func Transfer(a, b, c, d *Matrix) ([][]Rational, error) {
	numerators, denominator, err := Numerators(a, b, c, d)
	if err != nil {
		return nil, err
	}
	out := make([][]Rational, len(numerators))
	for i, row := range numerators {
		out[i] = make([]Rational, len(row))
		for j, num := range row {
			out[i][j] = reduced(num, denominator)
		}
	}
	return out, nil
}
