package gain

import (
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var observerBuiltins = []*value.Builtin{
	{
		Name: "observer_gain", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant with n states and p outputs"},
			{Name: "poles", Shape: value.PoleList, Doc: "n wanted poles of the estimation error"},
			{Name: "method", Shape: value.AChoice, Choices: methods, Named: true, Optional: true, Default: "as for assign_poles", Doc: "how"},
			{Name: "form", Shape: value.AChoice, Choices: []string{"predictor", "current"}, Named: true, Optional: true, Default: "\"predictor\"", Doc: "of a sampled plant: whether x̂ uses y up to the step before, or the newest y as well"},
		},
		Bare: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "C", Shape: value.AMatrix, Doc: "p×n"},
			{Name: "poles", Shape: value.PoleList, Doc: "n wanted poles of the estimation error"},
			{Name: "method", Shape: value.AChoice, Choices: methods, Named: true, Optional: true, Default: "as for assign_poles", Doc: "how"},
		},
		Result:  "gain L, n×p, in x̂' = A·x̂ + B·u + L·(y − ŷ)",
		Summary: "the observer gain that gives the estimation error the wanted poles",
		Doc: "The dual of assign_poles: the poles are those of A − L·C. For a sampled plant x̂⁺ = A·x̂ + B·u + L·(y − ŷ) is the predictor; " +
			"form \"current\" corrects x̂ by the newest y, x̂ = x̄ + L·(y − C·x̄), and gives A − L·C·A the wanted poles.",
		Examples: []value.Example{
			{Input: "observer_gain([[0, 1], [0, 0]], [[1, 0]], [-3, -4]).values", Output: "=\n        y\n  x1    7\n  x2   12"},
		},
		Errors:  []string{"more or fewer poles than states", "a mode that no output sees and that is not among the wanted poles", "the current form of a continuous plant"},
		Source:  "Luenberger 1966, IEEE Trans. Automatic Control 11",
		SeeAlso: []string{"assign_poles", "compensator", "kalman_gain", "reduced_observer"},
		Func:    observerGain,
	},
	{
		Name: "reduced_observer", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant with n states and p independent outputs"},
			{Name: "poles", Shape: value.PoleList, Doc: "n − p wanted poles of the estimation error"},
		},
		Result:  "plant from (u, y) to x̂, with field gain",
		Summary: "an observer of order n − p that takes the measured part from y",
		Doc: "With T = [C; R], R unit rows that complete C, the states are (y, z). L gives A22 − L·A12 the wanted poles; the observer's state is w = ẑ − L·y. " +
			"Inputs are the plant's inputs, then its outputs; outputs are the estimates of all states. Field gain is L, field transformation is T. " +
			"The measured part passes straight through, noise and all.",
		Examples: []value.Example{
			{Input: "reduced_observer(plant([[0, 1, 0], [0, 0, 1], [-6, -11, -6]], [[0], [0], [1]], [[1, 0, 0]]), [-5, -6]).gain", Output: "=\n    5\n  -11"},
		},
		Errors:  []string{"outputs that depend on each other", "more or fewer poles than n − p", "a mode that no output sees and that is not among the wanted poles"},
		Source:  "Luenberger 1966, IEEE Trans. Automatic Control 11",
		SeeAlso: []string{"observer_gain", "compensator"},
		Func:    reducedObserver,
	},
}

func observerGain(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	if p == nil {
		var err error
		if p, err = barePlant(c.Matrix("A"), nil, c.Matrix("C")); err != nil {
			return nil, err
		}
	}
	form := c.Text("form", "predictor")
	if form == "current" && p.Every == nil {
		return nil, value.Errf(diag.Type, "form", "the current form is for sampled plants; this one is continuous")
	}
	var ch system.Chain
	seen := p.C
	if form == "current" {
		seen = ch.Mul(p.C, p.A)
	}
	t := &task{wanted: c.List("poles"), method: c.Text("method", ""), dual: true, a: ch.Transpose(p.A), b: ch.Transpose(seen)}
	if ch.Err != nil {
		return nil, ch.Err
	}
	g, err := t.solve(c.Context)
	if err != nil {
		return nil, err
	}
	g.Role, g.Plant = "observer", p
	named(g, p.States, p.Outputs)
	if p.Every != nil {
		g.Extra = append(g.Extra, value.Named{Name: "form", Value: value.Text(form)})
	}
	return g, nil
}

// named names the rows and columns of a gain.
func named(g *value.Gain, rows, columns []value.Signal) {
	g.RowSignals, g.ColumnSignals = rows, columns
	g.Values.Rows, g.Values.Columns = system.Labels(rows), system.Labels(columns)
}

func reducedObserver(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	n, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	rest, err := completion(p.C)
	if err != nil {
		return nil, err
	}
	k := n - outs
	if got := len(c.List("poles").Items); got != k {
		return nil, value.Errf(diag.Shape, "poles", "%s for %d states of which %d are measured: give %s", count(got, "pole"), n, outs, count(k, "pole"))
	}
	var ch system.Chain
	t := p.C
	if k > 0 {
		t = system.Block([][]*value.Matrix{{p.C}, {rest}})
	}
	inverse := ch.Inverse(t)
	if ch.Err != nil {
		return nil, ch.Err
	}
	a, b := ch.Mul(t, p.A, inverse), ch.Mul(t, p.B)
	part := func(r0, r1, c0, c1 int) *value.Matrix { return system.Slice(a, r0, r1, c0, c1) }
	a11, a12, a21, a22 := part(0, outs, 0, outs), part(0, outs, outs, n), part(outs, n, 0, outs), part(outs, n, outs, n)
	b1, b2 := system.Slice(b, 0, outs, 0, m), system.Slice(b, outs, n, 0, m)
	assign := &task{wanted: c.List("poles"), dual: true, a: ch.Transpose(a22), b: ch.Transpose(a12)}
	if ch.Err != nil {
		return nil, ch.Err
	}
	g, err := assign.solve(c.Context)
	if err != nil {
		return nil, err
	}
	l := g.Values
	if k == 0 {
		l = system.Zero(0, outs)
	}
	// with y replaced by y − D·u: w' = F·w + (F·L + A21 − L·A11)·(y − D·u) + (B2 − L·B1)·u, x̂ = T⁻¹·(y − D·u, w + L·(y − D·u))
	f := ch.Sub(a22, ch.Mul(l, a12))
	fy := ch.Add(ch.Mul(f, l), ch.Sub(a21, ch.Mul(l, a11)))
	fu := ch.Sub(ch.Sub(b2, ch.Mul(l, b1)), ch.Mul(fy, p.D))
	straight := ch.Mul(inverse, system.Block([][]*value.Matrix{{system.Identity(outs)}, {l}}))
	q := &value.Plant{Every: p.Every, Title: "reduced observer", A: f, B: system.Block([][]*value.Matrix{{fu, fy}})}
	q.C = ch.Mul(inverse, system.Block([][]*value.Matrix{{system.Zero(outs, k)}, {system.Identity(k)}}))
	q.D = system.Block([][]*value.Matrix{{ch.Neg(ch.Mul(straight, p.D)), straight}})
	q.States = system.Numbered("w", k)
	q.Inputs = append(append([]value.Signal(nil), p.Inputs...), p.Outputs...)
	for _, s := range p.States {
		s.Name += "̂"
		q.Outputs = append(q.Outputs, s)
	}
	q.Inputs = distinct(q.Inputs)
	q.Notes = g.Remarks()
	q.Extra = []value.Named{{Name: "gain", Value: l}}
	t.Columns = system.Labels(p.States)
	q.Transformation = t
	return q, ch.Err
}

// distinct gives doubled names a prime.
func distinct(signals []value.Signal) []value.Signal {
	seen := map[string]bool{}
	for i := range signals {
		for seen[signals[i].Name] {
			signals[i].Name += "′"
		}
		seen[signals[i].Name] = true
	}
	return signals
}

// completion gives unit rows that complete the rows of c to a basis.
func completion(c *value.Matrix) (*value.Matrix, error) {
	x, err := system.Rational(c)
	if err != nil {
		return nil, err
	}
	p, n := x.Dims()
	_, pivots := x.Echelon()
	if len(pivots) < p {
		return nil, value.Errf(diag.Numerical, "plant", "the %d outputs depend on each other: only %d of them are independent", p, len(pivots)).
			WithHelp("leave out an output, P[[\"y1\", …], …], before making a reduced observer")
	}
	pivot := map[int]bool{}
	for _, k := range pivots {
		pivot[k] = true
	}
	var picks []int
	for i := range n {
		if !pivot[i] {
			picks = append(picks, i)
		}
	}
	return value.ExactMatrix(exact.Identity(n).Rows(picks...)), nil
}
