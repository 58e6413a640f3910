package gain

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/system"
	"gainwright/lang/exact"
	"gainwright/lang/value"
)

// given finds the poles that the gain gives: those of A − B·K with the binary64 numbers in it
// as they stand. Where K is large the entries of A − B·K cancel and their rounding alone
// spoils the poles; then the loop is made exactly, up to system.ExactOrder states.
func (t *task) given(k, loop *value.Matrix) ([]system.Root, error) {
	n, _ := loop.Dims()
	if loop.IsExact() || loop.IsComplex() {
		return system.Eigenvalues(loop)
	}
	roots, err := system.EigenvaluesWithin(loop.Dense(), t.loopRounding(k, 0))
	if err != nil || n > system.ExactOrder || system.LargestError(roots) <= system.FewDigits {
		return roots, err
	}
	x, err := system.Rational(k)
	if err != nil {
		return roots, nil
	}
	sharp, err := t.exactLoop(x)
	if err != nil {
		return roots, nil
	}
	return system.Eigenvalues(sharp)
}

// loopRounding bounds the errors of the entries of A − B·K made in binary64, where every entry of K is
// known to ±within.
func (t *task) loopRounding(k *value.Matrix, within float64) *mat.Dense {
	a, b, f := t.a.Dense(), t.b.Dense(), k.Dense()
	n, m := b.Dims()
	bound := mat.NewDense(n, n, nil)
	bound.Apply(func(i, j int, _ float64) float64 {
		sum := math.Abs(a.At(i, j)) * 0x1p-52
		for c := range m {
			x := math.Abs(b.At(i, c))
			sum += x * (math.Abs(f.At(c, j))*float64(m+2)*0x1p-53 + within)
		}
		return sum
	}, bound)
	return bound
}

// exactLoop is A − B·K without rounding.
func (t *task) exactLoop(k *exact.Matrix) (*value.Matrix, error) {
	a, err := system.Rational(t.a)
	if err != nil {
		return nil, err
	}
	b, err := system.Rational(t.b)
	if err != nil {
		return nil, err
	}
	var ch system.Chain
	loop := ch.Sub(value.ExactMatrix(a), ch.Mul(value.ExactMatrix(b), value.ExactMatrix(k)))
	return loop, ch.Err
}
