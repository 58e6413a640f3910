package exact

import "math/big"

// Resolvent gives (s·I − a)⁻¹ of an n×n matrix as numerators[i][j]/denominator:
// the adjugate and the characteristic polynomial, nothing cancelled. The
// coefficients of the adjugate follow Faddeev's recursion (D. K. Faddeev and
// V. N. Faddeeva 1963) with the characteristic polynomial known beforehand.
func Resolvent(a *Matrix) (numerators [][]Polynomial, denominator Polynomial, err error) {
	adj, err := adjugateTimes(a, Identity(a.rows))
	if err != nil {
		return nil, Polynomial{}, err
	}
	numerators = make([][]Polynomial, a.rows)
	for i := range numerators {
		numerators[i] = make([]Polynomial, a.rows)
		for j := range numerators[i] {
			c := make([]*big.Rat, a.rows)
			for k := range c {
				c[k] = fraction(&adj.coefficients[k][i*a.rows+j], &adj.den[k])
			}
			numerators[i][j] = trimmed(c)
		}
	}
	return numerators, adj.characteristic, nil
}

// adjugate holds adj(s·I − a)·b = Σ sᵏ·coefficients[k]/den[k], each coefficient
// an integer matrix of b's size.
type adjugate struct {
	coefficients   [][]big.Int
	den            []big.Int
	characteristic Polynomial
}

// adjugateTimes works the recursion h[n−1] = b, h[k−1] = a·h[k] + c[k]·b over the
// integers: with a = N/d and b = G/e the integers are e·d^(n−1−k)·h[k].
func adjugateTimes(a, b *Matrix) (*adjugate, error) {
	open, err := a.clearedCharacteristic()
	if err != nil {
		return nil, err
	}
	if !b.clearable() {
		return nil, ErrTooLarge
	}
	n, m := a.rows, b.cols
	drive, driveDen := clearAll(b)
	out := &adjugate{make([][]big.Int, n), make([]big.Int, n), open.polynomial()}
	var term big.Int
	for k := n - 1; k >= 0; k-- {
		if k == n-1 {
			out.coefficients[k] = drive
			out.den[k].Set(driveDen)
			continue
		}
		next := multiplyIntegers(n, n, m, open.ints, out.coefficients[k+1])
		for i := range next {
			if drive[i].Sign() != 0 {
				next[i].Add(&next[i], term.Mul(&open.coefficients[k+1], &drive[i]))
			}
		}
		out.coefficients[k] = next
		out.den[k].Mul(&out.den[k+1], open.den)
	}
	return out, nil
}

// multiplyIntegers gives the product of an r×n and an n×c integer matrix.
func multiplyIntegers(r, n, c int, x, y []big.Int) []big.Int {
	out := make([]big.Int, r*c)
	var term big.Int
	for i := range r {
		for k := range n {
			factor := &x[i*n+k]
			if factor.Sign() == 0 {
				continue
			}
			for j := range c {
				if y[k*c+j].Sign() != 0 {
					out[i*c+j].Add(&out[i*c+j], term.Mul(factor, &y[k*c+j]))
				}
			}
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
	adj, err := adjugateTimes(a, b)
	if err != nil {
		return nil, Polynomial{}, err
	}
	if !c.clearable() {
		return nil, Polynomial{}, ErrTooLarge
	}
	out, outDen := clearRows(c)
	products := make([][]big.Int, a.rows)
	for k := range products {
		products[k] = multiplyIntegers(c.rows, a.rows, b.cols, out, adj.coefficients[k])
	}
	var den big.Int
	numerators = make([][]Polynomial, c.rows)
	for i := range numerators {
		numerators[i] = make([]Polynomial, b.cols)
		for j := range numerators[i] {
			entry := make([]*big.Rat, a.rows)
			for k := range entry {
				entry[k] = fraction(&products[k][i*b.cols+j], den.Mul(&adj.den[k], &outDen[i]))
			}
			numerators[i][j] = trimmed(entry)
		}
	}
	denominator = adj.characteristic
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
