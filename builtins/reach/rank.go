package reach

import (
	"context"
	"fmt"
	"math"
	"math/big"
	"time"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// distanceCap bounds the search for the distance; what bracket was reached then is shown.
const distanceCap = 500 * time.Millisecond

var rankBuiltins = []*value.Builtin{
	{
		Name: "reachability", Family: "reach",
		Params: []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Bare: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "B", Shape: value.AMatrix, Doc: "n×m"},
		},
		Result:  "report",
		Summary: "which directions and modes the inputs can move, and by what margin",
		Doc: "Fields: matrix [B AB … Aⁿ⁻¹B]; rank; decided (\"exactly\", or the threshold and the gap); directions (a basis of what is reached); " +
			"missing (the modes no input moves, as often as they occur); indices (controllability indices, one an input); " +
			"distance (low, high, at: bounds of the smallest change of [A B], in declared ranges, that makes the plant unreachable, and the pole where); " +
			"gramian (of a stable plant). In require it stands for \"all modes are moved\".",
		Examples: []value.Example{
			{Input: "reachability([[4, 3], [-4.5, -3.5]], [[1], [-1]]).missing", Output: "= [-0.5]"},
		},
		Errors:  []string{"sizes that do not agree"},
		Source:  "Kalman 1960; distance: Eising 1984, Systems & Control Letters 4; exact rank: Bareiss 1968",
		SeeAlso: []string{"observability", "modes", "stabilizable", "kalman_split"},
		Func:    reachability,
	},
	{
		Name: "observability", Family: "reach",
		Params: []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Bare: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "C", Shape: value.AMatrix, Doc: "p×n"},
		},
		Result:  "report",
		Summary: "which directions and modes the outputs can see, and by what margin",
		Doc: "The dual of reachability. Fields: matrix [C; CA; …]; rank; decided; directions (a basis of what is seen); missing (the modes no output sees); " +
			"indices (observability indices, one an output); distance; gramian. In require it stands for \"all modes are seen\".",
		Examples: []value.Example{
			{Input: "observability([[0, 1], [0, 0]], [[0, 1]]).missing", Output: "= [0]"},
		},
		Errors:  []string{"sizes that do not agree"},
		Source:  "Kalman 1960; Luenberger 1966",
		SeeAlso: []string{"reachability", "modes", "detectable"},
		Func:    observability,
	},
	{
		Name: "stabilizable", Family: "reach",
		Params: []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Bare: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "B", Shape: value.AMatrix, Doc: "n×m"},
		},
		Result:  "report that stands for true or false",
		Summary: "whether every mode that does not decay is moved by some input",
		Doc:     "Fields: holds; because (the modes that neither decay nor are moved). A mode on the axis (on the circle for sampled plants) does not decay.",
		Examples: []value.Example{
			{Input: "stabilizable([[1, 0], [0, -2]], [[0], [1]]).because", Output: "= [1]"},
		},
		Errors:  []string{"sizes that do not agree"},
		Source:  "Wonham 1968, SIAM J. Control 6",
		SeeAlso: []string{"detectable", "reachability"},
		Func:    func(c *value.Call) (value.Value, error) { return lasting(c, false) },
	},
	{
		Name: "detectable", Family: "reach",
		Params: []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Bare: []value.Param{
			{Name: "A", Shape: value.ASquare, Doc: "n×n"},
			{Name: "C", Shape: value.AMatrix, Doc: "p×n"},
		},
		Result:  "report that stands for true or false",
		Summary: "whether every mode that does not decay is seen by some output",
		Doc:     "Fields: holds; because (the modes that neither decay nor are seen). A mode on the axis (on the circle for sampled plants) does not decay.",
		Examples: []value.Example{
			{Input: "detectable([[1, 0], [0, -2]], [[1, 0]]).holds", Output: "true"},
		},
		Errors:  []string{"sizes that do not agree"},
		Source:  "Wonham 1968, SIAM J. Control 6",
		SeeAlso: []string{"stabilizable", "observability"},
		Func:    func(c *value.Call) (value.Value, error) { return lasting(c, true) },
	},
}

// pair is (A, B), or (Aᵀ, Cᵀ) with dual set: what the one says of moving the other says of seeing.
type pair struct {
	a, b    *value.Matrix
	states  []value.Signal
	signals []value.Signal
	sampled bool
	dual    bool
}

// pairOf reads either form of a call.
func pairOf(c *value.Call, dual bool) (*pair, error) {
	if p := c.Plant("plant"); p != nil {
		return pairOfPlant(p, dual)
	}
	a, b, name := c.Matrix("A"), c.Matrix("B"), "B"
	n, _ := a.Dims()
	if dual {
		var err error
		name = "C"
		if _, cols := c.Matrix("C").Dims(); cols != n {
			r, k := c.Matrix("C").Dims()
			if k != 1 || r != n {
				return nil, value.Errf(diag.Shape, "C", "A is %d×%d and C is %d×%d: C needs %d columns", n, n, r, k, n)
			}
			b = c.Matrix("C")
		} else if b, err = system.Transpose(c.Matrix("C")); err != nil {
			return nil, err
		}
		if a, err = system.Transpose(a); err != nil {
			return nil, err
		}
	}
	r, m := b.Dims()
	if r != n {
		return nil, value.Errf(diag.Shape, name, "A is %d×%d and B is %d×%d: B needs %d rows", n, n, r, m, n)
	}
	for _, x := range []*value.Matrix{a, b} {
		if x.IsComplex() {
			return nil, value.Errf(diag.Type, name, "the matrices must be real")
		}
	}
	return &pair{a: a, b: b, states: system.Numbered("x", n), signals: system.Numbered("u", m), dual: dual}, nil
}

func pairOfPlant(p *value.Plant, dual bool) (*pair, error) {
	q := &pair{a: p.A, b: p.B, states: p.States, signals: p.Inputs, sampled: p.Every != nil, dual: dual}
	if !dual {
		return q, nil
	}
	var ch system.Chain
	q.a, q.b, q.signals = ch.Transpose(p.A), ch.Transpose(p.C), p.Outputs
	return q, ch.Err
}

func (p *pair) exact() bool {
	n, _ := p.a.Dims()
	return n <= system.ExactOrder && system.AllExact(p.a, p.b)
}

// decision is the verdict on a pair.
type decision struct {
	rank    int
	decided string
	missing []system.Root
	indices []int
}

func (p *pair) decide() (*decision, error) {
	if p.exact() {
		s, err := exact.ReachableSplit(p.a.Exact(), p.b.Exact())
		if err != nil {
			return nil, diag.New(diag.Limit, "%v", err)
		}
		d := &decision{rank: s.Rank, decided: "exactly", indices: s.Indices}
		if s.Missing.Degree() > 0 {
			d.missing, err = system.RootsOf(s.Missing)
		}
		return d, err
	}
	f, err := p.staircase(p.b)
	if err != nil {
		return nil, err
	}
	d := &decision{rank: f.Rank, indices: f.Indices, decided: gap(f)}
	for i, v := range f.Missing {
		d.missing = append(d.missing, system.Root{Value: v, Err: f.MissingError[i], Multiplicity: 1})
	}
	return d, nil
}

func (p *pair) staircase(b *value.Matrix) (*numeric.StaircaseForm, error) {
	f, err := numeric.Reachability(p.a.Dense(), b.Dense(), 0)
	if err != nil {
		return nil, system.Refused(err, "")
	}
	return f, nil
}

// gap words how a floating rank was decided.
func gap(f *numeric.StaircaseForm) string {
	text := fmt.Sprintf("floating, singular values above %.1e count", f.Threshold)
	if !math.IsInf(f.Above, 0) {
		text += fmt.Sprintf("; smallest counted %.1e", f.Above)
	}
	if f.Below > 0 {
		text += fmt.Sprintf(", largest not counted %.1e", f.Below)
	}
	return text
}

func reachability(c *value.Call) (value.Value, error)  { return rankReport(c, false) }
func observability(c *value.Call) (value.Value, error) { return rankReport(c, true) }

func rankReport(c *value.Call, dual bool) (value.Value, error) {
	p, err := pairOf(c, dual)
	if err != nil {
		return nil, err
	}
	d, err := p.decide()
	if err != nil {
		return nil, err
	}
	n, _ := p.a.Dims()
	holds := d.rank == n
	r := &value.Report{Holds: &holds}
	verb := "moved by the inputs"
	if dual {
		verb = "seen by the outputs"
	}
	r.Title = fmt.Sprintf("%d of %d modes are %s", d.rank, n, verb)
	if holds {
		r.Title = fmt.Sprintf("all %d modes are %s", n, verb)
	}
	indices := &value.List{}
	for _, k := range d.indices {
		indices.Items = append(indices.Items, value.Int(k))
	}
	r.Fields = []value.Named{
		{Name: "rank", Value: value.Int(d.rank)},
		{Name: "decided", Value: value.Text(d.decided)},
		{Name: "missing", Value: system.List(d.missing)},
		{Name: "indices", Value: indices},
		{Name: "distance", Value: value.Later(func() value.Value { return p.distance(c.Context) })},
		{Name: "directions", Value: value.Later(p.directions)},
		{Name: "matrix", Value: value.Later(p.matrix)},
		{Name: "gramian", Value: value.Later(func() value.Value { return p.gramian(c.Context) })},
	}
	return r, nil
}

// matrix is [B AB … Aⁿ⁻¹B], or its dual standing up.
func (p *pair) matrix() value.Value {
	n, _ := p.a.Dims()
	var ch system.Chain
	a, b := p.a, p.b
	if !p.exact() { // powers of many exact states would be the work of a minute
		a, b = a.Floating(), b.Floating()
	}
	blocks := []*value.Matrix{b}
	for i := 1; i < n; i++ {
		blocks = append(blocks, ch.Mul(a, blocks[i-1]))
	}
	m := system.Block([][]*value.Matrix{blocks})
	if p.dual {
		m = ch.Transpose(m)
		m.Columns = system.Labels(p.states)
	} else {
		m.Rows = system.Labels(p.states)
	}
	if ch.Err != nil {
		return value.Text(ch.Err.Error())
	}
	return m
}

// directions is a basis of what is reached, or of what is seen.
func (p *pair) directions() value.Value {
	var m *value.Matrix
	if p.exact() {
		s, err := exact.ReachableSplit(p.a.Exact(), p.b.Exact())
		if err != nil {
			return value.Text(err.Error())
		}
		m = value.ExactMatrix(leadingColumns(s.Inverse, s.Rank))
	} else {
		f, err := p.staircase(p.b)
		if err != nil {
			return value.Text(err.Error())
		}
		n, _ := p.a.Dims()
		if f.Rank == 0 {
			return system.Zero(n, 0)
		}
		m = value.FromDense(f.Inverse.Slice(0, n, 0, f.Rank), f.Certificate.Digits)
	}
	m.Rows = system.Labels(p.states)
	return m
}

// scaled gives (A, B) in working ranges when all states and signals declare one.
func (p *pair) scaled() (a, b *mat.Dense, ranged bool) {
	a, b = p.a.Dense(), p.b.Dense()
	x, okX := ranges(p.states)
	u, okU := rangesOr(p.signals, p.states)
	if !okX || !okU || len(x) == 0 {
		return a, b, false
	}
	if p.dual { // (Aᵀ, Cᵀ): states scale by 1/range, outputs by 1/range
		for i := range x {
			x[i] = 1 / x[i]
		}
		for i := range u {
			u[i] = 1 / u[i]
		}
	}
	a.Apply(func(i, j int, v float64) float64 { return v * x[j] / x[i] }, a)
	if !b.IsEmpty() {
		b.Apply(func(i, j int, v float64) float64 { return v * u[j] / x[i] }, b)
	}
	return a, b, true
}

// rangesOr takes the range of a state of the same name where a signal declares none: an output that is a state shares it.
func rangesOr(signals, states []value.Signal) ([]float64, bool) {
	out := make([]float64, len(signals))
	for i, s := range signals {
		if s.Range == nil {
			k := signalIndex(states, s.Name)
			if k < 0 || states[k].Range == nil || states[k].Unit.Text != s.Unit.Text {
				return nil, false
			}
			s = states[k]
		}
		out[i] = s.Range.Float64()
	}
	return out, true
}

func ranges(signals []value.Signal) ([]float64, bool) {
	out := make([]float64, len(signals))
	for i, s := range signals {
		if s.Range == nil {
			return nil, false
		}
		out[i] = s.Range.Float64()
	}
	return out, true
}

// distance is the report on the distance to the nearest pair that misses a mode.
func (p *pair) distance(ctx context.Context) value.Value {
	a, b, ranged := p.scaled()
	scale := "in declared ranges"
	if !ranged {
		scale = "in these units: declare ranges to compare"
	}
	if n, _ := p.a.Dims(); n == 0 {
		return value.Text("no states")
	}
	if _, m := p.b.Dims(); m == 0 {
		return &value.Report{Title: "distance", Fields: []value.Named{{Name: "low", Value: value.Int(0)}, {Name: "high", Value: value.Int(0)}}}
	}
	if ctx == nil {
		ctx = context.Background()
	}
	d, err := numeric.DistanceToUnreachable(ctx, a, b, distanceCap)
	if err != nil {
		return value.Text(err.Error())
	}
	at := d.At
	if imag(at) < 0 {
		at = complex(real(at), -imag(at))
	}
	fields := []value.Named{
		{Name: "low", Value: bound(d.Low, d.Low)},
		{Name: "high", Value: bound(d.High, d.High)},
		{Name: "at", Value: system.Root{Value: at, Err: math.Abs(real(at))*1e-4 + math.Abs(imag(at))*1e-4}.Number()},
		{Name: "scale", Value: value.Text(scale)},
	}
	return &value.Report{Title: "distance", Fields: fields, Notes: d.Certificate.Notes}
}

// bound is one end of a bracket: of a bracket four digits are enough.
func bound(x, size float64) value.Value { return value.FloatErr(x, math.Abs(size)*1e-5) }

func (p *pair) gramian(ctx context.Context) value.Value {
	if ctx == nil {
		ctx = context.Background()
	}
	roots, err := system.Eigenvalues(p.a)
	if err != nil {
		return value.Text(err.Error())
	}
	for _, r := range roots {
		if !Decays(r, p.sampled) {
			return value.Text("none: the plant is not stable")
		}
	}
	if n, _ := p.a.Dims(); n == 0 {
		return system.Zero(0, 0)
	}
	x, cert, err := numeric.ReachabilityGramian(ctx, p.a.Dense(), p.b.Dense(), p.sampled)
	if err != nil {
		return value.Text(err.Error())
	}
	m := value.FromDense(x, cert.Digits)
	m.Rows, m.Columns = system.Labels(p.states), system.Labels(p.states)
	return m
}

// Decays tells whether a mode certainly decays: inside the left half plane, or inside the unit circle.
func Decays(r system.Root, sampled bool) bool {
	if r.Re != nil && r.Im != nil {
		if sampled {
			return squaredModulus(r) < 0
		}
		return r.Re.Exact.Sign() < 0
	}
	if sampled {
		return math.Hypot(real(r.Value), imag(r.Value)) < 1-r.Err
	}
	return real(r.Value) < -r.Err
}

// squaredModulus compares |z|² of an exact root with 1.
func squaredModulus(r system.Root) int {
	re, im := r.Re.Exact, r.Im.Exact
	sum := newRat().Add(newRat().Mul(re, re), newRat().Mul(im, im))
	return sum.Cmp(newRat().SetInt64(1))
}

func lasting(c *value.Call, dual bool) (value.Value, error) {
	p, err := pairOf(c, dual)
	if err != nil {
		return nil, err
	}
	d, err := p.decide()
	if err != nil {
		return nil, err
	}
	var offending []system.Root
	for _, r := range d.missing {
		if !Decays(r, p.sampled) {
			offending = append(offending, r)
		}
	}
	holds := len(offending) == 0
	verb := "moved"
	if dual {
		verb = "seen"
	}
	title := "every mode that does not decay is " + verb
	if !holds {
		title = "a mode that does not decay is not " + verb
	}
	return &value.Report{Title: title, Holds: &holds, Fields: []value.Named{
		{Name: "holds", Value: value.Boolean(holds)},
		{Name: "because", Value: system.List(offending)},
		{Name: "decided", Value: value.Text(d.decided)},
	}}, nil
}

func newRat() *big.Rat { return new(big.Rat) }

func leadingColumns(m *exact.Matrix, k int) *exact.Matrix {
	r, _ := m.Dims()
	return m.Slice(0, r, 0, k)
}
