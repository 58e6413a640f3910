// Package model makes a plant from equations of motion and from diagrams.
//
// Build reads a model statement: parameters with tolerances, inputs, states and outputs
// with units and working ranges, equations in any order, and the point around which the
// plant is wanted. Every equation becomes a node of one expression graph in coherent SI
// units; the conversions from and to the declared units are nodes too. The graph is
// evaluated in two ways that check each other:
//
//   - exactly, over rationals times powers of π, with forward differentiation (dual
//     numbers with a sparse gradient): decimal data give exact matrices, and what a
//     function makes floating carries its error;
//   - as a Program, straight-line float64 code with the derivatives written out, which
//     allocates nothing and serves studies and the integration of the equations.
//
// At a switch (a corner of abs, the bound of limit, a knot of a table) both take the same
// side, and the built model has a note that says so.
//
// BuildDiagram wires systems by signal equations into one plant.
//
// Refused, each at its place in the text: units that clash, names that are unknown or
// declared twice, equations that are missing, loops of let, points without rest, more
// than 400 states, and values without a real result at the operating point. What lies
// outside a model (constants, tables, functions made by define) comes through Outer.
package model
