package value

import (
	"math"
	"math/big"
	"math/cmplx"

	"gainwright/lang/diag"
)

// floatFunction applies f to a floating number; slope is |f′|. Two roundings are allowed
// for the library function itself.
func floatFunction(n Number, f, slope func(float64) float64) (Number, error) {
	x, ex := n.approx()
	y := f(x)
	err := ulp(y)
	if ex > 0 {
		err += math.Abs(slope(x)) * ex
	}
	return settle(y, err, n)
}

// complexFunction is floatFunction for complex numbers.
func complexFunction(c Complex, f, slope func(complex128) complex128) (Value, error) {
	x, ex := c.approx()
	y := f(x)
	err := 4 * ulp(cmplx.Abs(y))
	if ex > 0 {
		err += cmplx.Abs(slope(x)) * ex
	}
	out, problem := settleComplex(y, err)
	if problem != nil {
		return nil, problem
	}
	return simplify(out), nil
}

// plainArgument brings the argument of an elementwise function to a Number or a Complex.
func plainArgument(name string, v Value) (Value, error) {
	switch x := oneEntry(Force(v)).(type) {
	case Number, Complex:
		return x, nil
	case Quantity:
		if x.Unit.Dim.IsPlain() {
			n, err := x.SI()
			return n, err
		}
		return nil, diag.New(diag.Unit, "%s takes a plain number; this one is in %s", name, unitName(x.Unit))
	default:
		e := diag.New(diag.Type, "%s takes a number; this is %s", name, Describe(v))
		if k := v.Kind(); k == KMatrix || k == KList {
			e = e.WithHelp("[%s(x) for each x of L] applies it to every item", name)
		}
		return nil, e
	}
}

// Sqrt gives the square root, exact where it is rational, imaginary for negative numbers;
// of a quantity the exponents of whose unit are even too.
func Sqrt(v Value) (Value, error) {
	half := Rat(big.NewRat(1, 2))
	switch x := oneEntry(Force(v)).(type) {
	case Quantity:
		if !x.Unit.Dim.IsPlain() {
			return powerQuantity(x, half)
		}
	}
	arg, err := plainArgument("sqrt", v)
	if err != nil {
		return nil, err
	}
	if c, ok := arg.(Complex); ok {
		return complexFunction(c, cmplx.Sqrt, func(x complex128) complex128 { return 0.5 / cmplx.Sqrt(x) })
	}
	n := arg.(Number)
	if n.Exact != nil {
		if n.Exact.Sign() == 0 {
			return n, nil
		}
		if root, ok, err := exactRoot(n.Exact, half.Exact); ok || err != nil {
			return root, err
		}
		if root, ok := rootOfLarge(n.Exact); ok {
			return root, nil
		}
	}
	if n.Sign() < 0 {
		root, err := realRoot(negateNumber(n))
		if err != nil {
			return nil, err
		}
		return MakeComplex(Int(0), root), nil
	}
	root, err := realRoot(n)
	return root, err
}

// rootOfLarge gives the floating root of a positive exact number beyond the floating range.
func rootOfLarge(x *big.Rat) (Number, bool) {
	if f, _ := x.Float64(); x.Sign() < 0 || f != 0 && !math.IsInf(f, 0) {
		return Number{}, false
	}
	root, _ := new(big.Float).Sqrt(new(big.Float).SetPrec(64).SetRat(x)).Float64()
	return FloatErr(root, ulp(root)), root != 0 && !math.IsInf(root, 0)
}

func realRoot(n Number) (Number, error) {
	x, ex := n.approx()
	root := math.Sqrt(x)
	err := math.Sqrt(ex) // where the argument may be zero
	if x > 0 {
		err = math.Min(err, 0.5*ex/root)
	}
	return settle(root, err, n)
}

// Exp gives eˣ; exp(0) is exact.
func Exp(v Value) (Value, error) {
	arg, err := plainArgument("exp", v)
	if err != nil {
		return nil, err
	}
	if c, ok := arg.(Complex); ok {
		return complexFunction(c, cmplx.Exp, cmplx.Exp)
	}
	if n := arg.(Number); n.Exact != nil && n.IsZero() {
		return Int(1), nil
	}
	n, err := floatFunction(arg.(Number), math.Exp, math.Exp)
	return n, err
}

// Log gives the natural logarithm, complex for negative numbers; log(1) is exact.
func Log(v Value) (Value, error) { return logarithm("log", v, 1) }

// Log10 gives the common logarithm, exact for powers of ten.
func Log10(v Value) (Value, error) { return logarithm("log10", v, math.Ln10) }

func logarithm(name string, v Value, scale float64) (Value, error) {
	arg, err := plainArgument(name, v)
	if err != nil {
		return nil, err
	}
	if n, ok := arg.(Number); ok {
		switch {
		case n.IsZero():
			return nil, diag.New(diag.Numerical, "%s of zero is infinite", name)
		case n.Exact != nil && n.Exact.IsInt() && n.Exact.Num().IsInt64() && n.Exact.Num().Int64() == 1:
			return Int(0), nil
		case n.Exact != nil && scale != 1:
			if k, ok := powerOfTen(n.Exact); ok {
				return Int(k), nil
			}
		}
		if n.Sign() > 0 {
			return realLogarithm(n, scale)
		}
		arg = toComplex(n)
	}
	return complexFunction(arg.(Complex), func(x complex128) complex128 { return cmplx.Log(x) / complex(scale, 0) },
		func(x complex128) complex128 { return 1 / (x * complex(scale, 0)) })
}

func realLogarithm(n Number, scale float64) (Value, error) {
	f := math.Log
	if scale != 1 {
		f = math.Log10
	}
	if x, _ := n.approx(); n.Exact != nil && (x == 0 || math.IsInf(x, 0)) { // beyond the floating range: split off powers of two
		shift := n.Exact.Num().BitLen() - n.Exact.Denom().BitLen()
		m := new(big.Rat).Quo(n.Exact, ratPower(big.NewRat(2, 1), shift))
		y, _ := m.Float64()
		result := (math.Log(y) + float64(shift)*math.Ln2) / scale
		return FloatErr(result, 4*ulp(result)), nil
	}
	out, err := floatFunction(n, f, func(x float64) float64 { return 1 / (x * scale) })
	return out, err
}

// powerOfTen gives k when x is 10ᵏ.
func powerOfTen(x *big.Rat) (int, bool) {
	if x.Sign() <= 0 || !x.IsInt() && x.Num().Cmp(big.NewInt(1)) != 0 {
		return 0, false
	}
	whole, sign := x.Num(), 1
	if !x.IsInt() {
		whole, sign = x.Denom(), -1
	}
	k := int(whole.TrailingZeroBits())
	if whole.BitLen() > 4*k+1 { // 10ᵏ has fewer bits
		return 0, false
	}
	return sign * k, new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(k)), nil).Cmp(whole) == 0
}

// Abs gives the absolute value; a quantity keeps its unit.
func Abs(v Value) (Value, error) {
	if q, ok := Force(v).(Quantity); ok {
		return Quantity{absolute(q.Magnitude), q.Unit}, nil
	}
	arg, err := plainArgument("abs", v)
	if err != nil {
		return nil, err
	}
	c, ok := arg.(Complex)
	if !ok {
		return absolute(arg.(Number)), nil
	}
	if c.ExactRe != nil {
		return Sqrt(Rat(squaredModulus(c.ExactRe, c.ExactIm)))
	}
	size := cmplx.Abs(c.C)
	n, err := settle(size, c.Err+ulp(size))
	return n, err
}

// Sign gives −1, 0 or 1 of a real number or a quantity.
func Sign(v Value) (Value, error) {
	if q, ok := Force(v).(Quantity); ok {
		return Int(q.Magnitude.Sign()), nil
	}
	arg, err := plainArgument("sign", v)
	if err != nil {
		return nil, err
	}
	if n, ok := arg.(Number); ok {
		return Int(n.Sign()), nil
	}
	return nil, diag.New(diag.Type, "sign takes a real number; this is a complex number")
}

// Real gives the real part.
func Real(v Value) (Value, error) { return complexPart("real", v, Complex.RealPart) }

// Imaginary gives the imaginary part.
func Imaginary(v Value) (Value, error) { return complexPart("imaginary", v, Complex.ImaginaryPart) }

func complexPart(name string, v Value, part func(Complex) Number) (Value, error) {
	switch x := Force(v).(type) {
	case *List:
		return mapList(x, func(v Value) (Value, error) { return complexPart(name, v, part) })
	case *Matrix:
		return matrixPart(x, name), nil
	}
	arg, err := plainArgument(name, v)
	if err != nil {
		return nil, err
	}
	if n, ok := arg.(Number); ok {
		return part(toComplex(n)), nil
	}
	return part(arg.(Complex)), nil
}

func matrixPart(m *Matrix, name string) *Matrix {
	var out *Matrix
	switch {
	case name == "real" && m.exactRe != nil:
		out = ExactMatrix(m.exactRe)
	case name == "real":
		out = FloatMatrix(m.rows, m.cols, m.re, m.Err)
	case m.exactRe != nil:
		out = ExactMatrix(m.imaginary())
	case m.im == nil:
		out = zeroMatrix(m.rows, m.cols)
	default:
		out = FloatMatrix(m.rows, m.cols, m.im, m.Err)
	}
	return named(out, m.Rows, m.Columns)
}

// mapList applies f to every item.
func mapList(l *List, f func(Value) (Value, error)) (Value, error) {
	out := &List{Items: make([]Value, len(l.Items)), Pair: l.Pair}
	for k, item := range l.Items {
		var err error
		if out.Items[k], err = f(item); err != nil {
			return nil, err
		}
	}
	return out, nil
}

// Conjugate gives the complex conjugate of a number, a matrix or each item of a list.
func Conjugate(v Value) (Value, error) {
	switch x := Force(v).(type) {
	case *List:
		return mapList(x, Conjugate)
	case Quantity:
		return x, nil
	case *Matrix:
		var out *Matrix
		switch {
		case !x.IsComplex():
			return x, nil
		case x.exactRe != nil:
			out = ExactComplexMatrix(x.exactRe, x.exactIm.Neg())
		default:
			out = FloatComplexMatrix(x.rows, x.cols, x.re, scaleSlice(x.im, -1), x.Err)
		}
		return named(out, x.Rows, x.Columns), nil
	}
	arg, err := plainArgument("conjugate", v)
	if err != nil {
		return nil, err
	}
	if c, ok := arg.(Complex); ok {
		return conjugate(c), nil
	}
	return arg, nil
}

// Argument gives the angle of a complex number in (−π, π].
func Argument(v Value) (Value, error) {
	arg, err := plainArgument("argument", v)
	if err != nil {
		return nil, err
	}
	if n, ok := arg.(Number); ok {
		if n.IsZero() {
			return nil, diag.New(diag.Numerical, "zero has no argument")
		}
		if n.Sign() > 0 {
			return Int(0), nil
		}
		return Pi(), nil
	}
	c := arg.(Complex)
	x, ex := c.approx()
	n, err := settle(cmplx.Phase(x), ulp(cmplx.Phase(x))+ex/cmplx.Abs(x))
	return n, err
}

// Decibels gives 20·log10|x|.
func Decibels(v Value) (Value, error) {
	size, err := Abs(v)
	if err != nil {
		return nil, err
	}
	if q, ok := size.(Quantity); ok {
		if size, err = plainArgument("decibels", q); err != nil {
			return nil, err
		}
	}
	if n := size.(Number); n.IsZero() {
		return nil, diag.New(diag.Numerical, "zero has no value in decibels")
	}
	log, err := Log10(size)
	if err != nil {
		return nil, err
	}
	return Multiply(Int(20), log)
}

// FromDecibels gives 10^(d/20); exact for multiples of 20.
func FromDecibels(v Value) (Value, error) {
	arg, err := plainArgument("from_decibels", v)
	if err != nil {
		return nil, err
	}
	n, ok := arg.(Number)
	if !ok {
		return nil, diag.New(diag.Type, "from_decibels takes a real number; this is a complex number")
	}
	exponent, err := divideNumbers(n, Int(20))
	if err != nil {
		return nil, err
	}
	return powerNumbers(Int(10), exponent)
}
