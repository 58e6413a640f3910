// Package numeric holds the float64 algorithms: plain *mat.Dense in, *mat.Dense and a
// [Certificate] out. It imports gonum and nothing of the module, and knows no language.
//
// # Rules that every routine keeps
//
// Inputs are checked for shape and finiteness at the door, because gonum's own routines
// hang, panic or lie on NaN and Inf. What is passed in is never changed, and results share
// no memory with it. Empty matrices (a nil or an empty *mat.Dense) are accepted where a
// degenerate shape makes sense. Panics of a library below are turned into errors. The same
// input gives the same bits whatever GOMAXPROCS is; seeded starts use fixed seeds.
//
// Long routines take a context and look at it between steps. A question without an answer
// is a [*Refusal] that names the modes at fault; everything else is an error in a sentence.
//
// # Certificates
//
// Certificate.Residual is a backward error in the balanced coordinates, Condition a
// first-order condition estimate, Digits the decimal digits of the largest entry that are
// estimated to hold: an estimate, not a bound, unless a bracket says otherwise. Tests on
// seeded problems of graded conditioning hold it to at most one digit too many.
//
// # Balancing
//
// States are scaled by powers of two, and reducible matrices are split into their
// irreducible blocks, before exponentials, Riccati equations, zeros and assignment, so
// that units hardly matter; nothing is rounded on the way in or out.
//
// # What is here
//
//   - Schur, Eigenvalues, Eigen, ReorderSchur: real Schur form by LAPACK's algorithms, an own
//     kernel for n ≤ 12; eigenvalue conditions, cluster bounds for repeated ones.
//   - Solve, Inverse, Rank, Kernel, Image, Norm, ConditionNumber, SingularValues: LU with
//     refinement, singular values with the gap of every rank shown.
//   - Sylvester, Lyapunov: Schur forms and a recursive triangular solve, separations estimated.
//   - Riccati: ordered Schur form of the Hamiltonian (continuous), structure-preserving
//     doubling (sampled), Newton steps last; refusals by name; errors by envelopes, and where
//     these are wide by small-sample estimates.
//   - Exponential, Hold, HoldLine, Bilinear, DelayedHold, PadeDelay, Continuous, VanLoanCost,
//     VanLoanNoise: sampling and its inverse.
//   - Staircase, Reachability, Observability, KalmanSplit: ranks by orthogonal reductions.
//   - DistanceToUnreachable: a bracket by best-first subdivision of the plane.
//   - TransmissionZeros: two reductions of the system pencil, zeros at infinity removed.
//   - AssignOneInput, AssignRobust: pole assignment without powers of A.
//   - FrequencyResponse, LargestGain, NoiseGain: one Hessenberg form for all points; level sets.
//   - ReachabilityGramian, ObservabilityGramian, HankelSingularValues, BalancedForm,
//     BalancedTruncation: factored gramians.
//
// Eigenvalues come in the order of the Schur form unless a routine says otherwise; conjugates
// stand next to each other. The paper behind each method is named at its routine.
package numeric
