package exact

import "math/big"

// Eval gives p(x). The size of the result grows like degree × bits of x; see [Polynomial.SizeAt].
func (p Polynomial) Eval(x *big.Rat) *big.Rat {
	if p.IsZero() {
		return new(big.Rat)
	}
	ints, den := p.integral()
	num, d := x.Num(), x.Denom()
	// Homogeneous Horner scheme: Σ c_k·num^k·d^(n−k), one reduction at the end.
	var sum, scale, term big.Int
	scale.SetInt64(1)
	whole := x.IsInt()
	for k := len(ints) - 1; k >= 0; k-- {
		sum.Mul(&sum, num)
		if whole {
			sum.Add(&sum, &ints[k])
			continue
		}
		sum.Add(&sum, term.Mul(&ints[k], &scale))
		if k > 0 {
			scale.Mul(&scale, d)
		}
	}
	return new(big.Rat).SetFrac(&sum, scale.Mul(&scale, den))
}

// SizeAt bounds the bit length of p evaluated at numbers of the given bit length.
func (p Polynomial) SizeAt(bits int) int {
	return p.MaxBits() + max(p.Degree(), 0)*(bits+1) + 8
}

// EvalComplex gives real and imaginary part of p(re + i·im).
func (p Polynomial) EvalComplex(re, im *big.Rat) (real, imaginary *big.Rat) {
	x, y := new(big.Rat), new(big.Rat)
	var a, b big.Rat
	for k := len(p.c) - 1; k >= 0; k-- {
		a.Sub(a.Mul(x, re), b.Mul(y, im))
		b.Mul(y, re)
		y.Add(y.Mul(x, im), &b)
		x.Add(&a, p.c[k])
	}
	return x, y
}

// Compose gives p(q(s)), or ErrTooLarge.
func (p Polynomial) Compose(q Polynomial) (Polynomial, error) {
	if p.SizeAt(q.MaxBits()+q.Degree()) > LargestBits || p.Degree()*q.Degree() > LargestDegree {
		return Polynomial{}, ErrTooLarge
	}
	var out Polynomial
	for k := len(p.c) - 1; k >= 0; k-- {
		out = out.Mul(q).Add(Constant(p.c[k]))
	}
	return out, nil
}

// LargestDegree bounds the degree that powers and compositions may reach.
const LargestDegree = 10_000

// Power gives pᵏ, or ErrNegativePower, or ErrTooLarge. p⁰ is 1.
func (p Polynomial) Power(k int) (Polynomial, error) {
	switch {
	case k < 0:
		return Polynomial{}, ErrNegativePower
	case p.Degree() == 0 && p.Lead().IsInt() && p.Lead().Num().IsInt64() && p.Lead().Num().Int64() == 1:
		return p, nil
	case p.IsZero() && k > 0:
		return p, nil
	case k > LargestBits || max(p.Degree(), 0)*k > LargestDegree || k*(p.MaxBits()+p.Degree()) > LargestBits:
		return Polynomial{}, ErrTooLarge
	}
	out, base := Constant(ratOne), p
	for ; k > 0; k >>= 1 {
		if k&1 == 1 {
			out = out.Mul(base)
		}
		if k > 1 {
			base = base.Mul(base)
		}
	}
	return out, nil
}

// EvalMatrix gives p(m) of a square matrix by Horner's scheme.
func (p Polynomial) EvalMatrix(m *Matrix) (*Matrix, error) {
	if m.rows != m.cols {
		return nil, sizeError("a polynomial of a matrix", m, nil)
	}
	out := NewMatrix(m.rows, m.rows)
	for k := len(p.c) - 1; k >= 0; k-- {
		var err error
		if out, err = out.Mul(m); err != nil {
			return nil, err
		}
		out = must(out.Add(Identity(m.rows).Scale(p.c[k])))
	}
	return out, nil
}
