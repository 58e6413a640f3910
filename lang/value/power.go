package value

import (
	"math"
	"math/big"
	"math/cmplx"

	"gainwright/lang/diag"
)

// powerNumbers gives a^b: exact for whole exponents of exact numbers and where a
// fractional power is rational; complex (the principal value) for fractional powers of
// negative numbers.
func powerNumbers(a, b Number) (Value, error) {
	if b.IsWhole() {
		n, err := powerWhole(a, b.Exact.Num())
		return n, err
	}
	if a.Exact != nil && b.Exact != nil {
		if v, ok, err := exactRoot(a.Exact, b.Exact); ok || err != nil {
			return v, err
		}
	}
	if a.Sign() < 0 {
		return powerComplex(toComplex(a), toComplex(b))
	}
	if a.IsZero() {
		if b.Sign() < 0 {
			return nil, divisionByZero()
		}
		return Rat(ratZero), nil
	}
	n, err := powerFloating(a, b)
	return n, err
}

// powerFloating gives a^b for a > 0: the relative error is |b| e_a/a + |ln a| e_b.
func powerFloating(a, b Number) (Number, error) {
	x, ex := a.approx()
	y, ey := b.approx()
	f := math.Pow(x, y)
	err := 0.0
	if f != 0 && !math.IsInf(f, 0) {
		err = f * (math.Abs(y)*ex/math.Abs(x) + math.Abs(math.Log(x))*ey + 0x1p-52)
	}
	return settle(f, err, a, b)
}

// powerWhole gives a^k; the size of an exact result is estimated before the work.
func powerWhole(a Number, k *big.Int) (Number, error) {
	if k.Sign() == 0 {
		return Rat(ratOne), nil
	}
	if a.IsZero() {
		if k.Sign() < 0 {
			return Number{}, divisionByZero()
		}
		return a, nil
	}
	if a.Exact == nil {
		return powerWholeFloating(a, k)
	}
	if a.Exact.IsInt() && a.Exact.Num().IsInt64() && max(a.Exact.Num().Int64(), -a.Exact.Num().Int64()) == 1 {
		if a.Exact.Sign() < 0 && k.Bit(0) == 1 {
			return a, nil
		}
		return Rat(ratOne), nil
	}
	if !k.IsInt64() || math.Abs(float64(k.Int64()))*float64(ratBits(a.Exact)-1) > LargestBits {
		return Number{}, diag.New(diag.Limit, "this power would have more than %d bits", LargestBits).
			WithHelp("floating(…) of the base keeps 16 digits instead")
	}
	return Rat(ratPower(a.Exact, int(k.Int64()))), nil
}

func powerWholeFloating(a Number, k *big.Int) (Number, error) {
	exponent, _ := new(big.Float).SetInt(k).Float64()
	f := math.Pow(math.Abs(a.F), exponent)
	if a.F < 0 && k.Bit(0) == 1 {
		f = -f
	}
	err := 0.0
	if f != 0 && !math.IsInf(f, 0) {
		err = math.Abs(f) * (math.Abs(exponent)*a.Err/math.Abs(a.F) + 0x1p-52)
	}
	return settle(f, err, a)
}

// largestRootIndex bounds the roots that are tried for exactness.
const largestRootIndex = 64

// exactRoot gives a^b where it is rational, or for square roots of negative numbers imaginary.
func exactRoot(a, b *big.Rat) (Value, bool, error) {
	if !b.Denom().IsInt64() || b.Denom().Int64() > largestRootIndex || a.Sign() == 0 || ratBits(a) > LargestBits/8 {
		return nil, false, nil
	}
	q := int(b.Denom().Int64())
	if a.Sign() < 0 && q != 2 {
		return nil, false, nil
	}
	size := new(big.Rat).Abs(a)
	num, ok1 := wholeRoot(size.Num(), q)
	den, ok2 := wholeRoot(size.Denom(), q)
	if !ok1 || !ok2 {
		return nil, false, nil
	}
	root := Rat(new(big.Rat).SetFrac(num, den))
	n, err := powerWhole(root, b.Num())
	if err != nil || a.Sign() > 0 {
		return n, true, err
	}
	// (i·r)^p for odd p: i^p is i or −i
	if odd := new(big.Int).And(b.Num(), big.NewInt(3)).Int64(); odd == 3 {
		n = negateNumber(n)
	}
	return MakeComplex(Rat(ratZero), n), true, nil
}

// wholeRoot gives the q-th root of x > 0 when it is whole, by Newton's iteration.
func wholeRoot(x *big.Int, q int) (*big.Int, bool) {
	if x.IsInt64() && x.Int64() == 1 {
		return x, true
	}
	if q == 2 {
		r := new(big.Int).Sqrt(x)
		return r, new(big.Int).Mul(r, r).Cmp(x) == 0
	}
	bigQ, lower := big.NewInt(int64(q)), big.NewInt(int64(q-1))
	r := new(big.Int).Lsh(big.NewInt(1), uint((x.BitLen()+q-1)/q)) // not below the root
	for {
		next := new(big.Int).Exp(r, lower, nil)
		next.Quo(x, next)
		next.Add(next, new(big.Int).Mul(lower, r)).Quo(next, bigQ)
		if next.Cmp(r) >= 0 {
			break
		}
		r = next
	}
	return r, new(big.Int).Exp(r, bigQ, nil).Cmp(x) == 0
}

// powerComplex gives a^b, the principal value; exact for whole exponents of exact numbers.
func powerComplex(a, b Complex) (Value, error) {
	if b.ExactRe != nil && b.ExactIm.Sign() == 0 && b.ExactRe.IsInt() {
		if !b.ExactRe.Num().IsInt64() {
			return nil, diag.New(diag.Limit, "the exponent is too large")
		}
		return powerComplexWhole(a, b.ExactRe.Num().Int64())
	}
	x, ex := a.approx()
	y, ey := b.approx()
	if x == 0 {
		if real(y) > 0 {
			return Rat(ratZero), nil
		}
		return nil, divisionByZero()
	}
	c := cmplx.Pow(x, y)
	err := cmplx.Abs(c) * (cmplx.Abs(y)*ex/cmplx.Abs(x) + cmplx.Abs(cmplx.Log(x))*(ey+2*ulp(cmplx.Abs(y))) + 4*0x1p-53)
	out, problem := settleComplex(c, err)
	return simplify(out), problem
}

func powerComplexWhole(a Complex, k int64) (Value, error) {
	if a.ExactRe != nil && math.Abs(float64(k))*float64(complexBits(a)) > LargestBits/2 {
		return nil, tooManyBits()
	}
	if k < 0 {
		inverse, err := invertComplex(a)
		if err != nil {
			return nil, err
		}
		if k == math.MinInt64 {
			return nil, diag.New(diag.Limit, "the exponent is too large")
		}
		a, k = inverse, -k
	}
	result := toComplex(Int(1))
	for base := a; k > 0; k >>= 1 {
		var err error
		if k&1 == 1 {
			if result, err = multiplyComplex(result, base); err != nil {
				return nil, err
			}
		}
		if k > 1 {
			if base, err = multiplyComplex(base, base); err != nil {
				return nil, err
			}
		}
	}
	return simplify(result), nil
}

// powerQuantity gives q^b for an exact b whose multiples of the unit's exponents are whole.
func powerQuantity(q Quantity, b Number) (Value, error) {
	if q.Unit.Dim.IsPlain() {
		n, err := q.SI()
		if err != nil {
			return nil, err
		}
		return powerNumbers(n, b)
	}
	if b.Exact == nil || !b.Exact.Num().IsInt64() || !b.Exact.Denom().IsInt64() {
		return nil, diag.New(diag.Unit, "the power of a quantity in %s needs an exact exponent", unitName(q.Unit))
	}
	n, err := q.SI()
	if err != nil {
		return nil, err
	}
	unit, err := q.Unit.SI().power(b.Exact)
	if err != nil {
		return nil, err
	}
	result, err := powerNumbers(n, b)
	if err != nil {
		return nil, err
	}
	if m, ok := result.(Number); ok {
		return makeQuantity(m, unit), nil
	}
	return nil, diag.New(diag.Numerical, "a fractional power of a negative quantity in %s is not real", unitName(q.Unit))
}

// power gives uᵇ of a coherent unit.
func (u Unit) power(b *big.Rat) (Unit, error) {
	q := b.Denom().Int64()
	root := Unit{Scale: u.scale()}
	whole := true
	for k, e := range u.Dim {
		if int64(e)%q != 0 {
			return None(), diag.New(diag.Unit, "the power %s of %s has no unit: the exponents of %s do not divide", b.RatString(), unitName(u), u.Dim)
		}
		root.Dim[k] = int8(int64(e) / q)
	}
	for _, f := range u.coherentFactors() {
		whole = whole && int64(f.Exponent)%q == 0
		root.factors = append(root.factors, UnitFactor{f.Symbol, int(int64(f.Exponent) / q)})
	}
	if !whole {
		root.factors = nil
	}
	p := b.Num().Int64()
	if p > largestExponent || p < -largestExponent {
		if u.Dim.IsPlain() {
			return None(), nil
		}
		return None(), diag.New(diag.Limit, "the exponent of %s is larger than %d", unitName(u), largestExponent)
	}
	return combineUnits(None(), root, int(p))
}
