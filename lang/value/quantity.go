package value

import (
	"math/big"

	"gainwright/lang/diag"
)

// SI gives the value in the coherent SI unit. Hz is refused: whether 2π belongs to it
// depends on what it is used for.
func (q Quantity) SI() (Number, error) {
	if q.Unit.hertz {
		return Number{}, diag.New(diag.Unit, "%s does not say whether 2π belongs to it here", q.Unit.Text).
			WithHelp("write rad/s for an angular frequency (2π for each cycle), or 1/s for a rate")
	}
	n, err := multiplyNumbers(q.Magnitude, Rat(q.Unit.scale()))
	if err != nil {
		return n, err
	}
	if n, err = timesPi(n, q.Unit.Pi); err != nil || q.Unit.Offset == nil {
		return n, err
	}
	return addNumbers(n, Rat(q.Unit.Offset))
}

// fromSI gives the magnitude in a unit of a value in SI; exact when no π comes in.
func fromSI(n Number, u Unit) (Number, error) {
	var err error
	if u.Offset != nil {
		if n, err = subtractNumbers(n, Rat(u.Offset)); err != nil {
			return n, err
		}
	}
	if n, err = divideNumbers(n, Rat(u.scale())); err != nil {
		return n, err
	}
	return timesPi(n, -u.Pi)
}

// toQuantity takes a plain number as a quantity without unit.
func toQuantity(n Number) Quantity { return Quantity{n, None()} }

// unitName is the unit in words for messages.
func unitName(u Unit) string {
	switch {
	case u.Text != "":
		return u.Text
	case u.Dim.IsPlain():
		return "no unit"
	}
	return u.Dim.String()
}

func unitClash(what string, a, b Unit) error {
	side := func(u Unit) string {
		if u.Text == "" && u.Dim.IsPlain() {
			return "has no unit"
		}
		return "is in " + unitName(u)
	}
	e := diag.New(diag.Unit, "%s: the left side %s, the right side %s", what, side(a), side(b))
	if a.Text == "" && a.Dim.IsPlain() || b.Text == "" && b.Dim.IsPlain() {
		if perSecond := (Dimension{2: -1}); a.Dim == perSecond || b.Dim == perSecond {
			return e.WithHelp("poles and rates of decay are plain numbers, in 1/s: leave the unit of the other side out")
		}
		if a.Text == "" && a.Dim.IsPlain() {
			return e.WithHelp("write the number on the left with its unit, as in 3 %s", unitName(b))
		}
		return e.WithHelp("write the number on the right with its unit, as in 3 %s", unitName(a))
	}
	return e.WithHelp("in base units these are %s and %s", a.Dim, b.Dim)
}

// convert expresses q in the unit u of the same dimension.
func (q Quantity) convert(u Unit) (Number, error) {
	if q.Unit.hertz && u.hertz || q.Unit.Offset == nil && u.Offset == nil && !q.Unit.hertz && !u.hertz {
		factor := new(big.Rat).Quo(q.Unit.scale(), u.scale())
		n, err := multiplyNumbers(q.Magnitude, Rat(factor))
		if err != nil {
			return n, err
		}
		return timesPi(n, q.Unit.Pi-u.Pi)
	}
	if u.hertz {
		_, err := Quantity{q.Magnitude, u}.SI()
		return Number{}, err
	}
	n, err := q.SI()
	if err != nil {
		return n, err
	}
	return fromSI(n, u)
}

// addQuantities adds or, with sign −1, subtracts. The sum keeps the left unit when that is exact.
func addQuantities(a, b Quantity, sign int) (Value, error) {
	what := "adding quantities of different kinds"
	if sign < 0 {
		what = "subtracting quantities of different kinds"
	}
	if a.Unit.Dim != b.Unit.Dim {
		return nil, unitClash(what, a.Unit, b.Unit)
	}
	if a.Unit.hertz != b.Unit.hertz {
		return nil, unitClash(what, a.Unit, b.Unit)
	}
	if a.Unit.Offset != nil || b.Unit.Offset != nil {
		return addTemperatures(a, b, sign)
	}
	unit := a.Unit
	if unit.IsNone() || unit.Pi != b.Unit.Pi {
		unit = a.Unit.SI()
	}
	x, err := a.convert(unit)
	if err != nil {
		return nil, err
	}
	y, err := b.convert(unit)
	if err != nil {
		return nil, err
	}
	if sign < 0 {
		y = negateNumber(y)
	}
	sum, err := addNumbers(x, y)
	return makeQuantity(sum, unit), err
}

// addTemperatures knows points and differences: point ± difference is a point, point − point a difference.
func addTemperatures(a, b Quantity, sign int) (Value, error) {
	if a.Unit.Offset == nil || b.Unit.Offset != nil && sign > 0 {
		return nil, diag.New(diag.Unit, "a temperature in degC is a point on a scale and is not added to or taken from another temperature").
			WithHelp("write differences, and sums, in K")
	}
	kelvin := a.Unit.SI()
	if b.Unit.Offset != nil {
		d, err := subtractNumbers(a.Magnitude, b.Magnitude)
		return Quantity{d, kelvin}, err
	}
	y, err := b.convert(kelvin)
	if err != nil {
		return nil, err
	}
	if sign < 0 {
		y = negateNumber(y)
	}
	sum, err := addNumbers(a.Magnitude, y)
	return Quantity{sum, a.Unit}, err
}

// makeQuantity gives a Number for the unit of plain numbers.
func makeQuantity(n Number, u Unit) Value {
	if u.IsNone() {
		return n
	}
	return Quantity{n, u}
}

// negateQuantity keeps the unit: −5 degC is a point on the scale too.
func negateQuantity(q Quantity) Quantity { return Quantity{negateNumber(q.Magnitude), q.Unit} }

// multiplyQuantities gives a·b, or a/b with exponent −1. A plain factor keeps the other's unit.
func multiplyQuantities(a, b Quantity, exponent int) (Value, error) {
	combine := multiplyNumbers
	if exponent < 0 {
		combine = divideNumbers
	}
	for _, q := range [...]Quantity{a, b} {
		if q.Unit.Offset != nil {
			return nil, diag.New(diag.Unit, "a temperature in degC is a point on a scale and is not multiplied or divided").
				WithHelp("write it in K")
		}
	}
	if b.Unit.IsNone() {
		n, err := combine(a.Magnitude, b.Magnitude)
		return makeQuantity(n, a.Unit), err
	}
	if a.Unit.IsNone() && exponent > 0 {
		n, err := combine(a.Magnitude, b.Magnitude)
		return Quantity{n, b.Unit}, err
	}
	if a.Unit.hertz && b.Unit.hertz && exponent < 0 {
		a.Unit, b.Unit = plainRate(a.Unit), plainRate(b.Unit)
	}
	for _, q := range [...]Quantity{a, b} {
		if q.Unit.hertz {
			_, err := q.SI()
			return nil, err
		}
	}
	unit, err := combineUnits(a.Unit, b.Unit, exponent)
	if err != nil {
		return nil, err
	}
	n, err := combine(a.Magnitude, b.Magnitude)
	if err != nil {
		return nil, err
	}
	factor := new(big.Rat).Mul(a.Unit.scale(), ratPower(b.Unit.scale(), exponent))
	if n, err = multiplyNumbers(n, Rat(factor)); err != nil {
		return nil, err
	}
	if n, err = timesPi(n, a.Unit.Pi+exponent*b.Unit.Pi); err != nil {
		return nil, err
	}
	if unit.Dim.IsPlain() {
		return n, nil
	}
	return Quantity{n, unit}, nil
}

// plainRate is Hz as cycles per second, for ratios where the question of 2π does not arise.
func plainRate(u Unit) Unit {
	return Unit{Text: u.Text, Dim: u.Dim, Scale: u.scale()}
}

// In expresses a number, a quantity or a list of them in a unit, for display.
func In(v Value, u Unit) (Value, error) {
	switch x := Force(v).(type) {
	case Number:
		if !u.Dim.IsPlain() {
			return nil, diag.New(diag.Unit, "a plain number cannot be shown in %s", unitName(u))
		}
		n, err := fromSI(x, u)
		return makeQuantity(n, u), err
	case Quantity:
		if x.Unit.Dim != u.Dim {
			return nil, diag.New(diag.Unit, "a quantity in %s cannot be shown in %s", unitName(x.Unit), unitName(u)).
				WithHelp("in base units these are %s and %s", x.Unit.Dim, u.Dim)
		}
		n, err := x.convert(u)
		return makeQuantity(n, u), err
	case *List:
		out := &List{Items: make([]Value, len(x.Items)), Pair: x.Pair}
		for k, item := range x.Items {
			var err error
			if out.Items[k], err = In(item, u); err != nil {
				return nil, err
			}
		}
		return out, nil
	}
	return nil, diag.New(diag.Unit, "%s cannot be shown in %s", Describe(v), unitName(u)).
		WithHelp("numbers, quantities and lists of them can")
}
