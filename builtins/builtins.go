// Package builtins puts the families of built-in functions together into the one table
// that calling, completion, explain and the reference page read.
package builtins

import (
	"gainwright/builtins/files"
	"gainwright/builtins/frequency"
	"gainwright/builtins/gain"
	"gainwright/builtins/matrix"
	"gainwright/builtins/polynomial"
	"gainwright/builtins/reach"
	"gainwright/builtins/response"
	"gainwright/builtins/sampling"
	"gainwright/builtins/study"
	"gainwright/builtins/system"
	"gainwright/lang/value"
)

// Table lists all built-in functions, family after family.
func Table() []*value.Builtin {
	var all []*value.Builtin
	for _, family := range [](func() []*value.Builtin){
		matrix.Builtins, polynomial.Builtins, system.Builtins, reach.Builtins, gain.Builtins, sampling.Builtins, frequency.Builtins, response.Builtins, study.Builtins, files.Builtins,
	} {
		all = append(all, family()...)
	}
	return all
}
