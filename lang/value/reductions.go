package value

import (
	"math"
	"math/big"

	"gainwright/lang/diag"
)

// operands gives what min, max and sum run over: the items of a single list or matrix, else the arguments themselves.
func operands(name string, args []Value) ([]Value, error) {
	if len(args) == 1 {
		switch x := Force(args[0]).(type) {
		case *List:
			args = x.Items
		case *Matrix:
			args = make([]Value, x.rows*x.cols)
			for k := range args {
				args[k] = x.At(k/x.cols, k%x.cols)
			}
		case *Gain:
			return operands(name, []Value{x.Values})
		}
	}
	return args, nil
}

// Min gives the least of real numbers or of quantities of one dimension; of a single list or matrix its least entry.
func Min(args ...Value) (Value, error) { return extreme("min", "<", args) }

// Max gives the greatest, as Min.
func Max(args ...Value) (Value, error) { return extreme("max", ">", args) }

func extreme(name, op string, args []Value) (Value, error) {
	items, err := operands(name, args)
	if err != nil {
		return nil, err
	}
	if len(items) == 0 {
		return nil, diag.New(diag.Type, "%s of an empty list has no value", name)
	}
	best := Force(items[0])
	if len(items) == 1 {
		if _, err := Compare(op, best, best); err != nil {
			return nil, err
		}
	}
	for _, item := range items[1:] {
		item = Force(item)
		better, err := Compare(op, item, best)
		if err != nil {
			return nil, err
		}
		if better {
			best = item
		}
	}
	return best, nil
}

// Sum adds values; of a single list or matrix its entries. The sum of nothing is 0.
func Sum(args ...Value) (Value, error) {
	items, err := operands("sum", args)
	if err != nil {
		return nil, err
	}
	if len(items) == 0 {
		return Int(0), nil
	}
	total := Force(items[0])
	if _, err := Negate(total); err != nil {
		return nil, undefinedFor("sum", total)
	}
	for _, item := range items[1:] {
		if total, err = Add(total, Force(item)); err != nil {
			return nil, err
		}
	}
	return total, nil
}

// floorRat gives the greatest whole number that is not above x.
func floorRat(x *big.Rat) *big.Int {
	return new(big.Int).Div(x.Num(), x.Denom()) // Euclidean: floor for a positive divisor
}

// Floor gives the greatest whole number that is not above a real number. A floating
// number whose uncertainty reaches over a whole number is rounded as it stands.
func Floor(v Value) (Value, error) {
	n, err := realArgument("floor", v)
	if err != nil {
		return nil, err
	}
	if n.Exact != nil {
		return Rat(new(big.Rat).SetInt(floorRat(n.Exact))), nil
	}
	return wholeOf(math.Floor(n.F))
}

// wholeOf takes a floating whole number as an exact one.
func wholeOf(f float64) (Value, error) {
	if math.IsInf(f, 0) || math.IsNaN(f) {
		return nil, notANumber()
	}
	return Rat(new(big.Rat).SetFloat64(f)), nil
}

func realArgument(name string, v Value) (Number, error) {
	arg, err := plainArgument(name, v)
	if err != nil {
		return Number{}, err
	}
	n, ok := arg.(Number)
	if !ok {
		return Number{}, diag.New(diag.Type, "%s takes a real number; this is a complex number", name)
	}
	return n, nil
}

// mostDecimals bounds the decimals that Round takes.
const mostDecimals = 1000

// Round gives the nearest number with so many decimals, halves away from zero, as an
// exact number; a quantity is rounded in its unit.
func Round(v Value, decimals int) (Value, error) {
	if decimals > mostDecimals || decimals < -mostDecimals {
		return nil, diag.New(diag.Limit, "round takes at most %d decimals", mostDecimals)
	}
	if q, ok := Force(v).(Quantity); ok {
		out, err := Round(q.Magnitude, decimals)
		if err != nil {
			return nil, err
		}
		return Quantity{out.(Number), q.Unit}, nil
	}
	n, err := realArgument("round", v)
	if err != nil {
		return nil, err
	}
	x := n.Exact
	if x == nil {
		if math.IsInf(n.F, 0) || math.IsNaN(n.F) {
			return nil, notANumber()
		}
		x = new(big.Rat).SetFloat64(n.F)
	}
	scale := ratPower(big.NewRat(10, 1), decimals)
	y := new(big.Rat).Mul(new(big.Rat).Abs(x), scale)
	rounded := new(big.Rat).SetInt(floorRat(y.Add(y, big.NewRat(1, 2))))
	rounded.Quo(rounded, scale)
	if x.Sign() < 0 {
		rounded.Neg(rounded)
	}
	return Rat(rounded), nil
}

// Exactly gives the exact value behind an exact number; floating values are taken at
// their binary64 value only when said so by name, so they are refused here.
func Exactly(v Value) (Value, error) {
	switch x := Force(v).(type) {
	case Number:
		if x.Exact != nil {
			return x, nil
		}
	case Complex:
		if x.ExactRe != nil {
			return x, nil
		}
	case *Matrix:
		if x.IsExact() {
			return x, nil
		}
	case *Polynomial:
		if x.IsExact() {
			return x, nil
		}
	case *Transfer:
		if x.IsExact() {
			return x, nil
		}
	case *Plant:
		if x.IsExact() {
			return x, nil
		}
	case *Gain:
		return Exactly(x.Values)
	case *List:
		return mapList(x, Exactly)
	case Quantity:
		if x.Magnitude.Exact != nil {
			return x, nil
		}
	default:
		return nil, undefinedFor("an exact value", v)
	}
	return nil, diag.New(diag.Numerical, "this value is floating; no exact one was kept")
}

// Floating rounds an exact value to binary64.
func Floating(v Value) (Value, error) {
	switch x := Force(v).(type) {
	case Number:
		f, err := x.approx()
		if math.IsInf(f, 0) && !x.isInfinite() {
			return nil, overflow()
		}
		return Number{F: f, Err: err}, nil
	case Complex:
		c, err := x.approx()
		return Complex{C: c, Err: err}, nil
	case Quantity:
		n, err := Floating(x.Magnitude)
		if err != nil {
			return nil, err
		}
		return Quantity{n.(Number), x.Unit}, nil
	case *Matrix:
		return named(x.Floating(), x.Rows, x.Columns), nil
	case *Gain:
		out := *x
		out.Values = x.Values.Floating()
		return &out, nil
	case *Polynomial:
		f, err := x.Floats()
		return FloatPolynomial(x.Variable, f, err), nil
	case *Transfer:
		return orError(mapTransfer(x, func(r Ratio) (Ratio, error) {
			num, e1 := r.Num.Floats()
			den, e2 := r.Den.Floats()
			return Ratio{FloatPolynomial(x.Variable, num, e1), FloatPolynomial(x.Variable, den, e2)}, nil
		}))
	case *Plant:
		out := *x
		out.A, out.B, out.C, out.D = x.A.Floating(), x.B.Floating(), x.C.Floating(), x.D.Floating()
		return &out, nil
	case *List:
		return mapList(x, Floating)
	}
	return nil, undefinedFor("rounding", v)
}
