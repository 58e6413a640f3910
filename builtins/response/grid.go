package response

import (
	"math"

	"gainwright/lang/value"
)

// grid is a row-major matrix that may have no rows or columns.
type grid struct {
	r, c int
	v    []float64
}

func newGrid(r, c int) grid { return grid{r, c, make([]float64, r*c)} }

// gridOf copies a real matrix.
func gridOf(m *value.Matrix) grid {
	r, c := m.Dims()
	re, _ := m.Floats()
	return grid{r, c, append([]float64(nil), re...)}
}

func unit(n int) grid {
	g := newGrid(n, n)
	for i := range n {
		g.v[i*n+i] = 1
	}
	return g
}

func (g grid) at(i, j int) float64 { return g.v[i*g.c+j] }

func (g grid) row(i int) []float64 { return g.v[i*g.c : (i+1)*g.c] }

func (g grid) times(h grid) grid {
	out := newGrid(g.r, h.c)
	for i := range g.r {
		for k := range g.c {
			if x := g.at(i, k); x != 0 {
				for j := range h.c {
					out.v[i*h.c+j] += x * h.at(k, j)
				}
			}
		}
	}
	return out
}

func (g grid) plus(h grid) grid {
	out := grid{g.r, g.c, append([]float64(nil), g.v...)}
	for i, x := range h.v {
		out.v[i] += x
	}
	return out
}

func (g grid) scaled(f float64) grid {
	out := newGrid(g.r, g.c)
	for i, x := range g.v {
		out.v[i] = f * x
	}
	return out
}

func (g grid) minus(h grid) grid { return g.plus(h.scaled(-1)) }

func (g grid) isZero() bool {
	for _, x := range g.v {
		if x != 0 {
			return false
		}
	}
	return true
}

// put copies h into g with its first entry at row i, column j.
func (g grid) put(i, j int, h grid) {
	for k := range h.r {
		copy(g.v[(i+k)*g.c+j:], h.row(k))
	}
}

// apply is dst = g·z.
func (g grid) apply(dst, z []float64) {
	for i := range g.r {
		dst[i] = dot(g.row(i), z)
	}
}

// add is dst += g·z.
func (g grid) add(dst, z []float64) {
	for i := range g.r {
		dst[i] += dot(g.row(i), z)
	}
}

func dot(a, b []float64) float64 {
	s := 0.0
	for i, x := range a {
		s += x * b[i]
	}
	return s
}

// inverse solves by elimination with row exchanges; ok is false for a singular matrix.
// It serves the algebraic loops of a few inputs.
func (g grid) inverse() (grid, bool) {
	n := g.r
	a, x := grid{n, n, append([]float64(nil), g.v...)}, unit(n)
	size := largest(g.v)
	for k := range n {
		best := k
		for i := k; i < n; i++ {
			if math.Abs(a.at(i, k)) > math.Abs(a.at(best, k)) {
				best = i
			}
		}
		if math.Abs(a.at(best, k)) <= 1e-14*size {
			return x, false
		}
		for j := range n {
			a.v[k*n+j], a.v[best*n+j] = a.v[best*n+j], a.v[k*n+j]
			x.v[k*n+j], x.v[best*n+j] = x.v[best*n+j], x.v[k*n+j]
		}
		for i := range n {
			if i == k {
				continue
			}
			f := a.at(i, k) / a.at(k, k)
			for j := range n {
				a.v[i*n+j] -= f * a.v[k*n+j]
				x.v[i*n+j] -= f * x.v[k*n+j]
			}
		}
	}
	for i := range n {
		for j := range n {
			x.v[i*n+j] /= a.at(i, i)
		}
	}
	return x, true
}

func largest(v []float64) float64 {
	most := 0.0
	for _, x := range v {
		most = math.Max(most, math.Abs(x))
	}
	return most
}
