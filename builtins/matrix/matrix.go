// Package matrix is the family of numbers, lists and matrices: elementary functions,
// linear algebra exact for exact data, and matrix equations with residuals.
package matrix

import "gainwright/lang/value"

// Builtins lists the family.
func Builtins() []*value.Builtin {
	var all []*value.Builtin
	for _, group := range [][]*value.Builtin{constants, elementary, reductions, kinds, builders, algebra, spaces, equations} {
		all = append(all, group...)
	}
	return all
}
