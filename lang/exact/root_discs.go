package exact

import (
	"math"
	"math/big"
)

// discs are enclosures of the roots of a real polynomial, one root in each.
type discs struct {
	z         []complexFloat
	radius    []*big.Float
	symmetric bool // with every root its negative is a root too
	zeroRe    []bool
	zeroIm    []bool
}

// separated tells whether the discs, enlarged threefold, are disjoint and small
// enough for the wanted digits.
func (d *discs) separated(digits int) bool {
	tolerance := powerOfTen(-digits)
	var re, im, reach, limit big.Float
	for i := range d.z {
		size := magnitude(&d.z[i].re, &d.z[i].im)
		if d.radius[i].Cmp(limit.Mul(size, tolerance)) > 0 {
			return false
		}
		for j := range i {
			re.SetPrec(0).Sub(&d.z[i].re, &d.z[j].re)
			im.SetPrec(0).Sub(&d.z[i].im, &d.z[j].im)
			reach.SetPrec(magnitudePrec).Add(d.radius[i], d.radius[j])
			reach.Mul(&reach, big.NewFloat(3.5))
			if magnitude(&re, &im).Cmp(&reach) <= 0 {
				return false
			}
		}
	}
	return true
}

// snap decides which real and imaginary parts vanish. The mirror image of a
// root in the real axis is a root; if the disc touches the axis, the image lies
// in the threefold disc, which holds one root only: so the root is real. The
// same holds for the imaginary axis when the roots lie symmetric to the origin;
// when they do not, none is on it. It reports whether all other parts have the
// wanted digits.
func (d *discs) snap(digits int) bool {
	d.zeroRe, d.zeroIm = make([]bool, len(d.z)), make([]bool, len(d.z))
	tolerance := powerOfTen(-digits)
	enough := true
	var part, limit big.Float
	for i := range d.z {
		part.SetPrec(magnitudePrec).Abs(&d.z[i].im)
		d.zeroIm[i] = part.Cmp(d.radius[i]) <= 0
		if !d.zeroIm[i] && d.radius[i].Cmp(limit.Mul(&part, tolerance)) > 0 {
			enough = false
		}
		part.SetPrec(magnitudePrec).Abs(&d.z[i].re)
		touches := part.Cmp(d.radius[i]) <= 0
		d.zeroRe[i] = touches && d.symmetric
		if !d.zeroRe[i] && d.radius[i].Cmp(limit.Mul(&part, tolerance)) > 0 {
			enough = false
		}
	}
	return enough
}

// roots gives the centres; conjugates get equal and opposite parts.
func (d *discs) roots() []Root {
	out := make([]Root, 0, len(d.z))
	for i := range d.z {
		if !d.zeroIm[i] && d.z[i].im.Sign() < 0 {
			continue // its conjugate brings it along
		}
		re, im := new(big.Float).Copy(&d.z[i].re), new(big.Float).Copy(&d.z[i].im)
		if d.zeroRe[i] {
			re.SetInt64(0)
		}
		if d.zeroIm[i] {
			im.SetInt64(0)
		}
		root := Root{Re: re, Im: im, Radius: outward(d.radius[i])}
		root.Value = rounded(&complexFloat{*re, *im})
		out = append(out, root)
		if !d.zeroIm[i] {
			mirror := root
			mirror.Im = new(big.Float).Neg(im)
			mirror.Value = complex(real(root.Value), -imag(root.Value))
			out = append(out, mirror)
		}
	}
	return out
}

// outward rounds a radius up, doubled so that a centre moved onto an axis stays covered.
func outward(radius *big.Float) float64 {
	x, _ := radius.Float64()
	return math.Nextafter(2*x, math.Inf(1))
}

func powerOfTen(exponent int) *big.Float {
	if exponent >= 0 {
		return new(big.Float).SetPrec(magnitudePrec).SetInt(new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(exponent)), nil))
	}
	return new(big.Float).SetPrec(magnitudePrec).Quo(big.NewFloat(1), powerOfTen(-exponent))
}
