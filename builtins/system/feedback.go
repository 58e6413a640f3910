package system

import (
	"fmt"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

// referenceEnters is the field of an augmented plant that tells how the references drive its integrators.
const referenceEnters = "reference_enters"

var feedbackBuiltins = []*value.Builtin{
	{
		Name: "closed", Family: "system",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant with n states, m inputs, p outputs"},
			{Name: "feedback", Shape: value.Anything, Doc: "a state-feedback gain K (m×n), or a system H from y to −u"},
			{Name: "reference", Shape: value.AGain, Optional: true, Default: "none: the input is u", Doc: "N (m×p): the law is u = −K·x + N·r"},
		},
		Result:  "plant",
		Summary: "the closed loop under u = −K·x (+ N·r), or under u = −H·y",
		Doc: "With a gain K, taken as the numbers it holds: x' = (A − B·K)·x + B·u and y = (C − D·K)·x + D·u; with N as well the input is r through B·N. " +
			"With a system H: the loop with negative feedback u = v − H·y, whose input is v at the plant's input. " +
			"A loop through both direct terms is solved when I + D·D_H is invertible. " +
			"A plant made by with_integrators keeps its references as further inputs, so that the closed loop can be driven by r.",
		Examples: []value.Example{
			{Input: "P = plant([[0, 1], [0, 0]], [[0], [1]], [[1, 0]])\npoles(closed(P, [[2, 3]]))", Output: "= [-1, -2]"},
		},
		Errors:  []string{"sizes that do not agree", "sample times that differ", "an algebraic loop without a solution"},
		Source:  "definition",
		SeeAlso: []string{"assign_poles", "compensator", "return_ratio"},
		Func:    closed,
	},
	{
		Name: "compensator", Family: "system",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant the two gains were made for"},
			{Name: "gain", Shape: value.AGain, Named: true, Doc: "the state-feedback gain K (m×n)"},
			{Name: "observer", Shape: value.AGain, Named: true, Doc: "the observer gain L (n×p)"},
		},
		Result:  "plant: the system H from y to −u",
		Summary: "observer and state feedback as one system H, u = −H·y",
		Doc: "x̂' = (A − B·K − L·C + L·D·K)·x̂ + L·y and −u = K·x̂. For a sampled plant the observer is the predictor, " +
			"unless the observer gain was made with form \"current\": then x̂ is corrected by the newest y before u is formed, and H has a direct term K·L.",
		Examples: []value.Example{
			{Input: "P = plant([[0, 1], [0, 0]], [[0], [1]], [[1, 0]])\nH = compensator(P, gain: [[2, 3]], observer: [[7], [12]])\npoles(closed(P, H))", Output: "= [-1, -2, -3, -4]"},
		},
		Errors:  []string{"gains whose sizes do not fit the plant", "the current form with a direct term D"},
		Source:  "Luenberger 1966, IEEE Trans. Automatic Control 11; current form: Franklin, Powell & Workman, common practice",
		SeeAlso: []string{"closed", "return_ratio", "observer_gain"},
		Func:    compensator,
	},
	{
		Name: "return_ratio", Family: "system",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
			{Name: "feedback", Shape: value.Anything, Doc: "a gain K (m×n), or a system H from y to −u"},
		},
		Result:  "plant: m inputs, m outputs",
		Summary: "the loop broken at the plant's input: K·(sI − A)⁻¹·B, or H·P",
		Doc:     "What comes back, with its sign turned, when the loop is cut at the plant's input. Its margins are the loop's margins there.",
		Examples: []value.Example{
			{Input: "P = plant([[0, 1], [0, 0]], [[0], [1]], [[1, 0]])\ntransfer(return_ratio(P, [[2, 3]]))", Output: "= (3*s + 2)/s^2"},
		},
		Errors:  []string{"sizes that do not agree"},
		Source:  "Bode 1945, Network Analysis and Feedback Amplifier Design",
		SeeAlso: []string{"closed", "margins"},
		Func:    returnRatio,
	},
	{
		Name: "with_integrators", Family: "system",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
			{Name: "outputs", Shape: value.NameList, Doc: "names of the outputs (or of states) to follow a reference without error"},
		},
		Result:  "plant with a state more for each name",
		Summary: "appends integrators of r − y as last states, for feedback without offset",
		Doc: "ξ' = r − y, appended last: A becomes [[A, 0], [−C, 0]] and B becomes [[B], [−D]] for the chosen outputs. " +
			"For a sampled plant ξ⁺ = ξ + (r − y). The gain for the new states comes out negative when the plant's static gain is positive. " +
			"closed(…) of the result has the references as further inputs.",
		Examples: []value.Example{
			{Input: "P = plant([[0, 1], [0, -1]], [[0], [1]], [[1, 0]], outputs: [\"y\"])\nassign_poles(with_integrators(P, [\"y\"]), [-2, -1 ± 1i]).values", Output: "=\n      x1   x2   ∫y\n  u    6    3   -4"},
		},
		Errors:  []string{"a name that is no output and no state"},
		Source:  "common practice",
		SeeAlso: []string{"assign_poles", "closed", "reference_gain"},
		Func:    withIntegrators,
	},
}

func closed(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	feedback := c.Args["feedback"]
	if g, ok := feedback.(*value.Gain); ok {
		feedback = g.Values
	}
	switch f := feedback.(type) {
	case *value.Plant, *value.Transfer, *value.Polynomial, *value.Model:
		if c.Has("reference") {
			return nil, value.Errf(diag.Type, "reference", "a reference gain goes with a state-feedback gain; multiply the loop by N instead")
		}
		h, err := value.ToPlant(f)
		if err != nil {
			return nil, err
		}
		return closedBySystem(p, h)
	}
	k, err := gainMatrix(p, feedback, "feedback")
	if err != nil {
		return nil, err
	}
	return ClosedByGain(p, k, c.Args["reference"])
}

// gainMatrix coerces a state-feedback gain and checks that it fits the plant.
func gainMatrix(p *value.Plant, v value.Value, param string) (*value.Matrix, error) {
	coerced, err := value.Coerce(value.Param{Name: param, Shape: value.AMatrix}, v)
	if err != nil {
		return nil, err
	}
	k := coerced.(*value.Matrix)
	n, m := PlantSize(p)
	r, col := k.Dims()
	if r != m || col != n {
		return nil, value.Errf(diag.Shape, param, "the gain is %d×%d; a plant with %d inputs and %d states needs %d×%d", r, col, m, n, m, n)
	}
	return asHeld(k), nil
}

// asHeld is a gain as the numbers that it holds: what was uncertain about how it was found
// is no uncertainty of the loop that these numbers close.
func asHeld(gain *value.Matrix) *value.Matrix {
	if gain.IsExact() || gain.Err == 0 {
		return gain
	}
	held := *gain
	held.Err = 0
	return &held
}

// PlantSize gives the numbers of states and inputs.
func PlantSize(p *value.Plant) (states, inputs int) {
	n, _ := p.A.Dims()
	_, m := p.B.Dims()
	return n, m
}

// ClosedByGain is the loop under u = −K·x + v, or + N·r when a reference gain is given.
func ClosedByGain(p *value.Plant, k *value.Matrix, reference value.Value) (*value.Plant, error) {
	var ch Chain
	q := derived(p, "closed loop")
	q.A = ch.Sub(p.A, ch.Mul(p.B, k))
	q.C = ch.Sub(p.C, ch.Mul(p.D, k))
	if reference != nil {
		n := gainValues(reference)
		r, cols := n.Dims()
		if _, m := PlantSize(p); r != m {
			return nil, value.Errf(diag.Shape, "reference", "the reference gain has %d rows; the plant has %d inputs", r, m)
		}
		q.B, q.D = ch.Mul(p.B, n), ch.Mul(p.D, n)
		q.Inputs = referenceSignals(reference, cols)
		return q, ch.Err
	}
	if enters := ReferenceEnters(p); enters != nil {
		_, refs := enters.Dims()
		outs, _ := p.D.Dims()
		q.B = Block([][]*value.Matrix{{p.B, enters}})
		q.D = Block([][]*value.Matrix{{p.D, Zero(outs, refs)}})
		for _, name := range enters.Columns {
			q.Inputs = append(append([]value.Signal(nil), q.Inputs...), value.Signal{Name: name, Unit: value.None()})
		}
	}
	return q, ch.Err
}

// ReferenceEnters tells how references drive the integrators of a plant made by
// with_integrators: n×k, columns named; nil for any other plant.
func ReferenceEnters(p *value.Plant) *value.Matrix {
	for _, e := range p.Extra {
		if m, ok := e.Value.(*value.Matrix); ok && e.Name == referenceEnters {
			return m
		}
	}
	return nil
}

func gainValues(v value.Value) *value.Matrix {
	if g, ok := v.(*value.Gain); ok {
		return asHeld(g.Values)
	}
	return asHeld(v.(*value.Matrix))
}

func referenceSignals(reference value.Value, n int) []value.Signal {
	if g, ok := reference.(*value.Gain); ok && len(g.ColumnSignals) == n {
		return g.ColumnSignals
	}
	return Numbered("r", n)
}

// Numbered makes n signals named stem1 … stemn, or stem alone for one.
func Numbered(stem string, n int) []value.Signal {
	s := make([]value.Signal, n)
	for i := range s {
		s[i] = value.Signal{Name: fmt.Sprintf("%s%d", stem, i+1), Unit: value.None()}
	}
	if n == 1 {
		s[0].Name = stem
	}
	return s
}

// derived copies a plant's names and sample time for a system made from it.
func derived(p *value.Plant, title string) *value.Plant {
	return &value.Plant{A: p.A, B: p.B, C: p.C, D: p.D, Every: p.Every, States: p.States, Inputs: p.Inputs,
		Outputs: p.Outputs, X0: p.X0, U0: p.U0, Y0: p.Y0, Title: title}
}

// sameTime tells whether two sample times agree.
func sameTime(a, b *value.Number) bool {
	if a == nil || b == nil {
		return a == b
	}
	if a.IsExact() && b.IsExact() {
		return a.Exact.Cmp(b.Exact) == 0
	}
	return a.Float64() == b.Float64()
}

func describeTime(t *value.Number) string {
	if t == nil {
		return "continuous"
	}
	return fmt.Sprintf("sampled every %g s", t.Float64())
}

// closedBySystem is the loop u = v − H·y with states (x, x_H).
func closedBySystem(p, h *value.Plant) (*value.Plant, error) {
	_, m := PlantSize(p)
	outs, _ := p.C.Dims()
	hOut, _ := h.C.Dims()
	_, hIn := h.B.Dims()
	if hIn != outs || hOut != m {
		return nil, value.Errf(diag.Shape, "feedback", "the feedback system has %d inputs and %d outputs; the plant needs one with %d inputs (its outputs) and %d outputs (its inputs)", hIn, hOut, outs, m)
	}
	if n, _ := h.A.Dims(); !sameTime(p.Every, h.Every) && n > 0 {
		return nil, value.Errf(diag.Type, "feedback", "the plant is %s and the feedback is %s", describeTime(p.Every), describeTime(h.Every))
	}
	var ch Chain
	// u = v − D_H·y − C_H·x_H and y = C·x + D·u, so (I + D_H·D)·u = v − D_H·C·x − C_H·x_H
	e, err := Inverse(ch.Add(Identity(m), ch.Mul(h.D, p.D)))
	if err != nil {
		return nil, value.Errf(diag.Numerical, "feedback", "the loop through the direct terms has no solution: I + D_H·D is singular")
	}
	ux := ch.Neg(ch.Mul(e, h.D, p.C))
	uh := ch.Neg(ch.Mul(e, h.C))
	yx := ch.Add(p.C, ch.Mul(p.D, ux))
	yh := ch.Mul(p.D, uh)
	q := derived(p, "closed loop")
	q.A = Block([][]*value.Matrix{
		{ch.Add(p.A, ch.Mul(p.B, ux)), ch.Mul(p.B, uh)},
		{ch.Mul(h.B, yx), ch.Add(h.A, ch.Mul(h.B, yh))},
	})
	q.B = Block([][]*value.Matrix{{ch.Mul(p.B, e)}, {ch.Mul(h.B, p.D, e)}})
	q.C = Block([][]*value.Matrix{{yx, yh}})
	q.D = ch.Mul(p.D, e)
	q.States = append(append([]value.Signal(nil), p.States...), renamed(h.States, p.States)...)
	q.X0 = nil
	return q, ch.Err
}

// renamed gives signals names that do not occur among the taken ones, by adding primes.
func renamed(signals, taken []value.Signal) []value.Signal {
	used := map[string]bool{}
	for _, s := range taken {
		used[s.Name] = true
	}
	out := append([]value.Signal(nil), signals...)
	for i := range out {
		for used[out[i].Name] {
			out[i].Name += "′"
		}
		used[out[i].Name] = true
	}
	return out
}

func compensator(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	n, _ := PlantSize(p)
	outs, _ := p.C.Dims()
	k, err := gainMatrix(p, c.Args["gain"], "gain")
	if err != nil {
		return nil, err
	}
	l := gainValues(c.Args["observer"])
	if r, col := l.Dims(); r != n || col != outs {
		return nil, value.Errf(diag.Shape, "observer", "the observer gain is %d×%d; a plant with %d states and %d outputs needs %d×%d", r, col, n, outs, n, outs)
	}
	var ch Chain
	h := &value.Plant{Every: p.Every, Title: "compensator, u = −H·y", Inputs: p.Outputs, States: hatted(p.States)}
	for _, s := range p.Inputs {
		s.Name = "−" + s.Name
		h.Outputs = append(h.Outputs, s)
	}
	abk := ch.Sub(p.A, ch.Mul(p.B, k))
	if IsCurrentForm(c.Args["observer"]) {
		if !isZero(p.D) {
			return nil, value.Errf(diag.Numerical, "observer", "the current form needs a plant without a direct term D")
		}
		keep := ch.Sub(Identity(n), ch.Mul(l, p.C))
		h.A, h.B = ch.Mul(abk, keep), ch.Mul(abk, l)
		h.C, h.D = ch.Mul(k, keep), ch.Mul(k, l)
		return h, ch.Err
	}
	h.A = ch.Add(ch.Sub(abk, ch.Mul(l, p.C)), ch.Mul(l, p.D, k))
	h.B, h.C, h.D = l, k, Zero(len(p.Inputs), outs)
	return h, ch.Err
}

// IsCurrentForm tells whether an observer gain was made with form "current": its estimate
// is corrected by the newest y.
func IsCurrentForm(v value.Value) bool {
	g, ok := v.(*value.Gain)
	if !ok {
		return false
	}
	for _, e := range g.Extra {
		if e.Name == "form" && e.Value == value.Text("current") {
			return true
		}
	}
	return false
}

func isZero(m *value.Matrix) bool {
	re, im := m.Floats()
	for _, x := range re {
		if x != 0 {
			return false
		}
	}
	return im == nil
}

// hatted marks estimated states.
func hatted(signals []value.Signal) []value.Signal {
	out := append([]value.Signal(nil), signals...)
	for i := range out {
		out[i].Name += "̂"
	}
	return out
}

func returnRatio(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	feedback := c.Args["feedback"]
	switch f := feedback.(type) {
	case *value.Plant, *value.Transfer, *value.Polynomial, *value.Model:
		h, err := value.ToPlant(f)
		if err != nil {
			return nil, err
		}
		v, err := value.Multiply(h, p)
		if q, ok := v.(*value.Plant); ok {
			q.Title = "return ratio"
		}
		return v, err
	}
	k, err := gainMatrix(p, feedback, "feedback")
	if err != nil {
		return nil, err
	}
	_, m := PlantSize(p)
	q := derived(p, "return ratio")
	q.C, q.D, q.Y0 = k, Zero(m, m), nil
	q.Outputs = nil
	for _, s := range p.Inputs {
		s.Name = "−" + s.Name
		q.Outputs = append(q.Outputs, s)
	}
	return q, nil
}

func withIntegrators(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	n, _ := PlantSize(p)
	names := c.List("outputs")
	var rowsC, rowsD []*value.Matrix
	q := derived(p, "plant with integrators")
	q.States = append([]value.Signal(nil), p.States...)
	var refs []string
	for _, item := range names.Items {
		name := string(item.(value.Text))
		rc, rd, err := followed(p, name)
		if err != nil {
			return nil, err
		}
		rowsC, rowsD = append(rowsC, rc), append(rowsD, rd)
		q.States = append(q.States, renamed([]value.Signal{{Name: "∫" + name, Unit: value.None()}}, q.States)...)
		refs = append(refs, "r_"+name)
	}
	k := len(rowsC)
	if k == 0 {
		return nil, value.Errf(diag.Shape, "outputs", "name at least one output to follow")
	}
	stackC, stackD := rowsC[0], rowsD[0]
	for i := 1; i < k; i++ {
		stackC = Block([][]*value.Matrix{{stackC}, {rowsC[i]}})
		stackD = Block([][]*value.Matrix{{stackD}, {rowsD[i]}})
	}
	corner := Zero(k, k)
	if p.Every != nil {
		corner = Identity(k)
	}
	var ch Chain
	outs, _ := p.C.Dims()
	q.A = Block([][]*value.Matrix{{p.A, Zero(n, k)}, {ch.Neg(stackC), corner}})
	q.B = Block([][]*value.Matrix{{p.B}, {ch.Neg(stackD)}})
	q.C = Block([][]*value.Matrix{{p.C, Zero(outs, k)}})
	enters := Block([][]*value.Matrix{{Zero(n, k)}, {Identity(k)}})
	enters.Columns = refs
	q.Extra = append(q.Extra, value.Named{Name: referenceEnters, Value: enters})
	if len(p.X0) == n {
		q.X0 = append(append([]value.Number(nil), p.X0...), make([]value.Number, k)...)
		for i := n; i < n+k; i++ {
			q.X0[i] = value.Int(0)
		}
	}
	return q, ch.Err
}

// followed gives the rows of C and D of a signal that integrators follow: an output, or a state.
func followed(p *value.Plant, name string) (rowC, rowD *value.Matrix, err error) {
	n, m := PlantSize(p)
	for i, s := range p.Outputs {
		if s.Name == name {
			return RowsOf(p.C, i), RowsOf(p.D, i), nil
		}
	}
	for i, s := range p.States {
		if s.Name == name {
			return RowsOf(Identity(n), i), Zero(1, m), nil
		}
	}
	var known []string
	for _, s := range append(append([]value.Signal(nil), p.Outputs...), p.States...) {
		known = append(known, s.Name)
	}
	e := value.Errf(diag.Name, "outputs", "%q is no output and no state of the plant", name)
	if near := diag.Nearest(name, known); near != "" {
		e.WithHelp("did you mean %q?", near)
	}
	return nil, nil, e
}
