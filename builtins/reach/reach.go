// Package reach is the family of what inputs move and outputs see: reachability and
// observability with their margins, modes with verdicts in words, the four parts of a
// plant, forms under a change of coordinates, and choices of sensors and actuators.
//
// Verdicts are exact for exact data of up to system.ExactOrder states; otherwise they are
// decided by orthogonal staircase reductions, with the threshold and the gap shown.
package reach

import "gainwright/lang/value"

// Builtins lists the family.
func Builtins() []*value.Builtin {
	var all []*value.Builtin
	for _, group := range [][]*value.Builtin{rankBuiltins, modeBuiltins, partBuiltins, formBuiltins, balanceBuiltins, optionBuiltins} {
		all = append(all, group...)
	}
	return all
}
