package eval

import (
	"fmt"
	"math"
	"slices"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// claim compares a printed value with the computed one and tells how it came out.
func (r *run) claim(t *task, src *diag.Source, st *syntax.Claim) *diag.Error {
	wanted, err := readPrinted(st.Printed)
	if err != nil {
		return err
	}
	c := &claimComparison{task: t}
	if st.In != nil {
		unit, err := unitOf(st.In)
		if err != nil {
			return err
		}
		c.unit = &unit
	}
	computed, err := r.session.evaluate(t, src, st.Expr)
	if err != nil {
		return err
	}
	c.ordered = inOrder(st.Expr)
	if err := c.compare(nil, wanted, computed); err != nil {
		return err.At(st.Printed.Extent())
	}
	outcome := c.outcome()
	if !outcome.Agrees {
		r.outcome.Missed = true
	}
	text := oneLine(sliceOf(src, st.Expr.Extent())) + " is " + oneLine(sliceOf(src, st.Printed.Extent()))
	e := r.event(src, st.Span, text)
	e.Claim = outcome
	r.emit(e)
	return nil
}

// inOrder tells whether a list's order is part of what it says: coefficients and lists
// that are written or made in order. All others are sets, as poles are.
func inOrder(e syntax.Expr) bool {
	switch e := e.(type) {
	case *syntax.List, *syntax.ForEach:
		return true
	case *syntax.Call:
		name, ok := e.Function.(*syntax.Name)
		return ok && name.Name == "coefficients"
	}
	return false
}

// verdict of one number.
type verdict int

const (
	agrees verdict = iota
	undecided
	disagrees
)

// comparison collects the verdicts of a claim.
type claimComparison struct {
	task    *task
	unit    *value.Unit // the unit the printed numbers are in
	ordered bool
	worst   verdict
	units   float64
	entries []ClaimEntry
	poles   []value.Value
	notes   []string
	rows    []string // names of rows and columns, of a gain or a named matrix
	columns []string
}

func (c *claimComparison) outcome() *Claim {
	return &Claim{
		Agrees: c.worst == agrees, Undecided: c.worst == undecided, WorstUnits: c.units,
		Entries: c.entries, Poles: c.poles, Notes: c.notes,
	}
}

// record keeps the verdict of an entry.
func (c *claimComparison) record(v verdict, units float64, entry ClaimEntry) {
	c.worst = max(c.worst, v)
	c.units = math.Max(c.units, units)
	if v == agrees {
		return
	}
	entry.Units = units
	if v == undecided && entry.Cannot == "" {
		entry.Cannot = "the value's own uncertainty reaches over the end of the printed interval"
	}
	c.entries = append(c.entries, entry)
}

// differ records a disagreement that is no matter of digits.
func (c *claimComparison) differ(format string, args ...any) {
	c.worst, c.units = disagrees, math.Inf(1)
	c.notes = append(c.notes, fmt.Sprintf(format, args...))
}

// compare judges a printed value against a computed one; at is the place inside a structure.
func (c *claimComparison) compare(at []int, p printed, v value.Value) *diag.Error {
	switch p := p.(type) {
	case printedNumber:
		return c.number(at, p, v)
	case printedComplex:
		return c.complexNumber(at, p, v)
	case printedPolynomial:
		return c.polynomialClaim(p, v)
	case printedRatio:
		return c.ratio(p, v)
	case printedList:
		return c.list(at, p, v)
	}
	return nil
}

func kindsDiffer(p printed, v value.Value) *diag.Error {
	return diag.New(diag.Type, "the computed value is %s, which this cannot be the print of", value.Describe(v)).At(p.place())
}

// number judges one real number.
func (c *claimComparison) number(at []int, p printedNumber, v value.Value) *diag.Error {
	switch v := v.(type) {
	case value.Number, value.Quantity:
		n, err := c.inPrintedUnit(p, v)
		if err != nil {
			return err
		}
		result, units := p.judge(n)
		c.record(result, units, ClaimEntry{At: at, Name: c.nameOf(at), Printed: p.text, Computed: n})
		return nil
	case value.Complex:
		return c.complexNumber(at, printedComplex{p, exactly(ratZero, p.span, "0"), p.span}, v)
	case *value.Polynomial, *value.Transfer:
		return c.constantTerm(p, v)
	case *value.Matrix:
		if r, k := v.Dims(); r == 1 && k == 1 {
			return c.number(at, p, v.At(0, 0))
		}
	case *value.Gain:
		if r, k := v.Values.Dims(); r == 1 && k == 1 {
			return c.gain(printedList{items: []printed{p}, span: p.span}, v)
		}
	case *value.List:
		if len(v.Items) == 1 {
			return c.number(at, p, v.Items[0])
		}
	}
	return kindsDiffer(p, v)
}

// constantTerm judges a number against a polynomial or a transfer function, which may be constant.
func (c *claimComparison) constantTerm(p printedNumber, v value.Value) *diag.Error {
	constant := printedPolynomial{terms: map[int]printedNumber{0: p}, span: p.span}
	if _, ok := v.(*value.Transfer); ok {
		one := exactly(ratOne, p.span, "1")
		return c.ratio(printedRatio{constant, printedPolynomial{terms: map[int]printedNumber{0: one}, span: p.span}, p.span}, v)
	}
	return c.polynomialClaim(constant, v)
}

func (c *claimComparison) complexNumber(at []int, p printedComplex, v value.Value) *diag.Error {
	re, im, ok := parts(v)
	if !ok {
		return kindsDiffer(p, v)
	}
	c.part(at, "real", p.re, re)
	c.part(at, "imaginary", p.im, im)
	return nil
}

func (c *claimComparison) part(at []int, name string, p printedNumber, n value.Number) {
	result, units := p.judge(n)
	c.record(result, units, ClaimEntry{At: at, Part: name, Name: c.nameOf(at), Printed: p.text, Computed: n})
}

// parts splits a number into real and imaginary part.
func parts(v value.Value) (re, im value.Number, ok bool) {
	switch v := v.(type) {
	case value.Number:
		return v, value.Int(0), true
	case value.Complex:
		return v.RealPart(), v.ImaginaryPart(), true
	}
	return re, im, false
}

// inPrintedUnit gives the computed value in the unit of the printed number.
func (c *claimComparison) inPrintedUnit(p printedNumber, v value.Value) (value.Number, *diag.Error) {
	unit := c.unit
	if p.unit != nil {
		own, err := unitOf(p.unit)
		if err != nil {
			return value.Number{}, err
		}
		unit = &own
	}
	q, isQuantity := v.(value.Quantity)
	if unit == nil {
		if !isQuantity {
			return v.(value.Number), nil
		}
		return value.Number{}, diag.New(diag.Unit, "the computed value is in %s, and the printed number has no unit", q.Unit.Text).
			At(p.span).WithHelp("write the unit after the printed number")
	}
	converted, err := value.In(v, *unit)
	if err != nil {
		return value.Number{}, asError(err, "claim").At(p.span)
	}
	if q, ok := converted.(value.Quantity); ok {
		return q.Magnitude, nil
	}
	return converted.(value.Number), nil
}

func (c *claimComparison) nameOf(at []int) string {
	if len(at) != 2 || at[0] > len(c.rows) || at[1] > len(c.columns) {
		return ""
	}
	row, column := c.rows[at[0]-1], c.columns[at[1]-1]
	if row == "" || column == "" {
		return row + column
	}
	return row + ", " + column
}

func within(at []int, i int) []int { return append(slices.Clone(at), i) }
