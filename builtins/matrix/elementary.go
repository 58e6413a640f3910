package matrix

import (
	"math"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var constants = []*value.Builtin{{
	Name: "pi", Family: "matrix", Result: "number", Summary: "the ratio of a circle's circumference to its diameter",
	Doc:      "A constant, written without brackets; floating, correct to binary64.",
	Examples: []value.Example{{Input: "pi", Output: "≈ 3.1416"}},
	Errors:   []string{"none"}, Source: "definition", SeeAlso: []string{"sin", "atan2"},
	Func: func(*value.Call) (value.Value, error) { return value.Pi(), nil },
}}

// function makes a built-in of one number.
func function(name, summary, doc, input, output, errs string, seeAlso []string, f func(value.Value) (value.Value, error)) *value.Builtin {
	return &value.Builtin{
		Name: name, Family: "matrix",
		Params: []value.Param{{Name: "x", Shape: value.Anything, Doc: "a number, or a list or matrix taken entry by entry"}},
		Result: "number, list or matrix, as x", Summary: summary, Doc: doc,
		Examples: []value.Example{{Input: input, Output: output}}, Errors: []string{errs}, Source: "definition", SeeAlso: seeAlso,
		Func: func(c *value.Call) (value.Value, error) { return each(c.Args["x"], f) },
	}
}

// each applies a function of one number to a number, or to every entry of a list or matrix.
func each(v value.Value, f func(value.Value) (value.Value, error)) (value.Value, error) {
	switch v := value.Force(v).(type) {
	case *value.List:
		out := &value.List{Pair: v.Pair}
		for _, item := range v.Items {
			r, err := each(item, f)
			if err != nil {
				return nil, err
			}
			out.Items = append(out.Items, r)
		}
		return out, nil
	case *value.Matrix:
		r, c := v.Dims()
		if r == 1 && c == 1 {
			return f(v)
		}
		rows := make([][]value.Entry, r)
		for i := range r {
			for j := range c {
				x, err := f(v.At(i, j))
				if err != nil {
					return nil, err
				}
				rows[i] = append(rows[i], value.Entry{Value: x})
			}
		}
		if r == 0 || c == 0 {
			return v, nil
		}
		m, _, err := value.MatrixLiteral(rows)
		return m, err
	case *value.Gain:
		return each(v.Values, f)
	}
	return f(v)
}

var elementary = []*value.Builtin{
	function("sqrt", "square root", "Exact for squares of rationals; of a negative number it is imaginary. Units are halved where they can be.", "sqrt(9/4)", "= 1.5", "a unit without a root", []string{"exp"}, value.Sqrt),
	function("exp", "exponential e^x of a number", "Entry by entry for matrices; the matrix exponential is exponential(A).", "exp(0)", "= 1", "a unit; overflow", []string{"log", "exponential"}, value.Exp),
	function("log", "natural logarithm", "Of a negative or complex number the principal value.", "log(1)", "= 0", "zero; a unit", []string{"exp", "log10", "decibels"}, value.Log),
	function("log10", "logarithm to base 10", "Exact for powers of ten.", "log10(1000)", "= 3", "zero; a unit", []string{"log", "decibels"}, value.Log10),
	function("sin", "sine", "The argument is in radians, or an angle with its unit: sin(30 deg).", "sin(90 deg)", "= 1", "a unit that is no angle", []string{"cos", "asin"}, value.Sin),
	function("cos", "cosine", "The argument is in radians, or an angle with its unit.", "cos(0)", "= 1", "a unit that is no angle", []string{"sin", "acos"}, value.Cos),
	function("tan", "tangent", "The argument is in radians, or an angle with its unit.", "tan(0)", "= 0", "a unit that is no angle; a pole", []string{"atan"}, value.Tan),
	function("asin", "inverse sine, in radians", "The principal value, between −π/2 and π/2.", "asin(0)", "= 0", "a unit", []string{"sin"}, value.Asin),
	function("acos", "inverse cosine, in radians", "The principal value, between 0 and π.", "acos(1)", "= 0", "a unit", []string{"cos"}, value.Acos),
	function("atan", "inverse tangent, in radians", "The principal value, between −π/2 and π/2.", "atan(0)", "= 0", "a unit", []string{"tan", "atan2"}, value.Atan),
	function("abs", "absolute value or magnitude", "Of a complex number its magnitude; keeps units.", "abs(-3/4)", "= 0.75", "no number", []string{"argument", "sign"}, value.Abs),
	function("sign", "sign of a real number: −1, 0 or 1", "A floating value that is zero within its error still has the sign of its digits.", "sign(-2)", "= -1", "a complex number", []string{"abs"}, value.Sign),
	function("real", "real part", "Of a real number the number itself.", "real(2 + 3i)", "= 2", "no number", []string{"imaginary", "conjugate"}, value.Real),
	function("imaginary", "imaginary part", "Of a real number zero.", "imaginary(2 + 3i)", "= 3", "no number", []string{"real", "argument"}, value.Imaginary),
	function("conjugate", "complex conjugate", "Of a matrix entry by entry; the conjugate transpose is transpose(conjugate(A)).", "conjugate(2 + 3i)", "= 2 - 3i", "no number", []string{"real", "imaginary"}, value.Conjugate),
	function("argument", "angle of a complex number, in radians", "Between −π and π.", "argument(-1 + 0i)", "≈ 3.1416", "zero", []string{"abs"}, value.Argument),
	function("decibels", "20·log10 |x|", "Of amplitude ratios.", "decibels(10)", "= 20", "zero; a unit", []string{"from_decibels"}, value.Decibels),
	function("from_decibels", "amplitude ratio of a number of decibels", "10^(d/20).", "from_decibels(20)", "= 10", "a unit", []string{"decibels"}, value.FromDecibels),
	function("floor", "largest whole number not above x", "Exact for exact numbers.", "floor(-3/2)", "= -2", "a unit; a complex number", []string{"round"}, value.Floor),
	{
		Name: "atan2", Family: "matrix",
		Params:  []value.Param{{Name: "y", Shape: value.Anything, Doc: "a real number"}, {Name: "x", Shape: value.Anything, Doc: "a real number of the same unit"}},
		Result:  "number in radians",
		Summary: "angle of the point (x, y), in radians, in all four quadrants",
		Doc:     "Between −π and π; atan2(0, 0) is an error.", Examples: []value.Example{{Input: "atan2(0, 1)", Output: "= 0"}},
		Errors: []string{"both zero", "units that differ"}, Source: "definition", SeeAlso: []string{"atan", "argument"},
		Func: func(c *value.Call) (value.Value, error) { return value.Atan2(c.Args["y"], c.Args["x"]) },
	},
	{
		Name: "round", Family: "matrix",
		Params: []value.Param{{Name: "x", Shape: value.Anything, Doc: "a number, or a list or matrix entry by entry"},
			{Name: "decimals", Shape: value.AWhole, Named: true, Optional: true, Default: "0", Doc: "how many decimals to keep; negative for tens"}},
		Result:  "as x",
		Summary: "rounds to a number of decimals, halves away from zero",
		Doc:     "The result is exact: what a controller that stores so many decimals holds.", Examples: []value.Example{{Input: "round(2/3, decimals: 3)", Output: "= 0.667"}},
		Errors: []string{"a complex number"}, Source: "definition", SeeAlso: []string{"floor", "exact"},
		Func: func(c *value.Call) (value.Value, error) {
			k := c.Number("decimals").Float64()
			if math.Abs(k) > 300 {
				return nil, value.Errf(diag.Limit, "decimals", "%g decimals are too many", k)
			}
			return each(c.Args["x"], func(v value.Value) (value.Value, error) { return value.Round(v, int(k)) })
		},
	},
}

// fold makes a built-in over any number of numbers or one list.
func fold(name, summary, input, output, errs string, seeAlso []string, f func(...value.Value) (value.Value, error)) *value.Builtin {
	return &value.Builtin{
		Name: name, Family: "matrix",
		Params: []value.Param{{Name: "values", Shape: value.Anything, Variadic: true, Doc: "numbers, or one list or matrix"}},
		Result: "number", Summary: summary, Doc: "Over the arguments, or over the entries of a single list or matrix. Units must agree.",
		Examples: []value.Example{{Input: input, Output: output}}, Errors: []string{errs}, Source: "definition", SeeAlso: seeAlso,
		Func: func(c *value.Call) (value.Value, error) {
			l := c.List("values")
			if l == nil {
				return nil, value.Errf(diag.Type, "", "%s needs at least one value", name)
			}
			return f(l.Items...)
		},
	}
}

var reductions = []*value.Builtin{
	fold("min", "the least of several real numbers", "min(3, 1, 2)", "= 1", "complex numbers", []string{"max"}, value.Min),
	fold("max", "the greatest of several real numbers", "max([3, 1, 2])", "= 3", "complex numbers", []string{"min"}, value.Max),
	fold("sum", "the sum of several numbers", "sum([1/2, 1/3])", "= 5/6 ≈ 0.83333", "units that differ", []string{"min", "max"}, value.Sum),
}
