package numeric

import (
	"math"

	"gonum.org/v1/gonum/lapack"
)

// kernelLimit is the largest order for which the small kernel is used; above
// it blocked LAPACK routines take over (they win from about n = 13).
const kernelLimit = 12

// EigenvalueKernelLimit is the largest order that an EigenvalueKernel takes.
const EigenvalueKernelLimit = kernelLimit

// EigenvalueKernel computes eigenvalues of small real matrices without
// allocating after its first use, for loops over samples. The zero value is
// ready; one kernel must not be used from two goroutines at once.
type EigenvalueKernel struct {
	scale [kernelLimit]float64
}

// Eigenvalues destroys the row-major n×n matrix a, n = len(w) ≤ 12, and fills w
// with its eigenvalues. It reports false when the iteration fails, when an entry
// is not finite, or when n is too large. Balanced, Hessenberg form by
// reflections, Francis double-shift QR (J. G. F. Francis, Comput. J. 4,
// 1961/62; R. S. Martin, G. Peters, J. H. Wilkinson, Numer. Math. 14, 1970).
func (k *EigenvalueKernel) Eigenvalues(w []complex128, a []float64) bool {
	n := len(w)
	if n > kernelLimit || len(a) < n*n {
		return false
	}
	largest := 0.0
	for _, v := range a[:n*n] {
		if v-v != 0 {
			return false
		}
		largest = math.Max(largest, math.Abs(v))
	}
	if n == 0 {
		return true
	}
	if largest > 0x1p300 || (largest < 0x1p-300 && largest > 0) {
		return false
	}
	low, high := kernels.Dgebal(lapack.PermuteScale, n, a, n, k.scale[:n])
	hessenbergByReflections(n, low, high, a)
	return francis(n, low, high, a, w)
}

// hessenbergByReflections reduces rows and columns low … high of a to upper
// Hessenberg form; what lies below the first subdiagonal is set to zero.
func hessenbergByReflections(n, low, high int, a []float64) {
	var v [kernelLimit]float64
	for m := low + 1; m < high; m++ {
		scale := 0.0
		for i := m; i <= high; i++ {
			scale = math.Max(scale, math.Abs(a[i*n+m-1]))
		}
		below := 0.0
		for i := m + 1; i <= high; i++ {
			below = math.Max(below, math.Abs(a[i*n+m-1]))
		}
		if below == 0 {
			continue
		}
		sum := 0.0
		for i := m; i <= high; i++ {
			v[i] = a[i*n+m-1] / scale
			sum += v[i] * v[i]
		}
		g := -math.Copysign(math.Sqrt(sum), v[m])
		h := sum - v[m]*g
		v[m] -= g
		for j := m; j < n; j++ {
			f := 0.0
			for i := m; i <= high; i++ {
				f += v[i] * a[i*n+j]
			}
			f /= h
			for i := m; i <= high; i++ {
				a[i*n+j] -= f * v[i]
			}
		}
		for i := 0; i <= high; i++ {
			row := a[i*n : i*n+n]
			f := 0.0
			for j := m; j <= high; j++ {
				f += v[j] * row[j]
			}
			f /= h
			for j := m; j <= high; j++ {
				row[j] -= f * v[j]
			}
		}
		a[m*n+m-1] = scale * g
		for i := m + 1; i <= high; i++ {
			a[i*n+m-1] = 0
		}
	}
}

// francis finds the eigenvalues of the upper Hessenberg a by double-shift QR
// with deflation; only the active window is transformed.
func francis(n, low, high int, a []float64, w []complex128) bool {
	for i := 0; i < n; i++ {
		if i < low || i > high {
			w[i] = complex(a[i*n+i], 0)
		}
	}
	norm := 0.0
	for i := 0; i < n; i++ {
		for j := max(i-1, 0); j < n; j++ {
			norm += math.Abs(a[i*n+j])
		}
	}
	shift := 0.0
	for end := high; end >= low; {
		done := false
		for iteration := 0; !done; iteration++ {
			start := smallSubdiagonal(n, low, end, a, norm)
			x := a[end*n+end]
			switch {
			case start == end:
				w[end] = complex(x+shift, 0)
				end--
				done = true
				continue
			case start == end-1:
				w[end-1], w[end] = pairOf(n, end, a, shift)
				end -= 2
				done = true
				continue
			case iteration == 40:
				return false
			}
			y, product := a[(end-1)*n+end-1], a[end*n+end-1]*a[(end-1)*n+end]
			if iteration > 0 && iteration%10 == 0 {
				// Exceptional shift with the constants of Martin, Peters and
				// Wilkinson: breaks the cycles of matrices such as permutations.
				shift += x
				for i := low; i <= end; i++ {
					a[i*n+i] -= x
				}
				s := math.Abs(a[end*n+end-1]) + math.Abs(a[(end-1)*n+end-2])
				x, y = 0.75*s, 0.75*s
				product = -0.4375 * s * s
			}
			doubleStep(n, start, end, a, x, y, product)
		}
	}
	return true
}

// smallSubdiagonal finds the first row of the active window that ends at end.
func smallSubdiagonal(n, low, end int, a []float64, norm float64) int {
	start := end
	for ; start > low; start-- {
		s := math.Abs(a[(start-1)*n+start-1]) + math.Abs(a[start*n+start])
		if s == 0 {
			s = norm
		}
		if math.Abs(a[start*n+start-1]) <= unitRoundoff*s {
			a[start*n+start-1] = 0
			break
		}
	}
	return start
}

// pairOf gives the two eigenvalues of the 2×2 block that ends at row end.
func pairOf(n, end int, a []float64, shift float64) (first, second complex128) {
	x, y := a[end*n+end], a[(end-1)*n+end-1]
	product := a[end*n+end-1] * a[(end-1)*n+end]
	p := (y - x) / 2
	q := p*p + product
	root := math.Sqrt(math.Abs(q))
	x += shift
	if q < 0 {
		return complex(x+p, root), complex(x+p, -root)
	}
	root = p + math.Copysign(root, p)
	first = complex(x+root, 0)
	second = first
	if root != 0 {
		second = complex(x-product/root, 0)
	}
	return first, second
}

// doubleStep is one implicit double-shift sweep over rows start … end.
func doubleStep(n, start, end int, a []float64, x, y, product float64) {
	var p, q, r float64
	m := end - 2
	for ; m >= start; m-- {
		z := a[m*n+m]
		rr, ss := x-z, y-z
		p = (rr*ss-product)/a[(m+1)*n+m] + a[m*n+m+1]
		q = a[(m+1)*n+m+1] - z - rr - ss
		r = a[(m+2)*n+m+1]
		s := math.Abs(p) + math.Abs(q) + math.Abs(r)
		p, q, r = p/s, q/s, r/s
		if m == start {
			break
		}
		u := math.Abs(a[m*n+m-1]) * (math.Abs(q) + math.Abs(r))
		v := math.Abs(p) * (math.Abs(a[(m-1)*n+m-1]) + math.Abs(z) + math.Abs(a[(m+1)*n+m+1]))
		if u <= unitRoundoff*v {
			break
		}
	}
	for i := m + 2; i <= end; i++ {
		a[i*n+i-2] = 0
		if i > m+2 {
			a[i*n+i-3] = 0
		}
	}
	for k := m; k < end; k++ {
		last := k == end-1
		scale := 1.0
		if k > m {
			p, q, r = a[k*n+k-1], a[(k+1)*n+k-1], 0
			if !last {
				r = a[(k+2)*n+k-1]
			}
			if scale = math.Abs(p) + math.Abs(q) + math.Abs(r); scale == 0 {
				continue
			}
			p, q, r = p/scale, q/scale, r/scale
		}
		s := math.Copysign(math.Sqrt(p*p+q*q+r*r), p)
		if k > m {
			a[k*n+k-1] = -s * scale
		} else if start != m {
			a[k*n+k-1] = -a[k*n+k-1]
		}
		p += s
		reflectThree(n, start, end, k, last, a, p/s, q/s, r/s, q/p, r/p)
	}
}

// reflectThree applies the reflection of rows and columns k … k+2 (k+1 when
// last) within the active window.
func reflectThree(n, start, end, k int, last bool, a []float64, x, y, z, q, r float64) {
	if last {
		for j := k; j <= end; j++ {
			p := a[k*n+j] + q*a[(k+1)*n+j]
			a[k*n+j] -= p * x
			a[(k+1)*n+j] -= p * y
		}
		for i := start; i <= end; i++ {
			p := x*a[i*n+k] + y*a[i*n+k+1]
			a[i*n+k] -= p
			a[i*n+k+1] -= p * q
		}
		return
	}
	for j := k; j <= end; j++ {
		p := a[k*n+j] + q*a[(k+1)*n+j] + r*a[(k+2)*n+j]
		a[k*n+j] -= p * x
		a[(k+1)*n+j] -= p * y
		a[(k+2)*n+j] -= p * z
	}
	for i := start; i <= min(end, k+3); i++ {
		p := x*a[i*n+k] + y*a[i*n+k+1] + z*a[i*n+k+2]
		a[i*n+k] -= p
		a[i*n+k+1] -= p * q
		a[i*n+k+2] -= p * r
	}
}
