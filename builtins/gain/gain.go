// Package gain is the family of feedback: pole assignment, observers, optimal gains and
// filters, reference gains, and the poles one asks for.
//
// One input and exact data give exact gains; every Gain carries the poles it really
// gives, how sensitive they are, and a note where rounding the gain would spoil them.
package gain

import "gainwright/lang/value"

// Builtins lists the family.
func Builtins() []*value.Builtin {
	var all []*value.Builtin
	for _, group := range [][]*value.Builtin{assignBuiltins, observerBuiltins, optimalBuiltins, betweenBuiltins, referenceBuiltins, poleBuiltins} {
		all = append(all, group...)
	}
	return all
}
