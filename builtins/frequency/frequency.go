// Package frequency is the family of frequency responses, margins, norms and the damping of poles.
package frequency

import "gainwright/lang/value"

// Builtins lists the family.
func Builtins() []*value.Builtin {
	var all []*value.Builtin
	for _, group := range [][]*value.Builtin{dampingBuiltins, normBuiltins, sweepBuiltins, marginBuiltins, poleMapBuiltins} {
		all = append(all, group...)
	}
	return all
}
