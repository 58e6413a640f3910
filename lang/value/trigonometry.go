package value

import (
	"math"
	"math/big"
	"math/cmplx"

	"gainwright/lang/diag"
)

// angle is the argument of a trigonometric function: a plain number, or an exact multiple
// of π when it came as a quantity such as 90 deg.
type angle struct {
	number Value    // Number or Complex
	turns  *big.Rat // the angle divided by π, or nil
}

func angleOf(name string, v Value) (angle, error) {
	v = oneEntry(Force(v))
	if q, ok := v.(Quantity); ok && q.Unit.Dim.IsPlain() && q.Unit.Pi == 1 && q.Magnitude.Exact != nil && !q.Unit.hertz {
		n, err := q.SI()
		return angle{n, new(big.Rat).Mul(q.Magnitude.Exact, q.Unit.scale())}, err
	}
	if q, ok := v.(Quantity); ok && !q.Unit.Dim.IsPlain() {
		return angle{}, diag.New(diag.Unit, "%s takes an angle or a plain number; this one is in %s", name, unitName(q.Unit))
	}
	n, err := plainArgument(name, v)
	return angle{n, nil}, err
}

// twelfths gives the angle modulo 2π in twelfths of π when it is a whole number of them.
func (a angle) twelfths() (int, bool) {
	if a.turns == nil {
		if n, ok := a.number.(Number); ok && n.Exact != nil && n.IsZero() {
			return 0, true
		}
		return 0, false
	}
	t := new(big.Rat).Mul(a.turns, big.NewRat(12, 1))
	if !t.IsInt() {
		return 0, false
	}
	return int(new(big.Int).Mod(t.Num(), big.NewInt(24)).Int64()), true
}

// reduced gives the angle brought to −π…π exactly before it is rounded.
func (a angle) reduced() (Number, error) {
	if a.turns == nil {
		return a.number.(Number), nil
	}
	whole := new(big.Rat).Quo(a.turns, big.NewRat(2, 1))
	nearest := floorRat(new(big.Rat).Add(whole, big.NewRat(1, 2)))
	rest := whole.Sub(whole, new(big.Rat).SetInt(nearest))
	return timesPi(Rat(rest.Mul(rest, big.NewRat(2, 1))), 1)
}

// Rational sines of multiples of π/12 (Niven 1956): at 0, ±π/6 and ±π/2 modulo π.
var sines = map[int]*big.Rat{0: ratZero, 2: big.NewRat(1, 2), 6: big.NewRat(1, 1), 10: big.NewRat(1, 2), 12: ratZero,
	14: big.NewRat(-1, 2), 18: big.NewRat(-1, 1), 22: big.NewRat(-1, 2)}

// Rational tangents: at 0 and ±π/4 modulo π.
var tangents = map[int]*big.Rat{0: ratZero, 3: big.NewRat(1, 1), 9: big.NewRat(-1, 1)}

// Sin gives the sine of an angle (radians, or a quantity such as 90 deg), exact where it is rational.
func Sin(v Value) (Value, error) {
	a, err := angleOf("sin", v)
	if err != nil {
		return nil, err
	}
	if k, ok := a.twelfths(); ok && sines[k] != nil {
		return Rat(sines[k]), nil
	}
	return a.apply(math.Sin, math.Cos, cmplx.Sin, cmplx.Cos)
}

// Cos gives the cosine, as Sin.
func Cos(v Value) (Value, error) {
	a, err := angleOf("cos", v)
	if err != nil {
		return nil, err
	}
	if k, ok := a.twelfths(); ok && sines[(k+6)%24] != nil {
		return Rat(sines[(k+6)%24]), nil
	}
	return a.apply(math.Cos, math.Sin, cmplx.Cos, cmplx.Sin)
}

// Tan gives the tangent, as Sin; at ±90 deg it is a Numerical error.
func Tan(v Value) (Value, error) {
	a, err := angleOf("tan", v)
	if err != nil {
		return nil, err
	}
	if k, ok := a.twelfths(); ok {
		if k%12 == 6 {
			return nil, diag.New(diag.Numerical, "the tangent of a right angle is infinite")
		}
		if t := tangents[k%12]; t != nil {
			return Rat(t), nil
		}
	}
	return a.apply(math.Tan, func(x float64) float64 { t := math.Tan(x); return 1 + t*t },
		cmplx.Tan, func(x complex128) complex128 { t := cmplx.Tan(x); return 1 + t*t })
}

func (a angle) apply(f, slope func(float64) float64, wide, wideSlope func(complex128) complex128) (Value, error) {
	if c, ok := a.number.(Complex); ok {
		return complexFunction(c, wide, wideSlope)
	}
	n, err := a.reduced()
	if err != nil {
		return nil, err
	}
	out, err := floatFunction(n, f, slope)
	return out, err
}

// inverse evaluates asin, acos or atan; exactAt maps arguments with exact results.
func inverse(name string, v Value, exactAt int64, bounded bool, f, slope func(float64) float64, wide, wideSlope func(complex128) complex128) (Value, error) {
	arg, err := plainArgument(name, v)
	if err != nil {
		return nil, err
	}
	if c, ok := arg.(Complex); ok {
		return complexFunction(c, wide, wideSlope)
	}
	n := arg.(Number)
	if n.Exact != nil && n.Exact.Cmp(big.NewRat(exactAt, 1)) == 0 {
		return Int(0), nil
	}
	if x := n.Float64(); bounded && math.Abs(x) > 1 {
		return nil, diag.New(diag.Numerical, "%s is defined between -1 and 1; the argument is %s", name, brief(n))
	}
	out, err := floatFunction(n, f, slope)
	return out, err
}

// Asin gives the inverse sine in radians.
func Asin(v Value) (Value, error) {
	return inverse("asin", v, 0, true, math.Asin, arcSlope, cmplx.Asin, wideArcSlope)
}

// Acos gives the inverse cosine in radians.
func Acos(v Value) (Value, error) {
	return inverse("acos", v, 1, true, math.Acos, arcSlope, cmplx.Acos, wideArcSlope)
}

// Atan gives the inverse tangent in radians.
func Atan(v Value) (Value, error) {
	return inverse("atan", v, 0, false, math.Atan, func(x float64) float64 { return 1 / (1 + x*x) },
		cmplx.Atan, func(x complex128) complex128 { return 1 / (1 + x*x) })
}

// arcSlope is the slope of asin and acos; near ±1 it is bounded by that one rounding away.
func arcSlope(x float64) float64 { return 1 / math.Sqrt(math.Max(1-x*x, 0x1p-52)) }

func wideArcSlope(x complex128) complex128 { return 1 / cmplx.Sqrt(1-x*x) }

// Atan2 gives the angle of the point (x, y) in (−π, π]; two quantities of one dimension are allowed.
func Atan2(y, x Value) (Value, error) {
	if q, ok := y.(Quantity); ok {
		if r, ok := x.(Quantity); ok && q.Unit.Dim == r.Unit.Dim {
			a, b, err := comparable(q, r)
			if err != nil {
				return nil, err
			}
			y, x = a, b
		}
	}
	v, err := plainArgument("atan2", y)
	if err != nil {
		return nil, err
	}
	w, err := plainArgument("atan2", x)
	if err != nil {
		return nil, err
	}
	a, ok1 := v.(Number)
	b, ok2 := w.(Number)
	if !ok1 || !ok2 {
		return nil, diag.New(diag.Type, "atan2 takes real numbers")
	}
	if a.IsZero() && b.IsZero() {
		return nil, diag.New(diag.Numerical, "atan2(0, 0) has no value")
	}
	if a.Exact != nil && a.IsZero() && b.Sign() > 0 {
		return Int(0), nil
	}
	f, ef := a.approx()
	g, eg := b.approx()
	size := math.Hypot(f, g)
	result := math.Atan2(f, g)
	n, err := settle(result, ulp(result)+(math.Abs(g)*ef+math.Abs(f)*eg)/(size*size))
	return n, err
}
