// Package value holds what a name can stand for and the arithmetic on it.
//
// The kinds are a closed set of concrete types behind the Value interface: numbers
// (exact or floating), quantities, complex numbers, matrices, polynomials, transfer
// functions, plants, gains, reports, studies, responses, lists, texts, truth values,
// functions and models. Values are never changed once another package can see them.
//
// Exactness: a Number, Complex, Matrix, Polynomial or Transfer is exact (rationals) or
// floating. A floating one carries Err, an estimate of the absolute error of its
// largest entry; the digits that hold follow from it. Arithmetic propagates Err to
// first order, so cancellation costs digits that the display then withholds.
//
// Errors are *diag.Error without a place; the evaluator adds it.
package value

import (
	"math"
	"math/big"
)

// Kind names the kind of a value in the words shown to users and in JSON.
type Kind string

// The kinds of value.
const (
	KNumber     Kind = "number"
	KComplex    Kind = "complex"
	KQuantity   Kind = "quantity"
	KMatrix     Kind = "matrix"
	KPolynomial Kind = "polynomial"
	KTransfer   Kind = "transfer"
	KPlant      Kind = "plant"
	KGain       Kind = "gain"
	KList       Kind = "list"
	KText       Kind = "text"
	KBoolean    Kind = "boolean"
	KReport     Kind = "report"
	KStudy      Kind = "study"
	KResponse   Kind = "response"
	KFunction   Kind = "function"
	KModel      Kind = "model"
)

// Value is one of the concrete types of this package.
type Value interface{ Kind() Kind }

// HasFields is a value with fields that `.name` reads and fields(v) lists, in order.
type HasFields interface {
	Value
	FieldNames() []string
	Field(name string) (Value, bool)
}

// Text is a text.
type Text string

// Boolean is a truth value.
type Boolean bool

// List is an ordered collection. Pair is set on the two members of a ± b i: such a
// list is spliced one level into a list literal.
type List struct {
	Items []Value
	Pair  bool
}

// Number is a real number: Exact when it is not nil, else F with the absolute error
// estimate Err (one unit in the last place of F at least, unless F is known to be a
// binary64 input taken as it is, where Err is 0).
type Number struct {
	Exact *big.Rat
	F     float64
	Err   float64
}

// Complex is a complex number: exact when ExactRe is not nil. When the number is one
// of a pair whose real quadratic is known, Quadratic holds s² + b s + c (monic) and
// both members share the pointer.
type Complex struct {
	ExactRe, ExactIm *big.Rat
	C                complex128
	Err              float64
	Quadratic        *Polynomial
}

// Quantity is a number with a unit; Magnitude is in Unit.
type Quantity struct {
	Magnitude Number
	Unit      Unit
}

// Kind tells the kind.
func (Text) Kind() Kind     { return KText }
func (Boolean) Kind() Kind  { return KBoolean }  // Kind tells the kind.
func (*List) Kind() Kind    { return KList }     // Kind tells the kind.
func (Number) Kind() Kind   { return KNumber }   // Kind tells the kind.
func (Complex) Kind() Kind  { return KComplex }  // Kind tells the kind.
func (Quantity) Kind() Kind { return KQuantity } // Kind tells the kind.

// Rat is an exact number.
func Rat(r *big.Rat) Number { return Number{Exact: r} }

// Int is an exact whole number.
func Int(n int) Number { return Number{Exact: new(big.Rat).SetInt64(int64(n))} }

// Float is a floating number with the error of one rounding.
func Float(f float64) Number { return Number{F: f, Err: ulp(f)} }

// FloatErr is a floating number with an absolute error estimate.
func FloatErr(f, err float64) Number { return Number{F: f, Err: math.Max(err, ulp(f))} }

// IsExact tells whether the number is exact.
func (n Number) IsExact() bool { return n.Exact != nil }

// Float64 is the nearest binary64 number.
func (n Number) Float64() float64 {
	if n.Exact != nil {
		f, _ := n.Exact.Float64()
		return f
	}
	return n.F
}

// Digits is how many significant decimal digits hold; +Inf for an exact number.
func (n Number) Digits() float64 {
	if n.Exact != nil {
		return math.Inf(1)
	}
	return digits(n.F, n.Err)
}

// IsExact tells whether the number is exact.
func (c Complex) IsExact() bool { return c.ExactRe != nil }

// Complex128 is the nearest binary64 pair.
func (c Complex) Complex128() complex128 {
	if c.ExactRe != nil {
		re, _ := c.ExactRe.Float64()
		im, _ := c.ExactIm.Float64()
		return complex(re, im)
	}
	return c.C
}

// ulp is half the spacing of binary64 numbers near f, relative rounding 2⁻⁵³.
func ulp(f float64) float64 { return math.Abs(f) * 0x1p-53 }

// digits turns a value and its absolute error into significant decimal digits, at most 15.95.
func digits(f, err float64) float64 {
	f = math.Abs(f)
	switch {
	case math.IsInf(f, 0):
		return 15.95
	case f == 0 || err >= f:
		return 0
	case err == 0:
		return 15.95
	}
	return math.Min(15.95, -math.Log10(err/f))
}
