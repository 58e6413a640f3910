package gain

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/big"
	"strings"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var methods = []string{"bass-gura", "ackermann", "robust"}

// startSeed makes the robust method's starts the same in every run.
const startSeed = 1

// spoiled is the relative shift of a pole from which a rounded gain is said to miss the wanted poles.
const spoiled = 1e-3

var assignBuiltins = []*value.Builtin{
	{
		Name: "assign_poles", Family: "gain",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant with n states and m inputs"},
			{Name: "poles", Shape: value.PoleList, Doc: "n wanted poles, conjugates complete; repeated ones allowed"},
			{Name: "method", Shape: value.AChoice, Choices: methods, Named: true, Optional: true, Default: "\"bass-gura\" for one input and exact data, else \"robust\"", Doc: "how"},
		},
		Bare: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "B", Shape: value.AMatrix, Doc: "n×m"},
			{Name: "poles", Shape: value.PoleList, Doc: "n wanted poles"},
			{Name: "method", Shape: value.AChoice, Choices: methods, Named: true, Optional: true, Default: "as above", Doc: "how"},
		},
		Result:  "gain K, m×n, of the law u = u₀ − K·(x − x₀)",
		Summary: "the state-feedback gain that puts the poles where they are wanted",
		Doc: "bass-gura and ackermann: one input, exact when the data and the poles are. robust: any number of inputs; eigenvectors are chosen as far from dependent as coordinate ascent makes them, " +
			"so the poles move least when the plant differs; with several inputs the gain is one of many. " +
			"A mode that no input moves stays where it is if it is among the wanted poles, otherwise it is named in an error. " +
			"Fields: values, poles (those the gain really gives, recomputed), sensitivity (condition of the eigenvectors), method, residual, condition.",
		Examples: []value.Example{
			{Input: "assign_poles([[0, 1], [0, 0]], [[0], [1]], [-1, -2]).values", Output: "=\n      x1   x2\n  u    2    3"},
		},
		Errors:  []string{"more or fewer poles than states", "a complex pole without its conjugate", "a mode that no input moves and that is not among the wanted poles", "bass-gura or ackermann with several inputs"},
		Source:  "Bass & Gura 1965; Ackermann 1972; Kautsky, Nichols & Van Dooren 1985; Tits & Yang 1996",
		SeeAlso: []string{"pole_pair", "observer_gain", "quadratic_gain", "reachability"},
		Func:    assignPoles,
	},
}

// task is a pole assignment: K for (A, B), or with dual set L = Kᵀ for (Aᵀ, Cᵀ).
type task struct {
	a, b   *value.Matrix
	wanted *value.List
	method string
	dual   bool
}

func assignPoles(c *value.Call) (value.Value, error) {
	t := &task{wanted: c.List("poles"), method: c.Text("method", "")}
	p := c.Plant("plant")
	if p == nil {
		a, b := c.Matrix("A"), c.Matrix("B")
		var err error
		if p, err = barePlant(a, b, nil); err != nil {
			return nil, err
		}
	}
	t.a, t.b = p.A, p.B
	g, err := t.solve(c.Context)
	if err != nil {
		return nil, err
	}
	g.Role, g.Plant = "state feedback", p
	g.RowSignals, g.ColumnSignals = p.Inputs, p.States
	g.Values.Rows, g.Values.Columns = system.Labels(p.Inputs), system.Labels(p.States)
	g.X0, g.U0 = p.X0, p.U0
	return g, nil
}

// barePlant makes a plant of bare matrices, checking their shapes; b or c may be nil.
func barePlant(a, b, c *value.Matrix) (*value.Plant, error) {
	n, _ := a.Dims()
	if b == nil {
		b = system.Zero(n, 0)
	}
	if c == nil {
		c = system.Zero(0, n)
	}
	r, m := b.Dims()
	if r != n {
		return nil, value.Errf(diag.Shape, "B", "A is %d×%d and B is %d×%d: B needs %d rows", n, n, r, m, n)
	}
	p, k := c.Dims()
	if k != n {
		return nil, value.Errf(diag.Shape, "C", "A is %d×%d and C is %d×%d: C needs %d columns", n, n, p, k, n)
	}
	for name, x := range map[string]*value.Matrix{"A": a, "B": b, "C": c} {
		if x.IsComplex() {
			return nil, value.Errf(diag.Type, name, "%s must be real", name)
		}
	}
	return &value.Plant{A: a, B: b, C: c, D: system.Zero(p, m), States: system.Numbered("x", n),
		Inputs: system.Numbered("u", m), Outputs: system.Numbered("y", p)}, nil
}

// solve chooses the method and makes the gain; roles and names are the caller's.
func (t *task) solve(ctx context.Context) (*value.Gain, error) {
	n, _ := t.a.Dims()
	_, m := t.b.Dims()
	if k := len(t.wanted.Items); k != n {
		return nil, value.Errf(diag.Shape, "poles", "%s for %s: give as many poles as states", count(k, "pole"), count(n, "state"))
	}
	if m == 0 && n > 0 {
		return nil, value.Errf(diag.Shape, "", "there is no %s to assign poles with", t.channel())
	}
	polynomial, err := value.PolynomialFromPoles(t.wanted)
	if err != nil {
		return nil, err
	}
	isExact := n <= system.ExactOrder && system.AllExact(t.a, t.b)
	one := t.method == "bass-gura" || t.method == "ackermann"
	if one && m != 1 {
		return nil, value.Errf(diag.Shape, "method", "%q is for one %s; there are %d: use \"robust\"", t.method, t.channel(), m)
	}
	if m == 1 && n <= system.ExactOrder && (one || t.method == "" && isExact) {
		return t.exactly(polynomial, isExact && polynomial.Exact != nil)
	}
	return t.floating(ctx)
}

func (t *task) channel() string {
	if t.dual {
		return "output"
	}
	return "input"
}

func count(n int, word string) string {
	if n == 1 {
		return "1 " + word
	}
	return fmt.Sprintf("%d %ss", n, word)
}

// exactly assigns by exact arithmetic. Floating data is taken as the binary64 numbers it is and the gain is rounded.
func (t *task) exactly(polynomial *value.Polynomial, keep bool) (*value.Gain, error) {
	a, b, w, err := t.rational(polynomial)
	if err != nil {
		return nil, err
	}
	var k *exact.Matrix
	name := "Bass–Gura"
	if t.method == "ackermann" {
		name = "Ackermann"
		k, err = exact.Ackermann(a, b, w)
		if errors.Is(err, exact.ErrSingular) {
			k, err = exact.AssignReachable(a, b, w)
		}
	} else {
		k, err = exact.AssignReachable(a, b, w)
	}
	if err != nil {
		return nil, t.refused(err)
	}
	g := &value.Gain{Method: name + ", exact arithmetic", Wanted: t.wanted.Items}
	values := value.ExactMatrix(k)
	if !keep {
		g.Method = name + ", exact arithmetic on the binary64 data, rounded"
		n, _ := t.a.Dims()
		f := k.Float64()
		err := t.inputError(f)
		values = value.FloatMatrix(1, n, f, err)
	}
	if err := t.complete(g, values); err != nil {
		return nil, err
	}
	return g, nil
}

// inputError estimates what the uncertainty of the data makes of the gain, through the floating method's condition.
func (t *task) inputError(k []float64) float64 {
	big := 0.0
	for _, x := range k {
		big = math.Max(big, math.Abs(x))
	}
	base := big * 0x1p-52
	if t.a.Err == 0 && t.b.Err == 0 {
		return base
	}
	p, err := numeric.AssignOneInput(t.a.Dense(), t.b.Dense(), floats(t.wanted))
	if err != nil || p.Certificate.Condition == 0 {
		return big
	}
	n, _ := t.a.Dims()
	return base + big*p.Certificate.Condition*float64(n)*(relative(t.a)+relative(t.b))
}

func relative(m *value.Matrix) float64 {
	re, _ := m.Floats()
	big := 0.0
	for _, x := range re {
		big = math.Max(big, math.Abs(x))
	}
	if big == 0 {
		return 0
	}
	return m.Err / big
}

// rational gives the data as rationals, binary64 numbers as what they are.
func (t *task) rational(p *value.Polynomial) (a, b *exact.Matrix, w exact.Polynomial, err error) {
	if a, err = system.Rational(t.a); err != nil {
		return nil, nil, w, err
	}
	if b, err = system.Rational(t.b); err != nil {
		return nil, nil, w, err
	}
	if p.Exact != nil {
		return a, b, *p.Exact, nil
	}
	row, err := exact.FromFloats(1, len(p.F), p.F)
	if err != nil {
		return nil, nil, w, diag.New(diag.Numerical, "%v", err).For("poles")
	}
	coefficients := make([]*big.Rat, len(p.F))
	for j := range coefficients {
		coefficients[j] = row.At(0, j)
	}
	return a, b, exact.NewPolynomial(coefficients...), nil
}

// refused words the error of an assignment.
func (t *task) refused(err error) error {
	var unreachable *exact.UnreachableError
	verb := "no input moves"
	if t.dual {
		verb = "no output sees"
	}
	if errors.As(err, &unreachable) {
		roots, rootErr := system.RootsOf(unreachable.Unreachable)
		if rootErr != nil {
			return rootErr
		}
		return fixedModes(roots, verb)
	}
	var refusal *numeric.Refusal
	if errors.As(err, &refusal) && len(refusal.Modes) > 0 && !t.dual {
		return value.Errf(diag.Numerical, "poles", "%v", refusal)
	}
	if errors.As(err, &refusal) && len(refusal.Modes) > 0 {
		modes := make([]system.Root, len(refusal.Modes))
		for i, v := range refusal.Modes {
			modes[i] = system.Root{Value: v}
		}
		return fixedModes(modes, verb)
	}
	return value.Errf(diag.Numerical, "poles", "%v", err)
}

func fixedModes(modes []system.Root, verb string) error {
	what, it := "the mode at %s stays where it is", "it"
	if len(modes) > 1 {
		what, it = "the modes at %s stay where they are", "them"
	}
	return value.Errf(diag.Numerical, "poles", what+": %s %s", system.RootText(modes), verb, it).
		WithHelp("keep it among the wanted poles, or give the plant an actuator or sensor that reaches it; modes(…) shows what does")
}

// floating assigns by the robust method, or for one input by Hessenberg sweeps.
func (t *task) floating(ctx context.Context) (*value.Gain, error) {
	n, _ := t.a.Dims()
	_, m := t.b.Dims()
	if n == 0 {
		return &value.Gain{Values: system.Zero(m, 0), Method: "nothing to assign"}, nil
	}
	var p *numeric.Placement
	var err error
	if m == 1 {
		p, err = numeric.AssignOneInput(t.a.Dense(), t.b.Dense(), floats(t.wanted))
	} else {
		p, err = numeric.AssignRobust(ctx, t.a.Dense(), t.b.Dense(), floats(t.wanted), startSeed)
	}
	if err != nil {
		return nil, t.refused(err)
	}
	cert := p.Certificate
	k := value.FromDense(p.K, cert.Digits)
	if m == 1 && cert.Condition > 0 && !math.IsInf(cert.Condition, 0) {
		re, _ := k.Floats()
		big := 0.0
		for _, x := range re {
			big = math.Max(big, math.Abs(x))
		}
		k.Err += big * cert.Condition * (relative(t.a) + relative(t.b))
	}
	g := &value.Gain{Method: cert.Method, Wanted: t.wanted.Items, Free: m > 1, Notes: cert.Notes}
	if cert.Residual > 0 {
		r := value.Float(cert.Residual)
		g.Residual = &r
	}
	if cert.Condition > 0 {
		r := value.Float(cert.Condition)
		g.Condition = &r
	}
	return g, t.complete(g, k)
}

// complete sets the values and what they give: the poles recomputed, their sensitivity, and notes.
func (t *task) complete(g *value.Gain, k *value.Matrix) error {
	g.Values = k
	loop, err := t.loop(k)
	if err != nil {
		return err
	}
	n, _ := loop.Dims()
	if n == 0 {
		g.Values = t.oriented(k)
		return nil
	}
	roots := t.asWanted(k)
	if roots == nil {
		if roots, err = t.given(k, loop); err != nil {
			return err
		}
	}
	g.Poles = system.List(roots).Items
	e, err := numeric.Eigen(loop.Dense())
	if err == nil {
		s := value.FloatErr(e.VectorCondition, e.VectorCondition*(1e-3+1e-14*e.VectorCondition))
		g.Sensitivity = &s
		g.Rounding = value.Later(func() value.Value { return value.Text(t.rounding(k, roots, e)) })
	}
	g.Values = t.oriented(k)
	return nil
}

// asWanted gives the wanted poles when an exact gain of one channel gives exactly their polynomial, else nil.
func (t *task) asWanted(k *value.Matrix) []system.Root {
	n, _ := t.a.Dims()
	if _, m := t.b.Dims(); t.wanted == nil || m != 1 || n > system.ExactOrder || !system.AllExact(t.a, t.b, k) {
		return nil
	}
	wanted, err := value.PolynomialFromPoles(t.wanted)
	if err != nil || wanted.Exact == nil {
		return nil
	}
	if same, err := exact.Assigns(t.a.Exact(), t.b.Exact(), k.Exact(), *wanted.Exact); err != nil || !same {
		return nil
	}
	return system.RootsFromList(t.wanted)
}

// oriented is K, or L = Kᵀ.
func (t *task) oriented(k *value.Matrix) *value.Matrix {
	if t.dual {
		if l, err := system.Transpose(k); err == nil {
			return l
		}
	}
	q := *k
	return &q
}

func (t *task) loop(k *value.Matrix) (*value.Matrix, error) {
	var ch system.Chain
	a := ch.Sub(t.a, ch.Mul(t.b, k))
	return a, ch.Err
}

func listWords(roots []system.Root) string {
	var words []string
	for _, r := range roots {
		v := r.Value
		switch {
		case imag(v) < 0:
		case imag(v) == 0:
			words = append(words, fmt.Sprintf("%.4g", real(v)))
		default:
			words = append(words, fmt.Sprintf("%.4g ± %.4gi", real(v), imag(v)))
		}
	}
	return strings.Join(words, ", ")
}

func toDigits(x float64, digits int) float64 {
	if digits >= 16 || x == 0 {
		return x
	}
	var y float64
	if _, err := fmt.Sscanf(fmt.Sprintf("%.*e", digits-1, x), "%g", &y); err != nil {
		return x
	}
	return y
}

// floats gives a pole list as complex numbers.
func floats(l *value.List) []complex128 {
	var out []complex128
	for _, v := range l.Items {
		switch v := v.(type) {
		case value.Number:
			out = append(out, complex(v.Float64(), 0))
		case value.Complex:
			out = append(out, v.Complex128())
		}
	}
	return out
}
