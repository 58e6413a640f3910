package exact

import (
	"math/big"
	"math/bits"
	"sync"
)

// residues computes modulo a prime below 2⁶². Products with a fixed factor use
// the precomputed quotient of V. Shoup (NTL; see D. Harvey, Faster arithmetic
// for number-theoretic transforms, J. Symb. Comput. 60, 2014): two
// multiplications instead of a division.
type residues struct{ p uint64 }

// primeOffsets lists the distances below 2⁶² of the 64 largest primes there; a
// test recomputes them.
var primeOffsets = [...]uint32{
	57, 87, 117, 143, 153, 167, 171, 195, 203, 273, 287, 317,
	443, 483, 495, 575, 581, 603, 633, 663, 765, 773, 777, 791,
	813, 831, 923, 981, 993, 1001, 1007, 1017, 1197, 1241, 1293, 1353,
	1433, 1515, 1553, 1575, 1581, 1595, 1617, 1673, 1697, 1701, 1703, 1823,
	1881, 1911, 1923, 2043, 2073, 2103, 2141, 2187, 2217, 2247, 2285, 2351,
	2367, 2375, 2397, 2421,
}

var primes struct {
	sync.Mutex
	found []uint64
}

// primeField gives the field of the index-th prime counted down from 2⁶².
func primeField(index int) residues {
	if index < len(primeOffsets) {
		return residues{1<<62 - uint64(primeOffsets[index])}
	}
	primes.Lock()
	defer primes.Unlock()
	if len(primes.found) == 0 {
		last := uint64(1 << 62)
		if len(primeOffsets) > 0 {
			last -= uint64(primeOffsets[len(primeOffsets)-1])
		}
		primes.found = append(primes.found, last)
	}
	for len(primes.found) <= index-len(primeOffsets)+1 {
		primes.found = append(primes.found, primeBelow(primes.found[len(primes.found)-1]))
	}
	return residues{primes.found[index-len(primeOffsets)+1]}
}

// primeBelow searches downward; ProbablyPrime is exact below 2⁶⁴.
func primeBelow(n uint64) uint64 {
	for candidate := (n - 1) | 1; ; candidate -= 2 {
		if candidate < n && new(big.Int).SetUint64(candidate).ProbablyPrime(0) {
			return candidate
		}
	}
}

func (f residues) mul(a, b uint64) uint64 {
	hi, lo := bits.Mul64(a, b)
	_, r := bits.Div64(hi, lo, f.p)
	return r
}

func (f residues) sub(a, b uint64) uint64 {
	if a >= b {
		return a - b
	}
	return a + f.p - b
}

func (f residues) neg(a uint64) uint64 {
	if a == 0 {
		return 0
	}
	return f.p - a
}

// inverse of a non-zero residue by Euclid's algorithm.
func (f residues) inverse(a uint64) uint64 {
	r0, r1 := int64(f.p), int64(a)
	t0, t1 := int64(0), int64(1)
	for r1 != 0 {
		q := r0 / r1
		r0, r1 = r1, r0-q*r1
		t0, t1 = t1, t0-q*t1
	}
	if t0 < 0 {
		t0 += int64(f.p)
	}
	return uint64(t0)
}

// subtractMultiple sets row[j] −= w·other[j].
func (f residues) subtractMultiple(row, other []uint64, w uint64) {
	if w == 0 {
		return
	}
	p := f.p
	w = p - w
	ratio, _ := bits.Div64(w, 0, p)
	other = other[:len(row)]
	for j, x := range other {
		q, _ := bits.Mul64(x, ratio)
		r := x*w - q*p // below 2p
		if r >= p {
			r -= p
		}
		r += row[j]
		if r >= p {
			r -= p
		}
		row[j] = r
	}
}

// scaleRow sets row[j] = w·row[j].
func (f residues) scaleRow(row []uint64, w uint64) {
	p := f.p
	ratio, _ := bits.Div64(w, 0, p)
	for j, x := range row {
		q, _ := bits.Mul64(x, ratio)
		r := x*w - q*p
		if r >= p {
			r -= p
		}
		row[j] = r
	}
}

// reduce gives x mod p in 0 … p−1.
func (f residues) reduce(x *big.Int) uint64 {
	r := magnitudeMod(x.Bits(), f.p)
	if x.Sign() < 0 {
		return f.neg(r)
	}
	return r
}

func magnitudeMod(words []big.Word, p uint64) uint64 {
	if len(words) == 1 {
		return uint64(words[0]) % p
	}
	var r uint64
	for k := len(words) - 1; k >= 0; k-- {
		if bits.UintSize == 64 {
			_, r = bits.Div64(r, uint64(words[k]), p)
		} else {
			_, r = bits.Div64(r>>32, r<<32|uint64(words[k]), p)
		}
	}
	return r
}

func (f residues) reduceAll(x []big.Int) []uint64 {
	out := make([]uint64, len(x))
	f.reduceInto(out, x)
	return out
}

func (f residues) reduceInto(out []uint64, x []big.Int) {
	for k := range x {
		out[k] = f.reduce(&x[k])
	}
}

// polynomialGcd gives the monic greatest common divisor, lowest power first.
// It overwrites its arguments, which must not both be zero.
func (f residues) polynomialGcd(a, b []uint64) []uint64 {
	a, b = trimResidues(a), trimResidues(b)
	if len(a) < len(b) {
		a, b = b, a
	}
	for len(b) > 0 {
		f.scaleRow(b, f.inverse(b[len(b)-1]))
		for len(a) >= len(b) {
			f.subtractMultiple(a[len(a)-len(b):], b, a[len(a)-1])
			a = trimResidues(a)
		}
		a, b = b, a
	}
	f.scaleRow(a, f.inverse(a[len(a)-1]))
	return a
}

func trimResidues(a []uint64) []uint64 {
	for len(a) > 0 && a[len(a)-1] == 0 {
		a = a[:len(a)-1]
	}
	return a
}

// remaindering collects residues of a vector of integers modulo several
// primes (Chinese remainder theorem, incremental form of H. L. Garner 1959).
type remaindering struct {
	modulus big.Int
	values  []big.Int // in 0 … modulus−1
}

func newRemaindering(n int) *remaindering {
	r := &remaindering{values: make([]big.Int, n)}
	r.modulus.SetInt64(1)
	return r
}

// add takes the residues modulo one more prime and tells whether any value
// changed as a number between −modulus/2 and modulus/2.
func (r *remaindering) add(residue []uint64, f residues) (changed bool) {
	w := f.inverse(f.reduce(&r.modulus))
	m := f.reduce(&r.modulus)
	first := r.modulus.IsInt64() && r.modulus.Int64() == 1
	var half, term, step big.Int
	half.Rsh(&r.modulus, 1)
	for k := range r.values {
		x := &r.values[k]
		current := f.reduce(x)
		// The symmetric lift is x or x − modulus; the value is settled when it already fits.
		if x.Cmp(&half) > 0 {
			changed = changed || f.sub(current, m) != residue[k]
		} else {
			changed = changed || current != residue[k]
		}
		t := f.mul(f.sub(residue[k], current), w)
		if t != 0 {
			x.Add(x, term.Mul(&r.modulus, step.SetUint64(t)))
		}
	}
	r.modulus.Mul(&r.modulus, step.SetUint64(f.p))
	return changed || first
}

// lift gives the values between −modulus/2 and modulus/2.
func (r *remaindering) lift() []big.Int {
	var half big.Int
	half.Rsh(&r.modulus, 1)
	out := make([]big.Int, len(r.values))
	for k := range out {
		if r.values[k].Cmp(&half) > 0 {
			out[k].Sub(&r.values[k], &r.modulus)
		} else {
			out[k].Set(&r.values[k])
		}
	}
	return out
}

func (f residues) add(a, b uint64) uint64 {
	if a += b; a >= f.p {
		a -= f.p
	}
	return a
}

// dot gives Σ a[k]·b[k] with one division for every eight products.
func (f residues) dot(a, b []uint64) uint64 {
	var hi, lo, carry uint64
	b = b[:len(a)]
	for k, x := range a {
		h, l := bits.Mul64(x, b[k])
		lo, carry = bits.Add64(lo, l, 0)
		hi += h + carry
		if k&7 == 7 { // eight products of 124 bits stay below 2¹²⁷
			hi %= f.p
		}
	}
	_, r := bits.Div64(hi%f.p, lo, f.p)
	return r
}
