package value

import (
	"math"
	"math/big"

	"gainwright/lang/diag"
)

// LargestBits bounds the bit length of the numerator and the denominator of an exact number.
const LargestBits = 1_000_000

var (
	ratZero = new(big.Rat)
	ratOne  = big.NewRat(1, 1)
)

// Pi is the floating number nearest to π.
func Pi() Number { return Float(math.Pi) }

// approx gives the nearest binary64 number and an estimate of its absolute error.
func (n Number) approx() (f, err float64) {
	if n.Exact == nil {
		return n.F, n.Err
	}
	f, same := n.Exact.Float64()
	if !same {
		err = ulp(f) + math.SmallestNonzeroFloat64
	}
	return f, err
}

// ErrorEstimate is the absolute error estimate, 0 for an exact number.
func (n Number) ErrorEstimate() float64 {
	if n.Exact != nil {
		return 0
	}
	return n.Err
}

// IsZero tells whether the value is zero.
func (n Number) IsZero() bool {
	if n.Exact != nil {
		return n.Exact.Sign() == 0
	}
	return n.F == 0
}

// Sign is −1, 0 or 1.
func (n Number) Sign() int {
	switch {
	case n.Exact != nil:
		return n.Exact.Sign()
	case n.F > 0:
		return 1
	case n.F < 0:
		return -1
	}
	return 0
}

// IsWhole tells whether the number is an exact whole number.
func (n Number) IsWhole() bool { return n.Exact != nil && n.Exact.IsInt() }

// Whole gives an exact whole number that fits an int.
func (n Number) Whole() (int, bool) {
	if !n.IsWhole() || !n.Exact.Num().IsInt64() {
		return 0, false
	}
	k := n.Exact.Num().Int64()
	return int(k), int64(int(k)) == k
}

func (n Number) isInfinite() bool { return n.Exact == nil && math.IsInf(n.F, 0) }

func ratBits(x *big.Rat) int { return max(x.Num().BitLen(), x.Denom().BitLen()) }

func tooManyBits() error {
	return diag.New(diag.Limit, "the exact result would have more than %d bits", LargestBits).
		WithHelp("floating(…) keeps 16 digits instead")
}

func overflow() error {
	return diag.New(diag.Numerical, "the result is larger than 1.8e308, the largest floating number")
}

func notANumber() error {
	return diag.New(diag.Numerical, "the result is not a number: infinities cancel or meet zero")
}

func divisionByZero() error { return diag.New(diag.Numerical, "division by zero") }

// settle checks a floating result of operands a and b and adds one rounding to its error.
func settle(f, err float64, operands ...Number) (Number, error) {
	switch {
	case math.IsNaN(f):
		return Number{}, notANumber()
	case math.IsInf(f, 0):
		for _, n := range operands {
			if n.isInfinite() {
				return Number{F: f}, nil
			}
		}
		return Number{}, overflow()
	case math.IsNaN(err):
		err = math.Inf(1)
	}
	return Number{F: f, Err: err + ulp(f)}, nil
}

func addNumbers(a, b Number) (Number, error) {
	if a.Exact != nil && b.Exact != nil {
		switch {
		case a.Exact.Sign() == 0:
			return b, nil
		case b.Exact.Sign() == 0:
			return a, nil
		case ratBits(a.Exact)+ratBits(b.Exact) > LargestBits:
			return Number{}, tooManyBits()
		}
		return Rat(new(big.Rat).Add(a.Exact, b.Exact)), nil
	}
	x, ex := a.approx()
	y, ey := b.approx()
	return settle(x+y, ex+ey, a, b)
}

func negateNumber(a Number) Number {
	if a.Exact != nil {
		return Rat(new(big.Rat).Neg(a.Exact))
	}
	if a.F == 0 { // never −0
		return a
	}
	return Number{F: -a.F, Err: a.Err}
}

func subtractNumbers(a, b Number) (Number, error) { return addNumbers(a, negateNumber(b)) }

func multiplyNumbers(a, b Number) (Number, error) {
	if a.Exact != nil && b.Exact != nil {
		if a.Exact.Sign() == 0 || b.Exact.Sign() == 0 {
			return Rat(ratZero), nil
		}
		if ratBits(a.Exact)+ratBits(b.Exact) > LargestBits {
			return Number{}, tooManyBits()
		}
		return Rat(new(big.Rat).Mul(a.Exact, b.Exact)), nil
	}
	if (a.Exact != nil && a.IsZero() && !b.isInfinite()) || (b.Exact != nil && b.IsZero() && !a.isInfinite()) {
		return Rat(ratZero), nil // an exact zero stays exact
	}
	x, ex := a.approx()
	y, ey := b.approx()
	f := x * y
	err := math.Abs(x)*ey + math.Abs(y)*ex + ex*ey
	if math.Abs(f) < 0x1p-1022 && x != 0 && y != 0 {
		err += math.SmallestNonzeroFloat64
	}
	return settle(f, err, a, b)
}

func divideNumbers(a, b Number) (Number, error) {
	if b.IsZero() {
		return Number{}, divisionByZero()
	}
	if b.Exact != nil {
		return multiplyNumbers(a, Rat(new(big.Rat).Inv(b.Exact)))
	}
	if a.Exact != nil && a.IsZero() {
		return a, nil
	}
	x, ex := a.approx()
	f := x / b.F
	err := (ex + math.Abs(f)*b.Err) / math.Abs(b.F)
	if b.isInfinite() {
		err = 0
	} else if math.Abs(f) < 0x1p-1022 && x != 0 {
		err += math.SmallestNonzeroFloat64
	}
	return settle(f, err, a)
}

// piDigits holds π to 60 places, so that exact multiples of π are rounded once.
var piDigits, _ = new(big.Rat).SetString("3.141592653589793238462643383279502884197169399375105820974944")

// timesPi gives n·π^power; exact when power is 0.
func timesPi(n Number, power int) (Number, error) {
	if power == 0 || n.Exact != nil && n.Exact.Sign() == 0 {
		return n, nil
	}
	if n.Exact == nil {
		factor, err := timesPi(Rat(ratOne), power)
		if err != nil {
			return Number{}, err
		}
		return multiplyNumbers(n, factor)
	}
	r := new(big.Rat).Set(n.Exact)
	for range max(power, -power) {
		if power > 0 {
			r.Mul(r, piDigits)
		} else {
			r.Quo(r, piDigits)
		}
	}
	f, _ := r.Float64()
	return settle(f, 0)
}

// Finite refuses a floating result that overflowed on the way: a number or a member of a list that is none,
// a matrix with an entry that is none or infinite. A single number may be infinite.
func Finite(v Value) error {
	switch v := v.(type) {
	case Number:
		if v.Exact == nil && math.IsNaN(v.F) {
			return notANumber()
		}
	case *List:
		for _, x := range v.Items {
			if n, ok := x.(Number); ok {
				if err := Finite(n); err != nil {
					return err
				}
			}
		}
	case *Matrix:
		if v.IsExact() {
			return nil
		}
		for _, part := range [][]float64{v.re, v.im} {
			for _, x := range part {
				if x-x != 0 {
					return overflow()
				}
			}
		}
	}
	return nil
}
