package eval

import (
	"math/big"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// polynomialClaim judges coefficient by coefficient; a power that is not printed is 0.
func (c *claimComparison) polynomialClaim(p printedPolynomial, v value.Value) *diag.Error {
	poly, ok := asPolynomial(v)
	if !ok {
		return kindsDiffer(p, v)
	}
	if p.variable != "" && poly.Variable != "" && p.variable != poly.Variable && degreeOf(poly) > 0 {
		c.differ("the computed polynomial is in %s, the printed one in %s", poly.Variable, p.variable)
		return nil
	}
	c.coefficients(p, coefficientsOf(poly))
	return nil
}

// coefficients judges against coefficients given lowest power first.
func (c *claimComparison) coefficients(p printedPolynomial, computed []value.Number) {
	highest := len(computed) - 1
	for power := range p.terms {
		highest = max(highest, power)
	}
	for power := highest; power >= 0; power-- {
		term, ok := p.terms[power]
		if !ok {
			term = implied(ratZero, p.span, "0")
		}
		n := value.Int(0)
		if power < len(computed) {
			n = computed[power]
		}
		if center, _, ok := enclosed(n); ok && term.implied && term.value.Cmp(center) == 0 {
			n = value.Rat(term.value)
		}
		result, units := term.judge(n)
		c.record(result, units, ClaimEntry{Name: powerName(p.variable, power), Printed: term.text, Computed: n})
	}
}

func powerName(variable string, power int) string {
	if variable == "" {
		variable = "s"
	}
	switch power {
	case 0:
		return "constant term"
	case 1:
		return "coefficient of " + variable
	}
	return "coefficient of " + variable + "^" + big.NewInt(int64(power)).String()
}

// coefficientList judges [a_n, …, a_0].
func (c *claimComparison) coefficientList(p printedList, poly *value.Polynomial) *diag.Error {
	out := printedPolynomial{variable: poly.Variable, terms: map[int]printedNumber{}, span: p.span}
	for i, item := range p.items {
		n, ok := item.(printedNumber)
		if !ok {
			return kindsDiffer(item, poly)
		}
		out.terms[len(p.items)-1-i] = n
	}
	c.coefficients(out, coefficientsOf(poly))
	return nil
}

// ratio judges a rational function. Both denominators are compared with the leading
// coefficient that is printed.
func (c *claimComparison) ratio(p printedRatio, v value.Value) *diag.Error {
	g, ok := v.(*value.Transfer)
	if !ok || len(g.Entries) != 1 || len(g.Entries[0]) != 1 {
		return kindsDiffer(p, v)
	}
	return c.ratioEntry(p, g.Entries[0][0])
}

func (c *claimComparison) ratioEntry(p printedRatio, entry value.Ratio) *diag.Error {
	lead := 0
	for power := range p.den.terms {
		lead = max(lead, power)
	}
	scale := value.Rat(p.den.terms[lead].value)
	num, err := scaled(entry.Num, scale)
	if err != nil {
		return asError(err, "claim").At(p.span)
	}
	den, err := scaled(entry.Den, scale)
	if err != nil {
		return asError(err, "claim").At(p.span)
	}
	before := len(c.entries)
	c.coefficients(p.num, coefficientsOf(num))
	nameEntries(c.entries[before:], "numerator")
	before = len(c.entries)
	c.coefficients(p.den, coefficientsOf(den))
	nameEntries(c.entries[before:], "denominator")
	return nil
}

func nameEntries(entries []ClaimEntry, of string) {
	for i := range entries {
		entries[i].Name = of + ": " + entries[i].Name
	}
}

func scaled(p *value.Polynomial, by value.Number) (*value.Polynomial, error) {
	v, err := value.Multiply(by, p)
	if err != nil {
		return nil, err
	}
	out, ok := asPolynomial(v)
	if !ok {
		return nil, diag.New(diag.Internal, "a scaled polynomial is no polynomial")
	}
	return out, nil
}

// transferMatrix judges a matrix of rational functions, entry by entry.
func (c *claimComparison) transferMatrix(p printedList, g *value.Transfer) *diag.Error {
	columns := 0
	if len(g.Entries) > 0 {
		columns = len(g.Entries[0])
	}
	rows, err := c.sized(p, len(g.Entries), columns)
	if err != nil {
		return err
	}
	for i, row := range rows {
		for j, item := range row {
			before := len(c.entries)
			one := *g
			one.Entries = [][]value.Ratio{{g.Entries[i][j]}}
			if err := c.compare([]int{i + 1, j + 1}, item, &one); err != nil {
				return err
			}
			for k := before; k < len(c.entries); k++ {
				c.entries[k].At = []int{i + 1, j + 1}
			}
		}
	}
	return nil
}

// asPolynomial takes a polynomial, a number or a transfer function whose denominator is 1.
func asPolynomial(v value.Value) (*value.Polynomial, bool) {
	switch v := v.(type) {
	case *value.Polynomial:
		return v, true
	case value.Number:
		if v.Exact != nil {
			p := exact.Constant(v.Exact)
			return &value.Polynomial{Exact: &p}, true
		}
		return &value.Polynomial{F: []float64{v.F}, Err: v.Err}, true
	case *value.Transfer:
		if len(v.Entries) == 1 && len(v.Entries[0]) == 1 && degreeOf(v.Entries[0][0].Den) == 0 {
			return v.Entries[0][0].Num, true
		}
	}
	return nil, false
}

func degreeOf(p *value.Polynomial) int {
	if p.Exact != nil {
		return p.Exact.Degree()
	}
	return len(p.F) - 1
}

// coefficientsOf lists coefficients lowest power first.
func coefficientsOf(p *value.Polynomial) []value.Number {
	out := make([]value.Number, degreeOf(p)+1)
	for power := range out {
		if p.Exact != nil {
			out[power] = value.Rat(p.Exact.Coefficient(power))
		} else {
			out[power] = value.FloatErr(p.F[len(p.F)-1-power], p.Err)
		}
	}
	return out
}
