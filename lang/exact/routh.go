package exact

import (
	"fmt"
	"math/big"
)

// RowChange says how a row of a Routh table was made regular.
type RowChange int

const (
	// Regular rows are used as the scheme gives them.
	Regular RowChange = iota
	// FromDerivative rows vanished; the derivative of the auxiliary polynomial stands in.
	FromDerivative
	// Shifted rows began with zeros; a shifted copy was added.
	Shifted
)

// RouthRow is one row of the table.
type RouthRow struct {
	Power    int        // the row belongs to s^Power and goes down in steps of two
	Entries  []*big.Rat // as used further down
	Change   RowChange
	Original []*big.Rat // as the scheme gave them; nil for a regular row
	// Auxiliary is the even or odd polynomial of the row above a vanished row;
	// it divides p, and its roots lie symmetric to the origin.
	Auxiliary Polynomial
	Shift     int // number of leading zeros of a shifted row
}

// Note tells in words what was done to the row; empty for a regular one.
func (r *RouthRow) Note() string {
	switch r.Change {
	case FromDerivative:
		return "the row vanished: derivative of the row above taken as a polynomial"
	case Shifted:
		sign := "added"
		if r.Shift%2 == 1 {
			sign = "subtracted"
		}
		return fmt.Sprintf("began with %d zero(s): the row moved left by as many places was %s", r.Shift, sign)
	}
	return ""
}

// RouthTable is the stability table of a polynomial with its verdict, roots
// counted with their multiplicities.
type RouthTable struct {
	Rows              []RouthRow
	Right, Left, Axis int // roots with positive, negative and zero real part
}

// Stable tells whether all roots have negative real parts.
func (t *RouthTable) Stable() bool { return t.Right == 0 && t.Axis == 0 }

// NewRouthTable works the scheme of E. J. Routh (A Treatise on the Stability of
// a Given State of Motion, 1877) exactly, for a non-zero polynomial. A vanished
// row is replaced by the derivative of the auxiliary polynomial; a row with k
// leading zeros has (−1)ᵏ times itself moved left by k places added (M. Benidir
// and B. Picinbono, Extended table for eliminating the singularities in Routh's
// array, IEEE Trans. Automat. Control 35, 1990), which keeps the count of sign
// changes in the first column right without a small parameter.
func NewRouthTable(p Polynomial) (*RouthTable, error) {
	n := p.Degree()
	if n < 0 {
		return nil, fmt.Errorf("every number is a root of the zero polynomial")
	}
	if tableTooLarge(p) {
		return nil, ErrTooLarge
	}
	t := &RouthTable{}
	t.append(RouthRow{Power: n, Entries: every(p, n)})
	if n > 0 {
		t.append(RouthRow{Power: n - 1, Entries: every(p, n-1)})
	}
	for power := n - 2; power >= 0; power-- {
		t.append(RouthRow{Power: power, Entries: t.next(power)})
	}
	t.count(n)
	return t, nil
}

// tableTooLarge bounds the work of a stability table: n² entries, each a
// quotient of minors of order up to n.
func tableTooLarge(p Polynomial) bool {
	n := p.Degree()
	return n > 1000 || n*n*(p.MaxBits()+n) > 4*LargestBits
}

// every lists the coefficients of sᵏ, sᵏ⁻², …
func every(p Polynomial, k int) []*big.Rat {
	out := make([]*big.Rat, 0, k/2+1)
	for ; k >= 0; k -= 2 {
		out = append(out, p.Coefficient(k))
	}
	return out
}

// next forms a row from the two above: x[j] = up[j+1] − up[0]/last[0]·last[j+1].
func (t *RouthTable) next(power int) []*big.Rat {
	up, last := t.Rows[len(t.Rows)-2].Entries, t.Rows[len(t.Rows)-1].Entries
	factor := new(big.Rat).Quo(up[0], last[0])
	out := make([]*big.Rat, power/2+1)
	for j := range out {
		out[j] = up[j+1]
		if j+1 < len(last) && last[j+1].Sign() != 0 {
			out[j] = tidy(new(big.Rat).Sub(up[j+1], new(big.Rat).Mul(factor, last[j+1])))
		}
	}
	return out
}

// append adds a row, made regular if need be.
func (t *RouthTable) append(r RouthRow) {
	shift := 0
	for shift < len(r.Entries) && r.Entries[shift].Sign() == 0 {
		shift++
	}
	switch {
	case shift == 0:
	case shift == len(r.Entries):
		r.Change, r.Original = FromDerivative, r.Entries
		above := &t.Rows[len(t.Rows)-1]
		r.Auxiliary = spread(above.Entries, above.Power)
		r.Entries = every(r.Auxiliary.Derivative(), r.Power)
	default:
		r.Change, r.Original, r.Shift = Shifted, r.Entries, shift
		r.Entries = make([]*big.Rat, len(r.Original))
		for j := range r.Entries {
			r.Entries[j] = r.Original[j]
			if j+shift < len(r.Original) {
				other := r.Original[j+shift]
				if shift%2 == 1 {
					other = new(big.Rat).Neg(other)
				}
				r.Entries[j] = tidy(new(big.Rat).Add(r.Original[j], other))
			}
		}
	}
	t.Rows = append(t.Rows, r)
}

// spread turns a row back into its polynomial.
func spread(entries []*big.Rat, power int) Polynomial {
	c := make([]*big.Rat, power+1)
	for k := range c {
		c[k] = ratZero
	}
	for j, x := range entries {
		c[power-2*j] = x
	}
	return trimmed(c)
}

// count reads the verdict off the first column: its sign changes count the
// roots on the right; those below the first auxiliary polynomial count its
// roots on the right, which mirror those on the left, so the rest of its roots
// lie on the axis.
func (t *RouthTable) count(n int) {
	symmetric, within := 0, 0
	for i := 1; i < len(t.Rows); i++ {
		if t.Rows[i].Change == FromDerivative && symmetric == 0 {
			symmetric = t.Rows[i].Auxiliary.Degree()
		}
		if t.Rows[i].Entries[0].Sign() != t.Rows[i-1].Entries[0].Sign() {
			t.Right++
			if symmetric > 0 {
				within++
			}
		}
	}
	t.Axis = symmetric - 2*within
	t.Left = n - t.Right - t.Axis
}
