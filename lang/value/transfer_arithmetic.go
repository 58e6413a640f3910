package value

import (
	"gainwright/lang/diag"
	"gainwright/lang/exact"
)

// Dims gives the numbers of outputs (rows) and inputs (columns).
func (t *Transfer) Dims() (outputs, inputs int) {
	if len(t.Entries) == 0 {
		return len(t.Outputs), len(t.Inputs)
	}
	return len(t.Entries), len(t.Entries[0])
}

// IsExact tells whether every entry is exact.
func (t *Transfer) IsExact() bool {
	for _, row := range t.Entries {
		for _, e := range row {
			if !e.isExact() {
				return false
			}
		}
	}
	return true
}

// isConstant tells whether no entry depends on the variable.
func (t *Transfer) isConstant() bool {
	for _, row := range t.Entries {
		for _, e := range row {
			if e.Num.Degree() > 0 || e.Den.Degree() > 0 {
				return false
			}
		}
	}
	return true
}

func (r Ratio) isExact() bool { return r.Num.Exact != nil && r.Den.Exact != nil }

// MakeRatio gives num/den with a monic denominator, in lowest terms when both are exact.
func MakeRatio(num, den *Polynomial) (Ratio, error) {
	if den.IsZero() {
		return Ratio{}, divisionByZero()
	}
	variable, err := num.sharedVariable(den)
	if err != nil {
		return Ratio{}, err
	}
	if num.Degree() > LargestRatioDegree || den.Degree() > LargestRatioDegree {
		return Ratio{}, diag.New(diag.Limit, "a transfer function of degree above %d is too large", LargestRatioDegree)
	}
	if num.Exact != nil && den.Exact != nil {
		r, err := exact.NewRational(*num.Exact, *den.Exact)
		return ratioOf(variable, r), exactLimit(err)
	}
	monic, lead, err := den.monic()
	if err != nil {
		return Ratio{}, err
	}
	inverse, err := divideNumbers(Int(1), lead)
	if err != nil {
		return Ratio{}, err
	}
	if num, err = scalePolynomial(num, inverse); err != nil {
		return Ratio{}, err
	}
	if num.IsZero() {
		monic = ConstantPolynomial(variable, Int(1))
	}
	return Ratio{inVariable(num, variable), inVariable(monic, variable)}, nil
}

func inVariable(p *Polynomial, variable string) *Polynomial {
	if p.Variable == variable {
		return p
	}
	out := *p
	out.Variable = variable
	return &out
}

// ratioOf wraps an exact rational function.
func ratioOf(variable string, r exact.Rational) Ratio {
	return Ratio{ExactPolynomial(variable, r.Num), ExactPolynomial(variable, r.Den)}
}

func constantRatio(variable string, n Number) Ratio {
	return Ratio{ConstantPolynomial(variable, n), ConstantPolynomial(variable, Int(1))}
}

func addRatios(a, b Ratio) (Ratio, error) {
	switch {
	case a.Num.IsZero():
		return b, nil
	case b.Num.IsZero():
		return a, nil
	case samePolynomial(a.Den, b.Den):
		num, err := addPolynomials(a.Num, b.Num)
		if err != nil {
			return Ratio{}, err
		}
		return MakeRatio(num, a.Den)
	}
	left, err := multiplyPolynomials(a.Num, b.Den)
	if err != nil {
		return Ratio{}, err
	}
	right, err := multiplyPolynomials(b.Num, a.Den)
	if err != nil {
		return Ratio{}, err
	}
	num, err := addPolynomials(left, right)
	if err != nil {
		return Ratio{}, err
	}
	den, err := multiplyPolynomials(a.Den, b.Den)
	if err != nil {
		return Ratio{}, err
	}
	return MakeRatio(num, den)
}

func multiplyRatios(a, b Ratio) (Ratio, error) {
	num, err := multiplyPolynomials(a.Num, b.Num)
	if err != nil {
		return Ratio{}, err
	}
	den, err := multiplyPolynomials(a.Den, b.Den)
	if err != nil {
		return Ratio{}, err
	}
	return MakeRatio(num, den)
}

func invertRatio(a Ratio) (Ratio, error) { return MakeRatio(a.Den, a.Num) }

// RatioTransfer gives the one-by-one transfer function num/den.
func RatioTransfer(num, den *Polynomial) (*Transfer, error) {
	r, err := MakeRatio(num, den)
	if err != nil {
		return nil, err
	}
	return &Transfer{Variable: r.Num.Variable, Entries: [][]Ratio{{r}}}, nil
}

// combineTime finds variable and sample time of a combination; what depends on neither fits any.
func combineTime(a, b *Transfer) (variable string, every *Number, err error) {
	variable, err = mergeVariables(a.Variable, b.Variable, a.isConstant() && a.Every == nil, b.isConstant() && b.Every == nil)
	if err != nil {
		return "", nil, err
	}
	switch {
	case a.Every == nil:
		return variable, b.Every, nil
	case b.Every == nil || sameNumber(*a.Every, *b.Every):
		return variable, a.Every, nil
	}
	return "", nil, sampleTimesDiffer(a.Every, b.Every)
}

func sampleTimesDiffer(a, b *Number) error {
	text := func(every *Number) string {
		if every == nil {
			return "continuous"
		}
		return "sampled every " + brief(*every) + " s"
	}
	e := diag.New(diag.Shape, "the sample times do not agree: the left system is %s, the right one %s", text(a), text(b))
	if a == nil || b == nil {
		return e.WithHelp("sampled(P, every: …) makes a sampled system of a continuous one")
	}
	return e
}

func addTransfers(a, b *Transfer) (*Transfer, error) {
	variable, every, err := combineTime(a, b)
	if err != nil {
		return nil, err
	}
	p, m := a.Dims()
	if p2, m2 := b.Dims(); p != p2 || m != m2 {
		return nil, sizesDiffer("adding", p, m, p2, m2)
	}
	out := &Transfer{Variable: variable, Every: every, Entries: newEntries(p, m),
		Inputs: firstNamed(a.Inputs, b.Inputs), Outputs: firstNamed(a.Outputs, b.Outputs)}
	for i := range p {
		for j := range m {
			if out.Entries[i][j], err = addRatios(a.Entries[i][j], b.Entries[i][j]); err != nil {
				return nil, err
			}
		}
	}
	return out, nil
}

func firstNamed(a, b []Signal) []Signal {
	if a != nil {
		return a
	}
	return b
}

func newEntries(p, m int) [][]Ratio {
	rows := make([][]Ratio, p)
	for i := range rows {
		rows[i] = make([]Ratio, m)
	}
	return rows
}

// mapTransfer applies f to every entry.
func mapTransfer(t *Transfer, f func(Ratio) (Ratio, error)) (*Transfer, error) {
	p, m := t.Dims()
	out := &Transfer{Variable: t.Variable, Every: t.Every, Entries: newEntries(p, m), Inputs: t.Inputs, Outputs: t.Outputs}
	for i := range p {
		for j := range m {
			var err error
			if out.Entries[i][j], err = f(t.Entries[i][j]); err != nil {
				return nil, err
			}
		}
	}
	return out, nil
}

func negateTransfer(t *Transfer) *Transfer {
	out, _ := mapTransfer(t, func(r Ratio) (Ratio, error) { return Ratio{negatePolynomial(r.Num), r.Den}, nil })
	return out
}

// multiplyTransfers gives a·b; a one-by-one factor multiplies every entry.
func multiplyTransfers(a, b *Transfer) (*Transfer, error) {
	variable, every, err := combineTime(a, b)
	if err != nil {
		return nil, err
	}
	p, n := a.Dims()
	n2, m := b.Dims()
	var out *Transfer
	switch {
	case n == n2:
		out, err = transferProduct(a, b, p, n, m)
	case p == 1 && n == 1:
		out, err = mapTransfer(b, func(r Ratio) (Ratio, error) { return multiplyRatios(a.Entries[0][0], r) })
	case n2 == 1 && m == 1:
		out, err = mapTransfer(a, func(r Ratio) (Ratio, error) { return multiplyRatios(r, b.Entries[0][0]) })
	default:
		return nil, sizesDiffer("the product", p, n, n2, m)
	}
	if err != nil {
		return nil, err
	}
	out.Variable, out.Every = variable, every
	return out, nil
}

func transferProduct(a, b *Transfer, p, n, m int) (*Transfer, error) {
	if p*n*m > 20_000 {
		return nil, diag.New(diag.Limit, "the product of %s and %s transfer functions is too large", sizeText(p, n), sizeText(n, m)).
			WithHelp("realize(…) turns them into plants, whose products are quicker")
	}
	out := &Transfer{Entries: newEntries(p, m), Inputs: b.Inputs, Outputs: a.Outputs}
	for i := range p {
		for j := range m {
			sum := constantRatio(a.Variable, Rat(ratZero))
			for k := range n {
				term, err := multiplyRatios(a.Entries[i][k], b.Entries[k][j])
				if err != nil {
					return nil, err
				}
				if sum, err = addRatios(sum, term); err != nil {
					return nil, err
				}
			}
			out.Entries[i][j] = sum
		}
	}
	return out, nil
}

func transposeTransfer(t *Transfer) *Transfer {
	p, m := t.Dims()
	out := &Transfer{Variable: t.Variable, Every: t.Every, Entries: newEntries(m, p), Inputs: t.Outputs, Outputs: t.Inputs}
	for i := range p {
		for j := range m {
			out.Entries[j][i] = t.Entries[i][j]
		}
	}
	return out
}

// staticTransfer takes a real matrix as a transfer function with the variable and time of like (nil for none).
func staticTransfer(m *Matrix, like *Transfer) *Transfer {
	t := &Transfer{Entries: newEntries(m.rows, m.cols)}
	if like != nil {
		t.Variable, t.Every = like.Variable, like.Every
	}
	for i := range m.rows {
		for j := range m.cols {
			n, _ := m.At(i, j).(Number)
			t.Entries[i][j] = constantRatio(t.Variable, n)
		}
	}
	if m.rows == 0 || m.cols == 0 {
		t.Entries = nil
		t.Outputs, t.Inputs = make([]Signal, m.rows), make([]Signal, m.cols)
	}
	return t
}
