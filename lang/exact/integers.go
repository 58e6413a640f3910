package exact

import "math/big"

// clearRows multiplies each row by the least common multiple of its
// denominators: entry [i, j] of m is ints[i·cols+j]/den[i].
func clearRows(m *Matrix) (ints []big.Int, den []big.Int) {
	ints, den = make([]big.Int, len(m.data)), make([]big.Int, m.rows)
	for i := range m.rows {
		row := m.data[i*m.cols : (i+1)*m.cols]
		commonDenominator(&den[i], row)
		scaleTo(ints[i*m.cols:(i+1)*m.cols], row, &den[i])
	}
	return ints, den
}

// clearAll uses one common denominator for the whole matrix.
func clearAll(m *Matrix) (ints []big.Int, den *big.Int) {
	ints, den = make([]big.Int, len(m.data)), new(big.Int)
	commonDenominator(den, m.data)
	scaleTo(ints, m.data, den)
	return ints, den
}

// commonDenominator sets den to the least common multiple of all denominators (1 for none).
func commonDenominator(den *big.Int, entries []*big.Rat) {
	boundedDenominator(den, entries, maxInt)
}

const maxInt = int(^uint(0) >> 1)

// boundedDenominator gives up (false) when the multiple exceeds the bit length.
func boundedDenominator(den *big.Int, entries []*big.Rat, bits int) bool {
	den.SetInt64(1)
	var quotient, remainder big.Int
	for _, x := range entries {
		if x.IsInt() {
			continue
		}
		d := x.Denom()
		if den.CmpAbs(d) >= 0 {
			if quotient.QuoRem(den, d, &remainder); remainder.Sign() == 0 {
				continue
			}
		}
		quotient.GCD(nil, nil, den, d)
		if den.Mul(den, remainder.Quo(d, &quotient)); den.BitLen() > bits {
			return false
		}
	}
	return true
}

// scaleTo sets ints[k] = entries[k]·den, where den is a multiple of every denominator.
func scaleTo(ints []big.Int, entries []*big.Rat, den *big.Int) {
	whole := den.IsInt64() && den.Int64() == 1
	var quotient big.Int
	for k, x := range entries {
		switch {
		case x.Sign() == 0:
		case whole:
			ints[k].Set(x.Num())
		case x.IsInt():
			ints[k].Mul(x.Num(), den)
		default:
			ints[k].Mul(x.Num(), quotient.Quo(den, x.Denom()))
		}
	}
}

// content gives the greatest common divisor of the integers (0 when all are 0).
func content(ints []big.Int) *big.Int {
	g := new(big.Int)
	for k := range ints {
		if ints[k].Sign() == 0 {
			continue
		}
		g.GCD(nil, nil, g, new(big.Int).Abs(&ints[k]))
		if g.IsInt64() && g.Int64() == 1 {
			break
		}
	}
	return g
}
