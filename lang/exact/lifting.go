package exact

import "math/big"

// lifted arithmetic: polynomials over the integers modulo m, lowest power
// first, coefficients in 0 … m−1, without leading zeros.
type modulusRing struct{ m *big.Int }

func (r modulusRing) tidy(a []big.Int) []big.Int {
	for k := range a {
		if a[k].Sign() < 0 || a[k].Cmp(r.m) >= 0 {
			a[k].Mod(&a[k], r.m)
		}
	}
	for len(a) > 0 && a[len(a)-1].Sign() == 0 {
		a = a[:len(a)-1]
	}
	return a
}

func (r modulusRing) multiply(a, b []big.Int) []big.Int {
	if len(a) == 0 || len(b) == 0 {
		return nil
	}
	out := make([]big.Int, len(a)+len(b)-1)
	var term big.Int
	for i := range a {
		for j := range b {
			out[i+j].Add(&out[i+j], term.Mul(&a[i], &b[j]))
		}
	}
	return r.tidy(out)
}

func (r modulusRing) combine(a, b []big.Int, subtract bool) []big.Int {
	out := make([]big.Int, max(len(a), len(b)))
	for k := range a {
		out[k].Set(&a[k])
	}
	for k := range b {
		if subtract {
			out[k].Sub(&out[k], &b[k])
		} else {
			out[k].Add(&out[k], &b[k])
		}
	}
	return r.tidy(out)
}

// divide by a monic b.
func (r modulusRing) divide(a, b []big.Int) (quotient, rest []big.Int) {
	rest = make([]big.Int, len(a))
	for k := range a {
		rest[k].Set(&a[k])
	}
	if len(a) < len(b) {
		return nil, rest
	}
	quotient = make([]big.Int, len(a)-len(b)+1)
	var term big.Int
	for k := len(quotient) - 1; k >= 0; k-- {
		quotient[k].Mod(&rest[k+len(b)-1], r.m)
		for j := range b {
			rest[k+j].Sub(&rest[k+j], term.Mul(&quotient[k], &b[j]))
		}
	}
	return r.tidy(quotient), r.tidy(rest[:len(b)-1])
}

// liftFactors raises a factorisation f ≡ ∏ factors modulo p, with monic
// pairwise coprime factors and monic f, to one modulo p^(2^steps), by Hensel's
// lemma along a tree of products (J. von zur Gathen and J. Gerhard, Modern
// Computer Algebra, 3rd ed. 2013, section 15.5).
func liftFactors(f []big.Int, factors [][]uint64, field residues, steps int) [][]big.Int {
	if len(factors) == 1 {
		return [][]big.Int{f}
	}
	half := len(factors) / 2
	product := func(list [][]uint64) []uint64 {
		out := []uint64{1}
		for _, g := range list {
			out = field.multiply(out, g)
		}
		return out
	}
	g0, h0 := product(factors[:half]), product(factors[half:])
	s0, t0 := field.bezout(g0, h0)
	g, h, s, t := widen(g0), widen(h0), widen(s0), widen(t0)
	m := new(big.Int).SetUint64(field.p)
	for range steps {
		m = new(big.Int).Mul(m, m)
		r := modulusRing{m}
		e := r.combine(f, r.multiply(g, h), true)
		q, rest := r.divide(r.multiply(s, e), h)
		g = r.combine(g, r.combine(r.multiply(t, e), r.multiply(q, g), false), false)
		h = r.combine(h, rest, false)
		b := r.combine(r.combine(r.multiply(s, g), r.multiply(t, h), false), widen([]uint64{1}), true)
		c, d := r.divide(r.multiply(s, b), h)
		s = r.combine(s, d, true)
		t = r.combine(t, r.combine(r.multiply(t, b), r.multiply(c, g), false), true)
	}
	return append(liftFactors(g, factors[:half], field, steps), liftFactors(h, factors[half:], field, steps)...)
}

func widen(a []uint64) []big.Int {
	out := make([]big.Int, len(a))
	for k, x := range a {
		out[k].SetUint64(x)
	}
	return out
}
