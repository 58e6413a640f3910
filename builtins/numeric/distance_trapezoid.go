package numeric

import (
	"math"
	"math/cmplx"
)

// shiftedTrapezoid factors M(z) = base − z·[0 I] for many complex z. base is
// real, rows × (rows+extra), and vanishes left of its main diagonal, which is
// what a staircase form gives; the shift sits on the last diagonal. One
// factorization M = [0 R]·Q costs about rows²·(extra+1) complex products.
type shiftedTrapezoid struct {
	rows, extra int
	base        []float64
	m           []complex128 // the factored matrix; R is its last rows columns
	vectors     []complex128 // row i: the reflection of columns i … i+extra
	taus        []float64
}

func newShiftedTrapezoid(rows, extra int, base []float64) *shiftedTrapezoid {
	return &shiftedTrapezoid{
		rows: rows, extra: extra, base: base,
		m:       make([]complex128, rows*(rows+extra)),
		vectors: make([]complex128, rows*(extra+1)),
		taus:    make([]float64, rows),
	}
}

// factor computes R and the reflections for one z, from the last row upwards:
// each row's extra+1 remaining entries are gathered in the last of them.
func (t *shiftedTrapezoid) factor(z complex128) {
	columns, width := t.rows+t.extra, t.extra+1
	for i := 0; i < t.rows; i++ {
		row := t.m[i*columns : (i+1)*columns]
		clear(row[:i])
		for j := i; j < columns; j++ {
			row[j] = complex(t.base[i*columns+j], 0)
		}
		row[i+t.extra] -= z
	}
	for i := t.rows - 1; i >= 0; i-- {
		v := t.vectors[i*width : (i+1)*width]
		row := t.m[i*columns+i : i*columns+i+width]
		alpha, tau := gatherLast(v, row)
		t.taus[i] = tau
		clear(row)
		row[width-1] = alpha
		if tau == 0 {
			continue
		}
		for k := 0; k < i; k++ {
			reflectRow(t.m[k*columns+i:k*columns+i+width], v, tau)
		}
	}
}

// gatherLast fills v with the vector of the reflection H = I − tau·v·vᴴ for
// which row·H has only its last entry, alpha, left.
func gatherLast(v, row []complex128) (alpha complex128, tau float64) {
	last := len(row) - 1
	scale := 0.0
	for _, x := range row {
		scale = math.Max(scale, math.Abs(real(x))+math.Abs(imag(x)))
	}
	head, tail := 0.0, 0.0
	if scale > 0 {
		for j, x := range row {
			re, im := real(x)/scale, imag(x)/scale
			if j < last {
				head += re*re + im*im
			} else {
				tail = re*re + im*im
			}
		}
	}
	if head == 0 {
		return row[last], 0
	}
	size := scale * math.Sqrt(head+tail)
	direction := complex(1, 0)
	if tail > 0 {
		direction = cmplx.Conj(row[last]) / complex(scale*math.Sqrt(tail), 0)
	}
	for j := range row {
		v[j] = cmplx.Conj(row[j]) / complex(size, 0)
	}
	v[last] += direction
	sum := 0.0
	for _, x := range v {
		sum += real(x)*real(x) + imag(x)*imag(x)
	}
	return -cmplx.Conj(direction) * complex(size, 0), 2 / sum
}

// reflectRow replaces row by row·(I − tau·v·vᴴ).
func reflectRow(row, v []complex128, tau float64) {
	var sum complex128
	for j, x := range row {
		sum += x * v[j]
	}
	sum *= complex(tau, 0)
	for j, x := range v {
		row[j] -= sum * complex(real(x), -imag(x))
	}
}

// kernelBasis writes an orthonormal basis of the kernel of M(z) for the last
// factored z into out, (rows+extra) × extra row by row.
func (t *shiftedTrapezoid) kernelBasis(out []complex128) {
	width := t.extra + 1
	clear(out)
	for j := 0; j < t.extra; j++ {
		out[j*t.extra+j] = 1
	}
	for i := 0; i < t.rows; i++ {
		tau := t.taus[i]
		if tau == 0 {
			continue
		}
		v := t.vectors[i*width : (i+1)*width]
		for j := 0; j < t.extra; j++ {
			var sum complex128
			for k, x := range v {
				sum += complex(real(x), -imag(x)) * out[(i+k)*t.extra+j]
			}
			sum *= complex(tau, 0)
			for k, x := range v {
				out[(i+k)*t.extra+j] -= sum * x
			}
		}
	}
}

// solve overwrites x with R⁻¹·x; a vanishing pivot is replaced by floor.
func (t *shiftedTrapezoid) solve(x []complex128, floor float64) {
	columns := t.rows + t.extra
	for i := t.rows - 1; i >= 0; i-- {
		row := t.m[i*columns+t.extra : (i+1)*columns]
		sum := x[i]
		for j := i + 1; j < t.rows; j++ {
			sum -= row[j] * x[j]
		}
		x[i] = divideBy(sum, row[i], floor)
	}
}

// solveAdjoint overwrites x with R⁻ᴴ·x.
func (t *shiftedTrapezoid) solveAdjoint(x []complex128, floor float64) {
	columns := t.rows + t.extra
	for i := 0; i < t.rows; i++ {
		row := t.m[i*columns+t.extra : (i+1)*columns]
		x[i] = divideBy(x[i], complex(real(row[i]), -imag(row[i])), floor)
		f := x[i]
		for j := i + 1; j < t.rows; j++ {
			r := row[j]
			x[j] -= complex(real(r), -imag(r)) * f
		}
	}
}

// divideBy is a/b, with b replaced by floor where it is smaller.
func divideBy(a, b complex128, floor float64) complex128 {
	size := real(b)*real(b) + imag(b)*imag(b)
	if size <= floor*floor {
		return a / complex(floor, 0)
	}
	return a * complex(real(b)/size, -imag(b)/size)
}

// smallestTriplets is how many singular values the inverse iteration carries:
// the two that the bounds use and one more, which speeds it when they are close.
const smallestTriplets = 3

// inverseIteration finds the smallest singular values of M and the left
// singular vector of the smallest by subspace iteration on (R·Rᴴ)⁻¹ with
// Rayleigh–Ritz.
type inverseIteration struct {
	n, width  int
	tolerance float64 // relative change of the smallest value at which to stop
	steps     int
	basis     [smallestTriplets][]complex128
	gram      [smallestTriplets * smallestTriplets]complex128
	turn      [smallestTriplets * smallestTriplets]complex128
	mixed     [smallestTriplets][]complex128
}

func newInverseIteration(n int) *inverseIteration {
	it := &inverseIteration{n: n, width: min(n, smallestTriplets), tolerance: 1e-5, steps: 14}
	for k := 0; k < it.width; k++ {
		it.basis[k], it.mixed[k] = make([]complex128, n), make([]complex128, n)
	}
	return it
}

// start fills the basis with fixed vectors that no structure is likely to share.
func (it *inverseIteration) start() {
	for k := 0; k < it.width; k++ {
		for i := range it.basis[k] {
			angle := 2.399963 * float64((i+1)*(k+1)) * (1 + 0.1*float64(k))
			it.basis[k][i] = complex(math.Cos(angle)+0.1, math.Sin(1.3*angle))
		}
	}
	it.orthonormalize()
}

// run returns the two smallest singular values (the second is +Inf when n = 1),
// both to within the returned relative uncertainty, and leaves the left
// singular vector of the smallest in basis[0].
func (it *inverseIteration) run(t *shiftedTrapezoid, floor float64) (first, second, uncertainty float64) {
	it.start()
	var before [smallestTriplets]float64
	for step := 0; step < it.steps; step++ {
		for k := 0; k < it.width; k++ {
			t.solve(it.basis[k], floor)
		}
		values := it.ritz()
		for k := 0; k < it.width; k++ {
			t.solveAdjoint(it.basis[k], floor)
		}
		it.orthonormalize()
		change := math.Abs(values[0]-before[0]) / values[0]
		changeSecond := 0.0
		if it.width > 1 {
			changeSecond = math.Abs(values[1]-before[1]) / values[1]
		}
		before = values
		if step > 0 && change < it.tolerance && changeSecond < 5e-3 {
			uncertainty = change
			break
		}
		uncertainty = math.Max(change, changeSecond)
	}
	first, second = 1/math.Sqrt(before[0]), math.Inf(1)
	if it.width > 1 {
		second = 0.99 / math.Sqrt(before[1])
	}
	return first, second, uncertainty
}

// ritz turns the basis W = R⁻¹·X so that WᴴW is diagonal and returns its
// diagonal, largest first: the Ritz values of (R·Rᴴ)⁻¹.
func (it *inverseIteration) ritz() (values [smallestTriplets]float64) {
	w := it.width
	for a := 0; a < w; a++ {
		for b := a; b < w; b++ {
			sum := innerProduct(it.basis[a], it.basis[b])
			it.gram[a*w+b] = sum
			it.gram[b*w+a] = cmplx.Conj(sum)
		}
	}
	hermitianJacobi(it.gram[:w*w], it.turn[:w*w], w)
	order := [smallestTriplets]int{0, 1, 2}
	for a := 1; a < w; a++ {
		for b := a; b > 0 && real(it.gram[order[b]*(w+1)]) > real(it.gram[order[b-1]*(w+1)]); b-- {
			order[b], order[b-1] = order[b-1], order[b]
		}
	}
	for k := 0; k < w; k++ {
		values[k] = real(it.gram[order[k]*(w+1)])
		out := it.mixed[k]
		clear(out)
		for a := 0; a < w; a++ {
			f := it.turn[a*w+order[k]]
			for i, x := range it.basis[a] {
				out[i] += x * f
			}
		}
	}
	it.basis, it.mixed = it.mixed, it.basis
	return values
}

// orthonormalize makes the basis orthonormal, first vector first, twice for
// safety; a vector that vanishes is left as zero.
func (it *inverseIteration) orthonormalize() {
	for k := 0; k < it.width; k++ {
		normalizeComplex(it.basis[k])
		for pass := 0; pass < 2; pass++ {
			for l := 0; l < k; l++ {
				f := innerProduct(it.basis[l], it.basis[k])
				for i, x := range it.basis[l] {
					it.basis[k][i] -= f * x
				}
			}
			normalizeComplex(it.basis[k])
		}
	}
}

// innerProduct is xᴴ·y.
func innerProduct(x, y []complex128) (sum complex128) {
	for i, v := range x {
		sum += complex(real(v), -imag(v)) * y[i]
	}
	return sum
}

// normalizeComplex makes x a unit vector and returns the length it had.
func normalizeComplex(x []complex128) float64 {
	scale := 0.0
	for _, v := range x {
		scale = math.Max(scale, math.Max(math.Abs(real(v)), math.Abs(imag(v))))
	}
	if scale == 0 {
		return 0
	}
	sum := 0.0
	for _, v := range x {
		re, im := real(v)/scale, imag(v)/scale
		sum += re*re + im*im
	}
	root := math.Sqrt(sum)
	f := complex(1/root, 0)
	for i, v := range x {
		x[i] = v / complex(scale, 0) * f
	}
	return scale * root
}

// hermitianJacobi diagonalizes the small Hermitian h (w×w, row by row) in
// place; the columns of v become its eigenvectors (C. G. J. Jacobi 1846).
func hermitianJacobi(h, v []complex128, w int) {
	clear(v)
	for i := 0; i < w; i++ {
		v[i*w+i] = 1
	}
	for sweep := 0; sweep < 30; sweep++ {
		off, diagonal := 0.0, 0.0
		for i := 0; i < w; i++ {
			diagonal += math.Abs(real(h[i*w+i]))
			for j := i + 1; j < w; j++ {
				off += cmplx.Abs(h[i*w+j])
			}
		}
		if off <= 1e-15*diagonal {
			return
		}
		for i := 0; i < w; i++ {
			for j := i + 1; j < w; j++ {
				rotateHermitian(h, v, w, i, j)
			}
		}
	}
}

// rotateHermitian zeroes h[i, j] by a unitary rotation.
func rotateHermitian(h, v []complex128, w, i, j int) {
	size := cmplx.Abs(h[i*w+j])
	if size == 0 {
		return
	}
	phase := h[i*w+j] / complex(size, 0)
	theta := (real(h[j*w+j]) - real(h[i*w+i])) / (2 * size)
	tangent := 1 / (math.Abs(theta) + math.Hypot(theta, 1))
	if theta < 0 {
		tangent = -tangent
	}
	cosine := 1 / math.Hypot(tangent, 1)
	sine := complex(tangent*cosine, 0)
	c := complex(cosine, 0)
	for k := 0; k < w; k++ { // columns: [i j] ← [c·i − s·p̄·j, s·p·i + c·j]
		a, b := h[k*w+i], h[k*w+j]
		h[k*w+i], h[k*w+j] = c*a-sine*cmplx.Conj(phase)*b, sine*phase*a+c*b
		a, b = v[k*w+i], v[k*w+j]
		v[k*w+i], v[k*w+j] = c*a-sine*cmplx.Conj(phase)*b, sine*phase*a+c*b
	}
	for k := 0; k < w; k++ {
		a, b := h[i*w+k], h[j*w+k]
		h[i*w+k], h[j*w+k] = c*a-sine*phase*b, sine*cmplx.Conj(phase)*a+c*b
	}
	h[i*w+j], h[j*w+i] = 0, 0
}
