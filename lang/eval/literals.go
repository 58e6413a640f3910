package eval

import (
	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// literal gives the value of a number as written.
func literal(e *syntax.Number) (value.Value, *diag.Error) {
	if e.Imaginary {
		return value.MakeComplex(value.Int(0), value.Rat(e.Value)), nil
	}
	if e.Unit == nil {
		return value.Rat(e.Value), nil
	}
	unit, err := unitOf(e.Unit)
	if err != nil {
		return nil, err
	}
	return value.Quantity{Magnitude: value.Rat(e.Value), Unit: unit}, nil
}

// unitOf resolves a unit as written; an error points at the symbol at fault.
func unitOf(u *syntax.Unit) (value.Unit, *diag.Error) {
	factors := make([]value.UnitFactor, len(u.Factors))
	for i, f := range u.Factors {
		factors[i] = value.UnitFactor{Symbol: f.Symbol, Exponent: f.Exponent}
	}
	unit, err := value.Resolve(u.Text, factors)
	if err == nil {
		return unit, nil
	}
	for i, f := range factors {
		if _, one := value.Resolve(f.Symbol, []value.UnitFactor{{Symbol: f.Symbol, Exponent: 1}}); one != nil {
			return unit, asError(one, "unit").At(u.Factors[i].Span)
		}
	}
	return unit, asError(err, "unit").At(u.Span)
}

func hertzElsewhere(text string) *diag.Error {
	return diag.New(diag.Unit, "%s stands only in arguments: elsewhere it does not say whether 2π belongs to it", text).
		WithHelp("write rad/s for an angular frequency (2π for each cycle), or 1/s for a rate")
}
