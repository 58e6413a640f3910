package reach

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var modeBuiltins = []*value.Builtin{
	{
		Name: "modes", Family: "reach",
		Params:  []value.Param{{Name: "plant", Shape: value.ASystem, Doc: "the plant"}},
		Result:  "report, a row a mode",
		Summary: "each mode: what moves it, what sees it, how it decays",
		Doc: "A row a mode, slowest first, a conjugate pair or a repeated pole in one row. The verdict says how it behaves, and whether it is not moved or not seen. " +
			"The strength after each name is |wᴴ·b| for inputs and |c·v| for outputs, with w and v the unit left and right eigenvectors, after scaling by the declared ranges " +
			"of states, inputs and outputs; without ranges it is in these units and ranks nothing. Of a repeated pole the lengths of its chains are shown instead. " +
			"Sampled poles are judged by p = ln z/T. Fields: poles, missing (moved by no input), unseen (seen by no output), and the table.",
		Examples: []value.Example{
			{Input: "modes(plant([[0, 1], [0, 0]], [[0], [1]], [[0, 1]])).unseen", Output: "= [0]"},
		},
		Errors:  []string{"eigenvalues that were not found"},
		Source:  "Hautus 1969; strengths: Hamdan & Nayfeh 1989, J. Guidance 12",
		SeeAlso: []string{"reachability", "observability", "poles"},
		Func:    modes,
	},
}

// mode is one row: an eigenvalue (the one with the imaginary part ≥ 0) and how often it occurs.
type mode struct {
	root  system.Root
	count int
	pair  bool
	chain []int // lengths of the Jordan chains, where known and count > 1
	moved [2]int
	seen  [2]int // how many of count are moved (seen) by some signal; [1] is count
	by    []mark // inputs
	shown []mark // outputs
}

// mark is a signal with the strength of its grip on a mode; strength < 0 is unknown.
type mark struct {
	name     string
	strength float64
	part     bool // only some of the repeated modes
}

func modes(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	rows, err := modesOf(p)
	if err != nil {
		return nil, err
	}
	timeUnit := "s"
	r := &value.Report{Columns: []string{"verdict", "moved by", "seen by", "pole", "time constant [" + timeUnit + "]", "period [s]", "damping ratio"}}
	var missing, unseen, all []system.Root
	hidden := 0
	for _, m := range rows {
		r.Rows = append(r.Rows, m.row(p))
		all = append(all, m.members()...)
		for i, root := range m.members() {
			if i < (m.count-m.moved[0])*m.width() {
				missing = append(missing, root)
			}
			if i < (m.count-m.seen[0])*m.width() {
				unseen = append(unseen, root)
			}
		}
		if (m.moved[0] < m.count || m.seen[0] < m.count) && !Decays(m.root, p.Every != nil) {
			hidden++
		}
	}
	n, _ := p.A.Dims()
	r.Title = fmt.Sprintf("%d modes", n)
	if n == 1 {
		r.Title = "1 mode"
	}
	if _, ok := scaling(p); ok {
		r.Notes = append(r.Notes, "strengths are in declared ranges")
	} else if n > 0 {
		r.Notes = append(r.Notes, "strengths are in these units: declare ranges of states, inputs and outputs to compare them")
	}
	if hidden > 0 {
		r.Notes = append(r.Notes, "a mode that does not decay is not moved or not seen: no feedback from these outputs to these inputs will tame it")
	}
	r.Fields = []value.Named{
		{Name: "poles", Value: system.List(all)},
		{Name: "missing", Value: system.List(missing)},
		{Name: "unseen", Value: system.List(unseen)},
	}
	return r, nil
}

// width is how many poles one count stands for.
func (m *mode) width() int {
	if m.pair {
		return 2
	}
	return 1
}

// members lists the poles of the row, pair by pair.
func (m *mode) members() []system.Root {
	var out []system.Root
	for range m.count {
		if m.pair {
			out = append(out, conjugated(m.root))
		}
		out = append(out, m.root)
	}
	return out
}

func conjugated(r system.Root) system.Root {
	r.Value = cmplx.Conj(r.Value)
	if r.Im != nil {
		im := value.Rat(newRat().Neg(r.Im.Exact))
		r.Im = &im
	}
	return r
}

// modesOf groups the eigenvalues into rows and finds who moves and who sees each.
func modesOf(p *value.Plant) ([]*mode, error) {
	roots, err := system.Eigenvalues(p.A)
	if err != nil {
		return nil, err
	}
	rows := grouped(roots, system.ExactPlant(p))
	if err := judge(p, rows, false); err != nil {
		return nil, err
	}
	if err := judge(p, rows, true); err != nil {
		return nil, err
	}
	if err := strengths(p, rows); err != nil {
		return nil, err
	}
	if system.ExactPlant(p) {
		return rows, chains(p, rows)
	}
	return rows, nil
}

// grouped makes a row of each distinct eigenvalue with imaginary part ≥ 0. Of an exact
// plant equal means equal; of a floating one, within the error estimates as far as these
// are small: eigenvalues of which nothing is known are not equal for that.
func grouped(roots []system.Root, exactly bool) []*mode {
	var rows []*mode
	largest := 0.0
	for _, r := range roots {
		largest = math.Max(largest, cmplx.Abs(r.Value))
	}
	for _, r := range roots {
		if imag(r.Value) < 0 {
			continue
		}
		found := false
		for _, m := range rows {
			d := cmplx.Abs(m.root.Value - r.Value)
			size := math.Max(cmplx.Abs(m.root.Value), cmplx.Abs(r.Value))
			near := math.Min(4*(m.root.Err+r.Err), math.Max(1e-2*size, 1e-6*largest))
			if exactly {
				near = 0
			}
			if d <= near && m.pair == (imag(r.Value) > 0) {
				m.count++
				found = true
				break
			}
		}
		if !found {
			rows = append(rows, &mode{root: r, count: 1, pair: imag(r.Value) > 0})
		}
	}
	for _, m := range rows {
		m.moved, m.seen = [2]int{m.count, m.count}, [2]int{m.count, m.count}
	}
	return rows
}

// judge finds, for each row, which signals have a grip on it: the inputs, or with dual set the outputs.
func judge(p *value.Plant, rows []*mode, dual bool) error {
	q, err := pairOfPlant(p, dual)
	if err != nil {
		return err
	}
	missing, err := missingModes(q, q.b)
	if err != nil {
		return err
	}
	for _, m := range rows {
		left := m.count - occurrences(missing, m, rows)
		if dual {
			m.seen[0] = left
		} else {
			m.moved[0] = left
		}
	}
	for j, s := range q.signals {
		one, err := missingModes(q, system.Columns(q.b, j))
		if err != nil {
			return err
		}
		for _, m := range rows {
			lost := occurrences(one, m, rows)
			if lost == m.count {
				continue
			}
			k := mark{name: s.Name, strength: -1, part: lost > 0}
			if dual {
				m.shown = append(m.shown, k)
			} else {
				m.by = append(m.by, k)
			}
		}
	}
	return nil
}

// missingModes are the eigenvalues that b does not move.
func missingModes(q *pair, b *value.Matrix) ([]system.Root, error) {
	one := *q
	one.b = b
	if one.exact() {
		u, err := exact.UnreachablePolynomial(one.a.Exact(), b.Exact())
		if err != nil {
			return nil, diag.New(diag.Limit, "%v", err)
		}
		if u.Degree() < 1 {
			return nil, nil
		}
		return system.RootsOf(u)
	}
	d, err := one.decide()
	if err != nil {
		return nil, err
	}
	return d.missing, nil
}

// occurrences counts the missing eigenvalues that belong to a row: those nearest to it of all rows.
func occurrences(missing []system.Root, m *mode, rows []*mode) int {
	count := 0
	for _, r := range missing {
		if imag(r.Value) < 0 {
			continue
		}
		best := m
		for _, other := range rows {
			if cmplx.Abs(other.root.Value-r.Value) < cmplx.Abs(best.root.Value-r.Value) {
				best = other
			}
		}
		if best == m {
			count++
		}
	}
	return min(count, m.count)
}

// chains finds the lengths of the Jordan chains of repeated rational modes of an exact plant.
func chains(p *value.Plant, rows []*mode) error {
	for _, m := range rows {
		if m.count < 2 || m.root.Re == nil {
			continue
		}
		re, im := m.root.Re.Exact, m.root.Im.Exact
		factor := exact.NewPolynomial(newRat().SetInt64(1), newRat().Neg(re))
		if im.Sign() != 0 {
			twice := newRat().Add(re, re)
			square := newRat().Add(newRat().Mul(re, re), newRat().Mul(im, im))
			factor = exact.NewPolynomial(newRat().SetInt64(1), twice.Neg(twice), square)
		}
		sizes, ok, err := exact.JordanSizes(p.A.Exact(), factor)
		if err != nil {
			return diag.New(diag.Limit, "%v", err)
		}
		if ok {
			m.chain = sizes
		}
	}
	return nil
}

// scaling gives the ranges of states, inputs and outputs when all are declared.
func scaling(p *value.Plant) (r [3][]float64, ok bool) {
	var full [3]bool
	r[0], full[0] = ranges(p.States)
	r[1], full[1] = ranges(p.Inputs)
	r[2], full[2] = rangesOr(p.Outputs, p.States)
	return r, full[0] && full[1] && full[2] && len(p.States) > 0
}

// strengths fills in |wᴴ·b| and |c·v| of simple modes.
func strengths(p *value.Plant, rows []*mode) error {
	n, _ := p.A.Dims()
	if n == 0 {
		return nil
	}
	a, b, c := p.A.Dense(), p.B.Dense(), p.C.Dense()
	if r, ok := scaling(p); ok {
		a.Apply(func(i, j int, v float64) float64 { return v * r[0][j] / r[0][i] }, a)
		if !b.IsEmpty() {
			b.Apply(func(i, j int, v float64) float64 { return v * r[1][j] / r[0][i] }, b)
		}
		if !c.IsEmpty() {
			c.Apply(func(i, j int, v float64) float64 { return v * r[0][j] / r[2][i] }, c)
		}
	}
	e, err := numeric.Eigen(a)
	if err != nil {
		return system.Refused(err, "plant")
	}
	for _, m := range rows {
		if m.count > 1 {
			continue
		}
		k := nearest(e.Values, m.root.Value)
		for i := range m.by {
			m.by[i].strength = grip(e.Left, k, b, signalIndex(p.Inputs, m.by[i].name), false)
		}
		for i := range m.shown {
			m.shown[i].strength = grip(e.Right, k, c, signalIndex(p.Outputs, m.shown[i].name), true)
		}
	}
	return nil
}

func signalIndex(signals []value.Signal, name string) int {
	for i, s := range signals {
		if s.Name == name {
			return i
		}
	}
	return -1
}

// grip is |xᴴ·column j of m|, or with rows set |row j of m · x|, x the k-th eigenvector of unit length.
func grip(vectors *mat.CDense, k int, m *mat.Dense, j int, rows bool) float64 {
	n, _ := vectors.Dims()
	var sum complex128
	norm := 0.0
	for i := range n {
		x := vectors.At(i, k)
		norm += real(x)*real(x) + imag(x)*imag(x)
		if rows {
			sum += x * complex(m.At(j, i), 0)
		} else {
			sum += cmplx.Conj(x) * complex(m.At(i, j), 0)
		}
	}
	return cmplx.Abs(sum) / math.Sqrt(norm)
}

func nearest(values []complex128, v complex128) int {
	best := 0
	for i, w := range values {
		if cmplx.Abs(w-v) < cmplx.Abs(values[best]-v) {
			best = i
		}
	}
	return best
}
