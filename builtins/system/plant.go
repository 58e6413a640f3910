package system

import (
	"math/big"
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/value"
)

var plantBuiltins = []*value.Builtin{
	{
		Name: "plant", Family: "system",
		Params: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n: how the states move on their own"},
			{Name: "B", Shape: value.AMatrix, Doc: "n×m: how the inputs enter"},
			{Name: "C", Shape: value.AMatrix, Optional: true, Default: "the identity: every state is an output", Doc: "p×n: what is measured"},
			{Name: "D", Shape: value.AMatrix, Optional: true, Default: "zero", Doc: "p×m: what goes straight through"},
			{Name: "every", Shape: value.ARate, Named: true, Optional: true, Default: "continuous", Doc: "the sample time, or the rate in Hz"},
			{Name: "states", Shape: value.NameList, Named: true, Optional: true, Default: "x1, x2, …", Doc: "names, each with its unit and working range if wanted: \"x in m range 10\""},
			{Name: "inputs", Shape: value.NameList, Named: true, Optional: true, Default: "u, or u1, u2, …", Doc: "names of inputs, as for states"},
			{Name: "outputs", Shape: value.NameList, Named: true, Optional: true, Default: "y, or y1, y2, …", Doc: "names of outputs, as for states"},
		},
		Result:  "plant",
		Summary: "a system x' = A·x + B·u, y = C·x + D·u from its matrices",
		Doc: "All numbers are in the declared units of the signals; nothing is converted. With every it is sampled: x⁺ = A·x + B·u. " +
			"A row given for B with one state, or a column for C with one output, is turned to fit. Working ranges scale strengths and distances.",
		Examples: []value.Example{
			{Input: "plant([[0, 1], [-2, -3]], [[0], [1]], [[1, 0]]).A", Output: "=\n   0    1\n  -2   -3"},
		},
		Errors:  []string{"sizes that do not agree; both are shown", "a number of names that is not the number of signals", "a name given twice"},
		Source:  "Kalman 1963, J. SIAM Control 1",
		SeeAlso: []string{"transfer", "poles", "modes"},
		Func:    newPlant,
	},
	{
		Name: "timed", Family: "system",
		Params: []value.Param{
			{Name: "system", Shape: value.ATransfer, Doc: "a transfer function in z"},
			{Name: "every", Shape: value.ARate, Named: true, Optional: true, Default: "1 s", Doc: "the sample time, or the rate in Hz"},
		},
		Result:  "transfer function in z with its sample time",
		Summary: "gives a transfer function in z its sample time",
		Doc:     "A rational function written in z has no sample time of its own; this sets it.",
		Examples: []value.Example{
			{Input: "poles(timed(1/(z - 0.5), every: 10 ms))", Output: "= [0.5]"},
		},
		Errors:  []string{"a transfer function in s"},
		Source:  "definition",
		SeeAlso: []string{"sampled", "plant"},
		Func:    timed,
	},
}

func newPlant(c *value.Call) (value.Value, error) {
	a, b := c.Matrix("A"), c.Matrix("B")
	n, _ := a.Dims()
	for _, name := range []string{"A", "B", "C", "D"} {
		if m := c.Matrix(name); m != nil && m.IsComplex() {
			return nil, value.Errf(diag.Type, name, "%s must be real", name)
		}
	}
	r, m := b.Dims()
	if r != n {
		if m != n || r != 1 {
			return nil, value.Errf(diag.Shape, "B", "A is %d×%d and B is %d×%d: B needs %d rows", n, n, r, m, n)
		}
		b = pickTransposed(b)
		m = 1
	}
	cm := c.Matrix("C")
	if cm == nil {
		cm = Identity(n)
	}
	p, cols := cm.Dims()
	if cols != n {
		if p != n || cols != 1 {
			return nil, value.Errf(diag.Shape, "C", "A is %d×%d and C is %d×%d: C needs %d columns", n, n, p, cols, n)
		}
		cm = pickTransposed(cm)
		p = 1
	}
	d := c.Matrix("D")
	if d == nil {
		d = Zero(p, m)
	}
	if r, k := d.Dims(); r != p || k != m {
		return nil, value.Errf(diag.Shape, "D", "D is %d×%d: with %d outputs and %d inputs it needs %d×%d", r, k, p, m, p, m)
	}
	q := &value.Plant{A: a, B: b, C: cm, D: d}
	if c.Has("every") {
		every := c.Number("every")
		q.Every = &every
	}
	var err error
	if q.States, err = signals(c, "states", "x", n); err != nil {
		return nil, err
	}
	if q.Inputs, err = signals(c, "inputs", "u", m); err != nil {
		return nil, err
	}
	if q.Outputs, err = signals(c, "outputs", "y", p); err != nil {
		return nil, err
	}
	return q, nil
}

func pickTransposed(m *value.Matrix) *value.Matrix {
	t, err := Transpose(m)
	if err != nil {
		return m
	}
	return t
}

// signals reads a list of declarations "name in unit range r", or numbers the signals.
func signals(c *value.Call, param, stem string, n int) ([]value.Signal, error) {
	list := c.List(param)
	if list == nil {
		return Numbered(stem, n), nil
	}
	if len(list.Items) != n {
		return nil, value.Errf(diag.Shape, param, "%d names for %d %s", len(list.Items), n, param)
	}
	seen := map[string]bool{}
	out := make([]value.Signal, n)
	for i, item := range list.Items {
		s, err := Declaration(string(item.(value.Text)), param)
		if err != nil {
			return nil, err
		}
		if seen[s.Name] {
			return nil, value.Errf(diag.Name, param, "the name %q is given twice", s.Name)
		}
		seen[s.Name] = true
		out[i] = s
	}
	return out, nil
}

// Declaration reads "name", "name in unit" or "name in unit range r".
func Declaration(text, param string) (value.Signal, error) {
	words := strings.Fields(text)
	s := value.Signal{Unit: value.None()}
	if len(words) == 0 {
		return s, value.Errf(diag.Name, param, "an empty name")
	}
	s.Name = words[0]
	words = words[1:]
	if len(words) >= 2 && words[0] == "in" {
		unit, err := value.ParseUnit(words[1])
		if err != nil {
			return s, value.Errf(diag.Unit, param, "%q: %v", text, err)
		}
		s.Unit, words = unit, words[2:]
	}
	if len(words) == 2 && words[0] == "range" {
		r, ok := new(big.Rat).SetString(words[1])
		if !ok || r.Sign() <= 0 || len(words[1]) > 40 {
			return s, value.Errf(diag.Type, param, "%q: the range must be a positive number in the declared unit", text)
		}
		n := value.Rat(r)
		s.Range, words = &n, words[2:]
	}
	if len(words) != 0 {
		return s, value.Errf(diag.Syntax, param, "%q is not \"name\", \"name in unit\" or \"name in unit range number\"", text)
	}
	return s, nil
}

func timed(c *value.Call) (value.Value, error) {
	g := c.Transfer("system")
	if g.Variable == "s" {
		return nil, value.Errf(diag.Type, "system", "a transfer function in s has no sample time; sampled(…) makes a sampled system")
	}
	q := *g
	q.Variable = "z"
	every := value.Int(1)
	if c.Has("every") {
		every = c.Number("every")
	}
	q.Every = &every
	return &q, nil
}
