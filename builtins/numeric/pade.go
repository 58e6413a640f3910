package numeric

import (
	"math"
	"sync"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// padeNumerators are the coefficients of the [m/m] Padé numerators of exp, for
// powers 0 … m; the denominator has the same with alternating signs.
// N. J. Higham, SIAM J. Matrix Anal. Appl. 26, 2005, section 2.
var padeNumerators = map[int][]float64{
	3:  {120, 60, 12, 1},
	5:  {30240, 15120, 3360, 420, 30, 1},
	7:  {17297280, 8648640, 1995840, 277200, 25200, 1512, 56, 1},
	9:  {17643225600, 8821612800, 2075673600, 302702400, 30270240, 2162160, 110880, 3960, 90, 1},
	13: {64764752532480000, 32382376266240000, 7771770303897600, 1187353796428800, 129060195264000, 10559470521600, 670442572800, 33522128640, 1323241920, 40840800, 960960, 16380, 182, 1},
}

// padeReach is the largest ‖A‖ for which the approximant's backward error stays
// below 2⁻⁵³, and padeTail the reciprocal of the first neglected coefficient of
// the backward error series. A. H. Al-Mohy, N. J. Higham, SIAM J. Matrix Anal.
// Appl. 31, 2009, table 3.1 and equation (3.6).
var (
	padeReach = map[int]float64{3: 1.495585217958292e-2, 5: 2.539398330063230e-1, 7: 9.504178996162932e-1, 9: 2.097847961257068, 13: 4.25}
	padeTail  = map[int]float64{3: 100800, 5: 10059033600, 7: 4487938430976000, 9: 5914384781877411840000, 13: 113250775606021113483283660800000000}
)

// smallOrder is the order up to which the highest degree is always taken: it
// costs little there, and it keeps entries that first appear at a high power of
// a small matrix correct relative to themselves.
const smallOrder = 24

// padeWork holds an n×n matrix, its even powers and the space to form a Padé
// approximant of its exponential.
type padeWork struct {
	n             int
	a, a2, a4, a6 []float64
	u, v, x, w    []float64
	absolute      []float64 // |A|, in the place of v
	probe, image  []float64
	powerRow      []float64
	powerBits     []float64
	powerExponent int
	pivots, signs []int
	slab          []float64
	// spread is max(‖A⁶‖^(1/6), ‖A⁸‖^(1/8)) or alike of the matrix before scaling,
	// which bounds how its powers grow far better than its norm.
	spread float64
}

// padeSlabs are reused: allocating them anew costs more than a product.
var padeSlabs = sync.Pool{New: func() any { return new([]float64) }}

// newPadeWork takes space whose contents are arbitrary; release gives it back.
func newPadeWork(n int) *padeWork {
	kept := padeSlabs.Get().(*[]float64)
	if size := 8*n*n + 3*n; cap(*kept) < size {
		*kept = make([]float64, size)
	} else {
		*kept = (*kept)[:size]
	}
	slab := *kept
	p := &padeWork{n: n, pivots: make([]int, n), signs: make([]int, n), slab: slab}
	for _, field := range []*[]float64{&p.a, &p.a2, &p.a4, &p.a6, &p.u, &p.v, &p.x, &p.w} {
		*field, slab = slab[:n*n:n*n], slab[n*n:]
	}
	p.probe, p.image, p.powerRow = slab[:n:n], slab[n:2*n:2*n], slab[2*n:]
	p.absolute = p.v
	p.powerBits = make([]float64, 0, 27)
	return p
}

func (p *padeWork) release() { padeSlabs.Put(&p.slab) }

// prepare scales p.a by a power of two, forms the even powers needed and
// returns the degree and the number of squarings, the scaling included.
// Algorithm 5.1 of Al-Mohy & Higham 2009, with the highest degree forced for
// small orders and for chains of scaled blocks.
func (p *padeWork) prepare(highest bool) (degree, squarings int) {
	n := p.n
	norm := oneNorm(n, p.a)
	// Powers up to the tenth of larger entries would overflow.
	const largestExponent = 60
	if e := math.Ilogb(math.Max(norm, 1)); e > largestExponent {
		squarings = e - largestExponent
		scaleSlice(p.a, math.Ldexp(1, -squarings))
		norm = math.Ldexp(norm, -squarings)
	}
	highest = highest || n <= smallOrder
	p.spread = math.Ldexp(norm, squarings)
	p.square(p.a2, p.a)
	if !highest && norm <= padeReach[3] {
		return 3, squarings
	}
	p.square(p.a4, p.a2)
	d4 := math.Sqrt(math.Sqrt(oneNorm(n, p.a4)))
	if !highest && squarings == 0 {
		d6 := math.Pow(p.normOfProduct(p.a4, p.a2), 1.0/6)
		if eta := math.Max(d4, d6); eta <= padeReach[5] && p.extraSquarings(5, 0) == 0 {
			p.spread = eta
			return 5, 0
		}
	}
	multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a4, n, p.a2, n, 0, p.a6, n)
	d6 := math.Pow(oneNorm(n, p.a6), 1.0/6)
	d8 := math.Pow(p.normOfProduct(p.a4, p.a4), 1.0/8)
	eta := math.Max(d6, d8)
	if !highest && squarings == 0 {
		for _, m := range []int{7, 9} {
			if eta <= padeReach[m] && p.extraSquarings(m, 0) == 0 {
				p.spread = eta
				return m, 0
			}
		}
	}
	d10 := math.Pow(p.normOfProduct(p.a4, p.a6), 1.0/10)
	eta = math.Min(eta, math.Max(d8, d10))
	p.spread = math.Ldexp(eta, squarings)
	s := 0
	if eta > padeReach[13] {
		s = int(math.Ceil(math.Log2(eta / padeReach[13])))
	}
	s += p.extraSquarings(13, s)
	p.halve(s)
	return 13, squarings + s
}

// halve divides the matrix by 2^s, and its powers accordingly.
func (p *padeWork) halve(s int) {
	if s == 0 {
		return
	}
	scaleSlice(p.a, math.Ldexp(1, -s))
	scaleSlice(p.a2, math.Ldexp(1, -2*s))
	scaleSlice(p.a4, math.Ldexp(1, -4*s))
	scaleSlice(p.a6, math.Ldexp(1, -6*s))
}

// extraSquarings is the ℓ of Al-Mohy & Higham 2009, equation (5.1), for the
// matrix divided by 2^s: how often more it must be halved because of the first
// neglected term, measured with |A|, which cancellation cannot hide.
func (p *padeWork) extraSquarings(degree, s int) int {
	bits := p.absolutePowerBits(2*degree + 1)
	if math.IsInf(bits, -1) {
		return 0
	}
	bits -= p.absolutePowerBits(1) + float64(2*degree*s)
	alpha := bits - math.Log2(padeTail[degree]) + 53
	return max(int(math.Ceil(alpha/float64(2*degree))), 0)
}

// absolutePowerBits is log₂ of the 1-norm of |A|^k for the matrix before halving,
// −Inf when that vanishes; the sequence is kept and extended as needed.
func (p *padeWork) absolutePowerBits(k int) float64 {
	n, row, next := p.n, p.powerRow, p.image
	if len(p.powerBits) == 0 {
		for i, v := range p.a {
			p.absolute[i] = math.Abs(v)
		}
		for j := range row {
			row[j] = 1
		}
	}
	for len(p.powerBits) < k {
		blas64.Implementation().Dgemv(blas.Trans, n, n, 1, p.absolute, n, row, 1, 0, next, 1)
		largest := 0.0
		for _, v := range next {
			if v > largest {
				largest = v
			}
		}
		if largest == 0 {
			return math.Inf(-1)
		}
		// The row is kept near 1 and its exponent apart.
		e := math.Ilogb(largest)
		factor := math.Ldexp(1, -e)
		for j, v := range next {
			row[j] = v * factor
		}
		p.powerExponent += e
		p.powerBits = append(p.powerBits, float64(p.powerExponent)+math.Log2(largest*factor))
	}
	return p.powerBits[k-1]
}

// normOfProduct estimates the 1-norm of the product of two of the powers
// (N. J. Higham, ACM Trans. Math. Softw. 14, 1988).
func (p *padeWork) normOfProduct(left, right []float64) float64 {
	n := p.n
	if n <= 4 {
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, left, n, right, n, 0, p.x, n)
		return oneNorm(n, p.x)
	}
	v, x, between := p.u[:n], p.probe, p.image
	var save [3]int
	estimate, kase := kernels.Dlacn2(n, v, x, p.signs, 0, 0, &save)
	for kase != 0 {
		if kase == 1 {
			blas64.Implementation().Dgemv(blas.NoTrans, n, n, 1, right, n, x, 1, 0, between, 1)
			blas64.Implementation().Dgemv(blas.NoTrans, n, n, 1, left, n, between, 1, 0, x, 1)
		} else {
			blas64.Implementation().Dgemv(blas.Trans, n, n, 1, left, n, x, 1, 0, between, 1)
			blas64.Implementation().Dgemv(blas.Trans, n, n, 1, right, n, between, 1, 0, x, 1)
		}
		estimate, kase = kernels.Dlacn2(n, v, x, p.signs, estimate, kase, &save)
	}
	return estimate
}

// approximant writes the [m/m] Padé approximant of exp(p.a) to p.x, destroying
// u and v but not the powers.
func (p *padeWork) approximant(degree int) {
	n, b := p.n, padeNumerators[degree]
	if degree == 13 {
		p.combine(p.x, b[13], b[11], b[9])
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a6, n, p.x, n, 0, p.v, n)
		p.accumulate(p.v, b[7], b[5], b[3], b[1])
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a, n, p.v, n, 0, p.u, n)
		p.combine(p.x, b[12], b[10], b[8])
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a6, n, p.x, n, 0, p.v, n)
		p.accumulate(p.v, b[6], b[4], b[2], b[0])
	} else {
		b := append(append(make([]float64, 0, 10), b...), 0, 0, 0, 0, 0, 0)
		if degree == 9 {
			multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a4, n, p.a4, n, 0, p.x, n)
		} else {
			clear(p.x)
		}
		fillScaled(p.v, b[9], p.x)
		p.accumulate(p.v, b[7], b[5], b[3], b[1])
		multiply(blas.NoTrans, blas.NoTrans, n, n, n, 1, p.a, n, p.v, n, 0, p.u, n)
		fillScaled(p.v, b[8], p.x)
		p.accumulate(p.v, b[6], b[4], b[2], b[0])
	}
	for i, u := range p.u {
		v := p.v[i]
		p.x[i] = v + u
		p.v[i] = v - u
	}
	factorColumns(n, 0, n, p.v, p.pivots)
	kernels.Dgetrs(blas.NoTrans, n, n, p.v, n, p.pivots, p.x, n)
}

// combine sets dst = c6·A⁶ + c4·A⁴ + c2·A².
func (p *padeWork) combine(dst []float64, c6, c4, c2 float64) {
	for i := range dst {
		dst[i] = c6*p.a6[i] + c4*p.a4[i] + c2*p.a2[i]
	}
}

// accumulate adds c6·A⁶ + c4·A⁴ + c2·A² + c0·I; powers with a zero coefficient
// were perhaps never formed and are not read.
func (p *padeWork) accumulate(dst []float64, c6, c4, c2, c0 float64) {
	if c6 != 0 {
		for i, v := range p.a6 {
			dst[i] += c6 * v
		}
	}
	if c4 != 0 {
		for i, v := range p.a4 {
			dst[i] += c4 * v
		}
	}
	for i, v := range p.a2 {
		dst[i] += c2 * v
	}
	for i := 0; i < len(dst); i += p.n + 1 {
		dst[i] += c0
	}
}

// square sets dst = m·m.
func (p *padeWork) square(dst, m []float64) {
	multiply(blas.NoTrans, blas.NoTrans, p.n, p.n, p.n, 1, m, p.n, m, p.n, 0, dst, p.n)
}

func scaleSlice(x []float64, factor float64) {
	for i := range x {
		x[i] *= factor
	}
}

func fillScaled(dst []float64, factor float64, x []float64) {
	for i, v := range x {
		dst[i] = factor * v
	}
}

// factorColumns factors columns from … to−1 of the n×n row-major a, whose earlier
// columns are factored already, as L·U with row interchanges, halving the
// columns so that most of the work is products (S. Toledo, SIAM J. Matrix Anal.
// Appl. 18, 1997). Whole rows are exchanged; pivots are as Dgetrs wants them.
func factorColumns(n, from, to int, a []float64, pivots []int) {
	const fewest = 8
	if to-from > fewest {
		middle := (from + to) / 2
		factorColumns(n, from, middle, a, pivots)
		blas64.Implementation().Dtrsm(blas.Left, blas.Lower, blas.NoTrans, blas.Unit, middle-from, to-middle, 1,
			a[from*n+from:], n, a[from*n+middle:], n)
		multiply(blas.NoTrans, blas.NoTrans, n-middle, to-middle, middle-from, -1,
			a[middle*n+from:], n, a[from*n+middle:], n, 1, a[middle*n+middle:], n)
		factorColumns(n, middle, to, a, pivots)
		return
	}
	for j := from; j < to; j++ {
		pivot, largest := j, math.Abs(a[j*n+j])
		for i := j + 1; i < n; i++ {
			if v := math.Abs(a[i*n+j]); v > largest {
				pivot, largest = i, v
			}
		}
		pivots[j] = pivot
		if pivot != j {
			x, y := a[j*n:j*n+n], a[pivot*n:pivot*n+n]
			for k, v := range x {
				x[k], y[k] = y[k], v
			}
		}
		if largest == 0 {
			continue
		}
		top := a[j*n+j+1 : j*n+to]
		for i := j + 1; i < n; i++ {
			factor := a[i*n+j] / a[j*n+j]
			a[i*n+j] = factor
			row := a[i*n+j+1 : i*n+to]
			for k, v := range top {
				row[k] -= factor * v
			}
		}
	}
}
