// Package response is the family of responses in time: response runs a system, alone or in
// a loop, and figures reads overshoot, settling and the like from what response made.
//
// A request (args.go) is a plant, a law in its loop (law.go), a drive (drive.go), limits on
// the inputs and noise. Which engine runs it depends on what it holds:
//
//   - linear.go: continuous linear systems, moved exactly by matrix exponentials, with inputs
//     that are polynomials between their corners; limits.go finds where an input reaches or
//     leaves its limit, between which the system is linear again;
//   - clocked.go: whatever acts at samples: sampled systems, and a sampled law on a continuous
//     plant, linear or not, that moves between the samples;
//   - nonlinear.go: a model's own equations by Dormand & Prince 5(4).
//
// Each leaves a course, which figures.go evaluates between the instants: a system's exact
// motion for all time where there is one, else the motion that was run.
//
// Signals are deviations from the plant's operating point. Refused: responses without an
// end, limits on inputs of an algebraic loop, impulses that limits would have to cut.
package response

import "gainwright/lang/value"

// Builtins lists the family.
func Builtins() []*value.Builtin { return []*value.Builtin{responseBuiltin, figuresBuiltin} }
