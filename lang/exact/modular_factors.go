package exact

import "math/rand/v2"

// Polynomials over a prime field, lowest power first, without leading zeros.

// multiplyModulo gives a·b mod m for a monic m of degree ≥ 1.
func (f residues) multiplyModulo(a, b, m []uint64) []uint64 {
	if len(a) == 0 || len(b) == 0 {
		return nil
	}
	out := make([]uint64, len(a)+len(b)-1)
	for i, x := range a {
		f.subtractMultiple(out[i:i+len(b)], b, f.neg(x))
	}
	return f.remainder(out, m)
}

// remainder reduces a modulo a monic m, in place.
func (f residues) remainder(a, m []uint64) []uint64 {
	a = trimResidues(a)
	for len(a) >= len(m) {
		f.subtractMultiple(a[len(a)-len(m):], m, a[len(a)-1])
		a = trimResidues(a)
	}
	return a
}

// quotientBy divides a by a monic m and drops the remainder.
func (f residues) quotientBy(a, m []uint64) []uint64 {
	if len(a) < len(m) {
		return nil
	}
	rest := append([]uint64(nil), a...)
	out := make([]uint64, len(a)-len(m)+1)
	for k := len(out) - 1; k >= 0; k-- {
		out[k] = rest[k+len(m)-1]
		f.subtractMultiple(rest[k:k+len(m)], m, out[k])
	}
	return out
}

// powerModulo gives aᵉ mod m, e ≥ 1.
func (f residues) powerModulo(a []uint64, e uint64, m []uint64) []uint64 {
	result := []uint64{1}
	base := f.remainder(append([]uint64(nil), a...), m)
	for ; e > 0; e >>= 1 {
		if e&1 == 1 {
			result = f.multiplyModulo(result, base, m)
		}
		if e > 1 {
			base = f.multiplyModulo(base, base, m)
		}
	}
	return result
}

func (f residues) difference(a, b []uint64) []uint64 {
	out := make([]uint64, max(len(a), len(b)))
	copy(out, a)
	f.subtractMultiple(out[:len(b)], b, 1)
	return trimResidues(out)
}

func (f residues) derivative(a []uint64) []uint64 {
	if len(a) < 2 {
		return nil
	}
	out := make([]uint64, len(a)-1)
	for k := range out {
		out[k] = f.mul(a[k+1], uint64(k+1)%f.p)
	}
	return trimResidues(out)
}

func (f residues) gcdOf(a, b []uint64) []uint64 {
	return f.polynomialGcd(append([]uint64(nil), a...), append([]uint64(nil), b...))
}

// sameDegree is a product of irreducible factors of one degree.
type sameDegree struct {
	product []uint64
	degree  int
}

// distinctDegrees splits a monic square-free polynomial by the degrees of its
// irreducible factors: x^(p^d) − x is the product of all those whose degree
// divides d.
func (f residues) distinctDegrees(a []uint64) []sameDegree {
	var out []sameDegree
	x := []uint64{0, 1}
	power := x
	for d := 1; len(a)-1 >= 2*d; d++ {
		power = f.powerModulo(power, f.p, a)
		common := f.gcdOf(a, f.difference(power, x))
		if len(common) > 1 {
			out = append(out, sameDegree{common, d})
			a = f.quotientBy(a, common)
			power = f.remainder(append([]uint64(nil), power...), a)
		}
	}
	if len(a) > 1 {
		out = append(out, sameDegree{a, len(a) - 1})
	}
	return out
}

// equalDegrees splits a product of irreducible factors of degree d, p odd (D. G.
// Cantor and H. Zassenhaus, A new algorithm for factoring polynomials over
// finite fields, Math. Comp. 36, 1981). The random choices come from a fixed
// seed, so that a run can be repeated.
func (f residues) equalDegrees(a []uint64, d int, random *rand.Rand) [][]uint64 {
	n := len(a) - 1
	if n == d {
		return [][]uint64{a}
	}
	for {
		trial := make([]uint64, n)
		for k := range trial {
			trial[k] = random.Uint64N(f.p)
		}
		if trial = trimResidues(trial); len(trial) < 2 {
			continue
		}
		// trial^((p^d − 1)/2) = (trial^(1 + p + … + p^(d−1)))^((p − 1)/2)
		norm, conjugate := trial, trial
		for range d - 1 {
			conjugate = f.powerModulo(conjugate, f.p, a)
			norm = f.multiplyModulo(norm, conjugate, a)
		}
		root := f.powerModulo(norm, (f.p-1)/2, a)
		difference := f.difference(root, []uint64{1})
		if len(difference) == 0 {
			continue
		}
		common := f.gcdOf(a, difference)
		if len(common) > 1 && len(common) < len(a) {
			return append(f.equalDegrees(common, d, random), f.equalDegrees(f.quotientBy(a, common), d, random)...)
		}
	}
}

// bezout gives s, t with s·a + t·b = 1 for coprime a and b, deg s < deg b and
// deg t < deg a.
func (f residues) bezout(a, b []uint64) (s, t []uint64) {
	r0, r1 := append([]uint64(nil), a...), append([]uint64(nil), b...)
	s0, s1 := []uint64{1}, []uint64(nil)
	t0, t1 := []uint64(nil), []uint64{1}
	for len(r1) > 0 {
		inverse := f.inverse(r1[len(r1)-1])
		monic := append([]uint64(nil), r1...)
		f.scaleRow(monic, inverse)
		q := f.quotientBy(r0, monic)
		f.scaleRow(q, inverse)
		r0, r1 = r1, f.difference(r0, f.multiply(q, r1))
		s0, s1 = s1, f.difference(s0, f.multiply(q, s1))
		t0, t1 = t1, f.difference(t0, f.multiply(q, t1))
	}
	inverse := f.inverse(r0[0])
	f.scaleRow(s0, inverse)
	f.scaleRow(t0, inverse)
	return s0, t0
}

func (f residues) multiply(a, b []uint64) []uint64 {
	if len(a) == 0 || len(b) == 0 {
		return nil
	}
	out := make([]uint64, len(a)+len(b)-1)
	for i, x := range a {
		f.subtractMultiple(out[i:i+len(b)], b, f.neg(x))
	}
	return trimResidues(out)
}
