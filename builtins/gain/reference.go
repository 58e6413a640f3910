package gain

import (
	"fmt"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var referenceBuiltins = []*value.Builtin{
	{
		Name: "reference_gain", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant; no more outputs than inputs"},
			{Name: "gain", Shape: value.AGain, Doc: "the state-feedback gain K"},
		},
		Result:  "gain N, m×p, in u = −K·x + N·r",
		Summary: "the gain N that lets y follow a constant r without offset",
		Doc: "N inverts the closed loop's static gain, N = ((C − D·K)·(B·K − A)⁻¹·B + D)⁻¹; with fewer outputs than inputs the smallest N that does. " +
			"It relies on the model's static gain: a plant that differs leaves an offset, which with_integrators removes.",
		Examples: []value.Example{
			{Input: "P = plant([[0, 1], [0, 0]], [[0], [1]], [[1, 0]])\nreference_gain(P, [[2, 3]]).values", Output: "=\n      r_y\n  u     2"},
		},
		Errors:  []string{"a zero of the plant at s = 0 (at z = 1): y cannot follow a constant", "more outputs than inputs", "a closed loop with a pole there"},
		Source:  "common practice",
		SeeAlso: []string{"closed", "with_integrators", "static_gain"},
		Func:    referenceGain,
	},
}

func referenceGain(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	k := c.Args["gain"]
	values, ok := k.(*value.Matrix)
	if g, isGain := k.(*value.Gain); isGain {
		values, ok = g.Values, true
	}
	n, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	if r, col := values.Dims(); !ok || r != m || col != n {
		return nil, value.Errf(diag.Shape, "gain", "the gain is %d×%d; the plant needs %d×%d", r, col, m, n)
	}
	if outs > m {
		return nil, value.Errf(diag.Shape, "plant", "%d outputs cannot all follow references with %d inputs", outs, m).
			WithHelp("choose the outputs to follow, as in reference_gain(P[\"%s\", 1..%d], K)", firstName(p.Outputs), m)
	}
	loop, err := system.ClosedByGain(plain(p), values, nil)
	if err != nil {
		return nil, err
	}
	static, err := system.StaticGain(loop)
	if err != nil {
		return nil, err
	}
	point := "s = 0"
	if p.Every != nil {
		point = "z = 1"
	}
	g := &value.Gain{Role: "reference", Plant: p, Method: "inverse of the closed loop's static gain"}
	if g.Values, err = rightInverse(static, point); err != nil {
		return nil, err
	}
	named(g, p.Inputs, references(p.Outputs))
	return g, nil
}

// plain is the plant without the references that integrators were given.
func plain(p *value.Plant) *value.Plant {
	q := *p
	q.Extra = nil
	return &q
}

func firstName(signals []value.Signal) string {
	if len(signals) == 0 {
		return "y"
	}
	return signals[0].Name
}

func references(outputs []value.Signal) []value.Signal {
	var out []value.Signal
	for _, s := range outputs {
		s.Name = "r_" + s.Name
		out = append(out, s)
	}
	return out
}

// rightInverse gives the smallest N with G·N = I.
func rightInverse(g *value.Matrix, point string) (*value.Matrix, error) {
	outs, m := g.Dims()
	refuse := func(detail string) error {
		return value.Errf(diag.Numerical, "plant", "the plant has a zero at %s: its outputs cannot follow a constant reference%s", point, detail)
	}
	if outs == 0 {
		return system.Zero(m, 0), nil
	}
	var ch system.Chain
	square := g
	if outs != m {
		square = ch.Mul(g, ch.Transpose(g))
	}
	if ch.Err != nil {
		return nil, ch.Err
	}
	if !square.IsExact() {
		cond, _, err := numeric.ConditionNumber(square.Dense())
		if err != nil {
			return nil, system.Refused(err, "plant")
		}
		if cond > 1e13 {
			return nil, refuse(fmt.Sprintf(" (its static gain has condition %.1e)", cond))
		}
	}
	inverse, err := system.Inverse(square)
	if err != nil {
		return nil, refuse("")
	}
	if outs == m {
		return inverse, nil
	}
	n := ch.Mul(ch.Transpose(g), inverse)
	return n, ch.Err
}
