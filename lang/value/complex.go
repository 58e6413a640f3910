package value

import (
	"math"
	"math/big"
	"math/cmplx"
)

// toComplex takes a number as a complex one.
func toComplex(n Number) Complex {
	if n.Exact != nil {
		return Complex{ExactRe: n.Exact, ExactIm: ratZero}
	}
	return Complex{C: complex(n.F, 0), Err: n.Err}
}

// approx gives the nearest binary64 pair and an estimate of its absolute error.
func (c Complex) approx() (complex128, float64) {
	if c.ExactRe == nil {
		return c.C, c.Err
	}
	re, er := Rat(c.ExactRe).approx()
	im, ei := Rat(c.ExactIm).approx()
	return complex(re, im), er + ei
}

// RealPart gives the real part.
func (c Complex) RealPart() Number {
	if c.ExactRe != nil {
		return Rat(c.ExactRe)
	}
	return FloatErr(real(c.C), c.Err)
}

// ImaginaryPart gives the imaginary part.
func (c Complex) ImaginaryPart() Number {
	if c.ExactRe != nil {
		return Rat(c.ExactIm)
	}
	return FloatErr(imag(c.C), c.Err)
}

// MakeComplex puts real and imaginary part together: a Number when the imaginary part is zero, exact when both parts are.
func MakeComplex(re, im Number) Value {
	if im.IsZero() {
		return re
	}
	if re.Exact != nil && im.Exact != nil {
		return Complex{ExactRe: re.Exact, ExactIm: im.Exact}
	}
	x, ex := re.approx()
	y, ey := im.approx()
	return Complex{C: complex(x, y), Err: math.Max(ex, ey)}
}

// simplify turns a complex number without imaginary part into a Number.
func simplify(c Complex) Value {
	if c.ExactRe != nil && c.ExactIm.Sign() == 0 {
		return Rat(c.ExactRe)
	}
	if c.ExactRe == nil && imag(c.C) == 0 {
		return Number{F: real(c.C), Err: c.Err}
	}
	return c
}

func settleComplex(c complex128, err float64) (Complex, error) {
	if cmplx.IsNaN(c) || math.IsNaN(err) {
		return Complex{}, notANumber()
	}
	if cmplx.IsInf(c) {
		return Complex{}, overflow()
	}
	return Complex{C: c, Err: err + 2*ulp(cmplx.Abs(c))}, nil
}

func conjugate(c Complex) Complex {
	if c.ExactRe != nil {
		return Complex{ExactRe: c.ExactRe, ExactIm: new(big.Rat).Neg(c.ExactIm), Quadratic: c.Quadratic}
	}
	return Complex{C: cmplx.Conj(c.C), Err: c.Err, Quadratic: c.Quadratic}
}

func negateComplex(c Complex) Complex {
	if c.ExactRe != nil {
		return Complex{ExactRe: new(big.Rat).Neg(c.ExactRe), ExactIm: new(big.Rat).Neg(c.ExactIm)}
	}
	return Complex{C: -c.C, Err: c.Err}
}

// byParts makes a complex number from the results of exact or floating arithmetic on its parts.
func byParts(re Number, reErr error, im Number, imErr error) (Complex, error) {
	if reErr != nil {
		return Complex{}, reErr
	}
	if imErr != nil {
		return Complex{}, imErr
	}
	return Complex{ExactRe: re.Exact, ExactIm: im.Exact}, nil
}

func addComplex(a, b Complex) (Complex, error) {
	if a.ExactRe != nil && b.ExactRe != nil {
		re, e1 := addNumbers(Rat(a.ExactRe), Rat(b.ExactRe))
		im, e2 := addNumbers(Rat(a.ExactIm), Rat(b.ExactIm))
		return byParts(re, e1, im, e2)
	}
	x, ex := a.approx()
	y, ey := b.approx()
	return settleComplex(x+y, ex+ey)
}

func multiplyComplex(a, b Complex) (Complex, error) {
	if a.ExactRe != nil && b.ExactRe != nil {
		if 2*(complexBits(a)+complexBits(b)) > LargestBits {
			return Complex{}, tooManyBits()
		}
		var p, q big.Rat
		re := new(big.Rat).Sub(p.Mul(a.ExactRe, b.ExactRe), q.Mul(a.ExactIm, b.ExactIm))
		im := new(big.Rat).Add(p.Mul(a.ExactRe, b.ExactIm), q.Mul(a.ExactIm, b.ExactRe))
		return Complex{ExactRe: re, ExactIm: im}, nil
	}
	x, ex := a.approx()
	y, ey := b.approx()
	return settleComplex(x*y, cmplx.Abs(x)*ey+cmplx.Abs(y)*ex+ex*ey)
}

func complexBits(c Complex) int { return ratBits(c.ExactRe) + ratBits(c.ExactIm) }

func divideComplex(a, b Complex) (Complex, error) {
	inverse, err := invertComplex(b)
	if err != nil {
		return Complex{}, err
	}
	return multiplyComplex(a, inverse)
}

func invertComplex(c Complex) (Complex, error) {
	if c.ExactRe != nil {
		if 2*complexBits(c) > LargestBits {
			return Complex{}, tooManyBits()
		}
		norm := squaredModulus(c.ExactRe, c.ExactIm)
		if norm.Sign() == 0 {
			return Complex{}, divisionByZero()
		}
		im := new(big.Rat).Quo(c.ExactIm, norm)
		return Complex{ExactRe: new(big.Rat).Quo(c.ExactRe, norm), ExactIm: im.Neg(im)}, nil
	}
	if c.C == 0 {
		return Complex{}, divisionByZero()
	}
	inverse := 1 / c.C
	size := cmplx.Abs(inverse)
	return settleComplex(inverse, size*size*c.Err)
}

func squaredModulus(re, im *big.Rat) *big.Rat {
	var p, q big.Rat
	return new(big.Rat).Add(p.Mul(re, re), q.Mul(im, im))
}
