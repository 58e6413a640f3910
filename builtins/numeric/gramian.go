package numeric

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// stableMargin is the distance from the stability boundary, in roundings of the
// size of A, within which a mode counts as on it.
const stableMargin = 16

// unstableModes lists the eigenvalues that do not lie strictly inside the
// stability region, to working precision.
func unstableModes(w []complex128, norm float64, sampled bool) []complex128 {
	var modes []complex128
	slack := stableMargin * machineEpsilon * norm
	for _, lambda := range w {
		if sampled && cmplx.Abs(lambda) >= 1-slack || !sampled && real(lambda) >= -slack {
			modes = append(modes, lambda)
		}
	}
	return modes
}

// refuseUnstable is the refusal of a quantity that only stable plants have.
func refuseUnstable(what string, modes []complex128) error {
	reason := what + ", because the plant has modes that do not decay"
	if len(modes) == 1 {
		reason = what + ", because the plant has a mode that does not decay"
	}
	return &Refusal{Reason: reason, Modes: modes}
}

// ReachabilityGramian is the W ⪰ 0 with A·W + W·Aᵀ + B·Bᵀ = 0, or
// A·W·Aᵀ − W + B·Bᵀ = 0 when sampled (A n×n, B n×m); a plant with a mode that does
// not decay is refused by name. W = F·Fᵀ is computed through its factor F, so
// small eigenvalues of W keep the relative accuracy that forming W first would
// destroy (S. J. Hammarling, IMA J. Numer. Anal. 2, 1982).
func ReachabilityGramian(ctx context.Context, a, b *mat.Dense, sampled bool) (*mat.Dense, Certificate, error) {
	if err := gramianShapes(a, b); err != nil {
		return nil, Certificate{}, err
	}
	factors, err := newGramianFactors(ctx, a, b, nil, sampled)
	if err != nil {
		return nil, Certificate{}, err
	}
	w := factors.gram(factors.reach)
	difference := 0.0
	for attempt := 1; attempt <= factors.samples(); attempt++ {
		turned, v := factors.turned(b, nil, attempt)
		second, err := newGramianFactors(ctx, turned.a, turned.b, nil, sampled)
		if err != nil {
			return nil, Certificate{}, err
		}
		other := second.gram(second.reach)
		reflectBothSides(other, v)
		other = factors.outOfBalanced(other)
		other.Sub(w, other)
		difference = math.Max(difference, largestEntry(other))
	}
	return w, factors.certificate(difference, largestEntry(w)), nil
}

// ObservabilityGramian is the dual: AᵀM + MA + CᵀC = 0 or AᵀMA − M + CᵀC = 0.
func ObservabilityGramian(ctx context.Context, a, c *mat.Dense, sampled bool) (*mat.Dense, Certificate, error) {
	if rows, _ := sizeOf(c); rows == 0 {
		return nil, Certificate{}, fmt.Errorf("C has no rows")
	}
	if rows, _ := sizeOf(a); rows == 0 {
		return &mat.Dense{}, Certificate{Method: "empty", Digits: mostDigits}, Square("A", a)
	}
	if n, _ := sizeOf(a); Shaped("C", c, c.RawMatrix().Rows, n) != nil {
		return nil, Certificate{}, Shaped("C", c, c.RawMatrix().Rows, n)
	}
	return ReachabilityGramian(ctx, transposedCopy(a), transposedCopy(c), sampled)
}

func gramianShapes(a, b *mat.Dense) error {
	if err := squareAndFinite("A", a); err != nil {
		return err
	}
	n, _ := sizeOf(a)
	_, m := sizeOf(b)
	if n == 0 || m == 0 {
		return fmt.Errorf("a gramian needs a state and an input; there are %d states and %d inputs", n, m)
	}
	if err := Shaped("B", b, n, m); err != nil {
		return err
	}
	return Finite("B", b)
}

// gramianFactors hold a plant's gramians through factors: in the coordinates
// x = P·D·x̃ of balance, W̃ = reach·reachᵀ and M̃ = see·seeᵀ, n×n each.
type gramianFactors struct {
	n          int
	balance    *coupling
	balanced   *mat.Dense
	reach, see *mat.Dense
	decay      float64 // distance of the slowest mode from the boundary, relative to the norm
}

// newGramianFactors computes the factors asked for (b or c may be nil) from one
// complex Schur form.
func newGramianFactors(ctx context.Context, a, b, c *mat.Dense, sampled bool) (*gramianFactors, error) {
	n, _ := a.Dims()
	f := &gramianFactors{n: n, balance: coupled(n, packed(a), true), balanced: mat.NewDense(n, n, nil)}
	f.balance.into(n, f.balanced.RawMatrix().Data, packed(a))
	plant := f.inBalanced(b, c)
	t, z, err := complexSchur(f.balanced)
	if err != nil {
		return nil, err
	}
	w, norm := make([]complex128, n), 0.0
	for i := range n {
		w[i] = t[i*n+i]
	}
	for i := range n {
		for j := i; j < n; j++ {
			norm = math.Hypot(norm, cmplx.Abs(t[i*n+j]))
		}
	}
	if modes := unstableModes(w, norm, sampled); len(modes) > 0 {
		return nil, refuseUnstable("there is no gramian", modes)
	}
	f.decay = slowestDecayOf(w, norm, sampled)
	if b != nil {
		if f.reach, err = f.factor(ctx, t, z, plant.b, false, sampled); err != nil {
			return nil, err
		}
	}
	if c != nil {
		if f.see, err = f.factor(ctx, t, z, plant.c, true, sampled); err != nil {
			return nil, err
		}
	}
	return f, nil
}

func slowestDecayOf(w []complex128, norm float64, sampled bool) float64 {
	slowest := math.Inf(1)
	for _, lambda := range w {
		margin := -real(lambda) / norm
		if sampled {
			margin = 1 - cmplx.Abs(lambda)
		}
		slowest = math.Min(slowest, margin)
	}
	return slowest
}

// factor returns the real n×n factor, in balanced coordinates, of the
// reachability gramian of (A, entry) or, with dual, of the observability
// gramian of (A, entry). The dual runs on the conjugate transpose of T with
// rows and columns reversed, which is upper triangular again.
func (f *gramianFactors) factor(ctx context.Context, t, z []complex128, entry *mat.Dense, dual, sampled bool) (*mat.Dense, error) {
	n := f.n
	rows, columns := entry.Dims()
	m := columns
	if dual {
		m = rows
	}
	right := make([]complex128, n*m)
	for k := range n {
		at := k
		if dual {
			at = n - 1 - k
		}
		for l := range n {
			for j := range m {
				v := 0.0
				if dual {
					v = entry.At(j, l)
				} else {
					v = entry.At(l, j)
				}
				right[at*m+j] += cmplx.Conj(z[l*n+k]) * complex(v, 0)
			}
		}
	}
	triangle := t
	if dual {
		triangle = make([]complex128, n*n)
		for i := range n {
			for j := i; j < n; j++ {
				triangle[i*n+j] = cmplx.Conj(t[(n-1-j)*n+n-1-i])
			}
		}
	}
	u, err := triangularFactor(ctx, n, m, triangle, right, sampled)
	if err != nil {
		return nil, err
	}
	wide := mat.NewDense(n, 2*n, nil)
	for l := range n {
		row := wide.RawRowView(l)
		for k := range n {
			at := k
			if dual {
				at = n - 1 - k
			}
			zl := z[l*n+at]
			for j := k; j < n; j++ {
				v := zl * u[k*n+j]
				row[j] += real(v)
				row[n+j] += imag(v)
			}
		}
	}
	return compressed(wide), nil
}

// compressed is a square L with L·Lᵀ = X·Xᵀ for a wide X, by an LQ factorization.
func compressed(x *mat.Dense) *mat.Dense {
	rows, columns := x.Dims()
	tau, work := make([]float64, rows), make([]float64, 64*(rows+columns))
	raw := x.RawMatrix()
	kernels.Dgelqf(rows, columns, raw.Data, raw.Stride, tau, work, len(work))
	l := mat.NewDense(rows, rows, nil)
	for i := range rows {
		copy(l.RawRowView(i)[:i+1], x.RawRowView(i)[:i+1])
	}
	return l
}

// triangularFactor is the upper triangular U with T·X + X·Tᴴ + B·Bᴴ = 0 (sampled:
// T·X·Tᴴ − X + B·Bᴴ = 0), X = U·Uᴴ, for a stable upper triangular T and an n×m B,
// which it overwrites; columns from last to first, each leaving an equation of
// the same kind one smaller (Hammarling 1982, complex form).
func triangularFactor(ctx context.Context, n, m int, t, b []complex128, sampled bool) ([]complex128, error) {
	u := make([]complex128, n*n)
	column, direction := make([]complex128, n), make([]complex128, m)
	for j := n - 1; j >= 0; j-- {
		if j%16 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		row := b[j*m : j*m+m]
		size := 0.0
		for _, v := range row {
			size = math.Hypot(size, cmplx.Abs(v))
		}
		if size == 0 {
			continue
		}
		lambda := t[j*n+j]
		var rate float64 // b/τ = direction·rate
		if sampled {
			modulus := cmplx.Abs(lambda)
			rate = math.Sqrt((1 - modulus) * (1 + modulus))
		} else {
			rate = math.Sqrt(-2 * real(lambda))
		}
		tau := size / rate
		u[j*n+j] = complex(tau, 0)
		for k, v := range row {
			direction[k] = v / complex(size, 0)
		}
		if sampled {
			sampledColumn(n, m, j, t, b, direction, tau, rate, lambda, column)
		} else {
			continuousColumn(n, m, j, t, b, direction, tau, rate, lambda, column)
		}
		for i := range j {
			u[i*n+j] = column[i]
		}
	}
	return u, nil
}

// continuousColumn solves (T₁ + λ̄I)·u = −t·τ − rate·B₁·yᴴ and replaces B₁ by
// B₁ − rate·u·y.
func continuousColumn(n, m, j int, t, b, y []complex128, tau, rate float64, lambda complex128, u []complex128) {
	for i := range j {
		sum := -t[i*n+j] * complex(tau, 0)
		for k := range m {
			sum -= b[i*m+k] * cmplx.Conj(y[k]) * complex(rate, 0)
		}
		u[i] = sum
	}
	for i := j - 1; i >= 0; i-- {
		sum := u[i]
		for k := i + 1; k < j; k++ {
			sum -= t[i*n+k] * u[k]
		}
		u[i] = sum / (t[i*n+i] + cmplx.Conj(lambda))
	}
	for i := range j {
		for k := range m {
			b[i*m+k] -= complex(rate, 0) * u[i] * y[k]
		}
	}
}

// sampledColumn solves (I − λ̄T₁)·u = λ̄·t·τ + rate·w with w = B₁·yᴴ and replaces B₁
// by B₁ + (rate·v − λ·w − w)·y with v = T₁·u + t·τ.
func sampledColumn(n, m, j int, t, b, y []complex128, tau, rate float64, lambda complex128, u []complex128) {
	w := make([]complex128, j)
	conjugate := cmplx.Conj(lambda)
	for i := range j {
		for k := range m {
			w[i] += b[i*m+k] * cmplx.Conj(y[k])
		}
		u[i] = conjugate*t[i*n+j]*complex(tau, 0) + complex(rate, 0)*w[i]
	}
	for i := j - 1; i >= 0; i-- {
		sum := u[i]
		for k := i + 1; k < j; k++ {
			sum += conjugate * t[i*n+k] * u[k]
		}
		u[i] = sum / (1 - conjugate*t[i*n+i])
	}
	for i := range j {
		v := t[i*n+j] * complex(tau, 0)
		for k := i; k < j; k++ {
			v += t[i*n+k] * u[k]
		}
		change := complex(rate, 0)*v - lambda*w[i] - w[i]
		for k := range m {
			b[i*m+k] += change * y[k]
		}
	}
}

// gram is P·D·F·Fᵀ·D·Pᵀ, exactly symmetric.
func (f *gramianFactors) gram(factor *mat.Dense) *mat.Dense {
	w := mat.NewDense(f.n, f.n, nil)
	w.Mul(factor, factor.T())
	for i := range f.n {
		for j := range i {
			w.Set(j, i, w.At(i, j))
		}
	}
	return f.outOfBalanced(w)
}

// outOfBalanced is P·D·W·D·Pᵀ.
func (f *gramianFactors) outOfBalanced(w *mat.Dense) *mat.Dense {
	out := mat.NewDense(f.n, f.n, nil)
	order, exponent := f.balance.order, f.balance.exponent
	for i := range f.n {
		for j := range f.n {
			out.Set(order[i], order[j], math.Ldexp(w.At(i, j), exponent[i]+exponent[j]))
		}
	}
	return out
}

// inBalanced is the plant in the coordinates x̃; b or c may be nil.
func (f *gramianFactors) inBalanced(b, c *mat.Dense) plantMatrices {
	plant := plantMatrices{a: f.balanced}
	if b != nil {
		_, m := b.Dims()
		plant.b = mat.NewDense(f.n, m, nil)
		for k, i := range f.balance.order {
			for j := range m {
				plant.b.Set(k, j, math.Ldexp(b.At(i, j), -f.balance.exponent[k]))
			}
		}
	}
	if c != nil {
		p, _ := c.Dims()
		plant.c = mat.NewDense(p, f.n, nil)
		for k, i := range f.balance.order {
			for j := range p {
				plant.c.Set(j, k, math.Ldexp(c.At(j, i), f.balance.exponent[k]))
			}
		}
	}
	return plant
}

// plantMatrices is a plant in some coordinates, without D.
type plantMatrices struct{ a, b, c *mat.Dense }

// turned reflects the balanced plant by I − 2·v·vᵀ. The reflection rounds every
// entry anew, so what a second computation there differs by samples the
// algorithm's own errors and the answer to rounding of the data. b or c may
// be nil.
func (f *gramianFactors) turned(b, c *mat.Dense, attempt int) (plantMatrices, []float64) {
	v := reflectionVector(f.n, attempt)
	plant := f.inBalanced(b, c)
	plant.a = mat.DenseCopyOf(f.balanced)
	reflectBothSides(plant.a, v)
	if b != nil {
		reflectRows(plant.b, v)
	}
	if c != nil {
		columns := transposedCopy(plant.c)
		reflectRows(columns, v)
		plant.c = transposedCopy(columns)
	}
	return plant, v
}

// samples is how many turned computations are made: small problems have few
// entries, in which two computations can agree by luck.
func (f *gramianFactors) samples() int {
	if f.n <= 2*smallOrder {
		return 2
	}
	return 1
}

// turnedMargin multiplies the difference of the two computations: two samples
// of an error can agree by luck.
const turnedMargin = 4

// certificate states the digits that a difference of two computations and the
// plant's slowest decay leave of a value of the given size.
func (f *gramianFactors) certificate(difference, size float64) Certificate {
	c := Certificate{Method: "factored gramian on the complex Schur form (Hammarling), recomputed in turned coordinates", Condition: 1 / f.decay}
	if size == 0 {
		if difference == 0 {
			c.Digits = mostDigits
		}
		return c
	}
	c.Residual = turnedMargin * difference / size
	c.Digits = math.Min(DigitsOf(c.Residual, 1), DigitsOf(2*unitRoundoff, c.Condition))
	return c
}

// complexSchur is A = Z·T·Zᴴ with T upper triangular, from the real Schur form
// by one rotation for each complex pair.
func complexSchur(a *mat.Dense) (t, z []complex128, err error) {
	form, basis, _, err := Schur(a)
	if err != nil {
		return nil, nil, err
	}
	n, _ := form.Dims()
	t, z = make([]complex128, n*n), make([]complex128, n*n)
	for i := range n {
		for j := range n {
			t[i*n+j], z[i*n+j] = complex(form.At(i, j), 0), complex(basis.At(i, j), 0)
		}
	}
	for i := 0; i+1 < n; i++ {
		if form.At(i+1, i) == 0 {
			continue
		}
		// (b, iω)ᵀ is an eigenvector of the standardised block [[d, b], [c, d]].
		b, c := form.At(i, i+1), form.At(i+1, i)
		omega := math.Sqrt(math.Abs(b)) * math.Sqrt(math.Abs(c))
		length := math.Hypot(b, omega)
		x, y := complex(b/length, 0), complex(0, omega/length)
		// Columns i and i+1 of Z become Z·[[x, y], [y, x]], which is unitary because
		// x is real and y imaginary.
		for k := range n {
			u, v := z[k*n+i], z[k*n+i+1]
			z[k*n+i], z[k*n+i+1] = u*x+v*y, u*y+v*x
			u, v = t[k*n+i], t[k*n+i+1]
			t[k*n+i], t[k*n+i+1] = u*x+v*y, u*y+v*x
		}
		for k := range n {
			u, v := t[i*n+k], t[(i+1)*n+k]
			t[i*n+k], t[(i+1)*n+k] = u*x-v*y, v*x-u*y
		}
		t[(i+1)*n+i] = 0
		t[i*n+i], t[(i+1)*n+i+1] = complex(form.At(i, i), omega), complex(form.At(i, i), -omega)
		i++
	}
	return t, z, nil
}
