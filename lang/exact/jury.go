package exact

import (
	"fmt"
	"math/big"
)

// JuryRow is one pair of rows of the table: the entries, lowest power first,
// and the same read backwards.
type JuryRow struct {
	Entries  []*big.Rat
	Reversed []*big.Rat
	// Divisor is the positive common factor that was taken out of the row to
	// keep its numbers short; nil when nothing was.
	Divisor *big.Rat
}

// JuryCondition is one of the conditions for all roots to lie inside the unit
// circle: Left > Right.
type JuryCondition struct {
	Text        string
	Left, Right *big.Rat
	Holds       bool
}

// JuryTable is the stability table of a polynomial in z with its verdict,
// roots counted with their multiplicities.
type JuryTable struct {
	Rows                []JuryRow
	Conditions          []JuryCondition
	Inside, On, Outside int  // roots inside, on and outside the unit circle
	Vanished            bool // the table ended early because a row became zero
}

// Stable tells whether all roots lie inside the unit circle.
func (t *JuryTable) Stable() bool { return t.On == 0 && t.Outside == 0 }

// plainBits is the bit length up to which rows are left as the determinants
// give them, so that a table of textbook size can be compared with paper.
const plainBits = 256

// NewJuryTable works the table of E. I. Jury (A simplified stability criterion
// for linear discrete systems, Proc. IRE 50, 1962) exactly for a non-zero
// polynomial, with the sign chosen so that the leading coefficient is positive:
// each pair of rows is b[k] = a[0]·a[k] − a[n]·a[n−k]. The counts hold in the
// singular cases too: they come from the Routh table of
// (1 − w)ⁿ·p((1 + w)/(1 − w)), whose left half-plane is the inside of the circle.
func NewJuryTable(p Polynomial) (*JuryTable, error) {
	n := p.Degree()
	if n < 0 {
		return nil, fmt.Errorf("every number is a root of the zero polynomial")
	}
	if tableTooLarge(p) {
		return nil, ErrTooLarge
	}
	if p.Lead().Sign() < 0 {
		p = p.Neg()
	}
	t := &JuryTable{}
	mapped := p.toHalfPlane()
	routh, err := NewRouthTable(mapped)
	if err != nil {
		return nil, err
	}
	t.Inside, t.Outside = routh.Left, routh.Right
	t.On = routh.Axis + n - mapped.Degree() // a root at −1 goes to infinity
	if n > 0 {
		t.fill(p)
	}
	return t, nil
}

// toHalfPlane gives (1 − w)ⁿ·p((1 + w)/(1 − w)).
func (p Polynomial) toHalfPlane() Polynomial {
	plus, minus := PolynomialOfIntegers(1, 1), PolynomialOfIntegers(-1, 1)
	var out Polynomial
	scale := Constant(ratOne) // (1 − w)^(n−k)
	for k := p.Degree(); k >= 0; k-- {
		out = out.Mul(plus).Add(scale.Scale(p.c[k]))
		scale = scale.Mul(minus)
	}
	return out
}

func (t *JuryTable) fill(p Polynomial) {
	n := p.Degree()
	zero := new(big.Rat)
	t.require("p(1) > 0", p.Eval(big.NewRat(1, 1)), zero)
	atMinusOne := p.Eval(big.NewRat(-1, 1))
	if n%2 == 1 {
		atMinusOne.Neg(atMinusOne)
	}
	t.require("(−1)ⁿ·p(−1) > 0", atMinusOne, zero)
	entries := append([]*big.Rat(nil), p.c...)
	t.require("aₙ > |a₀|", entries[n], new(big.Rat).Abs(entries[0]))
	t.Rows = append(t.Rows, newJuryRow(entries, nil))
	for len(entries) > 3 {
		entries = juryStep(entries)
		row := newJuryRow(shortened(entries))
		t.Rows = append(t.Rows, row)
		entries = row.Entries
		if t.Vanished = allZero(entries); t.Vanished {
			return
		}
		top := len(entries) - 1
		t.require(fmt.Sprintf("row %d: |first| > |last|", 2*len(t.Rows)-1),
			new(big.Rat).Abs(entries[0]), new(big.Rat).Abs(entries[top]))
	}
}

func (t *JuryTable) require(text string, left, right *big.Rat) {
	t.Conditions = append(t.Conditions, JuryCondition{text, left, right, left.Cmp(right) > 0})
}

func newJuryRow(entries []*big.Rat, divisor *big.Rat) JuryRow {
	reversed := make([]*big.Rat, len(entries))
	for k, x := range entries {
		reversed[len(entries)-1-k] = x
	}
	return JuryRow{entries, reversed, divisor}
}

func juryStep(a []*big.Rat) []*big.Rat {
	n := len(a) - 1
	out := make([]*big.Rat, n)
	for k := range out {
		x := new(big.Rat).Mul(a[0], a[k])
		out[k] = tidy(x.Sub(x, new(big.Rat).Mul(a[n], a[n-k])))
	}
	return out
}

// shortened takes out the positive common factor of a row of long numbers.
func shortened(entries []*big.Rat) (short []*big.Rat, divisor *big.Rat) {
	bits := 0
	for _, x := range entries {
		bits = max(bits, ratBits(x))
	}
	if bits <= plainBits {
		return entries, nil
	}
	var den big.Int
	commonDenominator(&den, entries)
	ints := make([]big.Int, len(entries))
	scaleTo(ints, entries, &den)
	common := content(ints)
	short = make([]*big.Rat, len(entries))
	for k := range ints {
		short[k] = fraction(ints[k].Quo(&ints[k], common), intOne)
	}
	return short, fraction(common, &den)
}

func allZero(entries []*big.Rat) bool {
	for _, x := range entries {
		if x.Sign() != 0 {
			return false
		}
	}
	return true
}
