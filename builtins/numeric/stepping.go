package numeric

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Propagator moves states of z' = M·z exactly in time: by products with e^(M·h·2ᵏ), made
// when they are first needed, and for what is left by a Taylor series whose terms fall
// below rounding. Inputs that are polynomials in t are states of M too (a chain of
// integrators), so steps, ramps and lines between samples need nothing else.
//
// One propagator serves one goroutine at a time. Step and Advance allocate nothing once
// the exponentials they need are there.
type Propagator struct {
	size      int
	generator []float64 // M, row-major
	matrix    *mat.Dense
	period    float64
	norm      float64
	ladder    map[int][]float64
	digits    float64
	spare     []float64
	terms     []float64
}

// the rungs reach from the period up and down by so many doublings
const farthestRung = 1000

// seriesReach is ‖M‖·t below which seriesTerms terms leave less than 2⁻⁶⁰ of ‖z‖:
// (2⁻⁵)¹⁰/10! < 2⁻⁷¹.
const (
	seriesReach = 1.0 / 32
	seriesTerms = 9
)

// NewPropagator prepares steps of z' = M·z (M n×n) of the given period in s, which must be
// positive. It errs where M is not square or not finite, and where e^(M·period) overflows.
func NewPropagator(m *mat.Dense, period float64) (*Propagator, error) {
	if err := squareAndFinite("M", m); err != nil {
		return nil, err
	}
	if !(period > 0) || math.IsInf(period, 0) {
		return nil, fmt.Errorf("the step is %g s; it must be positive and finite", period)
	}
	n, _ := sizeOf(m)
	p := &Propagator{size: n, period: period, ladder: map[int][]float64{}, digits: mostDigits,
		spare: make([]float64, n), terms: make([]float64, n), generator: packed(m), matrix: m}
	for i := range n {
		sum := 0.0
		for _, x := range p.generator[i*n : (i+1)*n] {
			sum += math.Abs(x)
		}
		p.norm = math.Max(p.norm, sum)
	}
	_, err := p.rung(0)
	return p, err
}

// Size is the number of states.
func (p *Propagator) Size() int { return p.size }

// Period is the step of level 0 in s.
func (p *Propagator) Period() float64 { return p.period }

// Digits estimates how many digits of the least certain exponential in use hold,
// relative to its largest entry.
func (p *Propagator) Digits() float64 { return p.digits }

// rung gives e^(M·period·2^level).
func (p *Propagator) rung(level int) ([]float64, error) {
	if e, ok := p.ladder[level]; ok {
		return e, nil
	}
	if level > farthestRung || level < -farthestRung {
		return nil, errors.New("the time lies too far from the step")
	}
	if p.size == 0 {
		return nil, nil
	}
	var scaled mat.Dense
	scaled.Scale(math.Ldexp(p.period, level), p.matrix)
	e, certificate, err := Exponential(&scaled)
	if err != nil {
		return nil, err
	}
	p.digits = math.Min(p.digits, certificate.Digits)
	p.ladder[level] = packed(e)
	return p.ladder[level], nil
}

// Step sets dst to z moved on by period·2^level. dst and z are different slices of Size entries.
func (p *Propagator) Step(level int, dst, z []float64) error {
	e, err := p.rung(level)
	if err != nil {
		return err
	}
	product(dst, e, z)
	return nil
}

// product is dst = E·z for a row-major E with len(z) columns.
func product(dst, e, z []float64) {
	n := len(z)
	for i := range dst {
		row := e[i*n : i*n+n]
		s := 0.0
		for j, x := range z {
			s += row[j] * x
		}
		dst[i] = s
	}
}

// Walk steps count times by period·2^level from z, which it moves, and calls visit before
// every step and after the last with the number of the step. z holds the last state then.
func (p *Propagator) Walk(level, count int, z []float64, visit func(k int, z []float64)) error {
	e, err := p.rung(level)
	if err != nil {
		return err
	}
	a, b := z, p.spare
	for k := range count {
		visit(k, a)
		product(b, e, a)
		a, b = b, a
	}
	visit(count, a)
	if count%2 == 1 {
		copy(z, a)
	}
	return nil
}

// Advance moves z on by any time t ≥ 0, in place.
func (p *Propagator) Advance(z []float64, t float64) error {
	if !(t >= 0) || math.IsInf(t, 0) {
		return fmt.Errorf("a state cannot be moved by %g s", t)
	}
	for t > 0 && p.norm*t > seriesReach {
		level := int(math.Floor(math.Log2(t / p.period)))
		for math.Ldexp(p.period, level) > t {
			level--
		}
		if err := p.Step(level, p.spare, z); err != nil {
			return err
		}
		copy(z, p.spare)
		t -= math.Ldexp(p.period, level)
	}
	if t > 0 {
		p.series(z, t)
	}
	return nil
}

// series moves z by a short time: z + t·M·z + t²/2·M²·z + …
func (p *Propagator) series(z []float64, t float64) {
	copy(p.terms, z)
	for k := 1; k <= seriesTerms; k++ {
		product(p.spare, p.generator, p.terms)
		factor := t / float64(k)
		for i := range z {
			p.terms[i] = p.spare[i] * factor
			z[i] += p.terms[i]
		}
	}
}

// Rates sets dst to M·z.
func (p *Propagator) Rates(dst, z []float64) { product(dst, p.generator, z) }

// Spare is room for one state that Step and Rates leave alone and Advance and Walk use.
func (p *Propagator) Spare() []float64 { return p.spare }
