package gain

import (
	"context"
	"math"
	"math/big"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var optimalBuiltins = []*value.Builtin{
	{
		Name: "quadratic_gain", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant with n states and m inputs"},
			{Name: "states", Shape: value.AMatrix, Named: true, Optional: true, Default: "with weights \"ranges\": the identity", Doc: "Q, n×n symmetric: the weight of the states"},
			{Name: "inputs", Shape: value.AMatrix, Named: true, Optional: true, Default: "with weights \"ranges\": the identity", Doc: "R, m×m symmetric: the weight of the inputs"},
			{Name: "cross", Shape: value.AMatrix, Named: true, Optional: true, Default: "zero", Doc: "N, n×m: the weight of x with u"},
			{Name: "weights", Shape: value.AChoice, Choices: []string{"as given", "ranges"}, Named: true, Optional: true, Default: "\"as given\"", Doc: "\"ranges\": weights in units of the declared ranges, 1/range² (Bryson's rule)"},
			{Name: "cost", Shape: value.AChoice, Choices: []string{"of the samples", "continuous"}, Named: true, Optional: true, Default: "\"of the samples\"", Doc: "\"continuous\": of a plant made by sampled(…) with a hold, the integral between the samples is weighted"},
		},
		Result:  "gain K, m×n, of the law u = u₀ − K·(x − x₀)",
		Summary: "the gain that minimises a quadratic cost of states and inputs",
		Doc: "Minimises ∫ xᵀQx + uᵀRu + 2xᵀNu dt, or the sum over the samples for a sampled plant, through the stabilising solution of the Riccati equation. " +
			"Fields: values, poles, cost (the Riccati solution), residual, condition, sensitivity, method. " +
			"Q may be indefinite where a stabilising solution exists; R of a sampled plant may be zero.",
		Examples: []value.Example{
			{Input: "quadratic_gain(plant([[0, 1], [0, 0]], [[0], [1]]), states: [[1, 0], [0, 2]], inputs: [[1]]).values", Output: "≈\n          x1       x2\n  u   1.0000   2.0000"},
		},
		Errors:  []string{"an unstable mode that no input moves, named", "a mode on the axis (circle) that no weight sees, named", "R that is not positive definite (continuous)", "weights that are not symmetric", "ranges that are not declared"},
		Source:  "Kalman 1960, Bol. Soc. Mat. Mexicana 5; Laub 1979; Chu, Fan & Lin 2005; Van Loan 1978",
		SeeAlso: []string{"kalman_gain", "riccati", "assign_poles", "sampled_weights"},
		Func:    quadraticGain,
	},
	{
		Name: "kalman_gain", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant with n states and p outputs"},
			{Name: "process", Shape: value.AMatrix, Named: true, Doc: "W: intensity (sampled: covariance) of the process noise, n×n in state coordinates, or that of the noise that enters through G"},
			{Name: "measurement", Shape: value.AMatrix, Named: true, Doc: "V, p×p: intensity (sampled: covariance) of the measurement noise"},
			{Name: "enters", Shape: value.AMatrix, Named: true, Optional: true, Default: "the identity", Doc: "G, n×q: how the process noise enters, W is then q×q"},
			{Name: "cross", Shape: value.AMatrix, Named: true, Optional: true, Default: "zero", Doc: "n×p (q×p with enters): covariance of process with measurement noise"},
			{Name: "form", Shape: value.AChoice, Choices: []string{"predictor", "current"}, Named: true, Optional: true, Default: "\"predictor\"", Doc: "of a sampled plant, as for observer_gain"},
			{Name: "noise", Shape: value.AChoice, Choices: []string{"of the samples", "continuous"}, Named: true, Optional: true, Default: "\"of the samples\"", Doc: "\"continuous\": W is an intensity, of a plant made by sampled(…)"},
		},
		Result:  "gain L, n×p, in x̂' = A·x̂ + B·u + L·(y − ŷ)",
		Summary: "the steady Kalman filter's gain from noise intensities",
		Doc: "Continuous: L = P·Cᵀ·V⁻¹. Sampled predictor: L = A·P·Cᵀ·(C·P·Cᵀ + V)⁻¹; form \"current\": L = P·Cᵀ·(C·P·Cᵀ + V)⁻¹, P the covariance before the measurement. " +
			"Fields: values, poles (of the estimation error), cost (P), residual, condition, sensitivity, method.",
		Examples: []value.Example{
			{Input: "kalman_gain(plant([[0]], [[1]]), process: [[4]], measurement: [[1]]).values", Output: "≈\n           y\n  x   2.0000"},
		},
		Errors:  []string{"an unstable mode that no output sees, named", "V that is not positive definite (continuous)", "intensities that are not symmetric"},
		Source:  "Kalman & Bucy 1961, J. Basic Engineering 83; Kalman 1960, J. Basic Engineering 82",
		SeeAlso: []string{"quadratic_gain", "observer_gain", "riccati", "sampled_noise"},
		Func:    kalmanGain,
	},
	{
		Name: "riccati", Family: "gain",
		Params: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "B", Shape: value.AMatrix, Doc: "n×m"},
			{Name: "states", Shape: value.ASquare, Named: true, Doc: "Q, n×n symmetric"},
			{Name: "inputs", Shape: value.ASquare, Named: true, Doc: "R, m×m symmetric"},
			{Name: "cross", Shape: value.AMatrix, Named: true, Optional: true, Default: "zero", Doc: "N, n×m"},
			{Name: "sampled", Shape: value.ABoolean, Named: true, Optional: true, Default: "false", Doc: "the discrete equation"},
		},
		Result:  "report",
		Summary: "the stabilising solution of an algebraic Riccati equation",
		Doc: "AᵀX + XA − (XB + N)R⁻¹(BᵀX + Nᵀ) + Q = 0, or AᵀXA − X − (AᵀXB + N)(R + BᵀXB)⁻¹(BᵀXA + Nᵀ) + Q = 0 when sampled. " +
			"Fields: solution, gain, poles, residual, condition, method, last_step.",
		Examples: []value.Example{
			{Input: "riccati([[1]], [[1]], states: [[0]], inputs: [[1]]).solution", Output: "≈\n  2.0000"},
		},
		Errors:  []string{"no stabilising solution, with the mode that stands against it"},
		Source:  "Laub 1979, IEEE Trans. Automatic Control 24; Kleinman 1968; Chu, Fan & Lin 2005, Linear Algebra Appl. 396",
		SeeAlso: []string{"quadratic_gain", "kalman_gain", "lyapunov"},
		Func:    riccati,
	},
}

// symmetric checks the size and symmetry of a weight.
func symmetric(m *value.Matrix, n int, param, what string) error {
	r, c := m.Dims()
	if r != n || c != n {
		return value.Errf(diag.Shape, param, "the weight is %d×%d; %s needs %d×%d", r, c, what, n, n)
	}
	if m.IsComplex() {
		return value.Errf(diag.Type, param, "the weight must be real")
	}
	re, _ := m.Floats()
	big := 0.0
	for _, x := range re {
		big = math.Max(big, math.Abs(x))
	}
	for i := range n {
		for j := range i {
			if d := math.Abs(re[i*n+j] - re[j*n+i]); d > 1e-12*big+2*m.Err {
				return value.Errf(diag.Numerical, param, "the weight is not symmetric: entries [%d, %d] and [%d, %d] differ by %.3g", i+1, j+1, j+1, i+1, d)
			}
		}
	}
	return nil
}

// weightsOf reads Q, R and N of a quadratic cost.
func weightsOf(c *value.Call, p *value.Plant) (q, r, cross *value.Matrix, err error) {
	n, m := system.PlantSize(p)
	q, r, cross = c.Matrix("states"), c.Matrix("inputs"), c.Matrix("cross")
	ranged := c.Text("weights", "as given") == "ranges"
	if !ranged {
		for name, w := range map[string]*value.Matrix{"states": q, "inputs": r} {
			if w == nil {
				return nil, nil, nil, value.Errf(diag.Type, "", "the weight of the %s is missing", name).
					WithHelp("give %s: …, or weights: \"ranges\"", name)
			}
		}
	}
	if q == nil {
		q = system.Identity(n)
	}
	if r == nil {
		r = system.Identity(m)
	}
	if err = symmetric(q, n, "states", "this plant"); err != nil {
		return nil, nil, nil, err
	}
	if err = symmetric(r, m, "inputs", "this plant"); err != nil {
		return nil, nil, nil, err
	}
	if cross != nil {
		if rr, cc := cross.Dims(); rr != n || cc != m {
			return nil, nil, nil, value.Errf(diag.Shape, "cross", "the cross weight is %d×%d; this plant needs %d×%d", rr, cc, n, m)
		}
	}
	if !ranged {
		return q, r, cross, nil
	}
	dx, err := inverseRanges(p.States, "states")
	if err != nil {
		return nil, nil, nil, err
	}
	du, err := inverseRanges(p.Inputs, "inputs")
	if err != nil {
		return nil, nil, nil, err
	}
	var ch system.Chain
	q, r = ch.Mul(dx, q, dx), ch.Mul(du, r, du)
	if cross != nil {
		cross = ch.Mul(dx, cross, du)
	}
	return q, r, cross, ch.Err
}

// inverseRanges is diag(1/range).
func inverseRanges(signals []value.Signal, what string) (*value.Matrix, error) {
	isExact := true
	for _, s := range signals {
		if s.Range == nil {
			return nil, value.Errf(diag.Type, "weights", "%q has no declared range, so its weight is unknown", s.Name).
				WithHelp("declare it: \"%s in … range …\", or give the weights of the %s", s.Name, what)
		}
		isExact = isExact && s.Range.IsExact()
	}
	n := len(signals)
	if isExact {
		d := exact.NewMatrix(n, n)
		for i, s := range signals {
			d.Set(i, i, new(big.Rat).Inv(s.Range.Exact))
		}
		return value.ExactMatrix(d), nil
	}
	data := make([]float64, n*n)
	for i, s := range signals {
		data[i*n+i] = 1 / s.Range.Float64()
	}
	return value.FloatMatrix(n, n, data, 0), nil
}

func dense(m *value.Matrix) *mat.Dense {
	if m == nil {
		return nil
	}
	return m.Dense()
}

func quadraticGain(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	q, r, cross, err := weightsOf(c, p)
	if err != nil {
		return nil, err
	}
	if c.Text("cost", "of the samples") == "continuous" {
		if q, r, cross, err = betweenSamples(c, p, q, r, cross); err != nil {
			return nil, err
		}
	}
	s, err := solveRiccati(c.Context, p.A, p.B, q, r, cross, p.Every != nil)
	if err != nil {
		return nil, err
	}
	g := &value.Gain{Role: "state feedback", Plant: p, X0: p.X0, U0: p.U0}
	if err := s.fill(g, p.A, p.B, false); err != nil {
		return nil, err
	}
	named(g, p.Inputs, p.States)
	g.Cost.Rows, g.Cost.Columns = system.Labels(p.States), system.Labels(p.States)
	return g, nil
}

// solved is a Riccati solution with the uncertainty of the data in its error estimates.
type solved struct {
	*numeric.RiccatiSolution
	x, k *value.Matrix
}

func solveRiccati(ctx context.Context, a, b, q, r, cross *value.Matrix, sampled bool) (*solved, error) {
	n, _ := a.Dims()
	_, m := b.Dims()
	if n == 0 || m == 0 {
		return nil, value.Errf(diag.Shape, "plant", "an optimal gain needs at least one state and one channel to act through")
	}
	s, err := numeric.Riccati(ctx, numeric.RiccatiProblem{A: a.Dense(), B: b.Dense(), Q: q.Dense(), R: r.Dense(), N: dense(cross), Sampled: sampled})
	if err != nil {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		return nil, value.Errf(diag.Numerical, "", "%v", err)
	}
	out := &solved{RiccatiSolution: s, x: value.FromDense(s.X, s.Certificate.Digits), k: value.FromDense(s.K, s.GainDigits)}
	data := relative(a) + relative(b) + relative(q) + relative(r)
	if cond := s.Certificate.Condition; data > 0 && cond > 0 && !math.IsInf(cond, 0) {
		out.x.Err += cond * data * size(out.x)
		out.k.Err += cond * data * size(out.k)
	}
	return out, nil
}

func size(m *value.Matrix) float64 {
	re, _ := m.Floats()
	big := 0.0
	for _, x := range re {
		big = math.Max(big, math.Abs(x))
	}
	return big
}

// fill puts the solution into a gain; with dual set the gain is Lᵀ for (Aᵀ, Cᵀ).
func (s *solved) fill(g *value.Gain, a, b *value.Matrix, dual bool) error {
	t := &task{a: a, b: b, dual: dual}
	g.Method = s.Certificate.Method
	g.Notes = append(g.Notes, s.Certificate.Notes...)
	residual, condition := value.Float(s.Certificate.Residual), value.Float(s.Certificate.Condition)
	g.Residual = &residual
	if condition.F > 0 {
		g.Condition = &condition
	}
	g.Cost = s.x
	return t.complete(g, s.k)
}

// poles are those of A − B·K, with what the error of K leaves uncertain.
func (s *solved) poles(a, b *value.Matrix) ([]system.Root, error) {
	t := &task{a: a, b: b}
	loop, err := t.loop(s.k)
	if err != nil {
		return nil, err
	}
	if n, _ := loop.Dims(); n == 0 {
		return nil, nil
	}
	return system.EigenvaluesWithin(loop.Dense(), t.loopRounding(s.k, s.k.Err))
}

func kalmanGain(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	n, _ := system.PlantSize(p)
	outs, _ := p.C.Dims()
	w, v, cross := c.Matrix("process"), c.Matrix("measurement"), c.Matrix("cross")
	form := c.Text("form", "predictor")
	if form == "current" && p.Every == nil {
		return nil, value.Errf(diag.Type, "form", "the current form is for sampled plants; this one is continuous")
	}
	var ch system.Chain
	if enters := c.Matrix("enters"); enters != nil {
		r, q := enters.Dims()
		if r != n {
			return nil, value.Errf(diag.Shape, "enters", "G is %d×%d; it needs %d rows, one a state", r, q, n)
		}
		if err := symmetric(w, q, "process", "noise through G"); err != nil {
			return nil, err
		}
		w = ch.Mul(enters, w, ch.Transpose(enters))
		if cross != nil {
			cross = ch.Mul(enters, cross)
		}
	}
	if ch.Err != nil {
		return nil, ch.Err
	}
	if err := symmetric(w, n, "process", "this plant"); err != nil {
		return nil, err
	}
	if err := symmetric(v, outs, "measurement", "this plant"); err != nil {
		return nil, err
	}
	if cross != nil {
		if r, k := cross.Dims(); r != n || k != outs {
			return nil, value.Errf(diag.Shape, "cross", "the cross covariance is %d×%d; this plant needs %d×%d", r, k, n, outs)
		}
	}
	if c.Text("noise", "of the samples") == "continuous" {
		var err error
		if w, err = noiseBetweenSamples(p, w); err != nil {
			return nil, err
		}
	}
	at, ct := ch.Transpose(p.A), ch.Transpose(p.C)
	if ch.Err != nil {
		return nil, ch.Err
	}
	s, err := solveRiccati(c.Context, at, ct, w, v, cross, p.Every != nil)
	if err != nil {
		return nil, err
	}
	g := &value.Gain{Role: "observer", Plant: p}
	if err := s.fill(g, at, ct, true); err != nil {
		return nil, err
	}
	if form == "current" {
		// L = P·Cᵀ·(C·P·Cᵀ + V)⁻¹; the error then moves by A − L·C·A with the predictor's poles
		pc := ch.Mul(s.x, ct)
		l := ch.Mul(pc, ch.Inverse(ch.Add(ch.Mul(p.C, pc), v)))
		if ch.Err != nil {
			return nil, ch.Err
		}
		l.Err = math.Max(l.Err, size(l)*math.Pow(10, -s.GainDigits))
		g.Values = l
	}
	if p.Every != nil {
		g.Extra = append(g.Extra, value.Named{Name: "form", Value: value.Text(form)})
	}
	named(g, p.States, p.Outputs)
	g.Cost.Rows, g.Cost.Columns = system.Labels(p.States), system.Labels(p.States)
	return g, nil
}

func riccati(c *value.Call) (value.Value, error) {
	a, b, q, r, cross := c.Matrix("A"), c.Matrix("B"), c.Matrix("states"), c.Matrix("inputs"), c.Matrix("cross")
	p, err := barePlant(a, b, nil)
	if err != nil {
		return nil, err
	}
	n, m := system.PlantSize(p)
	if err := symmetric(q, n, "states", "A"); err != nil {
		return nil, err
	}
	if err := symmetric(r, m, "inputs", "B"); err != nil {
		return nil, err
	}
	if cross != nil {
		if rr, cc := cross.Dims(); rr != n || cc != m {
			return nil, value.Errf(diag.Shape, "cross", "N is %d×%d; it must be %d×%d", rr, cc, n, m)
		}
	}
	s, err := solveRiccati(c.Context, a, b, q, r, cross, c.Truth("sampled"))
	if err != nil {
		return nil, err
	}
	poles, err := s.poles(a, b)
	if err != nil {
		return nil, err
	}
	return &value.Report{Title: "stabilising solution of the Riccati equation", Fields: []value.Named{
		{Name: "solution", Value: s.x},
		{Name: "gain", Value: s.k},
		{Name: "poles", Value: system.List(poles)},
		{Name: "residual", Value: value.Float(s.Certificate.Residual)},
		{Name: "condition", Value: value.Float(s.Certificate.Condition)},
		{Name: "last_step", Value: value.Float(s.LastNewtonStep)},
		{Name: "method", Value: value.Text(s.Certificate.Method)},
	}, Notes: s.Certificate.Notes}, nil
}
