package exact

import (
	"math"
	"math/big"
	"math/cmplx"
)

// complexFloat is a complex number in multiple precision.
type complexFloat struct{ re, im big.Float }

func (z *complexFloat) setPrec(bits uint) {
	z.re.SetPrec(bits)
	z.im.SetPrec(bits)
}

// refinement is Aberth's iteration at one working precision, with inclusion discs.
type refinement struct {
	prec         uint
	coefficients []big.Float // lowest power first
	magnitudes   []big.Float // their absolute values, to a few bits
	z            []complexFloat
	near         []complex128 // z rounded, for the repulsion term
	value, slope complexFloat
	t1, t2, t3   big.Float
}

func newRefinement(c []big.Int, z []complexFloat, prec uint) *refinement {
	r := &refinement{prec: prec, z: z}
	r.coefficients, r.magnitudes = make([]big.Float, len(c)), make([]big.Float, len(c))
	for k := range c {
		r.coefficients[k].SetPrec(prec).SetInt(&c[k])
		r.magnitudes[k].SetPrec(magnitudePrec).Abs(&r.coefficients[k])
	}
	for i := range z {
		z[i].setPrec(prec)
	}
	for _, t := range []*big.Float{&r.t1, &r.t2, &r.t3} {
		t.SetPrec(prec)
	}
	r.value.setPrec(prec)
	r.slope.setPrec(prec)
	return r
}

// multiplyAdd sets acc = acc·z + (re, im).
func (r *refinement) multiplyAdd(acc, z *complexFloat, re, im *big.Float) {
	r.t1.Mul(&acc.re, &z.re)
	r.t2.Mul(&acc.im, &z.im)
	r.t3.Mul(&acc.re, &z.im)
	r.t1.Sub(&r.t1, &r.t2)
	r.t2.Mul(&acc.im, &z.re)
	r.t3.Add(&r.t3, &r.t2)
	acc.re.Add(&r.t1, re)
	if im != nil {
		acc.im.Add(&r.t3, im)
	} else {
		acc.im.Set(&r.t3)
	}
}

// evaluate leaves p(z) and p'(z) in value and slope.
func (r *refinement) evaluate(z *complexFloat) {
	r.value.re.SetInt64(0)
	r.value.im.SetInt64(0)
	r.slope.re.SetInt64(0)
	r.slope.im.SetInt64(0)
	for k := len(r.coefficients) - 1; k >= 0; k-- {
		r.multiplyAdd(&r.slope, z, &r.value.re, &r.value.im)
		r.multiplyAdd(&r.value, z, &r.coefficients[k], nil)
	}
}

// divide sets a = a/b.
func (r *refinement) divide(a, b *complexFloat) bool {
	var norm, re, im big.Float
	norm.SetPrec(r.prec).Add(r.t1.Mul(&b.re, &b.re), r.t2.Mul(&b.im, &b.im))
	if norm.Sign() == 0 {
		return false
	}
	re.SetPrec(r.prec).Add(r.t1.Mul(&a.re, &b.re), r.t2.Mul(&a.im, &b.im))
	im.SetPrec(r.prec).Sub(r.t1.Mul(&a.im, &b.re), r.t2.Mul(&a.re, &b.im))
	a.re.Quo(&re, &norm)
	a.im.Quo(&im, &norm)
	return true
}

// sweep improves every point once and gives the largest relative change as a
// power of two.
func (r *refinement) sweep() (largest int) {
	r.near = r.near[:0]
	for i := range r.z {
		r.near = append(r.near, rounded(&r.z[i]))
	}
	largest = math.MinInt
	one := big.NewFloat(1)
	for i := range r.z {
		z := &r.z[i]
		r.evaluate(z)
		if r.value.re.Sign() == 0 && r.value.im.Sign() == 0 {
			continue
		}
		if !r.divide(&r.value, &r.slope) {
			continue
		}
		// correction = N/(1 − N·S); S to binary64 keeps the order of convergence
		// as long as the points are apart in binary64.
		sum := r.repulsion(i)
		if sum != 0 {
			denominator := complexFloat{}
			denominator.setPrec(r.prec)
			denominator.re.Set(&r.value.re)
			denominator.im.Set(&r.value.im)
			var s complexFloat
			s.re.SetPrec(r.prec).SetFloat64(-real(sum))
			s.im.SetPrec(r.prec).SetFloat64(-imag(sum))
			r.multiplyAdd(&denominator, &s, one, nil)
			r.divide(&r.value, &denominator)
		}
		largest = max(largest, exponentOf(&r.value)-exponentOf(z))
		z.re.Sub(&z.re, &r.value.re)
		z.im.Sub(&z.im, &r.value.im)
		r.near[i] = rounded(z)
	}
	return largest
}

// repulsion gives Σ 1/(zᵢ − zⱼ), differences formed before rounding where the
// points agree in binary64.
func (r *refinement) repulsion(i int) complex128 {
	var sum complex128
	var d complexFloat
	for j := range r.z {
		if j == i {
			continue
		}
		difference := r.near[i] - r.near[j]
		if size := math.Abs(real(difference)) + math.Abs(imag(difference)); size < 0x1p-30*(math.Abs(real(r.near[i]))+math.Abs(imag(r.near[i]))) {
			d.re.SetPrec(r.prec).Sub(&r.z[i].re, &r.z[j].re)
			d.im.SetPrec(r.prec).Sub(&r.z[i].im, &r.z[j].im)
			difference = rounded(&d)
		}
		if difference != 0 {
			sum += 1 / difference
		}
	}
	if math.IsInf(real(sum), 0) || math.IsInf(imag(sum), 0) || cmplx.IsNaN(sum) {
		return 0
	}
	return sum
}

func rounded(z *complexFloat) complex128 {
	re, _ := z.re.Float64()
	im, _ := z.im.Float64()
	return complex(re, im)
}

// exponentOf gives an e with |z| < 2^(e+1).
func exponentOf(z *complexFloat) int {
	switch {
	case z.re.Sign() == 0 && z.im.Sign() == 0:
		return math.MinInt32
	case z.re.Sign() == 0:
		return z.im.MantExp(nil)
	case z.im.Sign() == 0:
		return z.re.MantExp(nil)
	}
	return max(z.re.MantExp(nil), z.im.MantExp(nil))
}

// magnitudePrec is the precision of radii and other magnitudes; each operation
// on them is rounded to nearest and covered by a factor of 1 + 2⁻²⁰.
const magnitudePrec = 64

// radii gives rigorous inclusion radii: the union of the discs around z[i] with
// radius n·|p(z[i])|/|c_n·∏(z[i] − z[j])| holds all roots, and a disc disjoint
// from the others holds exactly one (B. T. Smith, Error bounds for zeros of a
// polynomial based upon Gerschgorin's theorems, J. ACM 17, 1970). |p(z[i])| is
// enlarged by the rounding bound of Horner's scheme. Points that coincide give nil.
func (r *refinement) radii() []*big.Float {
	n := len(r.z)
	out := make([]*big.Float, n)
	slack := big.NewFloat(1 + 0x1p-20)
	for i := range r.z {
		r.evaluate(&r.z[i])
		value := magnitude(&r.value.re, &r.value.im)
		size := magnitude(&r.z[i].re, &r.z[i].im)
		bound := new(big.Float).SetPrec(magnitudePrec)
		for k := n; k >= 0; k-- {
			bound.Add(bound.Mul(bound, size), &r.magnitudes[k])
		}
		// Each complex step errs by less than 4 units 2^−prec of its terms, the
		// coefficients by one more: 8·(n+2) covers the sum.
		bound.Mul(bound, new(big.Float).SetMantExp(big.NewFloat(float64(8*(n+2))), -int(r.prec)))
		product := new(big.Float).SetPrec(magnitudePrec).Abs(&r.coefficients[n])
		var re, im big.Float
		for j := range r.z {
			if j != i {
				re.SetPrec(r.prec).Sub(&r.z[i].re, &r.z[j].re)
				im.SetPrec(r.prec).Sub(&r.z[i].im, &r.z[j].im)
				product.Mul(product, magnitude(&re, &im))
			}
		}
		if product.Sign() == 0 {
			return nil
		}
		radius := value.Add(value, bound)
		radius.Mul(radius, big.NewFloat(float64(n)))
		radius.Quo(radius, product)
		out[i] = radius.Mul(radius, slack)
	}
	return out
}

func magnitude(re, im *big.Float) *big.Float {
	x := new(big.Float).SetPrec(magnitudePrec).Mul(re, re)
	y := new(big.Float).SetPrec(magnitudePrec).Mul(im, im)
	x.Add(x, y)
	return x.Sqrt(x)
}
