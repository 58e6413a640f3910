package numeric

import (
	"context"
	"math"
)

// climb sweeps over the poles until |det X| hardly grows.
func (s *ascent) climb(ctx context.Context) error {
	for sweep := 0; sweep < mostSweeps; sweep++ {
		if err := ctx.Err(); err != nil {
			return err
		}
		gain, at := 0.0, 0
		for p, w := range s.wanted {
			if w.pair() {
				gain += s.improvePair(at, p)
			} else {
				gain += s.improveReal(at, p)
			}
			at += w.count()
		}
		if (sweep%8 == 7 || gain > 3) && !s.invert() {
			return nil
		}
		if gain < smallestGain {
			break
		}
	}
	s.invert()
	return nil
}

// improveReal takes the vector of the space closest to the normal of all other
// columns, which is the row at of the inverse, and returns the growth of log|det X|.
func (s *ascent) improveReal(at, p int) float64 {
	n, q := s.n, s.q
	row := s.inverse[at*n : (at+1)*n]
	coefficients := make([]complex128, q)
	for i, y := range row {
		for j := 0; j < q; j++ {
			coefficients[j] += complex(real(s.spaces[p][i*q+j])*y, 0)
		}
	}
	growth := normalizeComplex(coefficients)
	if growth <= 1 {
		return 0
	}
	s.setVector(at, p, coefficients)
	copy(s.rows[:n], row)
	for i := range row {
		s.rows[i] /= growth
	}
	s.eliminate(at, 1)
	return math.Log(growth)
}

// improvePair maximises the area that the pair's real and imaginary part span
// in the plane perpendicular to all other columns. With q₁, q₂ orthonormal in that
// plane, a = Sᴴq₁ and b = Sᴴq₂, the area of x = S·w is wᴴHw for the Hermitian
// H = (a·bᴴ − b·aᴴ)/2i of rank two, whose eigenvectors lie in the span of a and b.
func (s *ascent) improvePair(at, p int) float64 {
	n, q := s.n, s.q
	first, second, area := planeOf(s.inverse[at*n:(at+1)*n], s.inverse[(at+1)*n:(at+2)*n])
	if second == nil {
		return 0
	}
	a, b := make([]complex128, q), make([]complex128, q)
	for i := 0; i < n; i++ {
		for j := 0; j < q; j++ {
			v := s.spaces[p][i*q+j]
			conj := complex(real(v), -imag(v))
			a[j] += conj * complex(first[i], 0)
			b[j] += conj * complex(second[i], 0)
		}
	}
	coefficients, value := rankTwoMaximizer(a, b)
	// The new columns have area 2·value in the plane, the old ones 1/area.
	growth := 2 * value * area
	if !(growth > 1) {
		return 0
	}
	s.setVector(at, p, coefficients)
	if !s.pairRows(at) {
		return 0
	}
	s.eliminate(at, 2)
	return math.Log(growth)
}

// planeOf gives an orthonormal basis of two rows' span and the area they span.
func planeOf(u, v []float64) (first, second []float64, area float64) {
	first, second = append([]float64(nil), u...), append([]float64(nil), v...)
	length := blocksNorm(first)
	if length == 0 {
		return nil, nil, 0
	}
	for i := range first {
		first[i] /= length
	}
	area = length
	for pass := 0; pass < 2; pass++ {
		sum := 0.0
		for i, x := range first {
			sum += x * second[i]
		}
		for i, x := range first {
			second[i] -= sum * x
		}
	}
	length = blocksNorm(second)
	if length == 0 {
		return nil, nil, 0
	}
	for i := range second {
		second[i] /= length
	}
	return first, second, area * length
}

// rankTwoMaximizer gives the unit w that maximises |wᴴ(a·bᴴ − b·aᴴ)w/2i|, and
// that maximum.
func rankTwoMaximizer(a, b []complex128) (w []complex128, value float64) {
	aa, bb := real(innerProduct(a, a)), real(innerProduct(b, b))
	ab := innerProduct(a, b)
	trace := -imag(ab)
	spread := math.Max(0, aa*bb-real(ab)*real(ab)-imag(ab)*imag(ab))
	root := math.Sqrt(trace*trace + spread)
	lambda := (trace + root) / 2
	if trace < 0 {
		lambda = (trace - root) / 2
	}
	// H·(c₁a + c₂b): two proportional solutions, the larger one is used.
	half := complex(0, -0.5) // 1/2i
	ba := complex(real(ab), -imag(ab))
	c1, c2 := half*complex(bb, 0), complex(lambda, 0)-half*ba
	d1, d2 := -half*ab-complex(lambda, 0), half*complex(aa, 0)
	if absSquare(d1)*aa+absSquare(d2)*bb > absSquare(c1)*aa+absSquare(c2)*bb {
		c1, c2 = d1, d2
	}
	w = make([]complex128, len(a))
	for i := range w {
		w[i] = c1*a[i] + c2*b[i]
	}
	if normalizeComplex(w) == 0 {
		return w, 0
	}
	return w, math.Abs(lambda)
}

func absSquare(x complex128) float64 { return real(x)*real(x) + imag(x)*imag(x) }

// pairRows solves for the two rows of the new inverse: the old ones times the
// inverse of their product with the new columns.
func (s *ascent) pairRows(at int) bool {
	n := s.n
	u, v := s.inverse[at*n:(at+1)*n], s.inverse[(at+1)*n:(at+2)*n]
	var p11, p12, p21, p22 float64
	for i := 0; i < n; i++ {
		x, y := s.x[i*n+at], s.x[i*n+at+1]
		p11, p12, p21, p22 = p11+u[i]*x, p12+u[i]*y, p21+v[i]*x, p22+v[i]*y
	}
	determinant := p11*p22 - p12*p21
	if determinant == 0 {
		return false
	}
	for i := 0; i < n; i++ {
		s.rows[i] = (p22*u[i] - p12*v[i]) / determinant
		s.rows[n+i] = (p11*v[i] - p21*u[i]) / determinant
	}
	return true
}

// eliminate updates the inverse after columns at … at+width−1 of x changed;
// rows holds the new rows. All pivots are at least 1 in size, since the
// determinant grew, so that the update is stable.
func (s *ascent) eliminate(at, width int) {
	n := s.n
	for i := 0; i < n; i++ {
		for part := 0; part < width; part++ {
			s.columns[part*n+i] = s.x[i*n+at+part]
		}
	}
	var factors [2]float64
	for i := 0; i < n; i++ {
		if i >= at && i < at+width {
			continue
		}
		row := s.inverse[i*n : (i+1)*n]
		for part := 0; part < width; part++ {
			sum := 0.0
			column := s.columns[part*n : (part+1)*n]
			for k, v := range row {
				sum += v * column[k]
			}
			factors[part] = sum
		}
		for part := 0; part < width; part++ {
			f := factors[part]
			for k, v := range s.rows[part*n : (part+1)*n] {
				row[k] -= f * v
			}
		}
	}
	for part := 0; part < width; part++ {
		copy(s.inverse[(at+part)*n:(at+part+1)*n], s.rows[part*n:(part+1)*n])
	}
}
