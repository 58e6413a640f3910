package numeric

import (
	"container/heap"
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"time"

	"gonum.org/v1/gonum/mat"
)

// cell is a rectangle of the upper half plane, with a lower bound of σ_min on it.
type cell struct {
	center       complex128
	wide, high   float64 // half widths
	bound        float64
	serialNumber int
}

// cellHeap keeps the cell of the smallest bound on top; equal bounds in order
// of birth, so that the search does not depend on anything but its data.
type cellHeap []cell

func (h cellHeap) Len() int { return len(h) }
func (h cellHeap) Less(i, j int) bool {
	if h[i].bound != h[j].bound {
		return h[i].bound < h[j].bound
	}
	return h[i].serialNumber < h[j].serialNumber
}
func (h cellHeap) Swap(i, j int) { h[i], h[j] = h[j], h[i] }
func (h *cellHeap) Push(x any)   { *h = append(*h, x.(cell)) }
func (h *cellHeap) Pop() any {
	old := *h
	last := old[len(old)-1]
	*h = old[:len(old)-1]
	return last
}

// distanceSearch is the branch and bound over complex z in scaled coordinates.
type distanceSearch struct {
	n, m      int
	a         []float64 // staircase coordinates
	bb        []float64 // B, same coordinates
	floor     float64
	pencil    *shiftedTrapezoid
	iteration *inverseIteration
	image     []complex128
	cells     cellHeap
	serial    int
	evaluated int
	low, high float64
	at        complex128
	capped    bool
	finished  float64 // the smallest bound among cells that were closed
	ctx       context.Context
	deadline  time.Time // zero: none
}

func newDistanceSearch(ctx context.Context, deadline time.Time, s *staircase, floor float64) *distanceSearch {
	n, m := s.n, s.m
	base := make([]float64, n*(n+m))
	for i := 0; i < n; i++ {
		copy(base[i*(n+m):], s.b[i*m:(i+1)*m])
		copy(base[i*(n+m)+m:], s.a[i*n:(i+1)*n])
	}
	return &distanceSearch{n: n, m: m, a: s.a, bb: s.b, floor: floor, high: math.Inf(1), finished: math.Inf(1), ctx: ctx, deadline: deadline,
		pencil: newShiftedTrapezoid(n, m, base), iteration: newInverseIteration(n), image: make([]complex128, n)}
}

// local is what one evaluation of σ_min tells: its value, the second singular
// value, and the numbers of the quadratic bound.
type local struct {
	first, second float64
	slope         complex128 // g = uᴴ(A − zI)u
	coupling      float64
	better        complex128 // Rayleigh point: σ there is no larger
}

// evaluate computes σ_min at z with the left vector u, keeps the best point
// and returns the numbers of the bound.
func (d *distanceSearch) evaluate(z complex128) local {
	d.evaluated++
	d.pencil.factor(z)
	pivotFloor := d.floor * 1e-4
	first, second, uncertain := d.iteration.run(d.pencil, pivotFloor)
	u := d.iteration.basis[0]
	if first < d.high {
		d.high, d.at = first, z
	}
	d.product(u)
	var g complex128
	for i, x := range d.image {
		d.image[i] = x - z*u[i]
		g += cmplx.Conj(u[i]) * d.image[i]
	}
	coupling := d.weighted(u, g, pivotFloor)
	d.adjointProduct(u)
	for i, x := range d.image {
		d.image[i] = x - cmplx.Conj(z)*u[i]
	}
	coupling += d.weighted(u, cmplx.Conj(g), pivotFloor)
	if d.n == 1 {
		coupling = 0
	}
	return local{first: first * (1 - 2*uncertain), second: second, slope: g, coupling: coupling, better: z + g}
}

// product sets image to A·u; A vanishes below its m-th subdiagonal.
func (d *distanceSearch) product(u []complex128) {
	n := d.n
	for i := 0; i < n; i++ {
		re, im := 0.0, 0.0
		row := d.a[i*n : (i+1)*n]
		for j := max(0, i-d.m); j < n; j++ {
			re += row[j] * real(u[j])
			im += row[j] * imag(u[j])
		}
		d.image[i] = complex(re, im)
	}
}

// adjointProduct sets image to Aᵀ·u.
func (d *distanceSearch) adjointProduct(u []complex128) {
	n := d.n
	clear(d.image)
	for i := 0; i < n; i++ {
		re, im := real(u[i]), imag(u[i])
		row := d.a[i*n : (i+1)*n]
		for j := max(0, i-d.m); j < n; j++ {
			d.image[j] += complex(row[j]*re, row[j]*im)
		}
	}
}

// weighted is ‖R⁻¹·(image − g·u)‖, the size of the part of image perpendicular
// to u in the norm of (M·Mᴴ)⁻¹; image is overwritten.
func (d *distanceSearch) weighted(u []complex128, g complex128, pivotFloor float64) float64 {
	for i, x := range u {
		d.image[i] -= g * x
	}
	rest := innerProduct(u, d.image)
	for i, x := range u {
		d.image[i] -= rest * x
	}
	d.pencil.solve(d.image, pivotFloor)
	return normalizeComplex(d.image)
}

// lowerBound bounds σ_min from below on the rectangle of half widths wide and
// high around z + offset.
//
// For a unit vector w, ‖wᴴ[A − (z+δ)I, B]‖² is the Hermitian form of F(δ) =
// M·Mᴴ − δ̄·N − δ·Nᴴ + |δ|²·I with N = A − zI. Split along the left vector u of σ₁ and its
// complement: F has the corner p = σ₁² − 2·Re(δ̄g) + |δ|², on the complement it is at
// least (1 − |δ|/σ₂)² of what it is at δ = 0, and the coupling between them, measured
// by the inverse of that, is at most |δ|·coupling. The Schur complement then bounds
// the smallest eigenvalue: σ² ≥ p − |δ|²·coupling²/κ, κ = (1 − |δ|/σ₂)² − (σ₁/σ₂)².
func (l local) lowerBound(offset complex128, wide, high float64) float64 {
	x, y := real(offset), imag(offset)
	r := math.Hypot(math.Abs(x)+wide, math.Abs(y)+high)
	lipschitz := math.Max(0, l.first-r)
	shrink := 1 - r/l.second
	kappa := shrink*shrink - (l.first/l.second)*(l.first/l.second)
	if shrink <= 0 || kappa <= 0 {
		return lipschitz
	}
	gx, gy := real(l.slope), imag(l.slope)
	linear := 2 * (x*gx + y*gy + wide*math.Abs(gx) + high*math.Abs(gy))
	curve := math.Max(0, l.coupling*l.coupling/kappa-1)
	square := l.first*l.first - math.Max(0, linear) - r*r*curve
	return math.Max(lipschitz, math.Sqrt(math.Max(0, square)))
}

// startingModes is how many eigenvalues, weakest first, start a descent.
const startingModes = 5

// prepare finds upper bounds by Rayleigh descent from the eigenvalues of A and
// covers the region that can hold a minimiser.
func (d *distanceSearch) prepare(original []float64) error {
	n := d.n
	a := mat.NewDense(n, n, original)
	modes, err := Eigenvalues(a)
	if err != nil {
		return err
	}
	starts := make([]local, 0, n)
	for _, mode := range modes {
		if imag(mode) >= 0 && (len(starts) == 0 || d.goOn()) {
			starts = append(starts, d.evaluate(mode))
		}
	}
	sort.SliceStable(starts, func(i, j int) bool { return starts[i].first < starts[j].first })
	for _, start := range starts[:min(len(starts), startingModes)] {
		d.descend(start.better, 4)
	}
	left, right, top, err := fieldOfValues(a)
	if err != nil {
		return err
	}
	left, right, top = left-d.high, right+d.high, top+d.high
	center := complex((left+right)/2, top/2)
	d.push(cell{center: center, wide: (right - left) / 2, high: top / 2})
	return nil
}

// goOn is false when the context was cancelled or the time cap met.
func (d *distanceSearch) goOn() bool {
	if d.ctx.Err() != nil || !d.deadline.IsZero() && time.Now().After(d.deadline) {
		d.capped = true
	}
	return !d.capped
}

// descend repeats z ← uᴴAu, which never raises σ_min.
func (d *distanceSearch) descend(z complex128, steps int) {
	for k := 0; k < steps && d.goOn(); k++ {
		l := d.evaluate(z)
		if cmplx.Abs(l.slope) <= 1e-9*(cmplx.Abs(z)+l.first) {
			return
		}
		z = l.better
	}
}

// polish sharpens the best point: −2g is the gradient of σ², differences of g
// give its second derivatives for a Newton step, and where that does not help
// a step along g is lengthened as long as it does.
func (d *distanceSearch) polish() {
	d.iteration.tolerance, d.iteration.steps = 1e-14, 60
	d.high = math.Inf(1)
	d.evaluate(d.at)
	for round := 0; round < 20 && d.goOn(); round++ {
		z, before := d.at, d.high
		l := d.evaluate(z)
		if cmplx.Abs(l.slope) <= 1e-12*(cmplx.Abs(z)+l.first) {
			return
		}
		h := 1e-5 * (cmplx.Abs(z) + l.first)
		across := (d.evaluate(z+complex(h, 0)).slope - l.slope) / complex(h, 0)
		up := (d.evaluate(z+complex(0, h)).slope - l.slope) / complex(h, 0)
		xx, xy, yy := -real(across), -(imag(across)+real(up))/2, -imag(up)
		if determinant := xx*yy - xy*xy; xx > 0 && determinant > 0 {
			gx, gy := real(l.slope), imag(l.slope)
			d.evaluate(z + complex((yy*gx-xy*gy)/determinant, (xx*gy-xy*gx)/determinant))
		}
		for length := 1.0; length < 1e4 && d.goOn(); length *= 2 {
			reached := d.high
			d.evaluate(z + complex(length, 0)*l.slope)
			if d.high >= reached {
				break
			}
		}
		if before-d.high <= 1e-13*before {
			return
		}
	}
}

// fieldOfValues bounds the field of values of a real matrix: real parts
// between left and right, imaginary parts at most top in modulus.
func fieldOfValues(a *mat.Dense) (left, right, top float64, err error) {
	n, _ := a.Dims()
	symmetric, skew := mat.NewSymDense(n, nil), mat.NewDense(n, n, nil)
	for i := 0; i < n; i++ {
		for j := 0; j < n; j++ {
			if j >= i {
				symmetric.SetSym(i, j, (a.At(i, j)+a.At(j, i))/2)
			}
			skew.Set(i, j, (a.At(i, j)-a.At(j, i))/2)
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(symmetric, false) {
		return 0, 0, 0, errNotConverged
	}
	values := eigen.Values(nil)
	turning, err := singularValues(skew)
	if err != nil {
		return 0, 0, 0, err
	}
	return values[0], values[n-1], turning[0], nil
}

func (d *distanceSearch) push(c cell) {
	d.serial++
	c.serialNumber = d.serial
	heap.Push(&d.cells, c)
}

// run divides the cell of the smallest bound until the bracket is narrow.
func (d *distanceSearch) run() error {
	for len(d.cells) > 0 {
		d.low = math.Min(d.cells[0].bound, d.finished)
		if d.low-d.floor >= distanceRatio*(d.high+d.floor) || d.high <= 2*d.floor {
			return nil
		}
		if !d.goOn() || len(d.cells) > mostCells {
			d.capped = true
			return d.ctx.Err()
		}
		d.divide(heap.Pop(&d.cells).(cell))
	}
	d.low = math.Min(d.finished, d.high)
	return nil
}

// divide evaluates a cell at its centre and, unless that closes it, pushes its
// parts.
func (d *distanceSearch) divide(c cell) {
	radius := math.Hypot(c.wide, c.high)
	l := d.evaluate(c.center)
	if bound := l.lowerBound(0, c.wide, c.high); bound > c.bound {
		c.bound = bound
	}
	if c.bound-d.floor >= distanceRatio*(d.high+d.floor) {
		d.finished = math.Min(d.finished, c.bound)
		return
	}
	if l.first < 1.2*d.high {
		d.descend(l.better, 3)
	}
	if radius <= machineEpsilon { // nothing is left to divide
		d.finished = math.Min(d.finished, c.bound)
		return
	}
	across, up := 2, 2
	if c.wide > 2*c.high {
		up = 1
	} else if c.high > 2*c.wide {
		across = 1
	}
	wide, high := c.wide/float64(across), c.high/float64(up)
	for i := 0; i < across; i++ {
		for j := 0; j < up; j++ {
			center := c.center + complex(float64(2*i+1-across)*wide, float64(2*j+1-up)*high)
			part := cell{center: center, wide: wide, high: high, bound: c.bound}
			part.bound = math.Max(part.bound, l.lowerBound(center-c.center, wide, high))
			d.push(part)
		}
	}
}

// result turns the search's state into the answer in the caller's scale.
func (d *distanceSearch) result(exponent int) *Distance {
	low := math.Max(0, math.Min(d.low, d.high)-d.floor)
	high := d.high + d.floor
	out := &Distance{Low: math.Ldexp(low, exponent), High: math.Ldexp(high, exponent),
		At: d.at * complex(math.Ldexp(1, exponent), 0)}
	if imag(out.At) < 0 {
		out.At = cmplx.Conj(out.At)
	}
	out.Certificate = Certificate{
		Method: fmt.Sprintf("best-first subdivision with certified lower bounds, %d evaluations", d.evaluated),
		Digits: math.Min(mostDigits, math.Max(0, -math.Log10((high-low)/high))),
	}
	switch {
	case d.high <= 2*d.floor:
		out.Certificate.note("the distance drowns in rounding: it is at most %.2g", out.High)
	case d.capped:
		out.Certificate.note("the time cap ended the search; the bracket is what was reached")
	}
	return out
}
