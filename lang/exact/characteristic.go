package exact

import (
	"errors"
	"math/big"
)

// CharacteristicPolynomial gives det(s·I − m), monic, of a square matrix.
//
// The matrix is cleared to integers N/d; the polynomial of N is found modulo
// word-sized primes through the Hessenberg form (H. Cohen, A Course in
// Computational Algebraic Number Theory, 1993, algorithm 2.2.9) and put
// together by Chinese remaindering up to a bound of Hadamard's kind, so the
// result is proved; it is compared modulo a fresh prime all the same.
//
// It panics for a matrix that is not square, and with ErrTooLarge where
// [Matrix.CheckSize] says so.
func (m *Matrix) CharacteristicPolynomial() Polynomial {
	p, err := m.characteristic()
	if err != nil {
		panic(err)
	}
	return p
}

func (m *Matrix) characteristic() (Polynomial, error) {
	c, err := m.clearedCharacteristic()
	if err != nil {
		return Polynomial{}, err
	}
	return c.polynomial(), nil
}

// clearedCharacteristic is the characteristic polynomial of the integer matrix
// ints = den·m, lowest power first.
type clearedCharacteristic struct {
	ints, coefficients []big.Int
	den                *big.Int
}

// polynomial gives that of m: det(s·I − N/d) = d⁻ⁿ·χ_N(d·s), so the coefficient
// of sᵏ is divided by d^(n−k).
func (c *clearedCharacteristic) polynomial() Polynomial {
	n := len(c.coefficients) - 1
	out := make([]*big.Rat, n+1)
	power := big.NewInt(1)
	for k := n; k >= 0; k-- {
		out[k] = fraction(&c.coefficients[k], power)
		power.Mul(power, c.den)
	}
	return trimmed(out)
}

func (m *Matrix) clearedCharacteristic() (*clearedCharacteristic, error) {
	if m.rows != m.cols {
		return nil, sizeError("the characteristic polynomial", m, nil)
	}
	if err := m.CheckSize(); err != nil {
		return nil, err
	}
	n := m.rows
	ints, den := clearAll(m)
	limit := min(minorBits(n, ints), minorBits(n, transposed(n, n, ints)))
	sum := newRemaindering(n + 1)
	index := 0
	for ; sum.modulus.BitLen() <= limit+2; index++ {
		f := primeField(index)
		sum.add(f.characteristic(f.reduceRows(n, n, ints)), f)
	}
	lifted := sum.lift()
	fresh := primeField(index)
	for k, want := range fresh.characteristic(fresh.reduceRows(n, n, ints)) {
		if fresh.reduce(&lifted[k]) != want {
			return nil, errors.New("the characteristic polynomial failed its check modulo a further prime")
		}
	}
	return &clearedCharacteristic{ints, lifted, den}, nil
}

// minorBits bounds the bit length of every coefficient: a sum of principal
// minors is at most the elementary symmetric function of the rows' norms, and
// all of these together are at most ∏(1 + ‖row‖).
func minorBits(n int, ints []big.Int) int {
	product := big.NewInt(1)
	var norm, square big.Int
	for i := range n {
		norm.SetInt64(0)
		for j := range n {
			norm.Add(&norm, square.Mul(&ints[i*n+j], &ints[i*n+j]))
		}
		if norm.Sign() != 0 {
			norm.Sqrt(&norm)
			norm.Add(&norm, big.NewInt(2)) // one for the root's rounding, one for the bound
			product.Mul(product, &norm)
		}
	}
	return product.BitLen()
}

// characteristic gives det(s·I − h) modulo the prime, lowest power first. It
// overwrites h.
func (f residues) characteristic(h [][]uint64) []uint64 {
	n := len(h)
	f.hessenberg(h)
	// p[k] is the polynomial of the leading k×k part:
	// p[k+1] = (s − h[k][k])·p[k] − Σ h[i][k]·(product of subdiagonals i+1 … k)·p[i].
	p := make([][]uint64, n+1)
	p[0] = []uint64{1}
	for k := range n {
		next := make([]uint64, k+2)
		copy(next[1:], p[k])
		f.subtractMultiple(next[:k+1], p[k], h[k][k])
		product := uint64(1)
		for i := k - 1; i >= 0; i-- {
			if product = f.mul(product, h[i+1][i]); product == 0 {
				break
			}
			f.subtractMultiple(next[:i+1], p[i], f.mul(h[i][k], product))
		}
		p[k+1] = next
	}
	return p[n]
}

// hessenberg reduces h by similarity to upper Hessenberg form, in place. The
// column operations of one step are gathered, so that both halves run along rows.
func (f residues) hessenberg(h [][]uint64) {
	n := len(h)
	factors := make([]uint64, n)
	for k := 0; k+2 < n; k++ {
		at := k + 1
		for at < n && h[at][k] == 0 {
			at++
		}
		if at == n {
			continue
		}
		if at != k+1 {
			h[at], h[k+1] = h[k+1], h[at]
			for _, row := range h {
				row[at], row[k+1] = row[k+1], row[at]
			}
		}
		inverse := f.inverse(h[k+1][k])
		for i := k + 2; i < n; i++ {
			factors[i] = f.mul(h[i][k], inverse)
			f.subtractMultiple(h[i][k:], h[k+1][k:], factors[i])
		}
		for _, row := range h {
			row[k+1] = f.add(row[k+1], f.dot(row[k+2:], factors[k+2:]))
		}
	}
}
