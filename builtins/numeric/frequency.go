package numeric

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// ErrAtPole is what FrequencyResponse returns beside a response taken at a pole:
// the entries that grow without bound there are infinite, the others are right.
var ErrAtPole = errors.New("the point lies on a pole, where the response is infinite")

// FrequencyResponse evaluates G(s) = C·(sI − A)⁻¹·B + D at one complex s after
// another. The plant is scaled and reduced to Hessenberg form once, so a point
// costs n² operations instead of n³ (A. J. Laub, IEEE Trans. Automat. Control
// 26, 1981). It holds scratch space: one goroutine at a time.
type FrequencyResponse struct {
	n, m, p    int
	hessenberg []float64
	norm       float64    // its 1-norm
	input      *mat.Dense // n×m
	output     *mat.Dense // p×n
	through    *mat.Dense // p×m
	pencil     *hessenbergPencil
	column     []complex128
	byOutputs  bool // fewer outputs than inputs: solve with rows of C
	at         complex128
}

// NewFrequencyResponse prepares A n×n, B n×m, C p×n, D p×m (nil for zero). It
// errs on shapes that do not fit and on entries that are not finite. n may be 0.
func NewFrequencyResponse(a, b, c, d *mat.Dense) (*FrequencyResponse, error) {
	n, m, p, err := plantShapes(a, b, c, d)
	if err != nil {
		return nil, err
	}
	r := &FrequencyResponse{n: n, m: m, p: p, through: mat.NewDense(p, m, nil), byOutputs: p < m}
	if rows, _ := sizeOf(d); rows > 0 {
		r.through.Copy(d)
	}
	if n == 0 {
		return r, nil
	}
	balance := coupled(n, packed(a), true)
	w := make([]float64, n*n)
	balance.into(n, w, packed(a))
	input, output := mat.NewDense(n, m, nil), mat.NewDense(p, n, nil)
	for k, i := range balance.order {
		for j := range m {
			input.Set(k, j, math.Ldexp(b.At(i, j), -balance.exponent[k]))
		}
		for j := range p {
			output.Set(j, k, math.Ldexp(c.At(j, i), balance.exponent[k]))
		}
	}
	q := hessenbergOf(n, w)
	r.hessenberg, r.norm, r.input = w, oneNorm(n, w), orthogonalProduct(n, q, input)
	r.output = mat.NewDense(p, n, nil)
	r.output.Mul(output, mat.NewDense(n, n, q))
	r.pencil = newHessenbergPencil(n, w)
	r.column = make([]complex128, n)
	return r, nil
}

// plantShapes is the door of routines on a whole plant; D may be nil or empty.
func plantShapes(a, b, c, d *mat.Dense) (n, m, p int, err error) {
	if err := squareAndFinite("A", a); err != nil {
		return 0, 0, 0, err
	}
	n, _ = sizeOf(a)
	p, m = sizeOf(d)
	if n > 0 {
		_, m = sizeOf(b)
		p, _ = sizeOf(c)
		if m == 0 || p == 0 {
			return 0, 0, 0, withoutChannels(m, p)
		}
		if err := Shaped("B", b, n, m); err != nil {
			return 0, 0, 0, err
		}
		if err := Shaped("C", c, p, n); err != nil {
			return 0, 0, 0, err
		}
		if rows, columns := sizeOf(d); rows > 0 || columns > 0 {
			if err := Shaped("D", d, p, m); err != nil {
				return 0, 0, 0, err
			}
		}
	}
	if m == 0 || p == 0 {
		return 0, 0, 0, withoutChannels(m, p)
	}
	for _, named := range []struct {
		name string
		m    *mat.Dense
	}{{"B", b}, {"C", c}, {"D", d}} {
		if err := Finite(named.name, named.m); err != nil {
			return 0, 0, 0, err
		}
	}
	return n, m, p, nil
}

func withoutChannels(inputs, outputs int) error {
	return fmt.Errorf("the plant has %d inputs and %d outputs; it needs one of each at least", inputs, outputs)
}

// At is the p×m response at s. At a pole it returns ErrAtPole beside it.
func (r *FrequencyResponse) At(s complex128) (*mat.CDense, error) {
	dst := mat.NewCDense(r.p, r.m, nil)
	return dst, r.AtInto(dst, s)
}

// AtInto writes the response at s to the p×m dst and allocates nothing unless
// s is a pole. It errs when dst has another size or s is not finite.
func (r *FrequencyResponse) AtInto(dst *mat.CDense, s complex128) error {
	if rows, columns := dst.Dims(); rows != r.p || columns != r.m {
		return fmt.Errorf("the response is %d×%d and its destination %d×%d", r.p, r.m, rows, columns)
	}
	if cmplx.IsNaN(s) || cmplx.IsInf(s) {
		return fmt.Errorf("the response is asked for at a point that is not finite")
	}
	if r.n > 0 && r.pencil.factor(s) {
		return r.atPole(dst, s)
	}
	r.at = s
	r.fill(dst)
	return nil
}

// fill writes the response for the factored pencil.
func (r *FrequencyResponse) fill(dst *mat.CDense) {
	raw := dst.RawCMatrix()
	for i := range r.p {
		for j := range r.m {
			raw.Data[i*raw.Stride+j] = complex(r.through.At(i, j), 0)
		}
	}
	if r.n == 0 {
		return
	}
	if r.byOutputs {
		for i := range r.p {
			for k, v := range r.output.RawRowView(i) {
				r.column[k] = complex(v, 0)
			}
			r.pencil.solveAdjoint(r.column)
			for k, v := range r.column {
				for j, b := range r.input.RawRowView(k) {
					raw.Data[i*raw.Stride+j] += complex(real(v)*b, -imag(v)*b)
				}
			}
		}
		return
	}
	for j := range r.m {
		for k := range r.column {
			r.column[k] = complex(r.input.At(k, j), 0)
		}
		r.pencil.solve(r.column)
		for i := range r.p {
			re, im := 0.0, 0.0
			for k, c := range r.output.RawRowView(i) {
				re += c * real(r.column[k])
				im += c * imag(r.column[k])
			}
			raw.Data[i*raw.Stride+j] += complex(re, im)
		}
	}
}

// poleStep is how far beside a pole the response is taken to see which of its
// entries grow there, relative to s and the size of A.
const poleStep = 1e-6

// atPole decides entry by entry whether the response at the pole s is infinite:
// an entry that at least grows by half again when the distance is halved is.
func (r *FrequencyResponse) atPole(dst *mat.CDense, s complex128) error {
	far, near := mat.NewCDense(r.p, r.m, nil), mat.NewCDense(r.p, r.m, nil)
	step := poleStep * (cmplx.Abs(s) + math.Min(1, r.norm))
	if step == 0 {
		step = poleStep
	}
	for _, point := range []struct {
		dst      *mat.CDense
		distance float64
	}{{far, step}, {near, step / 2}} {
		if r.pencil.factor(s + complex(point.distance, point.distance)) {
			fillInfinite(dst)
			return ErrAtPole
		}
		r.fill(point.dst)
	}
	infinite := false
	for i := range r.p {
		for j := range r.m {
			f, g := far.At(i, j), near.At(i, j)
			if cmplx.Abs(g) > 1.5*cmplx.Abs(f) {
				dst.Set(i, j, cmplx.Inf())
				infinite = true
			} else {
				dst.Set(i, j, 2*g-f)
			}
		}
	}
	if infinite {
		return ErrAtPole
	}
	return nil
}

func fillInfinite(dst *mat.CDense) {
	rows, columns := dst.Dims()
	for i := range rows {
		for j := range columns {
			dst.Set(i, j, cmplx.Inf())
		}
	}
}

// Certify judges the response at s: the residual of the solved columns relative
// to the data, the condition number of sI − A in the coordinates used, and the
// digits of the largest entry.
func (r *FrequencyResponse) Certify(s complex128) (Certificate, error) {
	certificate := Certificate{Method: "Hessenberg form, LU for each point", Digits: mostDigits}
	if r.n == 0 {
		return certificate, nil
	}
	if r.pencil.factor(s) {
		return certificate, ErrAtPole
	}
	inverse := r.pencil.inverseNorm()
	norm := r.norm + cmplx.Abs(s)
	certificate.Condition = inverse * norm
	dst := mat.NewCDense(r.p, r.m, nil)
	r.fill(dst)
	largest := 0.0
	for i := range r.p {
		for j := range r.m {
			largest = math.Max(largest, cmplx.Abs(dst.At(i, j)))
		}
	}
	lost, residual := r.lost(s, norm)
	certificate.Residual = residual
	if largest > 0 {
		certificate.Digits = DigitsOf(lost/largest, 1)
	} else if lost > 0 {
		certificate.Digits = 0
	}
	return certificate, nil
}

// ErrorAt estimates the error of the largest entry of the response that AtInto took last, at s and not at a pole:
// what Certify counts, without the condition number.
func (r *FrequencyResponse) ErrorAt(s complex128) float64 {
	if r.n == 0 {
		return 0
	}
	lost, _ := r.lost(s, r.norm+cmplx.Abs(s))
	return lost
}

// lost bounds to first order what the relative residuals of the states' responses leave in the outputs,
// ‖C·(sI − H)⁻¹‖·(ε·‖sI − H‖·‖x‖), and gives the largest residual; the pencil is factored at s.
func (r *FrequencyResponse) lost(s complex128, norm float64) (lost, worst float64) {
	reach := 0.0
	for i := range r.p {
		for k, v := range r.output.RawRowView(i) {
			r.column[k] = complex(v, 0)
		}
		r.pencil.solveAdjoint(r.column)
		size := 0.0
		for _, v := range r.column {
			size = math.Hypot(size, cmplx.Abs(v))
		}
		reach = math.Max(reach, size)
	}
	for j := range r.m {
		residual, backward := r.columnResidual(s, j, norm)
		worst = math.Max(worst, residual)
		lost = math.Max(lost, reach*backward*math.Max(residual, unitRoundoff))
	}
	return lost, worst
}

// columnResidual solves for column j of the states' response, and returns its relative residual and what that is relative to.
func (r *FrequencyResponse) columnResidual(s complex128, j int, norm float64) (residual, backward float64) {
	n := r.n
	for k := range n {
		r.column[k] = complex(r.input.At(k, j), 0)
	}
	r.pencil.solve(r.column)
	size, left, right := 0.0, 0.0, 0.0
	for i := range n {
		x := r.column[i]
		re, im := real(s)*real(x)-imag(s)*imag(x)-r.input.At(i, j), real(s)*imag(x)+imag(s)*real(x)
		from := max(i-1, 0)
		row := r.hessenberg[i*n+from : (i+1)*n]
		for k, x := range r.column[from:n] {
			re -= row[k] * real(x)
			im -= row[k] * imag(x)
		}
		left = math.Hypot(left, math.Hypot(re, im))
		right = math.Hypot(right, r.input.At(i, j))
		size = math.Hypot(size, cmplx.Abs(x))
	}
	if backward = norm*size + right; backward == 0 {
		return 0, 0
	}
	return left / backward, backward
}
