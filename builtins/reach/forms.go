package reach

import (
	"fmt"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

var formNames = []string{"modal form", "controller form", "observer form", "staircase form", "balanced form"}

var formBuiltins = []*value.Builtin{
	{
		Name: "similar", Family: "reach",
		Params: []value.Param{
			{Name: "plant", Shape: value.ASystem, Doc: "the plant"},
			{Name: "form", Shape: value.Anything, Doc: "an invertible matrix T, or \"modal form\", \"controller form\", \"observer form\", \"staircase form\", \"balanced form\""},
		},
		Result:  "plant, with field transformation",
		Summary: "the plant in other coordinates x̄ = T·x",
		Doc: "A̅ = T·A·T⁻¹, B̅ = T·B, C̅ = C·T⁻¹. modal form: block diagonal, a block a mode (real 2×2 blocks [[σ, ω], [−ω, σ]] for pairs); exact when the poles are rational and A has a full set of eigenvectors. " +
			"controller form and observer form: companion blocks, one a controllability (observability) index, exact for exact data. " +
			"staircase form: what the inputs reach first, by an orthogonal T. balanced form: of a stable plant that is moved and seen, both gramians equal and diagonal.",
		Examples: []value.Example{
			{Input: "similar(plant([[0, 1], [-2, -3]], [[0], [1]], [[1, 0]]), \"modal form\").A", Output: "=\n  -1    0\n   0   -2"},
		},
		Errors:  []string{"a singular T", "controller form of a plant with a mode no input moves, named", "balanced form of a plant that is not stable"},
		Source:  "Luenberger 1967, IEEE Trans. Automatic Control 12; balanced: Moore 1981, IEEE Trans. Automatic Control 26",
		SeeAlso: []string{"kalman_split", "modes", "reduced"},
		Func:    similar,
	},
}

func similar(c *value.Call) (value.Value, error) {
	p := c.Plant("plant")
	text, isText := c.Args["form"].(value.Text)
	if !isText {
		v, err := value.Coerce(value.Param{Name: "form", Shape: value.ASquare}, c.Args["form"])
		if err != nil {
			return nil, err
		}
		inverse, err := system.Inverse(v.(*value.Matrix))
		if err != nil {
			return nil, value.Errf(diag.Numerical, "form", "the transformation is singular: %v", err)
		}
		return transformed(p, v.(*value.Matrix), inverse, "")
	}
	var t, inverse *value.Matrix
	var err error
	switch form := string(text); form {
	case "modal form":
		t, inverse, err = modalForm(c, p)
	case "controller form":
		t, inverse, err = companionForm(p, false)
	case "observer form":
		t, inverse, err = companionForm(p, true)
	case "staircase form":
		var f *numeric.StaircaseForm
		if f, err = numeric.Reachability(p.A.Dense(), p.B.Dense(), 0); err == nil {
			t, inverse = value.FromDense(f.T, f.Certificate.Digits), value.FromDense(f.Inverse, f.Certificate.Digits)
		}
	case "balanced form":
		t, inverse, err = balancedForm(c, p)
	default:
		e := value.Errf(diag.Type, "form", "%q is no form", form)
		if near := diag.Nearest(form, formNames); near != "" {
			e.WithHelp("did you mean %q?", near)
		} else {
			e.WithHelp("the forms are modal form, controller form, observer form, staircase form and balanced form")
		}
		return nil, e
	}
	if err != nil {
		return nil, system.Refused(err, "plant")
	}
	return transformed(p, t, inverse, string(text))
}

// transformed is the plant in the coordinates x̄ = T·x.
func transformed(p *value.Plant, t, inverse *value.Matrix, title string) (value.Value, error) {
	n, _ := system.PlantSize(p)
	if k, _ := t.Dims(); k != n {
		return nil, value.Errf(diag.Shape, "form", "the transformation is %d×%d; the plant has %d states", k, k, n)
	}
	var ch system.Chain
	kept := *t
	kept.Columns = system.Labels(p.States)
	q := &value.Plant{Every: p.Every, Inputs: p.Inputs, Outputs: p.Outputs, U0: p.U0, Y0: p.Y0, D: p.D, Title: title,
		States: system.Numbered("x̄", n), Transformation: &kept}
	q.A, q.B, q.C = ch.Mul(t, p.A, inverse), ch.Mul(t, p.B), ch.Mul(p.C, inverse)
	if len(p.X0) == n && n > 0 {
		q.X0 = nil
		x := ch.Mul(t, columnOf(p.X0))
		if ch.Err == nil {
			for i := range n {
				if v, ok := x.At(i, 0).(value.Number); ok {
					q.X0 = append(q.X0, v)
				}
			}
		}
	}
	return q, ch.Err
}

func columnOf(ns []value.Number) *value.Matrix {
	blocks := make([][]*value.Matrix, len(ns))
	for i, n := range ns {
		blocks[i] = []*value.Matrix{system.FromNumber(n)}
	}
	return system.Block(blocks)
}

// modalForm finds T exactly when all poles have rational parts and A has a full set of eigenvectors, else in floating point.
func modalForm(c *value.Call, p *value.Plant) (t, inverse *value.Matrix, err error) {
	if system.ExactPlant(p) {
		if v := rationalModes(p.A); v != nil {
			inv, err := v.Inverse()
			if err == nil {
				return value.ExactMatrix(inv), value.ExactMatrix(v), nil
			}
		}
	}
	n, _ := system.PlantSize(p)
	e, err := numeric.Eigen(p.A.Dense())
	if err != nil {
		return nil, nil, err
	}
	order := seqByMagnitude(e.Values)
	v := mat.NewDense(n, n, nil)
	col := 0
	for _, k := range order {
		if imag(e.Values[k]) < 0 {
			continue
		}
		for i := range n {
			x := e.Right.At(i, k)
			v.Set(i, col, real(x))
			if imag(e.Values[k]) > 0 {
				v.Set(i, col+1, imag(x))
			}
		}
		col++
		if imag(e.Values[k]) > 0 {
			col++
		}
	}
	if e.VectorCondition > 1e10 {
		return nil, nil, value.Errf(diag.Numerical, "plant", "the plant has repeated modes that share eigenvectors (condition of the eigenvectors %.1e): there is no modal form", e.VectorCondition).
			WithHelp("modes(…) shows the chains; \"staircase form\" always exists")
	}
	if e.VectorCondition > 1e4 {
		c.Note(fmt.Sprintf("the eigenvectors are nearly dependent (condition %.1e): the modal form loses as many digits", e.VectorCondition))
	}
	inv, cert, err := numeric.Inverse(v)
	if err != nil {
		return nil, nil, err
	}
	return value.FromDense(inv, cert.Digits), value.FromDense(v, e.Certificate.Digits), nil
}

func seqByMagnitude(values []complex128) []int {
	order := make([]int, len(values))
	for i := range order {
		order[i] = i
	}
	for i := 1; i < len(order); i++ {
		for j := i; j > 0 && cmplx.Abs(values[order[j]]) < cmplx.Abs(values[order[j-1]])*(1-1e-12); j-- {
			order[j], order[j-1] = order[j-1], order[j]
		}
	}
	return order
}

// rationalModes gives real eigenvectors as columns (two for a pair) when all eigenvalues have
// rational parts and there are enough of them, else nil.
func rationalModes(a *value.Matrix) *exact.Matrix {
	n, _ := a.Dims()
	roots, err := system.Eigenvalues(a)
	if err != nil {
		return nil
	}
	v := exact.NewMatrix(n, n)
	col := 0
	for i, r := range roots {
		if r.Re == nil {
			return nil
		}
		if r.Im.Exact.Sign() < 0 || i > 0 && sameRoot(roots[:i], r) {
			continue
		}
		vectors := eigenspace(a.Exact(), r)
		_, k := vectors.Dims()
		if col+k > n {
			return nil
		}
		for j := range k {
			for row := range n {
				v.Set(row, col, vectors.At(row, j))
			}
			col++
		}
	}
	if col != n {
		return nil
	}
	return v
}

func sameRoot(earlier []system.Root, r system.Root) bool {
	for _, e := range earlier {
		if e.Value == r.Value {
			return true
		}
	}
	return false
}

// eigenspace gives the kernel of A − λ, or for λ = σ + iω the real and imaginary parts of its vectors in turn.
func eigenspace(a *exact.Matrix, r system.Root) *exact.Matrix {
	n, _ := a.Dims()
	shifted, err := a.Sub(exact.Identity(n).Scale(r.Re.Exact))
	if err != nil {
		return exact.NewMatrix(n, 0)
	}
	if r.Im.Exact.Sign() == 0 {
		return shifted.Kernel()
	}
	// (A − σ)x = −ωy, (A − σ)y = ωx: the kernel of [[A−σ, ω], [−ω, A−σ]] holds (x, y)
	w := exact.Identity(n).Scale(r.Im.Exact)
	top, err1 := exact.Augment(shifted, w)
	bottom, err2 := exact.Augment(w.Neg(), shifted)
	if err1 != nil || err2 != nil {
		return exact.NewMatrix(n, 0)
	}
	both, err := exact.Stack(top, bottom)
	if err != nil {
		return exact.NewMatrix(n, 0)
	}
	k := both.Kernel()
	_, count := k.Dims()
	out := exact.NewMatrix(n, count)
	// the kernel is closed under (x, y) → (−y, x): keep vectors whose span grows by two
	kept := exact.NewMatrix(n, 0)
	for j := range count {
		x, y := k.Slice(0, n, j, j+1), k.Slice(n, 2*n, j, j+1)
		pairXY, err := exact.Augment(x, y)
		if err != nil {
			continue
		}
		grown, err := exact.Augment(kept, pairXY)
		if err != nil {
			continue
		}
		_, before := kept.Dims()
		if grown.Rank() == before+2 {
			kept = grown
		}
	}
	if _, c := kept.Dims(); c == count {
		return kept
	}
	return out.Slice(0, n, 0, 0)
}

// companionForm finds T of the controller form from the controllability indices, or by duality of the observer form.
func companionForm(p *value.Plant, dual bool) (t, inverse *value.Matrix, err error) {
	q, err := pairOfPlant(p, dual)
	if err != nil {
		return nil, nil, err
	}
	d, err := q.decide()
	if err != nil {
		return nil, nil, err
	}
	n, _ := q.a.Dims()
	word, verb := "controller form", "moves"
	who := "input"
	if dual {
		word, verb, who = "observer form", "sees", "output"
	}
	if d.rank < n {
		return nil, nil, value.Errf(diag.Numerical, "plant", "no %s: there is a mode that no %s %s: %s", word, who, verb, system.RootText(d.missing))
	}
	a, b := q.a, q.b
	if !q.exact() {
		a, b = a.Floating(), b.Floating()
	}
	t, err = luenbergerForm(a, b, d.indices)
	if err != nil {
		return nil, nil, err
	}
	inverse, err = system.Inverse(t)
	if err != nil {
		return nil, nil, err
	}
	if dual { // (T·Aᵀ·T⁻¹)ᵀ = T⁻ᵀ·A·Tᵀ
		var ch system.Chain
		t, inverse = ch.Transpose(inverse), ch.Transpose(t)
		err = ch.Err
	}
	return t, inverse, err
}

// luenbergerForm: with L = [b₁ Ab₁ … A^(d₁−1)b₁ b₂ …] and qᵢ the last row of each input's block of L⁻¹,
// T stacks qᵢ, qᵢA, …, qᵢA^(dᵢ−1).
func luenbergerForm(a, b *value.Matrix, indices []int) (*value.Matrix, error) {
	var ch system.Chain
	var columns []*value.Matrix
	var ends []int
	total := 0
	for j, d := range indices {
		v := system.Columns(b, j)
		for range d {
			columns = append(columns, v)
			v = ch.Mul(a, v)
		}
		total += d
		ends = append(ends, total-1)
	}
	if ch.Err != nil {
		return nil, ch.Err
	}
	inverse := ch.Inverse(system.Block([][]*value.Matrix{columns}))
	if ch.Err != nil {
		return nil, ch.Err
	}
	var rows [][]*value.Matrix
	for j, d := range indices {
		if d == 0 {
			continue
		}
		q := system.RowsOf(inverse, ends[j])
		for range d {
			rows = append(rows, []*value.Matrix{q})
			q = ch.Mul(q, a)
		}
	}
	return system.Block(rows), ch.Err
}
