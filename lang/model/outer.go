package model

import (
	"strings"

	"gainwright/lang/diag"
	"gainwright/lang/syntax"
	"gainwright/lang/value"
)

// Outer is what surrounds a model: the names bound before it, the functions made by
// define, the built-ins and the library.
type Outer interface {
	// Evaluate gives the value of an expression that uses no name of the model. With
	// library set the expression stands in the library's text, whose names it sees.
	Evaluate(source *diag.Source, e syntax.Expr, library bool) (value.Value, *diag.Error)
	// Function gives the text of a function made by define or written in the library.
	Function(name string, library bool) (Function, bool)
	// Names lists the names in scope, for the nearest one to a misspelt name.
	Names() []string
}

// Function is the text of a function that equations call; it is written out where it stands.
type Function struct {
	Params  []string
	Body    syntax.Expr
	Source  *diag.Source
	Library bool
}

// errNotReal marks a result that is no real number, such as the root of a negative one.
var errNotReal = diag.New(diag.Numerical, "the result is not a real number")

// resolveUnit finds a unit as written; an error points at the symbol at fault.
func resolveUnit(u *syntax.Unit) (value.Unit, *diag.Error) {
	factors := make([]value.UnitFactor, len(u.Factors))
	for i, f := range u.Factors {
		factors[i] = value.UnitFactor{Symbol: f.Symbol, Exponent: f.Exponent}
	}
	unit, err := value.Resolve(u.Text, factors)
	if err == nil {
		if unit.IsHertz() {
			return unit, diag.New(diag.Unit, "%s does not say whether 2π belongs to it in a model", u.Text).At(u.Span).
				WithHelp("write rad/s for an angular frequency (2π for each cycle), or 1/s for a rate")
		}
		return unit, nil
	}
	for i, f := range factors {
		if _, one := value.Resolve(f.Symbol, []value.UnitFactor{{Symbol: f.Symbol, Exponent: 1}}); one != nil {
			return unit, asError(one).At(u.Factors[i].Span)
		}
	}
	return unit, asError(err).At(u.Span)
}

// asError gives an error of a lower package as ours, on a copy that may be given a place.
func asError(err error) *diag.Error {
	if known, ok := err.(*diag.Error); ok {
		c := *known
		return &c
	}
	e := diag.New(diag.Numerical, "%s", err.Error())
	e.Cause = err
	return e
}

// sliceOf is the source text of a span on one line.
func sliceOf(source *diag.Source, span diag.Span) string {
	start := min(max(span.Start, 0), len(source.Text))
	return strings.Join(strings.Fields(source.Text[start:min(max(span.End, start), len(source.Text))]), " ")
}

// excerpt is sliceOf cut to what fits into a message.
func excerpt(source *diag.Source, span diag.Span) string {
	text := []rune(sliceOf(source, span))
	if len(text) > 40 {
		return string(text[:39]) + "…"
	}
	return string(text)
}
