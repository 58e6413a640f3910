package response

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
)

// restOf solves M·x = b, M n×n, for a point of rest and estimates the error of c·x to first order,
// |c·M⁻¹|·(|M|·|x| + |b|) times the roundings of a row; it is false where M is singular.
func restOf(m, b *mat.Dense, rows ...[]float64) (rest, wrong []float64, ok bool) {
	n, _ := m.Dims()
	var lu mat.LU
	lu.Factorize(m)
	x := mat.NewDense(n, 1, nil)
	if err := lu.SolveTo(x, false, b); err != nil && math.IsInf(float64(conditionOf(err)), 1) {
		return nil, nil, false
	}
	rest = x.RawMatrix().Data
	left, step := mat.NewDense(n, 1, nil), mat.NewDense(n, 1, nil)
	left.Mul(m, x)
	left.Sub(b, left)
	if err := lu.SolveTo(step, false, left); err == nil { // a step of refinement makes the error small in every row
		x.Add(x, step)
	}
	rounding := float64(n+2) * 0x1p-52
	for _, c := range rows {
		reach := mat.NewDense(n, 1, nil)
		if err := lu.SolveTo(reach, true, mat.NewDense(n, 1, append([]float64(nil), c...))); err != nil && math.IsInf(float64(conditionOf(err)), 1) {
			return nil, nil, false
		}
		sum := 0.0
		for i := range n {
			row := math.Abs(b.At(i, 0))
			for j := range n {
				row += math.Abs(m.At(i, j) * rest[j])
			}
			sum += math.Abs(reach.At(i, 0))*row + math.Abs(c[i]*rest[i])
		}
		wrong = append(wrong, sum*rounding)
	}
	return rest, wrong, true
}

// motionError estimates how far off, relative to time and way, the figures of a decaying motion are: by the error
// of the final value and by what rounding makes of the rate at which the poles decay.
func (t *tail) motionError(way float64, sampled bool) float64 {
	worst := 0.0
	if way != 0 {
		worst = 4 * t.final.ErrorEstimate() / math.Abs(way)
	}
	n := t.a.r
	if n == 0 {
		return worst
	}
	e, err := numeric.Eigen(mat.NewDense(n, n, append([]float64(nil), t.a.v...)))
	if err != nil {
		return math.Max(worst, 1)
	}
	for i, p := range e.Values {
		decay := -real(p)
		if sampled {
			decay = -math.Log(cmplx.Abs(p)) * cmplx.Abs(p)
		}
		if !(decay > 0) {
			return math.Max(worst, 1)
		}
		worst = math.Max(worst, e.ErrorOf[i]/decay)
	}
	return math.Min(worst, 1)
}
