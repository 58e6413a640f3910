package model

import "math"

// leastNorm solves linear systems of any shape in the sense of least squares with the
// smallest norm: Householder QR with column pivoting, then a second orthogonal reduction
// of the rows that are left (the complete orthogonal decomposition; Golub & Van Loan,
// Matrix Computations, 5.5.2). It keeps its workspace.
type leastNorm struct {
	rows, cols int
	a          []float64 // row-major, overwritten
	b          []float64
	pivot      []int
	norms      []float64
	tau        []float64
	rank       int
	y          []float64
}

// what counts as nothing beside the largest pivot: derivatives are good to some 1e-15,
// and pivots between 1e-15 and this are decided as rank deficiency
const rankTolerance = 1e-11

func newLeastNorm(rows, cols int) *leastNorm {
	return &leastNorm{rows: rows, cols: cols, a: make([]float64, rows*cols), b: make([]float64, rows),
		pivot: make([]int, cols), norms: make([]float64, cols), tau: make([]float64, cols), y: make([]float64, cols)}
}

// solve factors l.a and gives the x of least norm that minimises ‖a·x − b‖.
func (l *leastNorm) solve(x []float64) {
	l.factor()
	l.back(x)
}

// factor reduces l.a to R in the pivoted columns, applying the reflections to l.b.
func (l *leastNorm) factor() {
	m, n := l.rows, l.cols
	for j := range n {
		l.pivot[j] = j
	}
	l.rank = 0
	first := 0.0
	for k := 0; k < min(m, n); k++ {
		best, size := k, -1.0
		for j := k; j < n; j++ {
			sum := 0.0
			for i := k; i < m; i++ {
				sum += l.a[i*n+j] * l.a[i*n+j]
			}
			if sum > size {
				best, size = j, sum
			}
		}
		size = math.Sqrt(size)
		if k == 0 {
			first = size
		}
		if size <= rankTolerance*first || size == 0 || math.IsNaN(size) {
			return
		}
		if best != k {
			for i := range m {
				l.a[i*n+k], l.a[i*n+best] = l.a[i*n+best], l.a[i*n+k]
			}
			l.pivot[k], l.pivot[best] = l.pivot[best], l.pivot[k]
		}
		l.reflect(k, size)
		l.rank++
	}
}

// reflect zeroes column k below its diagonal.
func (l *leastNorm) reflect(k int, size float64) {
	m, n := l.rows, l.cols
	alpha := l.a[k*n+k]
	if alpha > 0 {
		size = -size
	}
	// v = column − size·e_k, and the reflection is I − v·vᵀ/(size·(size − alpha))
	l.a[k*n+k] = alpha - size
	scale := size * (size - alpha)
	apply := func(get func(i int) float64, set func(i int, x float64)) {
		dot := 0.0
		for i := k; i < m; i++ {
			dot += l.a[i*n+k] * get(i)
		}
		dot /= scale
		for i := k; i < m; i++ {
			set(i, get(i)-dot*l.a[i*n+k])
		}
	}
	for j := k + 1; j < n; j++ {
		dot := 0.0
		for i := k; i < m; i++ {
			dot += l.a[i*n+k] * l.a[i*n+j]
		}
		dot /= scale
		for i := k; i < m; i++ {
			l.a[i*n+j] -= dot * l.a[i*n+k]
		}
	}
	apply(func(i int) float64 { return l.b[i] }, func(i int, x float64) { l.b[i] = x })
	l.a[k*n+k] = size
	for i := k + 1; i < m; i++ {
		l.a[i*n+k] = 0
	}
}

// back gives the least-norm solution from the factored form.
func (l *leastNorm) back(x []float64) {
	n, r := l.cols, l.rank
	for j := range x[:n] {
		x[j] = 0
	}
	if r < n {
		l.trim()
	}
	y := l.y
	for i := r - 1; i >= 0; i-- {
		sum := l.b[i]
		for j := i + 1; j < r; j++ {
			sum -= l.a[i*n+j] * y[j]
		}
		y[i] = sum / l.a[i*n+i]
	}
	for j := r; j < n; j++ {
		y[j] = 0
	}
	if r < n {
		l.untrim(y)
	}
	for j := range n {
		x[l.pivot[j]] = y[j]
	}
}

// trim turns [R S] with r rows into [T 0] by reflections from the right; row i's
// reflection is kept in the columns from r on and in tau, norms.
func (l *leastNorm) trim() {
	n, r := l.cols, l.rank
	for i := r - 1; i >= 0; i-- {
		row := l.a[i*n : i*n+n]
		sum := row[i] * row[i]
		for j := r; j < n; j++ {
			sum += row[j] * row[j]
		}
		size := math.Sqrt(sum)
		alpha := row[i]
		if alpha > 0 {
			size = -size
		}
		head := alpha - size
		scale := size * (size - alpha)
		l.norms[i], l.tau[i] = head, scale
		for k := range i {
			other := l.a[k*n : k*n+n]
			dot := head * other[i]
			for j := r; j < n; j++ {
				dot += row[j] * other[j]
			}
			if scale != 0 {
				dot /= scale
			}
			other[i] -= dot * head
			for j := r; j < n; j++ {
				other[j] -= dot * row[j]
			}
		}
		row[i] = size
	}
}

// untrim applies the reflections to a solution of T·y = b.
func (l *leastNorm) untrim(y []float64) {
	n, r := l.cols, l.rank
	for i := range r {
		row := l.a[i*n : i*n+n]
		head, scale := l.norms[i], l.tau[i]
		if scale == 0 {
			continue
		}
		dot := head * y[i]
		for j := r; j < n; j++ {
			dot += row[j] * y[j]
		}
		dot /= scale
		y[i] -= dot * head
		for j := r; j < n; j++ {
			y[j] -= dot * row[j]
		}
	}
}

// kernel gives a basis of the null space after factor: a vector for each column beyond
// the rank, with 1 there and what the pivots answer.
func (l *leastNorm) kernel() [][]float64 {
	n, r := l.cols, l.rank
	var out [][]float64
	for f := r; f < n; f++ {
		v := make([]float64, n)
		v[l.pivot[f]] = 1
		for i := r - 1; i >= 0; i-- {
			sum := -l.a[i*n+f]
			for j := i + 1; j < r; j++ {
				sum -= l.a[i*n+j] * v[l.pivot[j]]
			}
			v[l.pivot[i]] = sum / l.a[i*n+i]
		}
		out = append(out, v)
	}
	return out
}
