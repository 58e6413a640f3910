package matrix

import (
	"errors"
	"fmt"

	"gainwright/lang/diag"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// exactSolution solves over the rationals; done is false when there is no exact solution and least squares are wanted.
func exactSolution(c *value.Call, a, b *value.Matrix) (v value.Value, done bool, err error) {
	x, err := a.Exact().Solve(b.Exact())
	if err == nil {
		return value.ExactMatrix(x), true, nil
	}
	var free *exact.UnderdeterminedError
	if errors.As(err, &free) {
		p, solvable := particular(a.Exact(), b.Exact())
		if solvable {
			_, q := a.Dims()
			c.Note(fmt.Sprintf("the solution is one of many: rank %d of %d unknowns; the free ones are zero here", a.Exact().Rank(), q))
			return value.ExactMatrix(p), true, nil
		}
	}
	if errors.Is(err, exact.ErrTooLarge) {
		return nil, true, value.Errf(diag.Limit, "A", "%v", err)
	}
	return nil, false, nil
}

// particular gives the solution whose free unknowns are zero, from the echelon form of [a b].
func particular(a, b *exact.Matrix) (*exact.Matrix, bool) {
	joined, err := exact.Augment(a, b)
	if err != nil {
		return nil, false
	}
	_, q := a.Dims()
	_, k := b.Dims()
	reduced, pivots := joined.Echelon()
	x := exact.NewMatrix(q, k)
	for i, p := range pivots {
		if p >= q {
			return nil, false
		}
		for j := range k {
			x.Set(p, j, reduced.At(i, q+j))
		}
	}
	return x, true
}
