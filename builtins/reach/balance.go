package reach

import (
	"math"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var balanceBuiltins = []*value.Builtin{
	{
		Name: "reduced", Family: "reach",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
			{Name: "order", Shape: value.AWhole, Named: true, Doc: "how many states to keep"},
		},
		Result:  "plant, with fields bound and hankel_singular_values",
		Summary: "a plant of lower order by balanced truncation, with its error bound",
		Doc: "The states of the balanced form with the smallest Hankel singular values are left out. bound is twice the sum of the values left out: at no frequency does the " +
			"gain of the difference exceed it. Modes that do not decay are split off first and kept as they are.",
		Examples: []value.Example{
			{Input: "poles(reduced(plant([[-1, 0], [0, -100]], [[1], [0.01]], [[1, 0.01]]), order: 1))", Output: "≈ [-1.0000]"},
		},
		Errors:  []string{"an order below the number of modes that do not decay, which are named", "an order above the plant's"},
		Source:  "Moore 1981, IEEE Trans. Automatic Control 26; bound: Glover 1984, Int. J. Control 39",
		SeeAlso: []string{"similar", "hankel_singular_values", "minimal"},
		Func:    reduced,
	},
	{
		Name: "hankel_singular_values", Family: "reach",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "a stable plant"}},
		Result:  "list of numbers, largest first",
		Summary: "how much each state of the balanced form carries from input to output",
		Doc:     "√λ(W·M) for the gramians W of reachability and M of observability. Each carries its own digits.",
		Examples: []value.Example{
			{Input: "hankel_singular_values(plant([[-1]], [[1]], [[1]]))", Output: "≈ [0.50000]"},
		},
		Errors:  []string{"a mode that does not decay, named"},
		Source:  "Moore 1981; Laub, Heath, Paige & Ward 1987, IEEE Trans. Automatic Control 32",
		SeeAlso: []string{"reduced", "similar"},
		Func:    hankelSingularValues,
	},
}

func balancedForm(c *value.Call, p *value.Plant) (t, inverse *value.Matrix, err error) {
	tf, inv, _, cert, err := numeric.BalancedForm(c.Context, p.A.Dense(), p.B.Dense(), p.C.Dense(), p.Every != nil)
	if err != nil {
		return nil, nil, err
	}
	return value.FromDense(tf, cert.Digits), value.FromDense(inv, cert.Digits), nil
}

func hankelSingularValues(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	h, err := numeric.HankelSingularValues(c.Context, p.A.Dense(), p.B.Dense(), p.C.Dense(), p.Every != nil)
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	return hankelList(h.Values, h.Digits), nil
}

func hankelList(found, digits []float64) *value.List {
	l := &value.List{}
	for i, v := range found {
		l.Items = append(l.Items, value.FloatErr(v, v*pow10(-digits[i])))
	}
	return l
}

func reduced(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	order := int(c.Number("order").Float64())
	n, _ := system.PlantSize(p)
	if order < 0 || order > n {
		return nil, value.Errf(diag.Shape, "order", "the order %d must lie between 0 and the plant's %d", order, n)
	}
	r, err := numeric.BalancedTruncation(c.Context, p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense(), order, p.Every != nil)
	if err != nil {
		return nil, system.Refused(err, "order")
	}
	_, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	digits := r.Certificate.Digits
	q := &value.Plant{D: p.D, Every: p.Every, Inputs: p.Inputs, Outputs: p.Outputs, U0: p.U0, Y0: p.Y0,
		States: system.Numbered("x̄", r.Kept), Title: "balanced truncation", Notes: r.Certificate.Notes}
	q.A, q.B, q.C = system.Zero(0, 0), system.Zero(0, m), system.Zero(outs, 0)
	if r.Kept > 0 {
		q.A, q.B, q.C = value.FromDense(r.A, digits), value.FromDense(r.B, digits), value.FromDense(r.C, digits)
	}
	q.Extra = []value.Named{
		{Name: "bound", Value: value.FloatErr(r.Bound, r.BoundError)},
		{Name: "hankel_singular_values", Value: hankelList(r.Values, r.ValueDigits)},
	}
	return q, nil
}

func pow10(x float64) float64 { return math.Pow(10, x) }
