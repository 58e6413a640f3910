package numeric

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// Zeros describes where a system blocks signals.
type Zeros struct {
	// Zeros are the transmission zeros: the finite zeros of the minimal part.
	Zeros []complex128
	// ErrorOf estimates the absolute error of each, SigmaMin is the singular
	// value of the balanced system matrix that must vanish there, relative to
	// the matrix.
	ErrorOf, SigmaMin []float64
	// Invariant are the finite zeros of the whole system matrix
	// [A − sI, B; C, D]: the numbers at which it loses rank. For as many inputs as
	// outputs they hold all decoupling zeros; else perhaps only some.
	Invariant []complex128
	// InputDecoupling are the modes no input moves, OutputDecoupling those no
	// output sees, BothDecoupling those in both lists.
	InputDecoupling, OutputDecoupling, BothDecoupling []complex128
	// NormalRank is the rank of the transfer matrix at almost every s. Singular
	// says that it is smaller than both the number of inputs and of outputs, so that the
	// system matrix is singular for every s.
	NormalRank int
	Singular   bool
	// Infinite are the orders of the zeros at infinity, rising.
	Infinite []int
	// Threshold counted singular values as zero; Above is the smallest that
	// counted, Below the largest that did not, in balanced coordinates.
	Threshold, Above, Below float64
	Certificate             Certificate
}

// TransmissionZeros finds the zeros of the system (a, b, c, d): a n×n, b n×m,
// c p×n, d p×m (nil means no feedthrough). States, inputs and outputs are balanced by powers
// of two; the minimal part is found by two staircase forms; the system matrix is reduced
// by orthogonal transformations until D is square and invertible, so that no zero at infinity can
// come out as a large number; what is left is an ordinary eigenproblem, each simple zero
// of it improved by Rayleigh quotients on the reduced system matrix. Singular
// values up to 1000·(n+m+p)·ε·‖[A B; C D]‖_F count as zero.
//
// Any numbers of inputs and outputs are taken; without either there is no
// transmission zero. It errs on misfitting shapes, entries that are not
// finite, a cancelled context, and iterations that fail.
func TransmissionZeros(ctx context.Context, a, b, c, d *mat.Dense) (*Zeros, error) {
	s, err := newStateSpace(a, b, c, d)
	if err != nil {
		return nil, err
	}
	s.balanced()
	norm := blocksNorm(s.a, s.b, s.c, s.d)
	out := &Zeros{Threshold: staircaseThreshold(s.n, s.m+s.p, norm), Above: math.Inf(1)}
	out.Certificate = Certificate{Method: "orthogonal reduction of the balanced system matrix (Emami-Naeini & Van Dooren 1982), eigenvalues, Rayleigh quotients", Digits: mostDigits}
	minimal, err := out.decouple(s)
	if err != nil {
		return nil, err
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	pencil := newSystemPencil(minimal, out.Threshold)
	if err := pencil.regular(); err != nil {
		return nil, err
	}
	out.note(pencil, s)
	found, err := pencil.zeros(ctx)
	if err != nil {
		return nil, err
	}
	out.Zeros, out.ErrorOf = found.values, found.errors
	out.Invariant = out.Zeros
	if minimal != s {
		if err := out.wholeSystem(ctx, s); err != nil {
			return nil, err
		}
	}
	out.SigmaMin = found.residuals
	if s.n+max(s.m, s.p) <= directLimit {
		if err := out.measure(minimal, norm); err != nil {
			return nil, err
		}
	}
	out.judge(found, s.invariantSize())
	return out, nil
}

// newStateSpace checks a system at the door and copies it.
func newStateSpace(a, b, c, d *mat.Dense) (*stateSpace, error) {
	if err := checkPair(a, b); err != nil {
		return nil, err
	}
	n, _ := sizeOf(a)
	_, m := sizeOf(b)
	p, columns := sizeOf(c)
	if n == 0 {
		p, m = sizeOf(d)
	} else if p > 0 && columns != n {
		return nil, fmt.Errorf("%s is %d×%d; it must have %d columns", "C", p, columns, n)
	}
	if err := Finite("C", c); err != nil {
		return nil, err
	}
	s := &stateSpace{n: n, m: m, p: p, a: flatCopy(a), b: flatCopy(b), c: flatCopy(c), d: make([]float64, p*m)}
	if rows, _ := sizeOf(d); rows > 0 {
		if err := Shaped("D", d, p, m); err != nil {
			return nil, err
		}
		if err := Finite("D", d); err != nil {
			return nil, err
		}
		s.d = flatCopy(d)
	}
	return s, nil
}

// decouple finds the decoupling zeros and the minimal part (s itself when
// nothing is decoupled).
func (out *Zeros) decouple(s *stateSpace) (*stateSpace, error) {
	if s.n == 0 {
		return s, nil
	}
	reach, seen, q, err := s.minimalPart(out.Threshold)
	if err != nil {
		return nil, err
	}
	for _, decision := range []*staircase{reach, seen} {
		out.Above, out.Below = math.Min(out.Above, decision.above), math.Max(out.Below, decision.below)
	}
	r := seen.rank
	if r == s.n {
		return s, nil
	}
	bases, err := s.splitBases()
	if err != nil {
		return nil, err
	}
	split := Split{Sizes: [4]int{bases.both, bases.rank - bases.both, bases.seen - bases.both, s.n - bases.rank - bases.seen + bases.both}}
	if err := split.findPoles(s, bases.orthogonal); err != nil {
		return nil, err
	}
	out.InputDecoupling = append(append([]complex128(nil), split.Poles[2]...), split.Poles[3]...)
	out.OutputDecoupling = append(append([]complex128(nil), split.Poles[1]...), split.Poles[3]...)
	out.BothDecoupling = split.Poles[3]
	return s.restricted(q, r), nil
}

// restricted is the system on the first r columns of the orthogonal q.
func (s *stateSpace) restricted(q []float64, r int) *stateSpace {
	part := &stateSpace{n: r, m: s.m, p: s.p, d: s.d}
	if r == 0 {
		return part
	}
	basis := mat.NewDense(s.n, r, columnsOf(q, s.n, s.n, 0, r))
	var image, a mat.Dense
	image.Mul(mat.NewDense(s.n, s.n, s.a), basis)
	a.Mul(basis.T(), &image)
	part.a = flatCopy(&a)
	if s.m > 0 {
		var b mat.Dense
		b.Mul(basis.T(), mat.NewDense(s.n, s.m, s.b))
		part.b = flatCopy(&b)
	}
	if s.p > 0 {
		var c mat.Dense
		c.Mul(mat.NewDense(s.p, s.n, s.c), basis)
		part.c = flatCopy(&c)
	}
	return part
}

// note takes over ranks, orders and the gap from the reduced pencil.
func (out *Zeros) note(pencil *systemPencil, s *stateSpace) {
	out.NormalRank = pencil.p
	out.Singular = out.NormalRank < min(s.m, s.p)
	out.Infinite = pencil.infiniteOrders()
	out.Above, out.Below = math.Min(out.Above, pencil.above), math.Max(out.Below, pencil.below)
	if out.Singular {
		out.Certificate.note("the transfer matrix has rank %d only: the system matrix is singular for every s", out.NormalRank)
	}
	if out.Below > 0 && out.Above/out.Below < 1e3 {
		out.Certificate.note("the number of zeros is not well separated: a singular value of %.2g counted, one of %.2g did not", out.Above, out.Below)
	}
}

// wholeSystem finds the invariant zeros when some are decoupling zeros.
func (out *Zeros) wholeSystem(ctx context.Context, s *stateSpace) error {
	pencil := newSystemPencil(s, out.Threshold)
	if err := pencil.regular(); err != nil {
		return err
	}
	found, err := pencil.zeros(ctx)
	if err != nil {
		return err
	}
	out.Invariant = found.values
	return nil
}

// judge writes the digits, relative to the largest zero, or to the size of A
// when all zeros vanish.
func (out *Zeros) judge(found *foundZeros, size float64) {
	worst, largest := 0.0, 0.0
	for i, z := range out.Zeros {
		worst, largest = math.Max(worst, out.ErrorOf[i]), math.Max(largest, cmplx.Abs(z))
	}
	for _, sigma := range out.SigmaMin {
		out.Certificate.Residual = math.Max(out.Certificate.Residual, sigma)
	}
	out.Certificate.Condition = found.condition
	if largest <= worst {
		largest = size
	}
	if len(out.Zeros) > 0 {
		out.Certificate.Digits = digitsOfError(worst, largest)
	}
	out.Certificate.Notes = append(out.Certificate.Notes, found.notes...)
}
