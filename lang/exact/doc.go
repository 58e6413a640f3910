// Package exact holds matrices, polynomials and rational functions over the
// rational numbers, and the algorithms of linear systems that can be carried
// out without rounding: elimination, characteristic polynomials, greatest
// common divisors, splits into reachable and observable parts, one-input pole
// assignment, stability tables and certified roots.
//
// # Types
//
// [Matrix] is a rows×cols array of rationals; zero-sized shapes (0×n, n×0) are
// legal everywhere. [Polynomial] is a polynomial in one variable, written
// highest power first on the outside; its zero value is the zero polynomial.
// [Rational] is a quotient of two polynomials in lowest terms with a monic
// denominator.
//
// # Sharing
//
// Values are immutable once built. Constructors copy what they are given;
// accessors hand out the numbers that the value holds, which must not be
// modified. [Matrix.Set] exists for filling a matrix that nobody else holds
// yet. Finished values may be used by several goroutines at once.
//
// # What it refuses
//
// Shapes that do not fit give a [*SizeError] that carries both of them. A
// singular matrix, an inconsistent or an undetermined system, an input that
// does not reach a mode each have an error type of their own. An operation
// whose result would need more than [LargestBits] bits in one entry returns
// [ErrTooLarge] instead of running on. Nothing here rounds, except the
// functions that say so ([Matrix.Float64], [Polynomial.Float64],
// [Polynomial.Roots]).
package exact
