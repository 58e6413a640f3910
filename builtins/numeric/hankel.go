package numeric

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/mat"
)

// HankelValues are the Hankel singular values of a stable plant, largest first,
// with an estimate of the digits that hold of each, relative to itself.
type HankelValues struct {
	Values      []float64
	Digits      []float64
	Certificate Certificate
}

// HankelSingularValues computes √λ(W·M) for the gramians W and M of a stable
// plant (A n×n, B n×m, C p×n), as the singular values of the product of their
// factors, so that the error is about ε·σ₁ and not √ε·σ₁. A mode that does not
// decay is refused by name.
//
// A. J. Laub, M. T. Heath, C. C. Paige, R. C. Ward, IEEE Trans. Automat. Control
// 32, 1987.
func HankelSingularValues(ctx context.Context, a, b, c *mat.Dense, sampled bool) (*HankelValues, error) {
	n, _, _, err := plantShapes(a, b, c, nil)
	if err != nil {
		return nil, err
	}
	if n == 0 {
		return &HankelValues{Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	factors, values, _, _, err := hankelOf(ctx, a, b, c, sampled)
	if err != nil {
		return nil, err
	}
	return judgedHankel(ctx, factors, values, b, c, sampled)
}

// judgedHankel computes the values twice more in turned coordinates; how far these differ gives their digits.
func judgedHankel(ctx context.Context, factors *gramianFactors, values []float64, b, c *mat.Dense, sampled bool) (*HankelValues, error) {
	n := len(values)
	differences, worst := make([]float64, n), 0.0
	for attempt := 1; attempt <= 2; attempt++ {
		turned, _ := factors.turned(b, c, attempt)
		_, others, _, _, err := hankelOf(ctx, turned.a, turned.b, turned.c, sampled)
		if err != nil {
			return nil, err
		}
		for i, v := range values {
			differences[i] = math.Max(math.Max(differences[i], math.Abs(v-others[i])), unitRoundoff*values[0])
			worst = math.Max(worst, differences[i])
		}
	}
	h := &HankelValues{Values: values, Digits: make([]float64, n)}
	for i, v := range values {
		h.Digits[i] = factors.certificate(differences[i], v).Digits
	}
	h.Certificate = factors.certificate(worst, values[0])
	h.Certificate.Method = "singular values of the product of the gramians' factors, computed thrice"
	return h, nil
}

// hankelOf returns the factors and seeᵀ·reach = left·diag(values)·right.
func hankelOf(ctx context.Context, a, b, c *mat.Dense, sampled bool) (f *gramianFactors, values []float64, left, right *mat.Dense, err error) {
	f, err = newGramianFactors(ctx, a, b, c, sampled)
	if err != nil {
		return nil, nil, nil, nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, nil, nil, nil, err
	}
	n := f.n
	product := mat.NewDense(n, n, nil)
	product.Mul(f.see.T(), f.reach)
	left, right, values = mat.NewDense(n, n, nil), mat.NewDense(n, n, nil), make([]float64, n)
	work := make([]float64, 1)
	data := product.RawMatrix().Data
	kernels.Dgesvd(lapack.SVDAll, lapack.SVDAll, n, n, data, n, values, left.RawMatrix().Data, n, right.RawMatrix().Data, n, work, -1)
	work = make([]float64, int(work[0]))
	if !kernels.Dgesvd(lapack.SVDAll, lapack.SVDAll, n, n, data, n, values, left.RawMatrix().Data, n, right.RawMatrix().Data, n, work, len(work)) {
		return nil, nil, nil, nil, errors.New("the singular values of the gramians' product did not converge")
	}
	return f, values, left, right, nil
}

// Reduction is a plant of lower order with what is known of its error.
type Reduction struct {
	A, B, C, D *mat.Dense
	// Values are the Hankel singular values of the stable part, largest first.
	Values []float64
	// ValueDigits are the decimal digits of each that are estimated to hold.
	ValueDigits []float64
	// Kept counts the states kept, those of modes that do not decay included.
	Kept int
	// Modes are those that do not decay; they are kept as they are.
	Modes []complex128
	// Bound is twice the sum of the distinct Hankel values left out: no gain of the
	// difference, at any frequency, exceeds it.
	Bound       float64
	BoundError  float64
	Certificate Certificate
}

// BalancedTruncation reduces a plant to the given order by truncating its
// balanced form (B. C. Moore, IEEE Trans. Automat. Control 26, 1981; square-root
// method of M. S. Tombs, I. Postlethwaite, Int. J. Control 46, 1987), with the
// error bound of K. Glover, Int. J. Control 39, 1984 (sampled: U. M. Al-Saggaf,
// G. F. Franklin, IEEE Trans. Automat. Control 32, 1987). Modes that do not decay
// are split off first and kept; an order below their number is refused with
// their names. An order that cuts between equal Hankel values, or that keeps
// states of value 0 (not moved or not seen), is noted in the certificate; the
// latter are left out and Kept is smaller than order.
func BalancedTruncation(ctx context.Context, a, b, c, d *mat.Dense, order int, sampled bool) (*Reduction, error) {
	n, m, p, err := plantShapes(a, b, c, d)
	if err != nil {
		return nil, err
	}
	if order < 0 || order > n {
		return nil, fmt.Errorf("the order asked for is %d; it must lie between 0 and the plant's %d", order, n)
	}
	through := mat.NewDense(p, m, nil)
	if rows, _ := sizeOf(d); rows > 0 {
		through.Copy(d)
	}
	if n == 0 {
		return &Reduction{A: &mat.Dense{}, B: &mat.Dense{}, C: &mat.Dense{}, D: through, Certificate: Certificate{Method: "empty", Digits: mostDigits}}, nil
	}
	split, err := splitOffUnstable(ctx, a, b, c, sampled)
	if err != nil {
		return nil, err
	}
	if order < len(split.modes) {
		return nil, refuseUnstable(fmt.Sprintf("the order cannot be less than %d", len(split.modes)), split.modes)
	}
	r := &Reduction{D: through, Modes: split.modes, Certificate: Certificate{Method: "square-root balanced truncation", Digits: mostDigits}}
	if split.stable > 0 {
		if err := r.truncate(ctx, split, order-len(split.modes), sampled); err != nil {
			return nil, err
		}
	}
	r.append(split)
	return r, nil
}

// truncate balances the stable part and keeps its first k states.
func (r *Reduction) truncate(ctx context.Context, split *modeSplit, k int, sampled bool) error {
	f, values, left, right, err := hankelOf(ctx, split.a1, split.b1, split.c1, sampled)
	if err != nil {
		return err
	}
	r.Values = values
	judged, err := judgedHankel(ctx, f, values, split.b1, split.c1, sampled)
	if err != nil {
		return err
	}
	r.ValueDigits = judged.Digits
	floor := float64(f.n) * machineEpsilon * values[0]
	asked := k
	for k > 0 && values[k-1] <= floor {
		k--
	}
	if k < asked {
		r.Certificate.note("%d of the states asked for are not moved or not seen, and were left out", asked-k)
	}
	if k > 0 && k < f.n && values[k]-values[k-1] >= -floor && values[k] > floor {
		r.Certificate.note("the order cuts between equal Hankel values; another order keeps or leaves both")
	}
	last := 0.0
	for i := k; i < f.n; i++ {
		if i == k || last-values[i] > 1e-10*last { // a repeated value counts once
			r.Bound += 2 * values[i]
			r.BoundError += 2 * values[i] * math.Pow(10, -judged.Digits[i])
		}
		last = values[i]
	}
	if k == 0 {
		return nil
	}
	into, out := mat.NewDense(f.n, k, nil), mat.NewDense(k, f.n, nil)
	into.Mul(f.reach, right.Slice(0, k, 0, f.n).T())
	out.Mul(left.Slice(0, f.n, 0, k).T(), f.see.T())
	for j := range k {
		root := math.Sqrt(values[j])
		for i := range f.n {
			into.Set(i, j, into.At(i, j)/root)
			out.Set(j, i, out.At(j, i)/root)
		}
	}
	plant := f.inBalanced(split.b1, split.c1)
	r.A, r.B, r.C = &mat.Dense{}, &mat.Dense{}, &mat.Dense{}
	var moved mat.Dense
	moved.Mul(plant.a, into)
	r.A.Mul(out, &moved)
	r.B.Mul(out, plant.b)
	r.C.Mul(plant.c, into)
	r.Kept = k
	smallest := f.certificate(machineEpsilon*values[0], values[k-1])
	r.Certificate.Condition, r.Certificate.Digits = values[0]/values[k-1], smallest.Digits
	return nil
}

// append adds the modes that do not decay after the truncated states.
func (r *Reduction) append(split *modeSplit) {
	u := len(split.modes)
	if u == 0 {
		if r.Kept == 0 {
			r.A, r.B, r.C = &mat.Dense{}, &mat.Dense{}, &mat.Dense{}
		}
		return
	}
	k := r.Kept
	_, m := split.b2.Dims()
	p, _ := split.c2.Dims()
	a, b, c := mat.NewDense(k+u, k+u, nil), mat.NewDense(k+u, m, nil), mat.NewDense(p, k+u, nil)
	if k > 0 {
		a.Slice(0, k, 0, k).(*mat.Dense).Copy(r.A)
		b.Slice(0, k, 0, m).(*mat.Dense).Copy(r.B)
		c.Slice(0, p, 0, k).(*mat.Dense).Copy(r.C)
	}
	a.Slice(k, k+u, k, k+u).(*mat.Dense).Copy(split.a2)
	b.Slice(k, k+u, 0, m).(*mat.Dense).Copy(split.b2)
	c.Slice(0, p, k, k+u).(*mat.Dense).Copy(split.c2)
	r.A, r.B, r.C, r.Kept = a, b, c, k+u
}
