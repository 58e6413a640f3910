package system

import (
	"fmt"

	"gainwright/builtins/numeric"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var transferBuiltins = []*value.Builtin{
	{
		Name: "transfer", Family: "system",
		Params:  []value.Param{{Name: "plant", Shape: value.ATransfer, Doc: "a plant, a model, or a transfer function"}},
		Result:  "transfer function, p×m",
		Summary: "the transfer function C·(sI − A)⁻¹·B + D, common factors removed",
		Doc: "Each entry is reduced, with a monic denominator. Exact data stays exact. Floating data is taken as the binary64 numbers it is, " +
			"worked exactly and rounded, so that nothing cancels that does not cancel in the numbers given.",
		Examples: []value.Example{
			{Input: "transfer(plant([[0, 1], [-2, -3]], [[0], [1]], [[1, 1]]))", Output: "= 1/(s + 2)"},
		},
		Errors:  []string{fmt.Sprintf("a plant of more than %d states", 2*ExactOrder)},
		Source:  "Rosenbrock 1970, State-space and Multivariable Theory",
		SeeAlso: []string{"realize", "cancellations", "static_gain"},
		Func:    func(c *value.Call) (value.Value, error) { return c.Transfer("plant"), nil },
	},
	{
		Name: "realize", Family: "system",
		Params:  []value.Param{{Name: "transfer", Shape: value.ATransfer, Doc: "a proper transfer function"}},
		Result:  "plant of least order",
		Summary: "a plant of least order with the given transfer function",
		Doc:     "Controller form for one input and one output; for several, the columns' forms reduced to what is moved and seen.",
		Examples: []value.Example{
			{Input: "realize(1/(s^2 + 3*s + 2)).A", Output: "=\n   0    1\n  -2   -3"},
		},
		Errors:  []string{"a transfer function that is not proper"},
		Source:  "Kailath 1980, Linear Systems, ch. 2 and 6",
		SeeAlso: []string{"transfer", "minimal"},
		Func:    realize,
	},
	{
		Name: "static_gain", Family: "system",
		Params:  systemParam("a plant, a model or a transfer function"),
		Result:  "matrix p×m",
		Summary: "what the outputs settle at for constant unit inputs",
		Doc: "D − C·A⁻¹·B, or D + C·(I − A)⁻¹·B for a sampled plant. A pole at 0 (at 1) that the transfer function loses does not matter; " +
			"one that it keeps means the output grows without end, which is an error. It is the value of the transfer function there, " +
			"whether or not the plant is stable.",
		Examples: []value.Example{
			{Input: "static_gain(plant([[0, 1], [-2, -3]], [[0], [1]], [[1, 0]]))", Output: "=\n        u\n  y   0.5"},
		},
		Errors:  []string{"an entry that integrates"},
		Source:  "definition",
		SeeAlso: []string{"reference_gain", "transfer"},
		Func:    staticGain,
	},
	{
		Name: "resolvent", Family: "system",
		Params:  systemParam("a plant"),
		Bare:    matrixParam("a square matrix"),
		Result:  "transfer function, n×n",
		Summary: "(sI − A)⁻¹ as a matrix of rational functions, exact when A is",
		Doc:     "The adjugate over the characteristic polynomial, each entry reduced.",
		Examples: []value.Example{
			{Input: "resolvent([[0, 1], [0, 0]])", Output: "=\n  output 1 from input 1:   1/s\n  output 1 from input 2:   1/s^2\n  output 2 from input 1:   0\n  output 2 from input 2:   1/s"},
		},
		Errors:  []string{fmt.Sprintf("a matrix of more than %d rows", 2*ExactOrder)},
		Source:  "Faddeev & Faddeeva 1963, Computational Methods of Linear Algebra",
		SeeAlso: []string{"transfer", "characteristic_polynomial"},
		Func:    resolvent,
	},
}

func realize(c *value.Call) (value.Value, error) {
	g := c.Transfer("transfer")
	p, err := value.ToPlant(g)
	if err != nil {
		return nil, err
	}
	if len(p.Inputs) == 0 {
		_, m := PlantSize(p)
		outs, _ := p.C.Dims()
		n, _ := p.A.Dims()
		p.States, p.Inputs, p.Outputs = Numbered("x", n), Numbered("u", m), Numbered("y", outs)
	}
	return p, nil
}

func resolvent(c *value.Call) (value.Value, error) {
	a := squareOf(c)
	n, _ := a.Dims()
	return value.ToTransfer(&value.Plant{A: a, B: Identity(n), C: Identity(n), D: Zero(n, n), Every: everyOf(c.Plant("plant"))})
}

func everyOf(p *value.Plant) *value.Number {
	if p == nil {
		return nil
	}
	return p.Every
}

func staticGain(c *value.Call) (value.Value, error) { return StaticGain(c.Plant("plant")) }

// StaticGain is the transfer matrix at s = 0, or at z = 1 for a sampled plant.
func StaticGain(p *value.Plant) (*value.Matrix, error) {
	m, err := staticGainMatrix(p)
	if err != nil {
		return nil, err
	}
	m.Rows, m.Columns = Labels(p.Outputs), Labels(p.Inputs)
	return m, nil
}

// Labels names rows or columns by signals, each with its unit.
func Labels(signals []value.Signal) []string {
	out := make([]string, len(signals))
	for i, s := range signals {
		out[i] = s.Name
		if s.Unit.Text != "" {
			out[i] += " [" + s.Unit.Text + "]"
		}
	}
	return out
}

func staticGainMatrix(p *value.Plant) (*value.Matrix, error) {
	n, _ := PlantSize(p)
	if n == 0 {
		d := *p.D
		return &d, nil
	}
	var ch Chain
	at := p.A
	if p.Every != nil {
		at = ch.Sub(p.A, Identity(n))
	}
	if ExactPlant(p) {
		x, err := at.Exact().Solve(p.B.Exact())
		if err != nil {
			return exactLimit(p)
		}
		g := ch.Sub(p.D, ch.Mul(p.C, value.ExactMatrix(x)))
		return g, ch.Err
	}
	x, err := numeric.Solve(at.Dense(), p.B.Dense())
	if err != nil || x.Kind != "unique" {
		return nil, diag.New(diag.Numerical, "the plant has a pole at %s: an output grows without end under a constant input", stillPoint(p)).
			WithHelp("static_gain needs a plant whose outputs settle; look at modes(…)")
	}
	g := ch.Sub(p.D, ch.Mul(p.C, value.FromDense(x.X, x.Certificate.Digits)))
	return g, ch.Err
}

// stillPoint names the point of constant signals.
func stillPoint(p *value.Plant) string {
	if p.Every != nil {
		return "z = 1"
	}
	return "s = 0"
}

// exactLimit is the transfer matrix at the still point when A has an eigenvalue there.
func exactLimit(p *value.Plant) (*value.Matrix, error) {
	entries, err := exact.Transfer(p.A.Exact(), p.B.Exact(), p.C.Exact(), p.D.Exact())
	if err != nil {
		return nil, diag.New(diag.Numerical, "%v", err)
	}
	point := value.Int(0)
	if p.Every != nil {
		point = value.Int(1)
	}
	outs, ins := len(entries), 0
	if outs > 0 {
		ins = len(entries[0])
	}
	m := exact.NewMatrix(outs, ins)
	for i, row := range entries {
		for j, g := range row {
			den := g.Den.Eval(point.Exact)
			if den.Sign() == 0 {
				return nil, diag.New(diag.Numerical, "from %s to %s the plant has a pole at %s: it integrates, and has no static gain",
					signalName(p.Inputs, j, "input"), signalName(p.Outputs, i, "output"), stillPoint(p))
			}
			m.Set(i, j, den.Quo(g.Num.Eval(point.Exact), den))
		}
	}
	return value.ExactMatrix(m), nil
}

func signalName(signals []value.Signal, i int, kind string) string {
	if i < len(signals) {
		return signals[i].Name
	}
	return fmt.Sprintf("%s %d", kind, i+1)
}
