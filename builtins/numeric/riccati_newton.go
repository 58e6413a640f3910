package numeric

import (
	"context"
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"
)

// riccatiState is an iterate with what belongs to it.
type riccatiState struct {
	x, k, ac    []float64
	poles       []complex128
	definite    bool
	step        float64
	since       float64 // the step after the Schur form whose poles are kept
	steps       int
	doubled     bool
	regularised bool
	residual    []float64
	estimate    float64
	size        float64
	solver      *lyapunovSolver // with Acᵀ for coefficient
	envelope    []float64       // ±P encloses the error of X
	// gainEstimate is what the error of X is estimated to pass on to K; NaN to take the envelope's.
	gainEstimate float64
	method       string
}

var (
	errNotStabilising = errors.New("no stabilising solution of the Riccati equation was found: the closed loop of the candidate is not stable, or the problem is too ill-conditioned for binary64")
	errNotSettled     = errors.New("the Newton steps for the Riccati equation did not settle")
	errNoStart        = errors.New("no stabilising solution of the Riccati equation was found")
)

// mostNewtonSteps allows for the halving of the error far from the solution:
// from a regularised start a pole at 1e-10 needs some thirty.
const mostNewtonSteps = 60

// newton improves x. Each step solves a Lyapunov (Stein) equation with the
// closed loop; a second step after a small first one keeps its Schur form.
//
// doubly takes the residuals in doubled precision from the start.
func (d *riccatiData) newton(ctx context.Context, x []float64, doubly bool) (*riccatiState, error) {
	s := &riccatiState{x: append([]float64(nil), x...), method: d.method, doubled: doubly, gainEstimate: math.NaN()}
	n := d.n
	dx := make([]float64, n*n)
	previous := math.Inf(1)
	s.since = previous
	for s.steps = 0; s.steps < mostNewtonSteps; s.steps++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if err := d.evaluate(s); err != nil {
			return nil, err
		}
		if s.solver == nil || previous > 1e-7 {
			if err := d.factor(s); err != nil {
				return nil, err
			}
		}
		if s.doubled {
			s.residual = d.doubledResidual(s.x, s.k)
		} else {
			s.residual = d.residual(s.x, s.k, s.ac)
		}
		s.solver.solve(dx, s.residual)
		if s.solver.singular {
			return nil, errNotStabilising
		}
		s.step = addStep(s.x, dx)
		if !(s.step < 1e6) {
			return nil, errNotSettled
		}
		if s.steps >= 1 && (s.step < 1e-9 || s.step < 1e-5 && s.step > 0.4*previous) {
			s.steps++
			return s, d.settle(s)
		}
		// Steps that stall are rounding of the residual.
		s.doubled = s.doubled || s.steps >= 3 && s.step > 0.3*previous && d.n <= doubledOrderLimit
		previous = s.step
		s.since = previous
	}
	return nil, errNotSettled
}

// addStep adds dx to x and gives the largest change relative to the largest
// entry.
func addStep(x, dx []float64) float64 {
	change := largestOf(dx)
	for i, v := range dx {
		x[i] += v
	}
	return ratio(change, largestOf(x))
}

// evaluate computes gain and closed loop of the present iterate.
func (d *riccatiData) evaluate(s *riccatiState) error {
	var ok bool
	if s.k, s.definite, ok = d.gain(s.x); !ok {
		if d.sampled {
			return &Refusal{Reason: "the gain is not determined: R + BᵀXB is singular, to rounding (dependent inputs without weight)"}
		}
		return errNoStart
	}
	s.ac = d.closed(s.k)
	return nil
}

// factor computes the Schur form of the closed loop and checks its stability.
func (d *riccatiData) factor(s *riccatiState) error {
	n := d.n
	at := make([]float64, n*n)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			at[j*n+i] = s.ac[i*n+j]
		}
	}
	t, z, w, err := Schur(mat.NewDense(n, n, at))
	if err != nil {
		return err
	}
	s.poles = w
	if !d.allStable(w) {
		return errNotStabilising
	}
	s.solver = newLyapunovSolver(n, d.sampled, t.RawMatrix().Data, z.RawMatrix().Data)
	return nil
}

// allStable tells whether every pole lies in the open stability region.
func (d *riccatiData) allStable(w []complex128) bool {
	for _, pole := range w {
		if d.margin(pole) <= 0 {
			return false
		}
	}
	return true
}

// margin is the distance of a pole from the stability boundary, positive inside.
func (d *riccatiData) margin(pole complex128) float64 {
	if d.sampled {
		return 1 - math.Hypot(real(pole), imag(pole))
	}
	return -real(pole)
}

// doubledOrderLimit is the order up to which residuals in doubled precision are
// affordable (a fraction of a second).
const doubledOrderLimit = 120

// settle estimates the error and, where it is large, takes up to four more steps
// on residuals in doubled precision.
func (d *riccatiData) settle(s *riccatiState) error {
	if err := d.assess(s, false); err != nil {
		return err
	}
	if s.estimate < 1e-10*s.size || d.n > doubledOrderLimit {
		return nil
	}
	if err := d.factor(s); err != nil {
		return err
	}
	s.since = 1
	dx := make([]float64, len(s.x))
	kept := append([]float64(nil), s.x...)
	before := math.Inf(1)
	for i := 0; i < 6; i++ {
		s.residual = d.doubledResidual(s.x, s.k)
		s.solver.solve(dx, s.residual)
		if change := ratio(largestOf(dx), largestOf(s.x)); change > before/2 || !(change < 1) {
			// No longer contracting: the step before was the last good one.
			copy(s.x, kept)
			break
		} else {
			before = change
		}
		copy(kept, s.x)
		s.step = addStep(s.x, dx)
		s.steps++
		if err := d.evaluate(s); err != nil {
			return err
		}
		if s.step > 1e-9 {
			if err := d.factor(s); err != nil {
				return err
			}
		}
		if s.step < 2*unitRoundoff {
			break
		}
	}
	s.doubled = true
	if err := d.assess(s, true); err != nil {
		return err
	}
	d.sharpen(s, dx)
	return nil
}

// assess computes gain, closed loop, residual and the error estimate of x.
func (d *riccatiData) assess(s *riccatiState, doubly bool) error {
	if err := d.evaluate(s); err != nil {
		return err
	}
	if doubly {
		s.residual = d.doubledResidual(s.x, s.k)
	} else {
		s.residual = d.residual(s.x, s.k, s.ac)
	}
	s.envelope = errorEnvelope(s.solver, d.perturbation(s))
	s.estimate, s.size = 0, 0
	n := d.n
	for i := 0; i < n; i++ {
		s.estimate = math.Max(s.estimate, s.envelope[i*n+i]/(d.scale[i]*d.scale[i]))
		for j := 0; j < n; j++ {
			s.size = math.Max(s.size, math.Abs(s.x[i*n+j])/(d.scale[i]*d.scale[j]))
		}
	}
	return nil
}

// perturbation is the residual left plus what rounding of the data may do to it.
func (d *riccatiData) perturbation(s *riccatiState) []float64 {
	w := d.weight(s.x, s.k, s.ac)
	for i, v := range s.residual {
		w[i] = math.Abs(v) + 2*unitRoundoff*w[i]
	}
	return w
}
