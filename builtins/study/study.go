// Package study is the family of functions that read studies: the extremes, the median
// and the quantiles of what a study's samples came to. Studies themselves are made by the
// study statement. Lists of numbers are taken too, for the middle and the quantiles of
// what was computed otherwise.
package study

import (
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

const exampleModel = "model cart { given m = 2 kg ± 50%; input F in N; state v in m/s; output v; rate v = (F - 3 kg/s * v)/m; around rest }\n" +
	"study decay = slowest_decay(cart) over cart samples 100 at corners\n"

func params() []value.Param {
	return []value.Param{{Name: "study", Shape: value.Anything, Doc: "a study of one number, one result of a study, or a list of numbers"}}
}

// Builtins lists the family.
func Builtins() []*value.Builtin {
	return []*value.Builtin{
		{
			Name: "smallest", Family: "study", Params: params(), Result: "report: value, at, sample; of a list its smallest number",
			Summary:  "the smallest value of a study and where it stands",
			Doc:      "Corners count. at holds the parameters of the sample, sample says which it is. Failed samples do not count.",
			Examples: []value.Example{{Input: exampleModel + "smallest(decay).value", Output: "≈ 1.0000"}},
			Errors:   []string{"a study of several results", "a study whose samples all failed"}, Source: "definition",
			SeeAlso: []string{"largest", "quantile"}, Func: func(c *value.Call) (value.Value, error) { return extreme(c, false) },
		},
		{
			Name: "largest", Family: "study", Params: params(), Result: "report: value, at, sample; of a list its largest number",
			Summary:  "the largest value of a study and where it stands",
			Doc:      "Corners count. at holds the parameters of the sample, sample says which it is. Failed samples do not count.",
			Examples: []value.Example{{Input: exampleModel + "largest(decay).value", Output: "≈ 3.0000"}},
			Errors:   []string{"a study of several results", "a study whose samples all failed"}, Source: "definition",
			SeeAlso: []string{"smallest", "quantile"}, Func: func(c *value.Call) (value.Value, error) { return extreme(c, true) },
		},
		{
			Name: "median", Family: "study", Params: params(), Result: "number with the study's unit",
			Summary:  "the middle value of a study's drawn samples, or of a list",
			Doc:      "The quantile at 1/2. Corners are no draws and do not count, nor do failed samples.",
			Examples: []value.Example{{Input: "median([3, 1, 2])", Output: "≈ 2.0000"}},
			Errors:   []string{"a study of several results", "an empty list"}, Source: "Hyndman & Fan 1996, The American Statistician 50, definition 7",
			SeeAlso: []string{"quantile"}, Func: func(c *value.Call) (value.Value, error) { return quantile(c, value.FloatErr(0.5, 0)) },
		},
		{
			Name: "quantile", Family: "study",
			Params: append(params(), value.Param{Name: "q", Shape: value.AReal, Doc: "the part that lies below, between 0 and 1"}),
			Result: "number with the study's unit", Summary: "the value below which a part of a study's drawn samples lies",
			Doc: "Linear between neighbours: the place among n sorted values is q·(n − 1) from the first. Corners are no draws and do not " +
				"count, nor do failed samples. s.quantile(q) is the same.",
			Examples: []value.Example{{Input: "quantile([1, 2, 3, 5], 0.5)", Output: "≈ 2.5000"}},
			Errors:   []string{"q outside 0 … 1", "a study of several results"}, Source: "Hyndman & Fan 1996, The American Statistician 50, definition 7",
			SeeAlso: []string{"median", "smallest", "largest"}, Func: func(c *value.Call) (value.Value, error) { return quantile(c, c.Number("q")) },
		},
	}
}

func extreme(c *value.Call, largest bool) (value.Value, error) {
	if s, ok := c.Args["study"].(*value.Study); ok {
		r, err := s.Extreme(largest)
		if err != nil {
			return nil, err
		}
		return r, nil
	}
	if largest {
		return value.Max(c.Args["study"])
	}
	return value.Min(c.Args["study"])
}

// quantile is of a study, or of a list taken as draws.
func quantile(c *value.Call, q value.Number) (value.Value, error) {
	s, ok := c.Args["study"].(*value.Study)
	if !ok {
		list, err := value.Elements(c.Args["study"])
		if err != nil {
			return nil, value.Errf(diag.Type, "study", "a study or a list of numbers stands here, not %s", value.Describe(c.Args["study"]))
		}
		r := value.StudyResult{}
		for k, item := range list {
			n, unit, ok := numberOf(item)
			if k == 0 {
				r.Unit = unit
			}
			if !ok || unit.Dim != r.Unit.Dim || unit.Text != r.Unit.Text {
				return nil, value.Errf(diag.Type, "study", "item %d is %s; all have to be real numbers in one unit", k+1, value.Describe(item))
			}
			r.Values = append(r.Values, n)
		}
		if len(r.Values) == 0 {
			return nil, value.Errf(diag.Type, "study", "an empty list has no quantiles")
		}
		s = &value.Study{Samples: len(r.Values), Results: []value.StudyResult{r}}
	}
	return s.Quantile(q)
}

func numberOf(v value.Value) (float64, value.Unit, bool) {
	switch x := value.Force(v).(type) {
	case value.Number:
		return x.Float64(), value.None(), true
	case value.Quantity:
		return x.Magnitude.Float64(), x.Unit, true
	}
	return 0, value.Unit{}, false
}
