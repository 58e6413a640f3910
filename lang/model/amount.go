package model

import (
	"math/big"

	"gainwright/lang/value"
)

// amount is n·π^pi. An exact n with its power of π stays exact through products, so that
// sin(180 deg) is 0 and a plant whose angles are all in degrees has exact matrices. A
// floating n has pi 0.
type amount struct {
	n  value.Number
	pi int
}

// mostBits is the size beyond which exact numbers turn floating.
const mostBits = 4096

var (
	zeroAmount = amount{n: value.Int(0)}
	oneAmount  = amount{n: value.Int(1)}
)

func exactly(r *big.Rat) amount { return amount{n: value.Rat(r)} }

func (a amount) isZero() bool  { return a.n.IsZero() }
func (a amount) isExact() bool { return a.n.IsExact() }
func (a amount) isOne() bool {
	return a.pi == 0 && a.isExact() && a.n.Exact.Cmp(oneAmount.n.Exact) == 0
}

// number multiplies the power of π out.
func (a amount) number() (value.Number, error) {
	if a.pi == 0 || a.isZero() && a.isExact() {
		return a.n, nil
	}
	return value.Quantity{Magnitude: a.n, Unit: value.Unit{Pi: a.pi}}.SI()
}

// float is the nearest binary64 number; what cannot be multiplied out is NaN in effect
// and does not occur for the small powers units have.
func (a amount) float() float64 {
	n, err := a.number()
	if err != nil {
		return 0
	}
	return n.Float64()
}

// settled gives floating numbers the power 0, and exact ones that have grown too large a
// floating value.
func settled(n value.Number, pi int) (amount, error) {
	if n.IsExact() && n.Exact.Num().BitLen()+n.Exact.Denom().BitLen() > mostBits {
		v, err := value.Floating(n)
		if err != nil {
			return amount{}, err
		}
		n = v.(value.Number)
	}
	if n.IsExact() {
		if n.IsZero() {
			pi = 0
		}
		return amount{n, pi}, nil
	}
	if pi == 0 {
		return amount{n: n}, nil
	}
	out, err := amount{n, pi}.number()
	return amount{n: out}, err
}

func numberOf(v value.Value, err error) (value.Number, error) {
	if err != nil {
		return value.Number{}, err
	}
	n, ok := v.(value.Number)
	if !ok {
		return value.Number{}, errNotReal
	}
	return n, nil
}

func (a amount) add(b amount) (amount, error) {
	switch {
	case a.isZero() && a.isExact():
		return b, nil
	case b.isZero() && b.isExact():
		return a, nil
	}
	if a.pi == b.pi {
		n, err := numberOf(value.Add(a.n, b.n))
		if err != nil {
			return amount{}, err
		}
		return settled(n, a.pi)
	}
	x, err := a.number()
	if err != nil {
		return amount{}, err
	}
	y, err := b.number()
	if err != nil {
		return amount{}, err
	}
	n, err := numberOf(value.Add(x, y))
	if err != nil {
		return amount{}, err
	}
	return settled(n, 0)
}

func (a amount) negate() amount {
	n, err := numberOf(value.Negate(a.n))
	if err != nil {
		return a
	}
	return amount{n, a.pi}
}

func (a amount) subtract(b amount) (amount, error) { return a.add(b.negate()) }

func (a amount) multiply(b amount) (amount, error) {
	if a.isOne() {
		return b, nil
	}
	if b.isOne() {
		return a, nil
	}
	n, err := numberOf(value.Multiply(a.n, b.n))
	if err != nil {
		return amount{}, err
	}
	return settled(n, a.pi+b.pi)
}

func (a amount) divide(b amount) (amount, error) {
	if b.isOne() {
		return a, nil
	}
	n, err := numberOf(value.Divide(a.n, b.n))
	if err != nil {
		return amount{}, err
	}
	return settled(n, a.pi-b.pi)
}

// power gives a^(p/q); powers of π that are not whole are multiplied out first.
func (a amount) power(e *big.Rat) (amount, error) {
	pi := 0
	base := a.n
	if a.pi != 0 {
		if e.IsInt() && e.Num().IsInt64() && e.Num().Int64() < 100 && e.Num().Int64() > -100 {
			pi = a.pi * int(e.Num().Int64())
		} else {
			var err error
			if base, err = a.number(); err != nil {
				return amount{}, err
			}
		}
	}
	if tooManyBits(base, e) {
		v, err := value.Floating(base)
		if err != nil {
			return amount{}, err
		}
		base = v.(value.Number)
	}
	n, err := numberOf(value.Power(base, value.Rat(e)))
	if err != nil {
		return amount{}, err
	}
	return settled(n, pi)
}

// tooManyBits foretells that a whole power would be beyond mostBits.
func tooManyBits(base value.Number, e *big.Rat) bool {
	if !base.IsExact() || !e.IsInt() {
		return false
	}
	k, _ := new(big.Rat).Abs(e).Float64()
	return k*float64(base.Exact.Num().BitLen()+base.Exact.Denom().BitLen()-2) > 2*mostBits
}

// compare gives the sign of a − b and whether the two agree within their own error.
func (a amount) compare(b amount) (sign int, tied bool, err error) {
	d, err := a.subtract(b)
	if err != nil {
		return 0, false, err
	}
	if d.isExact() {
		return d.n.Sign(), d.isZero(), nil
	}
	f := d.n.F
	return d.n.Sign(), f <= 2*d.n.Err && -f <= 2*d.n.Err, nil
}

// asAngle is the amount as the argument of a trigonometric function.
func (a amount) asAngle() (value.Value, error) {
	if a.pi == 1 && a.isExact() {
		return value.Quantity{Magnitude: a.n, Unit: value.Unit{Text: "rad", Pi: 1}}, nil
	}
	n, err := a.number()
	return n, err
}

// conversion is by how much a number in the unit is multiplied to be in SI.
func conversion(u value.Unit) amount {
	if u.Scale == nil {
		return oneAmount
	}
	return amount{value.Rat(u.Scale), u.Pi}
}

// offsetOf is what is added after the conversion; zero for all units but degC.
func offsetOf(u value.Unit) amount {
	if u.Offset == nil {
		return zeroAmount
	}
	return exactly(u.Offset)
}

// toSI converts a number in a unit.
func toSI(n value.Number, u value.Unit) (amount, error) {
	a, err := amount{n: n}.multiply(conversion(u))
	if err != nil {
		return amount{}, err
	}
	return a.add(offsetOf(u))
}
