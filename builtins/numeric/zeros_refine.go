package numeric

import (
	"context"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// refineLimit is the size of the reduced system matrix up to which each zero
// is improved, at a cost of size³ a zero; directLimit that up to which the singular
// value at each zero is computed directly.
const (
	refineLimit = 64
	directLimit = 24
)

// foundZeros are the zeros of a reduced pencil with their error estimates.
type foundZeros struct {
	values            []complex128
	errors, residuals []float64
	condition         float64
	notes             []string
}

// zeros computes the finite zeros of a regular pencil (D square, invertible).
func (z *systemPencil) zeros(ctx context.Context) (*foundZeros, error) {
	out := &foundZeros{condition: 1}
	n, r := z.n, z.p
	if n == 0 {
		return out, nil
	}
	closed := mat.NewDense(n, n, append([]float64(nil), z.a...))
	feedthrough, solved := 1.0, mat.NewDense(max(r, 1), n, nil)
	if r > 0 {
		d := mat.NewDense(r, r, z.d)
		values, err := singularValues(d)
		if err != nil {
			return nil, err
		}
		feedthrough = values[0] / values[r-1]
		_ = solved.Solve(d, mat.NewDense(r, n, z.c)) // rank and gap were judged in the reduction
		var product mat.Dense
		product.Mul(mat.NewDense(n, r, z.b), solved)
		closed.Sub(closed, &product)
	}
	system, err := Eigen(closed)
	if err != nil {
		return nil, err
	}
	out.values = append([]complex128(nil), system.Values...)
	out.errors, out.residuals = make([]float64, n), make([]float64, n)
	clustered := make([]bool, n)
	for _, cluster := range system.Clusters {
		for _, j := range cluster {
			clustered[j] = true
		}
	}
	out.notes = append(out.notes, system.Certificate.Notes...)
	for j := 0; j < n; j++ {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if imag(system.Values[j]) < 0 && j > 0 && system.Values[j] == cmplx.Conj(system.Values[j-1]) {
			out.values[j], out.errors[j], out.residuals[j] = cmplx.Conj(out.values[j-1]), out.errors[j-1], out.residuals[j-1]
			continue
		}
		z.refine(out, system, j, clustered[j], feedthrough, solved)
	}
	return out, nil
}

// refine improves zero j by two-sided Rayleigh quotients on the pencil
// P(λ) = [A − λI, B; C, D] and estimates its error.
func (z *systemPencil) refine(out *foundZeros, system *Eigensystem, j int, clustered bool, feedthrough float64, solved *mat.Dense) {
	n, r := z.n, z.p
	size := n + r
	norm := blocksNorm(z.a, z.b, z.c, z.d) + cmplx.Abs(system.Values[j])
	right, left := make([]complex128, size), make([]complex128, size)
	for i := 0; i < n; i++ {
		right[i], left[i] = system.Right.At(i, j), system.Left.At(i, j)
	}
	for i := 0; i < r; i++ {
		for k := 0; k < n; k++ {
			right[n+i] -= complex(solved.At(i, k), 0) * right[k]
		}
	}
	if clustered || size > refineLimit {
		out.residuals[j] = z.residual(system.Values[j], right) / norm
		out.errors[j] = system.ErrorOf[j] * math.Max(1, feedthrough)
		if clustered {
			out.errors[j] = system.ErrorOf[j] * math.Sqrt(math.Max(1, feedthrough))
		}
		out.condition = math.Max(out.condition, system.Condition[j])
		return
	}
	value, moved := system.Values[j], 0.0
	for step := 0; step < 2; step++ {
		factors := factorComplex(size, z.at(value), machineEpsilon*norm)
		clear(right[n:])
		factors.solve(right)
		normalizeComplex(right)
		clear(left[n:])
		factors.solveAdjoint(left)
		normalizeComplex(left)
		next := z.quotient(value, left, right)
		if imag(value) == 0 {
			next = complex(real(next), 0)
		}
		change := cmplx.Abs(next - value)
		limit := 1e3*system.ErrorOf[j]*math.Max(1, feedthrough) + 1e-10*cmplx.Abs(value)
		if math.IsNaN(change) || change > limit {
			break
		}
		value, moved = next, change
	}
	// The reduction's rounding acts through the whole vectors, that of λ itself
	// through their state parts only.
	overlap := cmplx.Abs(innerProduct(left[:n], right[:n]))
	condition := 1 / overlap
	own := lengthOf(left[:n]) * lengthOf(right[:n]) * cmplx.Abs(value)
	out.values[j] = value
	out.residuals[j] = z.residual(value, right) / norm
	out.errors[j] = math.Sqrt(float64(size))*4*machineEpsilon*(blocksNorm(z.a, z.b, z.c, z.d)+own)/overlap + math.Min(moved, 1e-3*cmplx.Abs(value))*1e-3
	out.condition = math.Max(out.condition, condition)
}

// at is P(λ) row by row.
func (z *systemPencil) at(lambda complex128) []complex128 {
	n, r := z.n, z.p
	size := n + r
	m := make([]complex128, size*size)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			m[i*size+j] = complex(z.a[i*n+j], 0)
		}
		m[i*size+i] -= lambda
		for j := 0; j < r; j++ {
			m[i*size+n+j] = complex(z.b[i*r+j], 0)
		}
	}
	for i := 0; i < r; i++ {
		for j := 0; j < n; j++ {
			m[(n+i)*size+j] = complex(z.c[i*n+j], 0)
		}
		for j := 0; j < r; j++ {
			m[(n+i)*size+n+j] = complex(z.d[i*r+j], 0)
		}
	}
	return m
}

// quotient is the λ for which yᴴP(λ)x vanishes.
func (z *systemPencil) quotient(near complex128, left, right []complex128) complex128 {
	n := z.n
	image := z.apply(near, right)
	return near + innerProduct(left, image)/innerProduct(left[:n], right[:n])
}

// apply is P(λ)·x.
func (z *systemPencil) apply(lambda complex128, x []complex128) []complex128 {
	n, r := z.n, z.p
	out := make([]complex128, n+r)
	add := func(i int, block []float64, columns int, part []complex128) {
		row := block[:columns]
		var re, im float64
		for k, v := range row {
			re += v * real(part[k])
			im += v * imag(part[k])
		}
		out[i] += complex(re, im)
	}
	for i := 0; i < n; i++ {
		add(i, z.a[i*n:], n, x[:n])
		out[i] -= lambda * x[i]
		add(i, z.b[i*r:], r, x[n:])
	}
	for i := 0; i < r; i++ {
		add(n+i, z.c[i*n:], n, x[:n])
		add(n+i, z.d[i*r:], r, x[n:])
	}
	return out
}

// residual is ‖P(λ)x‖/‖x‖, which bounds the smallest singular value there.
func (z *systemPencil) residual(lambda complex128, x []complex128) float64 {
	image := z.apply(lambda, x)
	length := lengthOf(x)
	if length == 0 {
		return 0
	}
	return lengthOf(image) / length
}

// lengthOf is ‖x‖₂.
func lengthOf(x []complex128) float64 {
	return normalizeComplex(append([]complex128(nil), x...))
}

// measure computes, at each zero, the singular value of the balanced system
// matrix that vanishes there: number n + normal rank, found in the real form
// [Re −Im; Im Re], where each stands twice.
func (out *Zeros) measure(s *stateSpace, norm float64) error {
	rows, columns := s.n+s.p, s.n+s.m
	for k, zero := range out.Zeros {
		m := mat.NewDense(2*rows, 2*columns, nil)
		put := func(i, j int, v complex128) {
			m.Set(i, j, real(v))
			m.Set(rows+i, columns+j, real(v))
			m.Set(i, columns+j, -imag(v))
			m.Set(rows+i, j, imag(v))
		}
		for i := 0; i < s.n; i++ {
			for j := 0; j < s.n; j++ {
				v := complex(s.a[i*s.n+j], 0)
				if i == j {
					v -= zero
				}
				put(i, j, v)
			}
			for j := 0; j < s.m; j++ {
				put(i, s.n+j, complex(s.b[i*s.m+j], 0))
			}
		}
		for i := 0; i < s.p; i++ {
			for j := 0; j < s.n; j++ {
				put(s.n+i, j, complex(s.c[i*s.n+j], 0))
			}
			for j := 0; j < s.m; j++ {
				put(s.n+i, s.n+j, complex(s.d[i*s.m+j], 0))
			}
		}
		values, err := singularValues(m)
		if err != nil {
			return err
		}
		out.SigmaMin[k] = values[2*(s.n+out.NormalRank)-1] / (norm + cmplx.Abs(zero))
	}
	return nil
}
