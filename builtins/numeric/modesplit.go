package numeric

import (
	"context"

	"gonum.org/v1/gonum/mat"
)

// modeSplit is a plant as the sum of a stable part (a1, b1, c1) and the modes
// that do not decay (a2, b2, c2).
type modeSplit struct {
	stable     int
	modes      []complex128
	a1, b1, c1 *mat.Dense
	a2, b2, c2 *mat.Dense
}

// splitOffUnstable orders the Schur form, stable eigenvalues first, and removes
// the coupling by a Sylvester equation A₁₁·X − X·A₂₂ + A₁₂ = 0. A plant all of one
// kind is passed through as it is.
func splitOffUnstable(ctx context.Context, a, b, c *mat.Dense, sampled bool) (*modeSplit, error) {
	w, err := Eigenvalues(a)
	if err != nil {
		return nil, err
	}
	norm := mat.Norm(a, 2)
	n, _ := a.Dims()
	s := &modeSplit{modes: unstableModes(w, norm, sampled)}
	switch len(s.modes) {
	case 0:
		s.stable, s.a1, s.b1, s.c1 = n, a, b, c
		return s, nil
	case n:
		s.a2, s.b2, s.c2 = a, b, c
		return s, nil
	}
	form, basis, _, err := Schur(a)
	if err != nil {
		return nil, err
	}
	count, err := ReorderSchur(form, basis, func(lambda complex128) bool {
		return len(unstableModes([]complex128{lambda}, norm, sampled)) == 0
	})
	if err != nil {
		return nil, err
	}
	if n-count != len(s.modes) { // the two computations of a mode at the boundary disagree
		w := make([]complex128, n)
		diagonalEigenvalues(n, packed(form), w)
		s.modes = w[count:]
	}
	if count == 0 {
		s.a2, s.b2, s.c2 = a, b, c
		return s, nil
	}
	if count == n {
		s.stable, s.a1, s.b1, s.c1 = n, a, b, c
		return s, nil
	}
	s.stable = count
	s.a1 = mat.DenseCopyOf(form.Slice(0, count, 0, count))
	s.a2 = mat.DenseCopyOf(form.Slice(count, n, count, n))
	x, err := decoupling(ctx, s.a1, s.a2, mat.DenseCopyOf(form.Slice(0, count, count, n)))
	if err != nil {
		return nil, err
	}
	var inputs, outputs, moved mat.Dense
	inputs.Mul(basis.T(), b)
	outputs.Mul(c, basis)
	s.b2 = mat.DenseCopyOf(inputs.Slice(count, n, 0, inputs.RawMatrix().Cols))
	moved.Mul(x, s.b2)
	s.b1 = mat.DenseCopyOf(inputs.Slice(0, count, 0, inputs.RawMatrix().Cols))
	s.b1.Sub(s.b1, &moved)
	rows := outputs.RawMatrix().Rows
	s.c1 = mat.DenseCopyOf(outputs.Slice(0, rows, 0, count))
	s.c2 = mat.DenseCopyOf(outputs.Slice(0, rows, count, n))
	var seen mat.Dense
	seen.Mul(s.c1, x)
	s.c2.Add(s.c2, &seen)
	return s, nil
}

// decoupling is the X with A₁·X − X·A₂ + A₁₂ = 0.
func decoupling(ctx context.Context, a1, a2, a12 *mat.Dense) (*mat.Dense, error) {
	solution, err := Sylvester(ctx, a1, scaledCopy(-1, a2), scaledCopy(-1, a12))
	if err != nil {
		return nil, err
	}
	return solution.X, nil
}
