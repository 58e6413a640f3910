// Package polynomial is the family of polynomials and their values, roots and stability tables.
package polynomial

import (
	"fmt"
	"math"
	"math/big"
	"math/cmplx"

	"gainwright/builtins/numeric"
	"gainwright/builtins/system"
	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// mostDegree bounds polynomials that roots and stability tables take.
const mostDegree = 200

func polynomialParam() []value.Param {
	return []value.Param{{Name: "p", Shape: value.APolynomial, Doc: "a polynomial in s or z"}}
}

// Builtins lists the family.
func Builtins() []*value.Builtin {
	return []*value.Builtin{
		{
			Name: "polynomial", Family: "polynomial",
			Params: []value.Param{{Name: "coefficients", Shape: value.AVector, Doc: "a list of coefficients, highest power first"}},
			Result: "polynomial in s", Summary: "a polynomial from its coefficients, highest power first",
			Doc:      "Exact when the coefficients are. A polynomial can also be written as it stands: s^2 + 3*s + 2.",
			Examples: []value.Example{{Input: "polynomial([1, 3, 2])", Output: "= s^2 + 3*s + 2"}},
			Errors:   []string{"complex coefficients"}, Source: "definition", SeeAlso: []string{"coefficients", "roots"},
			Func: fromCoefficients,
		},
		{
			Name: "coefficients", Family: "polynomial", Params: polynomialParam(),
			Result: "list of numbers, highest power first", Summary: "the coefficients of a polynomial, highest power first",
			Doc: "Zero coefficients between are listed too.", Examples: []value.Example{{Input: "coefficients(s^2 + 2)", Output: "= [1, 0, 2]"}},
			Errors: []string{"a value that is no polynomial"}, Source: "definition", SeeAlso: []string{"polynomial", "degree"},
			Func: func(c *value.Call) (value.Value, error) {
				l := &value.List{}
				for _, n := range c.Polynomial("p").Coefficients() {
					l.Items = append(l.Items, n)
				}
				return l, nil
			},
		},
		{
			Name: "degree", Family: "polynomial", Params: polynomialParam(),
			Result: "number", Summary: "the degree of a polynomial",
			Doc: "Of the zero polynomial −1, by convention.", Examples: []value.Example{{Input: "degree(s^2 + 2)", Output: "= 2"}},
			Errors: []string{"a value that is no polynomial"}, Source: "definition", SeeAlso: []string{"coefficients"},
			Func: func(c *value.Call) (value.Value, error) { return value.Int(c.Polynomial("p").Degree()), nil },
		},
		{
			Name: "roots", Family: "polynomial", Params: polynomialParam(),
			Result: "list, each root as often as it occurs", Summary: "the roots of a polynomial, with certified digits",
			Doc: "Ordered by magnitude. Made square-free first, then found in as much precision as it takes to hold each root in a disc of its own; rational roots are exact. " +
				"Of floating coefficients the roots of the numbers as they are, with the error that the coefficients' own uncertainty makes.",
			Examples: []value.Example{{Input: "roots(s^2 + 3*s + 2)", Output: "= [-1, -2]"}},
			Errors:   []string{"the zero polynomial", fmt.Sprintf("a degree above %d", mostDegree)},
			Source:   "Aberth 1973, Mathematics of Computation 27; Yun 1976", SeeAlso: []string{"polynomial_with_roots", "routh_table"},
			Func: roots,
		},
		{
			Name: "polynomial_with_roots", Family: "polynomial",
			Params: []value.Param{{Name: "roots", Shape: value.PoleList, Doc: "a list of numbers and conjugate pairs"}},
			Result: "monic polynomial in s", Summary: "the monic polynomial with the given roots",
			Doc:      "Exact when the roots are, or when a pair's quadratic is: pole_pair(damping: 0.7, frequency: 1.1) is.",
			Examples: []value.Example{{Input: "polynomial_with_roots([-1, -2 ± 3i])", Output: "= s^3 + 5*s^2 + 17*s + 13"}},
			Errors:   []string{"a complex root without its conjugate"}, Source: "definition", SeeAlso: []string{"roots", "characteristic_polynomial"},
			Func: func(c *value.Call) (value.Value, error) { return value.PolynomialFromPoles(c.List("roots")) },
		},
		{
			Name: "at", Family: "polynomial",
			Params: []value.Param{{Name: "f", Shape: value.Anything, Doc: "a polynomial, a transfer function or a plant"}, {Name: "x", Shape: value.ANumber, Doc: "where: a real or complex number"}},
			Result: "number, or a matrix for several channels", Summary: "the value of a polynomial or a transfer function at a point",
			Doc: "Exact for exact data at an exact point. Of a floating plant one solution with a Hessenberg matrix. at(G, 2i) is the frequency response at 2 rad/s; " +
				"of a sampled plant the point is z, so exp(2i*T).",
			Examples: []value.Example{{Input: "at(1/(s + 1), 1i)", Output: "= 0.5 - 0.5i"}},
			Errors:   []string{"a pole at the point"}, Source: "Horner; Laub 1981, IEEE Trans. Automatic Control 26", SeeAlso: []string{"transfer", "sweep"},
			Func: at,
		},
		{
			Name: "routh_table", Family: "polynomial", Params: polynomialParam(),
			Result: "report; stands for \"all roots in the left half plane\"", Summary: "the stability table of a polynomial in s, singular cases worked",
			Doc:      "Exact. Fields: rows, right, left, axis (how many roots lie there), holds. A row that vanishes and a leading zero are worked, and the table says how.",
			Examples: []value.Example{{Input: "routh_table(s^3 + 2*s^2 + 3*s + 10).right", Output: "= 2"}},
			Errors:   []string{"the zero polynomial"}, Source: "Routh 1877; singular rows: Benidir & Picinbono 1990, IEEE Trans. Automatic Control 35", SeeAlso: []string{"jury_table", "roots"},
			Func: routhTable,
		},
		{
			Name: "jury_table", Family: "polynomial", Params: polynomialParam(),
			Result: "report; stands for \"all roots inside the unit circle\"", Summary: "the stability table of a polynomial in z, singular cases worked",
			Doc:      "Exact. Fields: rows, conditions, inside, on, outside, holds.",
			Examples: []value.Example{{Input: "jury_table(z^2 - 0.5*z + 0.06).inside", Output: "= 2"}},
			Errors:   []string{"the zero polynomial"}, Source: "Jury 1962, Proc. IRE 50", SeeAlso: []string{"routh_table", "roots"},
			Func: juryTable,
		},
	}
}

func fromCoefficients(c *value.Call) (value.Value, error) {
	m := c.Matrix("coefficients")
	n, _ := m.Dims()
	var coefficients []value.Number
	for i := range n {
		x, ok := m.At(i, 0).(value.Number)
		if !ok {
			return nil, value.Errf(diag.Type, "coefficients", "the coefficients must be real")
		}
		coefficients = append(coefficients, x)
	}
	return value.PolynomialOf("s", coefficients)
}

// rational gives a polynomial over the rationals, binary64 coefficients as what they are.
func rational(p *value.Polynomial) (exact.Polynomial, error) {
	if p.Exact != nil {
		return *p.Exact, nil
	}
	cs := make([]*big.Rat, len(p.F))
	for i, x := range p.F {
		r := new(big.Rat).SetFloat64(x)
		if r == nil {
			return exact.Polynomial{}, value.Errf(diag.Numerical, "p", "a coefficient is not a finite number")
		}
		cs[i] = r
	}
	return exact.NewPolynomial(cs...), nil
}

// usable refuses the zero polynomial and degrees beyond the bound.
func usable(c *value.Call) (exact.Polynomial, *value.Polynomial, error) {
	p := c.Polynomial("p")
	x, err := rational(p)
	if err != nil {
		return x, p, err
	}
	if x.Degree() < 0 {
		return x, p, value.Errf(diag.Numerical, "p", "every number is a root of the zero polynomial")
	}
	if x.Degree() > mostDegree {
		return x, p, value.Errf(diag.Limit, "p", "the degree is %d; at most %d is worked", x.Degree(), mostDegree)
	}
	return x, p, nil
}

func roots(c *value.Call) (value.Value, error) {
	x, p, err := usable(c)
	if err != nil {
		return nil, err
	}
	found, err := system.RootsOf(x)
	if err != nil {
		return nil, err
	}
	if p.Exact == nil {
		for i := range found {
			found[i].Err += shift(p, found[i])
			if p.Err > 0 {
				found[i].Re, found[i].Im = nil, nil
			}
		}
	}
	return system.List(found), nil
}

// shift is how far the coefficients' uncertainty can move a root: (Err·Σ|x|ᵏ / |p⁽ᵐ⁾(x)/m!|)^(1/m) for multiplicity m.
func shift(p *value.Polynomial, r system.Root) float64 {
	if p.Err == 0 {
		return 0
	}
	size := cmplx.Abs(r.Value)
	sum := 0.0
	for range p.F {
		sum = sum*size + 1
	}
	d := append([]float64(nil), p.F...)
	factorial := 1.0
	for k := 1; k <= r.Multiplicity; k++ {
		next := make([]float64, 0, len(d))
		for i := 0; i < len(d)-1; i++ {
			next = append(next, d[i]*float64(len(d)-1-i))
		}
		d = next
		factorial *= float64(k)
	}
	var v complex128
	for _, x := range d {
		v = v*r.Value + complex(x, 0)
	}
	slope := cmplx.Abs(v) / factorial
	if slope == 0 {
		return math.Inf(1)
	}
	return math.Pow(p.Err*sum/slope, 1/float64(r.Multiplicity))
}

func routhTable(c *value.Call) (value.Value, error) {
	x, p, err := usable(c)
	if err != nil {
		return nil, err
	}
	if p.Variable == "z" {
		c.Note("the table counts roots by half planes; of a sampled system jury_table counts by the unit circle")
	}
	t, err := exact.NewRouthTable(x)
	if err != nil {
		return nil, value.Errf(diag.Numerical, "p", "%v", err)
	}
	holds := t.Stable()
	r := &value.Report{Holds: &holds, Columns: []string{"row", "entries", "remark"}}
	r.Title = verdict(holds, "all roots in the left half plane", fmt.Sprintf("%d in the right half plane, %d on the axis", t.Right, t.Axis))
	rows := &value.List{}
	for _, row := range t.Rows {
		entries := numbers(row.Entries)
		rows.Items = append(rows.Items, entries)
		r.Rows = append(r.Rows, []value.Value{value.Text(power(p.Variable, row.Power)), entries, value.Text(row.Note())})
	}
	r.Fields = []value.Named{
		{Name: "right", Value: value.Int(t.Right)}, {Name: "left", Value: value.Int(t.Left)}, {Name: "axis", Value: value.Int(t.Axis)},
		{Name: "rows", Value: rows}, {Name: "holds", Value: value.Boolean(holds)},
	}
	return r, nil
}

func verdict(holds bool, yes, no string) string {
	if holds {
		return yes
	}
	return no
}

func power(variable string, k int) string {
	if variable == "" {
		variable = "s"
	}
	return fmt.Sprintf("%s^%d", variable, k)
}

func numbers(rs []*big.Rat) *value.List {
	l := &value.List{}
	for _, r := range rs {
		l.Items = append(l.Items, value.Rat(r))
	}
	return l
}

func juryTable(c *value.Call) (value.Value, error) {
	x, p, err := usable(c)
	if err != nil {
		return nil, err
	}
	if p.Variable == "s" && x.Degree() > 0 {
		c.Note("the table counts roots by the unit circle; of a continuous system routh_table counts by half planes")
	}
	t, err := exact.NewJuryTable(x)
	if err != nil {
		return nil, value.Errf(diag.Numerical, "p", "%v", err)
	}
	holds := t.Stable()
	r := &value.Report{Holds: &holds, Columns: []string{"row", "entries"}}
	r.Title = verdict(holds, "all roots inside the unit circle", fmt.Sprintf("%d outside the unit circle, %d on it", t.Outside, t.On))
	rows := &value.List{}
	for i, row := range t.Rows {
		entries := numbers(row.Entries)
		rows.Items = append(rows.Items, entries)
		r.Rows = append(r.Rows, []value.Value{value.Text(fmt.Sprintf("%d", 2*i+1)), entries})
		if row.Reversed != nil {
			r.Rows = append(r.Rows, []value.Value{value.Text(fmt.Sprintf("%d, reversed", 2*i+2)), numbers(row.Reversed)})
		}
	}
	conditions := &value.List{}
	for _, k := range t.Conditions {
		conditions.Items = append(conditions.Items, value.Text(k.Text+": "+verdict(k.Holds, "holds", "fails")))
	}
	if t.Vanished {
		r.Notes = append(r.Notes, "a row vanished: roots lie on the circle or mirrored in it; the counts are worked through the map to the half plane")
	}
	r.Fields = []value.Named{
		{Name: "inside", Value: value.Int(t.Inside)}, {Name: "on", Value: value.Int(t.On)}, {Name: "outside", Value: value.Int(t.Outside)},
		{Name: "conditions", Value: conditions}, {Name: "rows", Value: rows}, {Name: "holds", Value: value.Boolean(holds)},
	}
	return r, nil
}

func at(c *value.Call) (value.Value, error) {
	x := c.Args["x"]
	switch f := value.Force(c.Args["f"]).(type) {
	case *value.Polynomial:
		return horner(f, x)
	case *value.Transfer:
		return transferAt(f, x)
	case *value.Plant, *value.Model:
		p, err := value.ToPlant(f)
		if err != nil {
			return nil, err
		}
		if n, m := system.PlantSize(p); n <= 8 && m > 0 && system.ExactPlant(p) && isExact(x) {
			g, err := value.ToTransfer(p)
			if err != nil {
				return nil, err
			}
			return transferAt(g, x)
		}
		return plantAt(p, x)
	case value.Number, value.Complex:
		return f, nil
	}
	return nil, value.Errf(diag.Type, "f", "%s has no value at a point", value.Describe(c.Args["f"]))
}

func isExact(v value.Value) bool {
	switch v := v.(type) {
	case value.Number:
		return v.IsExact()
	case value.Complex:
		return v.IsExact()
	}
	return false
}

func horner(p *value.Polynomial, x value.Value) (value.Value, error) {
	var sum value.Value = value.Int(0)
	for _, k := range p.Coefficients() {
		product, err := value.Multiply(sum, x)
		if err != nil {
			return nil, err
		}
		if sum, err = value.Add(product, k); err != nil {
			return nil, err
		}
	}
	return sum, nil
}

func transferAt(g *value.Transfer, x value.Value) (value.Value, error) {
	rows := make([][]value.Entry, len(g.Entries))
	for i, row := range g.Entries {
		for _, ratio := range row {
			num, err := horner(ratio.Num, x)
			if err != nil {
				return nil, err
			}
			den, err := horner(ratio.Den, x)
			if err != nil {
				return nil, err
			}
			v, err := value.Divide(num, den)
			if err != nil {
				return nil, value.Errf(diag.Numerical, "x", "the transfer function has a pole there")
			}
			rows[i] = append(rows[i], value.Entry{Value: v})
		}
	}
	if len(rows) == 1 && len(rows[0]) == 1 {
		return rows[0][0].Value, nil
	}
	if len(rows) == 0 || len(rows[0]) == 0 {
		return system.Zero(len(rows), 0), nil
	}
	m, _, err := value.MatrixLiteral(rows)
	return m, err
}

func plantAt(p *value.Plant, x value.Value) (value.Value, error) {
	f, err := numeric.NewFrequencyResponse(p.A.Dense(), p.B.Dense(), p.C.Dense(), p.D.Dense())
	if err != nil {
		return nil, system.Refused(err, "f")
	}
	var s complex128
	switch x := x.(type) {
	case value.Number:
		s = complex(x.Float64(), 0)
	case value.Complex:
		s = x.Complex128()
	}
	g, err := f.At(s)
	if err != nil {
		return nil, value.Errf(diag.Numerical, "x", "%v", err)
	}
	cert, err := f.Certify(s)
	if err != nil {
		return nil, system.Refused(err, "x")
	}
	outs, m := g.Dims()
	re, im := make([]float64, outs*m), make([]float64, outs*m)
	big := 0.0
	for i := range outs {
		for j := range m {
			v := g.At(i, j)
			re[i*m+j], im[i*m+j] = real(v), imag(v)
			big = math.Max(big, cmplx.Abs(v))
		}
	}
	relative := math.Pow(10, -cert.Digits)
	if outs == 1 && m == 1 {
		return value.Complex{C: g.At(0, 0), Err: big * relative}, nil
	}
	v := value.FloatComplexMatrix(outs, m, re, im, big*relative)
	v.Rows, v.Columns = system.Labels(p.Outputs), system.Labels(p.Inputs)
	return v, nil
}
