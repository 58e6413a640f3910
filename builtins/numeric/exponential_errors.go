package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// errorMargin is what measured differences of two computations are multiplied
// by: errors that both share, and luck.
const errorMargin = 2

// halfStepErrors repeats the computation from half the step with one squaring
// more and measures the difference in each column group.
func (s *squaring) halfStepErrors(degree int, value []float64, groups []columnGroup, rows int) []float64 {
	n := s.n
	s.halve(1)
	s.approximant(degree)
	s.squareUp(s.step+1, false)
	other := s.u
	s.blocks.from(n, other, s.x)
	measured := make([]float64, len(groups))
	for g, group := range groups {
		largest, difference := 0.0, 0.0
		for i := range rows {
			for j := group.from; j < group.to; j++ {
				largest = math.Max(largest, math.Abs(value[i*n+j]))
				difference = math.Max(difference, math.Abs(value[i*n+j]-other[i*n+j]))
			}
		}
		measured[g] = relativeError(errorMargin*difference, largest, group)
	}
	return measured
}

// relativeError is difference/largest, at least one rounding, gradual underflow
// included. A result that is all zero holds no digits, except where zero stands
// for the coupling of an input that moves nothing.
func relativeError(difference, largest float64, group columnGroup) float64 {
	switch {
	case math.IsNaN(difference):
		return math.Inf(1)
	case largest == 0 && difference == 0 && group.from > 0:
		return unitRoundoff
	case largest == 0:
		return math.Inf(1)
	}
	return math.Max((difference+math.SmallestNonzeroFloat64)/largest, unitRoundoff)
}

// probeErrors compares the result, applied to one vector a group, with the
// Taylor series of the exponential applied to it in steps over which powers grow
// by at most 2 each. It costs n² a term, far less than a product, and shares
// nothing with the result but the working matrix.
func (s *squaring) probeErrors(value []float64, groups []columnGroup, rows int) []float64 {
	n := s.n
	measured := make([]float64, len(groups))
	term, sum, next := s.u[:n], s.u[n:2*n], s.v[:n]
	order := s.blocks.order
	for g, group := range groups {
		direct, x := make([]float64, n), make([]float64, n)
		largest := 0.0
		for j := group.from; j < group.to; j++ {
			x[j] = signOf(j)
		}
		blas64.Implementation().Dgemv(blas.NoTrans, rows, n, 1, value, n, x, 1, 0, direct, 1)
		for i := range rows {
			for _, v := range value[i*n+group.from : i*n+group.to] {
				if v = math.Abs(v); v > largest {
					largest = v
				}
			}
		}
		for k := range n {
			sum[k] = math.Ldexp(x[order[k]], -s.blocks.exponent[k])
		}
		s.taylorAction(sum, term, next)
		difference := 0.0
		for k := range n {
			if order[k] < rows {
				difference = math.Max(difference, math.Abs(math.Ldexp(sum[k], s.blocks.exponent[k])-direct[order[k]]))
			}
		}
		measured[g] = relativeError(errorMargin*difference, largest, group)
	}
	return measured
}

// taylorAction overwrites y with e^W·y.
func (s *squaring) taylorAction(y, term, next []float64) {
	n := s.n
	steps := max(int(math.Ceil(s.spread/2)), 1)
	// s.a holds the shifted working matrix divided by 2^step.
	factor := math.Ldexp(1, s.step) / float64(steps)
	growth := math.Exp(s.shift / float64(steps))
	const mostTerms = 100
	for range steps {
		copy(term, y)
		for k := 1; k <= mostTerms; k++ {
			blas64.Implementation().Dgemv(blas.NoTrans, n, n, factor/float64(k), s.a, n, term, 1, 0, next, 1)
			term, next = next, term
			size, whole := 0.0, 0.0
			for i, v := range term {
				y[i] += v
				if v = math.Abs(v); v > size {
					size = v
				}
				if v = math.Abs(y[i]); v > whole {
					whole = v
				}
			}
			if size <= whole*unitRoundoff/8 {
				break
			}
		}
		scaleSlice(y, growth)
	}
}
