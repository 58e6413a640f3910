package response

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"gainwright/builtins/numeric"
)

// modal is how much of each mode a motion c·e^(At)·d (or c·Aᵏ·d) holds, row by row of c:
// an upper bound of its size for all later times, and the measure of which modes matter.
type modal struct {
	poles     []complex128
	amplitude grid // a row a signal, a column a mode
}

// modalOf resolves the motion from d under a. Nearly defective matrices are bent by 1e-6
// of their size so that the modes can be told apart; the bound then holds for as many time
// constants as figures ask for.
func modalOf(a grid, d []float64, rows grid) (*modal, error) {
	n := a.r
	m := &modal{amplitude: newGrid(rows.r, n)}
	if n == 0 {
		return m, nil
	}
	dense := mat.NewDense(n, n, append([]float64(nil), a.v...))
	e, err := numeric.Eigen(dense)
	if err != nil {
		return nil, err
	}
	if largest(e.Condition) > 1e12 || math.IsNaN(largest(e.Condition)) {
		size := mat.Norm(dense, 1)
		for i := range n {
			dense.Set(i, i, dense.At(i, i)-1e-6*size*float64(i+1)/float64(n)*math.Sqrt(float64(i+2)))
		}
		if bent, err := numeric.Eigen(dense); err == nil {
			bent.Values = nearest(bent.Values, e.Values)
			e = bent
		}
	}
	m.poles = e.Values
	for j := range n {
		var inner, scale complex128
		for i := range n {
			inner += cmplx.Conj(e.Left.At(i, j)) * complex(d[i], 0)
			scale += cmplx.Conj(e.Left.At(i, j)) * e.Right.At(i, j)
		}
		for r := range rows.r {
			var out complex128
			for i := range n {
				out += complex(rows.at(r, i), 0) * e.Right.At(i, j)
			}
			size := cmplx.Abs(out*inner) / cmplx.Abs(scale)
			if math.IsNaN(size) || math.IsInf(size, 0) {
				size = 1e300
			}
			m.amplitude.v[r*n+j] = size
		}
	}
	return m, nil
}

// nearest gives each bent eigenvalue the real part of the true one it came from, so that
// the bound decays as the true motion does.
func nearest(bent, true []complex128) []complex128 {
	out := make([]complex128, len(bent))
	for i, b := range bent {
		out[i] = b
		best := math.Inf(1)
		for _, t := range true {
			if d := cmplx.Abs(b - t); d < best {
				best = d
				out[i] = complex(real(t), imag(b))
			}
		}
	}
	return out
}

// rates gives the poles as those of a continuous system: ln z / T of a sampled one.
func rates(poles []complex128, period float64) []complex128 {
	out := make([]complex128, len(poles))
	for i, p := range poles {
		switch {
		case period == 0:
			out[i] = p
		case cmplx.Abs(p) < 1e-14:
			out[i] = complex(-32/period, 0)
		default:
			out[i] = cmplx.Log(p) / complex(period, 0)
		}
	}
	return out
}
