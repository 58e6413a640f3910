// Package system is the family of systems: plants from matrices, transfer functions,
// poles and zeros, feedback loops and what is made of them. It also holds what the
// other families share about systems: spectra with error estimates (Eigenvalues) and
// block algebra that keeps exactness (Block, Chain).
package system

import "gainwright/lang/value"

// Builtins lists the family.
func Builtins() []*value.Builtin {
	var all []*value.Builtin
	for _, group := range [][]*value.Builtin{plantBuiltins, spectrumBuiltins, transferBuiltins, zeroBuiltins, feedbackBuiltins} {
		all = append(all, group...)
	}
	return all
}
