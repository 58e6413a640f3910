package numeric

import (
	"errors"
	"fmt"
	"math"
)

// Integrator solves z' = f(t, z) by the pair of orders 5 and 4 of J. R. Dormand and
// P. J. Prince (J. Comput. Appl. Math. 6, 1980) with the fourth-order continuous
// extension of Hairer, Nørsett & Wanner (Solving Ordinary Differential Equations I, 2nd
// edition 1993, section II.6). The error of a step is kept below Relative·|z| + Absolute,
// entry by entry in the root mean square.
//
// Nothing is allocated per step. One integrator serves one goroutine at a time.
type Integrator struct {
	Relative float64
	Absolute []float64 // one for each entry
	MaxSteps int       // accepted and rejected ones together

	rates   func(t float64, z, out []float64)
	size    int
	time    float64
	z, next []float64
	trial   []float64
	k       [7][]float64
	step    float64 // proposed
	fresh   bool    // k[0] has to be computed
	last    float64 // the error of the step before, for the step control
	steps   int
	segment Segment
}

// Segment is one step with what is needed to evaluate it anywhere inside.
type Segment struct {
	Start, Span float64
	rest        []float64 // five coefficients for each entry, coefficient after coefficient
}

// ErrStiff is returned when the steps become too many or too short: the equations hold
// motions so fast that an explicit method cannot follow them for so long.
var ErrStiff = errors.New("the equations need too many steps: they hold motions far faster than the time asked for")

// NewIntegrator prepares the integration of size equations; rates fills out with f(t, z).
func NewIntegrator(size int, rates func(t float64, z, out []float64)) *Integrator {
	g := &Integrator{Relative: 1e-10, MaxSteps: 1_000_000, rates: rates, size: size,
		z: make([]float64, size), next: make([]float64, size), trial: make([]float64, size), Absolute: make([]float64, size)}
	for i := range g.k {
		g.k[i] = make([]float64, size)
	}
	g.segment.rest = make([]float64, 5*size)
	for i := range g.Absolute {
		g.Absolute[i] = 1e-10
	}
	return g
}

// Start sets the state; the length of the next step is kept from before when there was one.
func (g *Integrator) Start(t float64, z []float64) {
	g.time, g.fresh, g.last = t, true, 1e-4
	copy(g.z, z)
}

// Time is where the integration stands.
func (g *Integrator) Time() float64 { return g.time }

// State is the state there; it must not be changed.
func (g *Integrator) State() []float64 { return g.z }

// Steps counts the steps tried so far.
func (g *Integrator) Steps() int { return g.steps }

// Segment gives the last accepted step; it changes with the next one.
func (g *Integrator) Segment() *Segment { return &g.segment }

// Clone copies a segment so that it can be kept.
func (s *Segment) Clone() *Segment {
	return &Segment{Start: s.Start, Span: s.Span, rest: append([]float64(nil), s.rest...)}
}

// At evaluates the step at a time inside it.
func (s *Segment) At(t float64, out []float64) {
	n := len(s.rest) / 5
	a := (t - s.Start) / s.Span
	b := 1 - a
	c := s.rest
	for i := range out {
		out[i] = c[i] + a*(c[n+i]+b*(c[2*n+i]+a*(c[3*n+i]+b*c[4*n+i])))
	}
}

// Step takes one step that does not pass the time limit. It errs with ErrStiff, or where
// the rates are not finite.
func (g *Integrator) Step(limit float64) error {
	if g.fresh {
		g.rates(g.time, g.z, g.k[0])
		g.fresh = false
		if !allFinite(g.k[0]) {
			return fmt.Errorf("the equations have no finite value at t = %.6g s", g.time)
		}
	}
	if g.step <= 0 {
		g.step = g.firstStep(limit - g.time)
	}
	for {
		g.steps++
		if g.steps > g.MaxSteps {
			return ErrStiff
		}
		h := g.step
		left := limit - g.time
		reaches := h >= left*(1-1e-12)
		if reaches {
			h = left
		} else if h > left/2 {
			h = left / 2 // two equal steps rather than a long one and a sliver
		}
		if h <= 0 || g.time+h == g.time && !reaches {
			return ErrStiff
		}
		wrong := g.try(h)
		if wrong <= 1 {
			g.accept(h, reaches, limit)
			factor := 0.9 * math.Pow(math.Max(wrong, 1e-10), -0.7/5) * math.Pow(g.last, 0.4/5)
			g.last = math.Max(wrong, 1e-4)
			next := h * math.Min(10, math.Max(0.2, factor))
			if !reaches || next < g.step {
				g.step = next
			}
			return nil
		}
		if math.IsNaN(wrong) || math.IsInf(wrong, 0) {
			if h < 1e-13*math.Max(math.Abs(g.time), 1e-300) || h < 1e-290 {
				return fmt.Errorf("the equations have no finite value near t = %.6g s", g.time)
			}
			g.step = h / 10
			continue
		}
		g.step = h * math.Max(0.1, 0.9*math.Pow(wrong, -0.2))
		if g.step < 1e-15*math.Max(math.Abs(g.time), limit-g.time) {
			return ErrStiff
		}
	}
}

// firstStep guesses a step from the size of the state and of its rates.
func (g *Integrator) firstStep(span float64) float64 {
	size, rate := 0.0, 0.0
	for i, x := range g.z {
		w := g.Absolute[i] + g.Relative*math.Abs(x)
		size += (x / w) * (x / w)
		rate += (g.k[0][i] / w) * (g.k[0][i] / w)
	}
	h := 1e-6 * span
	if size > 1e-10 && rate > 1e-10 {
		h = 0.01 * math.Sqrt(size/rate)
	}
	return math.Min(h, span)
}

// The coefficients of the pair and of its continuous extension.
var (
	pairNodes = [7]float64{0, 1.0 / 5, 3.0 / 10, 4.0 / 5, 8.0 / 9, 1, 1}
	pairRows  = [7][6]float64{
		{},
		{1.0 / 5},
		{3.0 / 40, 9.0 / 40},
		{44.0 / 45, -56.0 / 15, 32.0 / 9},
		{19372.0 / 6561, -25360.0 / 2187, 64448.0 / 6561, -212.0 / 729},
		{9017.0 / 3168, -355.0 / 33, 46732.0 / 5247, 49.0 / 176, -5103.0 / 18656},
		{35.0 / 384, 0, 500.0 / 1113, 125.0 / 192, -2187.0 / 6784, 11.0 / 84},
	}
	pairError = [7]float64{71.0 / 57600, 0, -71.0 / 16695, 71.0 / 1920, -17253.0 / 339200, 22.0 / 525, -1.0 / 40}
	pairDense = [7]float64{-12715105075.0 / 11282082432, 0, 87487479700.0 / 32700410799, -10690763975.0 / 1880347072,
		701980252875.0 / 199316789632, -1453857185.0 / 822651844, 69997945.0 / 29380423}
)

// try computes the step into next and gives its error in units of what is allowed.
func (g *Integrator) try(h float64) float64 {
	for stage := 1; stage < 7; stage++ {
		target := g.trial
		if stage == 6 {
			target = g.next
		}
		for i, x := range g.z {
			s := 0.0
			for j := range stage {
				if w := pairRows[stage][j]; w != 0 {
					s += w * g.k[j][i]
				}
			}
			target[i] = x + h*s
		}
		g.rates(g.time+pairNodes[stage]*h, target, g.k[stage])
	}
	sum := 0.0
	for i, x := range g.z {
		e := 0.0
		for j, w := range pairError {
			e += w * g.k[j][i]
		}
		allowed := g.Absolute[i] + g.Relative*math.Max(math.Abs(x), math.Abs(g.next[i]))
		sum += (h * e / allowed) * (h * e / allowed)
	}
	if g.size == 0 {
		return 0
	}
	return math.Sqrt(sum / float64(g.size))
}

// accept takes the step over and prepares its continuous extension.
func (g *Integrator) accept(h float64, reaches bool, limit float64) {
	n := g.size
	c := g.segment.rest
	for i, x := range g.z {
		d := g.next[i] - x
		b := h*g.k[0][i] - d
		e := 0.0
		for j, w := range pairDense {
			e += w * g.k[j][i]
		}
		c[i], c[n+i], c[2*n+i], c[3*n+i], c[4*n+i] = x, d, b, d-h*g.k[6][i]-b, h*e
	}
	g.segment.Start, g.segment.Span = g.time, h
	g.time += h
	if reaches {
		g.time = limit
	}
	g.z, g.next = g.next, g.z
	g.k[0], g.k[6] = g.k[6], g.k[0]
}
