package matrix

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var kinds = []*value.Builtin{
	{
		Name: "exact", Family: "matrix",
		Params:  []value.Param{{Name: "v", Shape: value.Anything, Doc: "a number, matrix, polynomial, transfer function, gain or list"}},
		Result:  "the same value, exact",
		Summary: "the exact value that is kept behind a shortened display",
		Doc: "A value marked `exact kept` was shown with its digits cut; this shows it whole, as fractions where its decimals do not end. " +
			"A floating value has no exact one; round(x, decimals: n) makes one.",
		Examples: []value.Example{{Input: "exact(1/3)", Output: "= 1/3"}},
		Errors:   []string{"a floating value, which keeps no exact one", "a value without numbers"}, Source: "definition", SeeAlso: []string{"floating", "fraction"},
		Func: func(c *value.Call) (value.Value, error) {
			v, err := value.Exactly(plainValues(c.Args["v"]))
			if err != nil {
				return nil, err
			}
			return value.AsFraction(v), nil
		},
	},
	{
		Name: "floating", Family: "matrix",
		Params:  []value.Param{{Name: "v", Shape: value.Anything, Doc: "a number, matrix, polynomial, transfer function, gain or list"}},
		Result:  "the same value, floating",
		Summary: "the value rounded to binary64",
		Doc:     "What a computation in binary64 starts from; its error estimate is one rounding.", Examples: []value.Example{{Input: "floating(1/3)", Output: "≈ 0.33333"}},
		Errors: []string{"a value without numbers"}, Source: "IEEE 754", SeeAlso: []string{"exact"},
		Func: func(c *value.Call) (value.Value, error) { return value.Floating(plainValues(c.Args["v"])) },
	},
	{
		Name: "fraction", Family: "matrix",
		Params:  []value.Param{{Name: "v", Shape: value.Anything, Doc: "an exact value"}},
		Result:  "the same value, shown as fractions",
		Summary: "shows an exact value as fractions",
		Doc:     "24/109 rather than 0.22018. A floating value is shown as it is.", Examples: []value.Example{{Input: "fraction(0.12)", Output: "= 3/25"}},
		Errors: []string{"a floating value"}, Source: "definition", SeeAlso: []string{"exact"},
		Func: func(c *value.Call) (value.Value, error) { return value.AsFraction(plainValues(c.Args["v"])), nil },
	},
	{
		Name: "si_number", Family: "matrix",
		Params:  []value.Param{{Name: "x", Shape: value.Anything, Doc: "a quantity; a plain number is taken as it is"}},
		Result:  "number",
		Summary: "the plain number that a quantity is in SI units",
		Doc:     "For use where a number without its unit is wanted, as in a matrix.", Examples: []value.Example{{Input: "si_number(20 mm)", Output: "= 0.02"}},
		Errors: []string{"Hz, which is a frequency or a rate only where one is asked for"}, Source: "BIPM 2019, The International System of Units", SeeAlso: []string{"exact", "floating"},
		Func: siNumber,
	},
	{
		Name: "fields", Family: "matrix",
		Params:  []value.Param{{Name: "v", Shape: value.Anything, Doc: "a report, plant, gain, model, study or response"}},
		Result:  "report",
		Summary: "everything a value holds, by name",
		Doc:     "What .name reads: for a gain also residual, condition and method.", Examples: []value.Example{{Input: "fields(2 + 3i)", Output: "fields\n  real      = 2\n  imaginary = 3"}},
		Errors: []string{"a value without fields"}, Source: "definition", SeeAlso: []string{"exact"},
		Func: func(c *value.Call) (value.Value, error) {
			v := c.Args["v"]
			h, ok := v.(value.HasFields)
			if !ok {
				return nil, value.Errf(diag.Type, "v", "%s has no fields", value.Describe(v))
			}
			r := &value.Report{Title: "fields"}
			for _, name := range h.FieldNames() {
				f, ok := h.Field(name)
				if ok && f != nil {
					r.Fields = append(r.Fields, value.Named{Name: name, Value: f})
				}
			}
			return r, nil
		},
	},
}

// siNumber gives the plain number a quantity is in SI units.
func siNumber(c *value.Call) (value.Value, error) {
	if q, ok := value.Force(c.Args["x"]).(value.Quantity); ok {
		return q.SI()
	}
	v, err := value.Coerce(value.Param{Name: "x", Shape: value.ANumber}, c.Args["x"])
	return v, err
}

// plainValues gives a gain's matrix, and every other value as it is.
func plainValues(v value.Value) value.Value {
	if g, ok := v.(*value.Gain); ok {
		return g.Values
	}
	return v
}
