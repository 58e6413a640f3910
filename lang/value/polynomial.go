package value

import "gainwright/lang/exact"

// Polynomial is a polynomial in one variable with real coefficients, exact or floating.
type Polynomial struct {
	Variable string            // "s", "z", or another name for display
	Exact    *exact.Polynomial // nil when floating
	F        []float64         // highest power first; of a floating one
	Err      float64           // absolute error estimate of the largest coefficient
}

// Kind tells the kind.
func (*Polynomial) Kind() Kind { return KPolynomial }
