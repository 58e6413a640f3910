package numeric

import (
	"math"

	"gonum.org/v1/gonum/blas"
)

// leafOrder is the size below which the recursion ends and plain substitution
// begins; between 16 and 48 the time hardly depends on it.
const leafOrder = 24

// triangularEquation holds one of two equations with upper quasi-triangular
// coefficients T (m×m) and R (n×n), row-major, and solves them recursively:
//
//	T·Y + Y·Rᵀ = F        (Sylvester)
//	T·Y·Rᵀ − Y = F        (Stein, when sampled)
//
// I. Jonsson, B. Kågström, Recursive blocked algorithms for solving triangular
// systems, ACM Trans. Math. Softw. 28, 2002. A pivot that vanishes to rounding
// is replaced by the rounding, and singular is set.
type triangularEquation struct {
	sampled  bool
	floor    float64
	singular bool
	scratch  []float64
}

// newTriangularEquation takes the sizes of T and R for the pivot floor.
func newTriangularEquation(sampled bool, normT, normR float64) *triangularEquation {
	e := &triangularEquation{sampled: sampled}
	if sampled {
		e.floor = unitRoundoff * math.Max(1, normT*normR)
	} else {
		e.floor = math.Max(unitRoundoff*(normT+normR), 0x1p-1000)
	}
	return e
}

// splitAt gives the row near the middle of an n×n quasi-triangular matrix where
// no 2×2 block is cut.
func splitAt(n int, t []float64, ldt int) int {
	half := n / 2
	if t[half*ldt+half-1] != 0 {
		half++
	}
	return half
}

// solve overwrites F (m×n, leading dimension ldf) with Y.
func (e *triangularEquation) solve(m, n int, t []float64, ldt int, r []float64, ldr int, f []float64, ldf int) {
	if m == 0 || n == 0 {
		return
	}
	if m <= leafOrder && n <= leafOrder {
		e.leaf(m, n, t, ldt, r, ldr, f, ldf)
		return
	}
	if m >= n {
		k := splitAt(m, t, ldt)
		low := f[k*ldf:]
		e.solve(m-k, n, t[k*ldt+k:], ldt, r, ldr, low, ldf)
		source, lds := low, ldf
		if e.sampled {
			source, lds = e.borrow((m-k)*n), n
			multiply(blas.NoTrans, blas.Trans, m-k, n, n, 1, low, ldf, r, ldr, 0, source, n)
		}
		multiply(blas.NoTrans, blas.NoTrans, k, n, m-k, -1, t[k:], ldt, source, lds, 1, f, ldf)
		e.solve(k, n, t, ldt, r, ldr, f, ldf)
		return
	}
	k := splitAt(n, r, ldr)
	right := f[k:]
	e.solve(m, n-k, t, ldt, r[k*ldr+k:], ldr, right, ldf)
	if e.sampled {
		moved := e.borrow(m * k)
		multiply(blas.NoTrans, blas.Trans, m, k, n-k, 1, right, ldf, r[k:], ldr, 0, moved, k)
		multiply(blas.NoTrans, blas.NoTrans, m, k, m, -1, t, ldt, moved, k, 1, f, ldf)
	} else {
		multiply(blas.NoTrans, blas.Trans, m, k, n-k, -1, right, ldf, r[k:], ldr, 1, f, ldf)
	}
	e.solve(m, k, t, ldt, r, ldr, f, ldf)
}

// borrow gives scratch space that is free again before the next borrowing.
func (e *triangularEquation) borrow(size int) []float64 {
	if len(e.scratch) < size {
		e.scratch = make([]float64, size)
	}
	return e.scratch[:size]
}

// solveSymmetric overwrites the symmetric F (n×n) with the symmetric Y for
// R = T, at about half the work.
func (e *triangularEquation) solveSymmetric(n int, t []float64, ldt int, f []float64, ldf int) {
	if n <= leafOrder {
		e.leaf(n, n, t, ldt, t, ldt, f, ldf)
		for i := 0; i < n; i++ {
			for j := 0; j < i; j++ {
				v := (f[i*ldf+j] + f[j*ldf+i]) / 2
				f[i*ldf+j], f[j*ldf+i] = v, v
			}
		}
		return
	}
	k := splitAt(n, t, ldt)
	q := n - k
	t12, t22 := t[k:], t[k*ldt+k:]
	f12, f22 := f[k:], f[k*ldf+k:]
	e.solveSymmetric(q, t22, ldt, f22, ldf)
	// moved is T12·Y22, or T12·Y22·T22ᵀ when sampled.
	moved := make([]float64, k*q)
	multiply(blas.NoTrans, blas.NoTrans, k, q, q, 1, t12, ldt, f22, ldf, 0, moved, q)
	corner := moved
	if e.sampled {
		corner = append([]float64(nil), moved...)
		multiply(blas.NoTrans, blas.Trans, k, q, q, 1, corner, q, t22, ldt, 0, moved, q)
	}
	for i := 0; i < k; i++ {
		row := f12[i*ldf : i*ldf+q]
		for j := range row {
			row[j] -= moved[i*q+j]
		}
	}
	e.solve(k, q, t, ldt, t22, ldt, f12, ldf)
	update := make([]float64, k*k)
	if e.sampled {
		// T11·Y12·T12ᵀ, its transpose, and T12·Y22·T12ᵀ.
		multiply(blas.NoTrans, blas.NoTrans, k, q, k, 1, t, ldt, f12, ldf, 0, moved, q)
		multiply(blas.NoTrans, blas.Trans, k, k, q, 0.5, corner, q, t12, ldt, 0, update, k)
		multiply(blas.NoTrans, blas.Trans, k, k, q, 1, moved, q, t12, ldt, 1, update, k)
	} else {
		multiply(blas.NoTrans, blas.Trans, k, k, q, 1, f12, ldf, t12, ldt, 0, update, k)
	}
	for i := 0; i < k; i++ {
		for j := 0; j < k; j++ {
			f[i*ldf+j] -= update[i*k+j] + update[j*k+i]
		}
	}
	e.solveSymmetric(k, t, ldt, f, ldf)
	for i := k; i < n; i++ {
		for j := 0; j < k; j++ {
			f[i*ldf+j] = f[j*ldf+i]
		}
	}
}

// leaf solves by substitution, block row by block row from the bottom.
func (e *triangularEquation) leaf(m, n int, t []float64, ldt int, r []float64, ldr int, f []float64, ldf int) {
	var image [2][leafOrder + 2]float64
	for i := m - 1; i >= 0; i-- {
		p := 1
		if i > 0 && t[i*ldt+i-1] != 0 {
			p = 2
			i--
		}
		e.leafRows(i, p, n, t, ldt, r, ldr, f, ldf, &image)
		for a := 0; a < p; a++ {
			source := f[(i+a)*ldf : (i+a)*ldf+n]
			if e.sampled {
				source = image[a][:n]
			}
			for above := 0; above < i; above++ {
				factor := t[above*ldt+i+a]
				if factor == 0 {
					continue
				}
				row := f[above*ldf : above*ldf+n]
				for j, v := range source {
					row[j] -= factor * v
				}
			}
		}
	}
}

// leafRows solves for the p rows that start at row i; image receives Y·Rᵀ of
// these rows, which the sampled equation needs further up.
func (e *triangularEquation) leafRows(i, p, n int, t []float64, ldt int, r []float64, ldr int, f []float64, ldf int, image *[2][leafOrder + 2]float64) {
	var tb, rb, rhs, sums [4]float64
	for a := 0; a < p; a++ {
		for b := 0; b < p; b++ {
			tb[2*a+b] = t[(i+a)*ldt+i+b]
		}
	}
	for j := n - 1; j >= 0; j-- {
		q := 1
		if j > 0 && r[j*ldr+j-1] != 0 {
			q = 2
			j--
		}
		for a := 0; a < p; a++ {
			y := f[(i+a)*ldf : (i+a)*ldf+n]
			for c := 0; c < q; c++ {
				row := r[(j+c)*ldr : (j+c)*ldr+n]
				sum := 0.0
				for k := j + q; k < n; k++ {
					sum += row[k] * y[k]
				}
				sums[2*a+c] = sum
				rhs[2*a+c] = y[j+c]
			}
		}
		for a := 0; a < q; a++ {
			for b := 0; b < q; b++ {
				rb[2*a+b] = r[(j+a)*ldr+j+b]
			}
		}
		e.prepare(p, q, &tb, &sums, &rhs)
		e.smallBlock(p, q, &tb, &rb, &rhs)
		for a := 0; a < p; a++ {
			for c := 0; c < q; c++ {
				f[(i+a)*ldf+j+c] = rhs[2*a+c]
			}
			if e.sampled {
				for c := 0; c < q; c++ {
					v := sums[2*a+c]
					for d := 0; d < q; d++ {
						v += rb[2*c+d] * rhs[2*a+d]
					}
					image[a][j+c] = v
				}
			}
		}
	}
}

// prepare subtracts what the columns already solved contribute to the right
// side of a small block.
func (e *triangularEquation) prepare(p, q int, tb, sums, rhs *[4]float64) {
	for a := 0; a < p; a++ {
		for c := 0; c < q; c++ {
			if !e.sampled {
				rhs[2*a+c] -= sums[2*a+c]
				continue
			}
			for b := 0; b < p; b++ {
				rhs[2*a+c] -= tb[2*a+b] * sums[2*b+c]
			}
		}
	}
}

// smallBlock solves for one p×q block, p, q ≤ 2, by elimination with complete
// pivoting on its Kronecker form.
func (e *triangularEquation) smallBlock(p, q int, tb, rb, rhs *[4]float64) {
	if p == 1 && q == 1 {
		pivot := tb[0] + rb[0]
		if e.sampled {
			pivot = tb[0]*rb[0] - 1
		}
		rhs[0] /= e.guard(pivot)
		return
	}
	if p*q == 2 {
		e.pairBlock(p, tb, rb, rhs)
		return
	}
	var k [4][5]float64
	size := p * q
	for a := 0; a < p; a++ {
		for c := 0; c < q; c++ {
			row := &k[a*q+c]
			for b := 0; b < p; b++ {
				for d := 0; d < q; d++ {
					switch {
					case e.sampled:
						row[b*q+d] = tb[2*a+b] * rb[2*c+d]
						if a == b && c == d {
							row[b*q+d]--
						}
					case a == b && c == d:
						row[b*q+d] = tb[2*a+b] + rb[2*c+d]
					case c == d:
						row[b*q+d] = tb[2*a+b]
					case a == b:
						row[b*q+d] = rb[2*c+d]
					}
				}
			}
			row[4] = rhs[2*a+c]
		}
	}
	x := e.eliminate(size, &k)
	for a := 0; a < p; a++ {
		for c := 0; c < q; c++ {
			rhs[2*a+c] = x[a*q+c]
		}
	}
}

// pairBlock solves for a 1×2 or 2×1 block: two equations, partial pivoting.
func (e *triangularEquation) pairBlock(p int, tb, rb, rhs *[4]float64) {
	block, scalar, second := rb, tb[0], 1
	if p == 2 {
		block, scalar, second = tb, rb[0], 2
	}
	a, b, c, d := block[0], block[1], block[2], block[3]
	if e.sampled {
		a, b, c, d = a*scalar-1, b*scalar, c*scalar, d*scalar-1
	} else {
		a, d = a+scalar, d+scalar
	}
	x, y := rhs[0], rhs[second]
	if math.Abs(c) > math.Abs(a) {
		a, b, c, d = c, d, a, b
		x, y = y, x
	}
	a = e.guard(a)
	factor := c / a
	y = (y - factor*x) / e.guard(d-factor*b)
	rhs[0], rhs[second] = (x-b*y)/a, y
}

// guard keeps a pivot away from zero.
func (e *triangularEquation) guard(pivot float64) float64 {
	if math.Abs(pivot) < e.floor {
		e.singular = true
		return math.Copysign(e.floor, pivot)
	}
	return pivot
}

// eliminate solves a system of at most four equations; column 4 of k is the
// right side.
func (e *triangularEquation) eliminate(size int, k *[4][5]float64) (x [4]float64) {
	order := [4]int{0, 1, 2, 3}
	for s := 0; s < size; s++ {
		pi, pj := s, s
		for i := s; i < size; i++ {
			for j := s; j < size; j++ {
				if math.Abs(k[i][j]) > math.Abs(k[pi][pj]) {
					pi, pj = i, j
				}
			}
		}
		k[s], k[pi] = k[pi], k[s]
		if pj != s {
			for i := 0; i < size; i++ {
				k[i][s], k[i][pj] = k[i][pj], k[i][s]
			}
			order[s], order[pj] = order[pj], order[s]
		}
		k[s][s] = e.guard(k[s][s])
		for i := s + 1; i < size; i++ {
			factor := k[i][s] / k[s][s]
			if factor == 0 {
				continue
			}
			for j := s + 1; j < size; j++ {
				k[i][j] -= factor * k[s][j]
			}
			k[i][4] -= factor * k[s][4]
		}
	}
	for s := size - 1; s >= 0; s-- {
		v := k[s][4]
		for j := s + 1; j < size; j++ {
			v -= k[s][j] * x[order[j]]
		}
		x[order[s]] = v / k[s][s]
	}
	return x
}
