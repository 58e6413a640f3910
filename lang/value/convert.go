package value

import (
	"errors"
	"math"
	"math/big"
	"math/rand/v2"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// largestConversion bounds the order of plants that are converted to transfer functions.
const largestConversion = 100

// ToPlant takes what acts as a system as a plant: a model's plant, a gain or a matrix as a
// constant, a transfer function realised (of least order for exact data; in z without a
// sample time, 1 s is taken).
func ToPlant(v Value) (*Plant, error) {
	v = Force(v)
	switch x := v.(type) {
	case *Plant:
		return x, nil
	case *Model:
		return x.Plant, nil
	case *Gain:
		return staticPlant(x.Values, x.ColumnSignals, x.RowSignals), nil
	case *Transfer:
		return realize(x)
	case *Polynomial:
		t, err := asTransfer(x)
		if err != nil {
			return nil, err
		}
		return realize(t)
	case Number, Quantity, *Matrix, *List:
		m, err := asMatrix(v)
		if err != nil {
			return nil, err
		}
		if m.IsComplex() {
			return nil, diag.New(diag.Type, "systems have real gains; this matrix is complex")
		}
		return staticPlant(m, nil, nil), nil
	}
	return nil, diag.New(diag.Type, "a system is needed; this is %s", Describe(v))
}

// ToTransfer takes a system, a polynomial, a matrix or a number as a transfer function.
// Floating matrices count at their binary64 values; the coefficients are computed exactly
// and rounded, with the error that the entries' own uncertainty brings.
func ToTransfer(v Value) (*Transfer, error) {
	v = Force(v)
	switch x := v.(type) {
	case *Plant:
		return plantTransfer(x)
	case *Model:
		return plantTransfer(x.Plant)
	}
	return asTransfer(v)
}

// rationalMatrix gives the entries as rationals.
func rationalMatrix(m *Matrix) (*exact.Matrix, error) {
	if m.IsComplex() {
		return nil, diag.New(diag.Type, "a real matrix is needed; this one is complex")
	}
	if m.IsExact() {
		return m.exactRe, nil
	}
	r, err := exact.FromFloats(m.rows, m.cols, m.re)
	if err != nil {
		return nil, diag.New(diag.Numerical, "%s", err)
	}
	return r, nil
}

func rationalParts(p *Plant) (parts [4]*exact.Matrix, err error) {
	for k, m := range [...]*Matrix{p.A, p.B, p.C, p.D} {
		if parts[k], err = rationalMatrix(m); err != nil {
			return parts, err
		}
	}
	return parts, nil
}

func plantTransfer(p *Plant) (*Transfer, error) {
	if p.Order() > largestConversion {
		return nil, diag.New(diag.Limit, "a plant with %d states is too large for a transfer function: at most %d", p.Order(), largestConversion).
			WithHelp("at(P, 2i) evaluates it without one")
	}
	parts, err := rationalParts(p)
	if err != nil {
		return nil, err
	}
	variable := "s"
	if p.Every != nil {
		variable = "z"
	}
	out := &Transfer{Variable: variable, Every: p.Every, Inputs: p.Inputs, Outputs: p.Outputs}
	if p.inputCount() == 0 || p.outputCount() == 0 {
		return out, nil
	}
	entries, err := exact.Transfer(parts[0], parts[1], parts[2], parts[3])
	if err != nil {
		return nil, exactLimit(err)
	}
	var spread func(i, j int) (num, den float64)
	if !p.IsExact() {
		if spread, err = coefficientSpread(p, parts); err != nil {
			return nil, err
		}
	}
	out.Entries = newEntries(p.outputCount(), p.inputCount())
	for i, row := range entries {
		for j, r := range row {
			if spread == nil {
				out.Entries[i][j] = ratioOf(variable, r)
				continue
			}
			num, den := spread(i, j)
			out.Entries[i][j] = Ratio{roundPolynomial(variable, r.Num, num), roundPolynomial(variable, r.Den, den)}
		}
	}
	return out, nil
}

// roundPolynomial rounds to binary64 with a relative error of the largest coefficient.
func roundPolynomial(variable string, p exact.Polynomial, relative float64) *Polynomial {
	f := p.Float64()
	most := largest(f)
	return FloatPolynomial(variable, f, most*relative+ulp(most))
}

// coefficientSpread estimates by how much the uncertainty of a floating plant moves the
// coefficients of its transfer functions: the largest change under three fixed patterns
// of perturbation of the size of the entries' errors, times three.
func coefficientSpread(p *Plant, parts [4]*exact.Matrix) (func(i, j int) (num, den float64), error) {
	zero := func(int, int) (float64, float64) { return 0, 0 }
	if p.A.Err == 0 && p.B.Err == 0 && p.C.Err == 0 && p.D.Err == 0 || p.Order() > largestConversion/2 && p.A.Err == 0 {
		return zero, nil
	}
	nums, den, err := exact.Numerators(parts[0], parts[1], parts[2], parts[3])
	if err != nil {
		return nil, exactLimit(err)
	}
	changes := make([][]float64, len(nums))
	for i := range changes {
		changes[i] = make([]float64, len(nums[i]))
	}
	denChange := 0.0
	random := rand.New(rand.NewPCG(1, 2))
	for range 3 {
		var moved [4]*exact.Matrix
		for k, m := range [...]*Matrix{p.A, p.B, p.C, p.D} {
			moved[k] = perturbed(m, parts[k], random)
		}
		nums2, den2, err := exact.Numerators(moved[0], moved[1], moved[2], moved[3])
		if err != nil {
			return nil, exactLimit(err)
		}
		denChange = math.Max(denChange, relativeChange(den, den2))
		for i := range nums {
			for j := range nums[i] {
				changes[i][j] = math.Max(changes[i][j], relativeChange(nums[i][j], nums2[i][j]))
			}
		}
	}
	return func(i, j int) (float64, float64) { return 3 * changes[i][j], 3 * denChange }, nil
}

func relativeChange(p, q exact.Polynomial) float64 {
	size := largest(p.Float64())
	change := largest(p.Sub(q).Float64())
	if size == 0 {
		return change
	}
	return change / size
}

// perturbed moves the non-zero entries of a floating matrix by its error estimate, up or down.
func perturbed(m *Matrix, at *exact.Matrix, random *rand.Rand) *exact.Matrix {
	if m.IsExact() || m.Err == 0 {
		return at
	}
	out := at.Clone()
	for i := range m.rows {
		for j := range m.cols {
			if x := at.At(i, j); x.Sign() != 0 {
				step := new(big.Rat).SetFloat64(math.Min(m.Err, math.MaxFloat64))
				if random.IntN(2) == 0 {
					step.Neg(step)
				}
				out.Set(i, j, step.Add(step, x))
			}
		}
	}
	return out
}

// realize gives a plant with the transfer function t.
func realize(t *Transfer) (*Plant, error) {
	p, m := t.Dims()
	if p == 0 || m == 0 {
		return staticPlant(zeroMatrix(p, m), t.Inputs, t.Outputs), nil
	}
	rows, isExact, relative := make([][]exact.Rational, p), t.IsExact(), 0.0
	for i := range rows {
		rows[i] = make([]exact.Rational, m)
		for j, e := range t.Entries[i] {
			r, err := rationalOf(e)
			if err != nil {
				return nil, err
			}
			rows[i][j] = r
			for _, q := range [...]*Polynomial{e.Num, e.Den} {
				if f, err := q.Floats(); !isExact && len(f) > 0 {
					relative = math.Max(relative, err/largest(f))
				}
			}
		}
	}
	a, b, c, d, err := exact.Realize(rows)
	var improper *exact.ImproperError
	if errors.As(err, &improper) {
		return nil, diag.New(diag.Numerical, "entry [%d, %d] has a numerator of degree %d over a denominator of degree %d: it differentiates and has no state space",
			improper.Row, improper.Column, improper.NumeratorDegree, improper.DenominatorDegree)
	}
	if err != nil {
		return nil, exactLimit(err)
	}
	out := &Plant{Every: t.Every, Inputs: t.Inputs, Outputs: t.Outputs}
	if t.Variable == "z" && t.Every == nil && !t.isConstant() {
		out.Every = ptr(Int(1))
		out.Notes = []string{"the sample time is taken as 1 s; timed(G, every: …) sets it"}
	}
	for k, part := range [...]*exact.Matrix{a, b, c, d} {
		target := [...]**Matrix{&out.A, &out.B, &out.C, &out.D}[k]
		*target = ExactMatrix(part)
		if !isExact {
			*target = (*target).Floating()
			(*target).Err = math.Max((*target).Err, relative*largest((*target).re))
		}
	}
	out.States = DefaultSignals("x", out.Order())
	if out.Inputs == nil {
		out.Inputs = DefaultSignals("u", m)
	}
	if out.Outputs == nil {
		out.Outputs = DefaultSignals("y", p)
	}
	return out, nil
}

func ptr[T any](v T) *T { return &v }

// rationalOf takes floating coefficients at their binary64 values.
func rationalOf(r Ratio) (exact.Rational, error) {
	num, err := rationalPolynomial(r.Num)
	if err != nil {
		return exact.Rational{}, err
	}
	den, err := rationalPolynomial(r.Den)
	if err != nil {
		return exact.Rational{}, err
	}
	out, err := exact.NewRational(num, den)
	return out, exactLimit(err)
}

func rationalPolynomial(p *Polynomial) (exact.Polynomial, error) {
	if p.Exact != nil {
		return *p.Exact, nil
	}
	c := make([]*big.Rat, len(p.F))
	for k, x := range p.F {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return exact.Polynomial{}, diag.New(diag.Numerical, "a coefficient is not a finite number")
		}
		c[k] = new(big.Rat).SetFloat64(x)
	}
	return exact.NewPolynomial(c...), nil
}
