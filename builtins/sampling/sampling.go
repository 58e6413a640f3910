// Package sampling is the family that goes between continuous and sampled plants:
// holds, the bilinear map, their inverses, and input delays.
package sampling

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// heldFrom is the field by which a sampled plant remembers the continuous one; gain reads it.
const heldFrom = "continuous"

// Builtins lists the family.
func Builtins() []*value.Builtin {
	return []*value.Builtin{
		{
			Name: "sampled", Family: "sampling",
			Params: []value.Param{
				{Name: "plant", Shape: value.ASystem, Doc: "a continuous plant"},
				{Name: "every", Shape: value.ARate, Named: true, Doc: "the sample time, or the rate in Hz"},
				{Name: "between", Shape: value.AChoice, Choices: []string{"hold", "line", "bilinear"}, Named: true, Optional: true, Default: "\"hold\"", Doc: "what the input does between samples"},
				{Name: "exact_at", Shape: value.AFrequency, Named: true, Optional: true, Default: "0", Doc: "with bilinear: the frequency in rad/s that is kept"},
			},
			Result:  "sampled plant",
			Summary: "the plant as a controller that samples it sees it",
			Doc: "hold: the input is held between samples, A_d = exp(A·T), B_d = ∫exp(A·τ)dτ·B; exact at the samples, and exact in its numbers for chains of integrators. line: the input runs straight from sample to sample. " +
				"bilinear: s = α(z − 1)/(z + 1), α = 2/T, or ω/tan(ωT/2) with exact_at: ω; for redesigning filters rather than for plants. " +
				"A note warns of a sample time at which a mode is lost or nearly lost.",
			Examples: []value.Example{
				{Input: "sampled(plant([[0, 1], [0, 0]], [[0], [1]]), every: 0.1).A", Output: "=\n  1   0.1\n  0   1"},
			},
			Errors:  []string{"a plant that is sampled already", "exact_at at or above the Nyquist frequency", "entries that overflow"},
			Source:  "Franklin, Powell & Workman 1998, Digital Control of Dynamic Systems; exponential: Al-Mohy & Higham 2009",
			SeeAlso: []string{"continuous", "with_delay", "timed"},
			Func:    sampled,
		},
		{
			Name: "continuous", Family: "sampling",
			Params: []value.Param{
				{Name: "plant", Shape: value.ASystem, Doc: "a sampled plant"},
			},
			Result:  "continuous plant",
			Summary: "the continuous plant whose held samples are the given plant",
			Doc:     "The inverse of sampled(…, between: \"hold\") by the principal logarithm of A: of all plants with these samples the one whose modes turn less than half a turn a sample.",
			Examples: []value.Example{
				{Input: "continuous(sampled(plant([[-2]], [[1]]), every: 0.1)).A", Output: "≈\n  -2.0000"},
			},
			Errors:  []string{"a pole at z = 0 or on the negative axis, where no unique continuous plant exists", "a continuous plant"},
			Source:  "Al-Mohy & Higham 2012, SIAM J. Scientific Computing 34",
			SeeAlso: []string{"sampled"},
			Func:    continuous,
		},
		{
			Name: "with_delay", Family: "sampling",
			Params: []value.Param{
				{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
				{Name: "delay", Shape: value.ATime, Doc: "the delay of all inputs"},
				{Name: "pade", Shape: value.AWhole, Named: true, Optional: true, Doc: "of a continuous plant: the order of the Padé approximant for each input, 1 to 10"},
			},
			Result:  "plant with further states",
			Summary: "the plant with its inputs delayed, such as by computing time",
			Doc: "Sampled plant made by sampled(…) with a hold: exact for any delay, whole or fractional multiples of the sample time, by states that remember past inputs. " +
				"Another sampled plant: whole multiples only. Continuous plant: give pade: 3 or so; the approximant has gain 1 at all frequencies and the delay's phase up to about order/delay rad/s.",
			Examples: []value.Example{
				{Input: "poles(with_delay(plant([[0.5]], [[1]], every: 0.1), 0.1))", Output: "= [0, 0.5]"},
			},
			Errors:  []string{"a continuous plant without pade", "a fractional delay of a plant whose continuous origin is not known"},
			Source:  "Åström & Wittenmark 1997, Computer-Controlled Systems; Padé 1892",
			SeeAlso: []string{"sampled", "margins"},
			Func:    withDelay,
		},
	}
}

// shell copies names for a plant made from another.
func shell(p *value.Plant, every *value.Number, title string) *value.Plant {
	return &value.Plant{Every: every, States: p.States, Inputs: p.Inputs, Outputs: p.Outputs, X0: p.X0, U0: p.U0, Y0: p.Y0, Title: title}
}

// wrapped turns a dense matrix of the wanted shape into a value, with what the data's own uncertainty adds.
func wrapped(m *mat.Dense, r, c int, digits float64, data float64) *value.Matrix {
	if r == 0 || c == 0 {
		return system.Zero(r, c)
	}
	x := value.FromDense(m, digits)
	x.Err += data * mat.Norm(m, math.Inf(1))
	return x
}

// relativeError is the largest relative uncertainty of a plant's matrices.
func relativeError(p *value.Plant) float64 {
	worst := 0.0
	for _, m := range []*value.Matrix{p.A, p.B, p.C, p.D} {
		if d := m.Digits(); !math.IsInf(d, 1) && m.Err > 0 {
			worst = math.Max(worst, math.Pow(10, -d))
		}
	}
	return worst
}

func sampled(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	if p.Every != nil {
		return nil, value.Errf(diag.Type, "plant", "the plant is sampled already, every %g s", p.Every.Float64())
	}
	every := c.Number("every")
	t := every.Float64()
	n, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	between := c.Text("between", "hold")
	if c.Has("exact_at") && between != "bilinear" {
		return nil, value.Errf(diag.Type, "exact_at", "exact_at goes with between: \"bilinear\"")
	}
	if err := warnLost(c, p, t); err != nil {
		return nil, err
	}
	q := shell(p, &every, "sampled with "+between)
	data := relativeError(p)
	var a, b, cm, d *mat.Dense
	var cert numeric.Certificate
	var err error
	switch between {
	case "hold":
		if n == 0 {
			q.A, q.B, q.C, q.D = p.A, p.B, p.C, p.D
			return q, nil
		}
		if exactHold(q, p, every) {
			q.Title = "sampled with a hold"
			q.Extra = []value.Named{{Name: heldFrom, Value: p}}
			return q, nil
		}
		a, b, cert, err = numeric.Hold(p.A.Dense(), inputsOf(p.B, n), t)
		q.Title = "sampled with a hold"
		q.Extra = []value.Named{{Name: heldFrom, Value: p}}
	case "line":
		a, b, cm, d, cert, err = numeric.HoldLine(p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense(), t)
		q.Title = "sampled with straight lines"
	case "bilinear":
		w := c.Number("exact_at").Float64()
		if w < 0 || w*t >= math.Pi {
			return nil, value.Errf(diag.Numerical, "exact_at", "%g rad/s is not below the Nyquist frequency %.6g rad/s", w, math.Pi/t)
		}
		a, b, cm, d, cert, err = numeric.Bilinear(p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense(), t, w)
		q.Title = "sampled by the bilinear map"
	}
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	q.Notes = cert.Notes
	q.A, q.B = wrapped(a, n, n, cert.Digits, data), wrapped(b, n, m, cert.Digits, data)
	q.C, q.D = p.C, p.D
	if cm != nil {
		q.C, q.D = wrapped(cm, outs, n, cert.Digits, data), wrapped(d, outs, m, cert.Digits, data)
		q.X0 = nil
	}
	return q, nil
}

// exactHold samples chains of integrators, whose exponential is a finite series, over the rationals.
func exactHold(q, p *value.Plant, every value.Number) bool {
	n, m := system.PlantSize(p)
	if !system.ExactPlant(p) || !every.IsExact() || n+m > system.ExactOrder {
		return false
	}
	joined := system.Block([][]*value.Matrix{{p.A, p.B}, {system.Zero(m, n), system.Zero(m, m)}})
	e := system.NilpotentExponential(joined.Exact().Scale(every.Exact))
	if e == nil {
		return false
	}
	x := value.ExactMatrix(e)
	q.A, q.B, q.C, q.D = system.Slice(x, 0, n, 0, n), system.Slice(x, 0, n, n, n+m), p.C, p.D
	return true
}

// inputsOf gives B, or nil for a plant without inputs.
func inputsOf(b *value.Matrix, n int) *mat.Dense {
	if _, m := b.Dims(); m == 0 || n == 0 {
		return nil
	}
	return b.Dense()
}

// warnLost notes pairs of modes that sampling maps to one.
func warnLost(c *value.Call, p *value.Plant, t float64) error {
	n, m := system.PlantSize(p)
	if n < 2 || m == 0 {
		return nil
	}
	lost, err := numeric.LostAtSampling(p.A.Dense(), p.B.Dense(), t)
	if err != nil {
		return system.Refused(err, "plant")
	}
	for _, l := range lost {
		what := "are mapped to one and can no longer be moved or seen apart by one channel"
		if l.Offset > 1e-9 {
			what = "are nearly mapped to one and become hard to move or see apart"
		}
		c.Note(fmt.Sprintf("at this sample time the modes %s and %s %s (exactly at %.6g s)", complexText(l.First), complexText(l.Second), what, l.Period))
	}
	return nil
}

func complexText(z complex128) string {
	if imag(z) == 0 {
		return fmt.Sprintf("%.5g", real(z))
	}
	sign := "+"
	if imag(z) < 0 {
		sign = "-"
	}
	return fmt.Sprintf("%.5g %s %.5gi", real(z), sign, math.Abs(imag(z)))
}

func continuous(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	if p.Every == nil {
		return nil, value.Errf(diag.Type, "plant", "the plant is continuous already")
	}
	n, m := system.PlantSize(p)
	q := shell(p, nil, "continuous plant behind a hold")
	q.C, q.D = p.C, p.D
	if n == 0 {
		q.A, q.B = p.A, p.B
		return q, nil
	}
	a, b, cert, err := numeric.Continuous(p.A.Dense(), inputsOf(p.B, n), p.Every.Float64())
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	data := relativeError(p) * math.Max(1, cert.Condition)
	q.Notes = cert.Notes
	q.A, q.B = wrapped(a, n, n, cert.Digits, data), wrapped(b, n, m, cert.Digits, data)
	return q, nil
}

func withDelay(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	delay := c.Number("delay")
	if p.Every == nil {
		return padeDelay(c, p, delay.Float64())
	}
	if c.Has("pade") {
		return nil, value.Errf(diag.Type, "pade", "a sampled plant takes its delay exactly; leave pade out")
	}
	t := p.Every.Float64()
	steps := delay.Float64() / t
	if whole := math.Round(steps); math.Abs(steps-whole) < 1e-9 {
		if whole > 1000 {
			return nil, value.Errf(diag.Limit, "delay", "the delay is %g samples; at most 1000 are kept as states", whole)
		}
		return shifted(p, int(whole))
	}
	for _, e := range p.Extra {
		held, ok := e.Value.(*value.Plant)
		if !ok || e.Name != heldFrom {
			continue
		}
		if math.Ceil(steps) > 1000 {
			return nil, value.Errf(diag.Limit, "delay", "the delay is %g samples; at most 1000 are kept as states", steps)
		}
		return fractional(p, held, t, delay.Float64())
	}
	return nil, value.Errf(diag.Numerical, "delay", "the delay is %.6g samples; the part between samples needs the continuous plant", steps).
		WithHelp("make the sampled plant by sampled(P, every: …) and delay that")
}

// pastInputs names the states that remember inputs: F⟨1⟩ is F one sample ago.
func pastInputs(p *value.Plant, steps int) []value.Signal {
	var out []value.Signal
	for k := steps; k >= 1; k-- {
		for _, s := range p.Inputs {
			s.Name = fmt.Sprintf("%s_%d", s.Name, k)
			out = append(out, s)
		}
	}
	return out
}

// shifted delays all inputs by whole samples, exactly: the states appended last are the inputs of the last samples, oldest first.
func shifted(p *value.Plant, steps int) (value.Value, error) {
	if steps == 0 {
		return p, nil
	}
	n, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	k := steps * m
	q := shell(p, p.Every, fmt.Sprintf("with inputs delayed by %d samples", steps))
	if steps == 1 {
		q.Title = "with inputs delayed by 1 sample"
	}
	rest := k - m
	q.A = system.Block([][]*value.Matrix{
		{p.A, p.B, system.Zero(n, rest)},
		{system.Zero(rest, n), system.Zero(rest, m), system.Identity(rest)},
		{system.Zero(m, n), system.Zero(m, m), system.Zero(m, rest)},
	})
	q.B = system.Block([][]*value.Matrix{{system.Zero(n+rest, m)}, {system.Identity(m)}})
	q.C = system.Block([][]*value.Matrix{{p.C, p.D, system.Zero(outs, rest)}})
	q.D = system.Zero(outs, m)
	q.States = append(append([]value.Signal(nil), p.States...), pastInputs(p, steps)...)
	q.X0 = nil
	return q, nil
}

// fractional delays the inputs of a held plant by a delay that is no whole number of samples.
func fractional(p, held *value.Plant, t, delay float64) (value.Value, error) {
	_, m := system.PlantSize(p)
	outs, _ := p.C.Dims()
	a, b, cm, d, cert, err := numeric.DelayedHold(held.A.Dense(), held.B.Dense(), held.C.Dense(), held.D.Dense(), t, delay)
	if err != nil {
		return nil, system.Refused(err, "delay")
	}
	k, _ := a.Dims()
	q := shell(p, p.Every, fmt.Sprintf("sampled with a hold, inputs delayed by %.6g samples", delay/t))
	data := relativeError(held)
	q.A, q.B = wrapped(a, k, k, cert.Digits, data), wrapped(b, k, m, cert.Digits, data)
	q.C, q.D = wrapped(cm, outs, k, cert.Digits, data), wrapped(d, outs, m, cert.Digits, data)
	n, _ := system.PlantSize(p)
	past := pastInputs(p, (k-n)/max(m, 1))
	q.States = append(append([]value.Signal(nil), p.States...), past...)
	q.X0, q.Notes = nil, cert.Notes
	return q, nil
}

func padeDelay(c *value.Call, p *value.Plant, delay float64) (value.Value, error) {
	if !c.Has("pade") {
		return nil, value.Errf(diag.Type, "", "a delay of a continuous plant has no finite number of states").
			WithHelp("approximate it: with_delay(P, %g s, pade: 3); or sample first and delay the sampled plant exactly", delay)
	}
	order := int(c.Number("pade").Float64())
	if order < 1 || order > 10 {
		return nil, value.Errf(diag.Numerical, "pade", "the order %d is outside 1 to 10", order)
	}
	a, b, cm, d, err := numeric.PadeDelay(order, delay)
	if err != nil {
		return nil, system.Refused(err, "delay")
	}
	n, m := system.PlantSize(p)
	// the delays stand before the plant: u → m parallel approximants → plant
	k := order * m
	ad, bd, cd, dd := mat.NewDense(max(k, 1), max(k, 1), nil), mat.NewDense(max(k, 1), max(m, 1), nil), mat.NewDense(max(m, 1), max(k, 1), nil), mat.NewDense(max(m, 1), max(m, 1), nil)
	if m == 0 {
		return p, nil
	}
	var names []value.Signal
	for j := range m {
		for r := range order {
			for s := range order {
				ad.Set(j*order+r, j*order+s, a.At(r, s))
			}
			bd.Set(j*order+r, j, b.At(r, 0))
			cd.Set(j, j*order+r, cm.At(0, r))
			name := p.Inputs[j]
			name.Name = fmt.Sprintf("%s_delay%d", name.Name, r+1)
			name.Unit, name.Range = value.None(), nil
			names = append(names, name)
		}
		dd.Set(j, j, d.At(0, 0))
	}
	wrap := func(x *mat.Dense) *value.Matrix { return value.FromDense(x, 15.9) }
	var ch system.Chain
	q := shell(p, nil, fmt.Sprintf("with inputs delayed by %.6g s, Padé order %d", delay, order))
	q.A = system.Block([][]*value.Matrix{{p.A, ch.Mul(p.B, wrap(cd))}, {system.Zero(k, n), wrap(ad)}})
	q.B = system.Block([][]*value.Matrix{{ch.Mul(p.B, wrap(dd))}, {wrap(bd)}})
	q.C = system.Block([][]*value.Matrix{{p.C, ch.Mul(p.D, wrap(cd))}})
	q.D = ch.Mul(p.D, wrap(dd))
	q.States = append(append([]value.Signal(nil), p.States...), names...)
	q.X0 = nil
	return q, ch.Err
}
