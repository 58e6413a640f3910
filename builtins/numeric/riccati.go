package numeric

import (
	"context"
	"errors"
	"fmt"

	"gonum.org/v1/gonum/mat"
)

// RiccatiProblem asks for the stabilising solution of an algebraic Riccati
// equation: continuous
//
//	AᵀX + XA − (XB + N)·R⁻¹·(BᵀX + Nᵀ) + Q = 0
//
// or, when Sampled, discrete
//
//	AᵀXA − X − (AᵀXB + N)·(R + BᵀXB)⁻¹·(BᵀXA + Nᵀ) + Q = 0.
//
// A is n×n, B n×m, Q n×n and R m×m symmetric, N n×m or nil for none. Q may be
// indefinite. R must be positive definite in the continuous equation and may be
// singular, even zero, in the sampled one as long as R + BᵀXB is not.
type RiccatiProblem struct {
	A, B, Q, R, N *mat.Dense
	Sampled       bool
}

// RiccatiSolution is the stabilising solution with the gain of u = −K·x.
type RiccatiSolution struct {
	// X is symmetric n×n. Certificate speaks of it.
	X *mat.Dense
	// K is R⁻¹(BᵀX + Nᵀ), or (R + BᵀXB)⁻¹(BᵀXA + Nᵀ) when sampled; m×n.
	K *mat.Dense
	// Poles are the eigenvalues of A − B·K, all stable.
	Poles       []complex128
	Certificate Certificate
	// GainDigits estimates the decimal digits of K that hold, relative to its
	// largest entry.
	GainDigits float64
	// LastNewtonStep is the last correction of X, relative to its largest entry.
	LastNewtonStep float64
}

// Riccati solves the problem. Nothing passed in is changed. It refuses with a
// *Refusal where no stabilising solution exists: when an unstable mode is moved
// by no input, when a mode on the stability boundary is seen by no weight, when
// R is not positive definite (continuous), or when the Hamiltonian matrix has
// eigenvalues on the boundary for another reason; "on the boundary" means that
// rounding of the data alone can put it there. It errs on wrong shapes and
// entries that are not finite, on asymmetric Q or R, on a cancelled context,
// and when no iteration settles.
//
// Powers-of-two balancing (Benner 2001); structure-preserving doubling (E. K.-W.
// Chu, H.-Y. Fan, W.-W. Lin, Linear Algebra Appl. 396, 2005); Newton steps (D. L.
// Kleinman, IEEE TAC 13, 1968; G. A. Hewer, IEEE TAC 16, 1971). Where doubling
// leads to no stable closed loop, the ordered Schur form of the Hamiltonian, or
// of the Cayley transform of the symplectic pencil, is the second start (A. J.
// Laub, IEEE TAC 24, 1979), and for semidefinite weights the solution for larger
// weights the third. Where the first-order error estimate is poor the last steps
// use residuals in doubled precision.
func Riccati(ctx context.Context, p RiccatiProblem) (*RiccatiSolution, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	if n, _ := sizeOf(p.A); n == 0 {
		return &RiccatiSolution{X: &mat.Dense{}, K: &mat.Dense{}, Certificate: Certificate{Method: "empty", Digits: mostDigits}, GainDigits: mostDigits}, nil
	}
	d, err := newRiccatiData(p)
	if err != nil {
		return nil, err
	}
	s, err := d.search(ctx)
	if err != nil {
		var refusal *Refusal
		if errors.As(err, &refusal) || ctx.Err() != nil {
			return nil, err
		}
		if refusal := d.diagnose(); refusal != nil {
			return nil, refusal
		}
		return nil, err
	}
	if refusal := d.doubt(s); refusal != nil {
		return nil, refusal
	}
	return d.finish(s)
}

// check is the door: shapes, finiteness, symmetry.
func (p *RiccatiProblem) check() error {
	if err := squareAndFinite("A", p.A); err != nil {
		return err
	}
	n, _ := sizeOf(p.A)
	rows, m := sizeOf(p.B)
	if n == 0 {
		return nil
	}
	if rows != n || m == 0 {
		return fmt.Errorf("B is %d×%d; it must have as many rows as A (%d) and at least one column", rows, m, n)
	}
	if err := Shaped("Q", p.Q, n, n); err != nil {
		return err
	}
	if err := Shaped("R", p.R, m, m); err != nil {
		return err
	}
	if p.N != nil {
		if err := Shaped("N", p.N, n, m); err != nil {
			return err
		}
		if err := Finite("N", p.N); err != nil {
			return err
		}
	}
	for _, part := range []struct {
		name string
		m    *mat.Dense
	}{{"B", p.B}, {"Q", p.Q}, {"R", p.R}} {
		if err := Finite(part.name, part.m); err != nil {
			return err
		}
	}
	if err := Symmetric("Q", p.Q); err != nil {
		return err
	}
	return Symmetric("R", p.R)
}

// search finds a stabilising solution by the first start that leads to one.
func (d *riccatiData) search(ctx context.Context) (*riccatiState, error) {
	starts := []func(context.Context) ([]float64, error){d.doublingStart, d.hamiltonianStart, d.regularisedStart}
	if d.sampled {
		starts = []func(context.Context) ([]float64, error){d.doublingStart, d.cayleyStart, d.regularisedStart}
	}
	var first error
	for i, start := range starts {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		x, err := start(ctx)
		if err == nil {
			var s *riccatiState
			s, err = d.newton(ctx, x, false)
			if (err == errNotStabilising || err == errNotSettled) && d.n <= doubledOrderLimit {
				s, err = d.newton(ctx, x, true)
			}
			if err == nil {
				s.regularised = i == len(starts)-1
				return s, nil
			}
		}
		if first == nil {
			first = err
		}
		if i == 0 {
			// Before longer ways are tried: is there anything to be found?
			if refusal := d.unstabilizable(); refusal != nil {
				return nil, refusal
			}
		}
	}
	return nil, first
}
