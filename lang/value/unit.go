package value

import "math/big"

// Dimension holds the exponents of m, kg, s, A, K, mol, cd.
type Dimension [7]int8

// Unit is a unit of measurement: value in SI = (value in unit) × Scale × π^Pi + Offset.
// Only degC has an offset, and only alone.
type Unit struct {
	Text   string // as written, or derived; "" for a plain number
	Dim    Dimension
	Scale  *big.Rat
	Pi     int
	Offset *big.Rat // nil for none
}

// None is the unit of plain numbers.
func None() Unit { return Unit{Scale: big.NewRat(1, 1)} }
