package exact

import (
	"fmt"
	"math/big"
	"slices"
)

// Root is one root of a polynomial with a proved enclosure.
type Root struct {
	Value        complex128 // the centre, rounded; real roots have imaginary part exactly 0
	Re, Im       *big.Float // the centre at the working precision
	Radius       float64    // the root lies within this distance of (Re, Im); 0 when exact
	Multiplicity int
	Exact        bool     // both parts are rational, and ExactRe, ExactIm are their values
	ExactRe      *big.Rat // nil unless Exact
	ExactIm      *big.Rat
}

// RootsError says that roots could not be separated within the precision and
// iteration limits.
type RootsError struct {
	Degree int
	Bits   uint
}

// Error names the degree and the precision reached.
func (e *RootsError) Error() string {
	return fmt.Sprintf("the roots of a factor of degree %d were not separated with %d bits", e.Degree, e.Bits)
}

const (
	largestRootPrecision = 1 << 14 // bits; beyond, roots count as not separable
	sweepsPerPrecision   = 40
	startPrecision       = 128
)

// Roots gives the roots ordered by real part, then imaginary part, each once
// with its multiplicity, to at least the given number of decimal digits of its
// modulus, and of its real and imaginary parts unless these are smaller than
// the precision limit can tell.
//
// Rational roots and pairs a ± b·i with rational a and b come out exactly.
// Whether a real or imaginary part is zero is decided, not rounded: a real
// root has Im = 0 and a root on the imaginary axis Re = 0. The polynomial is
// factored first, so multiple roots cost no accuracy. The zero polynomial and
// constants have no roots.
func (p Polynomial) Roots(digits int) ([]Root, error) {
	digits = max(1, min(digits, 1000))
	var roots []Root
	factors, _ := p.Factorize()
	for _, f := range factors {
		found, err := factorRoots(f.Polynomial, digits)
		if err != nil {
			return nil, err
		}
		for _, r := range found {
			r.Multiplicity = f.Multiplicity
			roots = append(roots, r)
		}
	}
	slices.SortStableFunc(roots, compareRoots)
	return roots, nil
}

func compareRoots(x, y Root) int {
	if c := x.Re.Cmp(y.Re); c != 0 {
		return c
	}
	return x.Im.Cmp(y.Im)
}

// factorRoots finds the roots of a monic square-free factor.
func factorRoots(p Polynomial, digits int) ([]Root, error) {
	switch p.Degree() {
	case 1:
		return []Root{exactRoot(new(big.Rat).Neg(p.Coefficient(0)), ratZero, digits)}, nil
	case 2:
		half := new(big.Rat).Mul(p.Coefficient(1), big.NewRat(-1, 2))
		square := new(big.Rat).Sub(p.Coefficient(0), new(big.Rat).Mul(half, half))
		if im, ok := squareRoot(square); ok {
			return []Root{exactRoot(half, new(big.Rat).Neg(im), digits), exactRoot(half, im, digits)}, nil
		}
	}
	// Roots that lie symmetric to the origin are the common roots of p(s) and
	// p(−s); all imaginary ones are among them.
	symmetric := p.Gcd(p.mirrored())
	var roots []Root
	for _, part := range []struct {
		p         Polynomial
		symmetric bool
	}{{symmetric, true}, {p.quotient(symmetric), false}} {
		if part.p.Degree() < 1 {
			continue
		}
		found, err := isolate(part.p, digits, part.symmetric)
		if err != nil {
			return nil, err
		}
		roots = append(roots, found...)
	}
	return roots, nil
}

// mirrored gives p(−s).
func (p Polynomial) mirrored() Polynomial {
	c := slices.Clone(p.c)
	for k := 1; k < len(c); k += 2 {
		c[k] = tidy(new(big.Rat).Neg(c[k]))
	}
	return Polynomial{c}
}

func exactRoot(re, im *big.Rat, digits int) Root {
	prec := max(64, uint(digits*4+16))
	r := Root{Exact: true, ExactRe: re, ExactIm: im}
	r.Re = new(big.Float).SetPrec(prec).SetRat(re)
	r.Im = new(big.Float).SetPrec(prec).SetRat(im)
	x, _ := re.Float64()
	y, _ := im.Float64()
	r.Value = complex(x, y)
	return r
}

// isolate encloses the roots of a square-free polynomial without rational
// roots, raising the working precision until the discs are disjoint and small.
func isolate(p Polynomial, digits int, symmetric bool) ([]Root, error) {
	c := p.primitive()
	start := newScaledPolynomial(c).approximate()
	z := make([]complexFloat, len(start))
	for i, x := range start {
		z[i].re.SetFloat64(real(x))
		z[i].im.SetFloat64(imag(x))
	}
	// Real and imaginary parts much smaller than the modulus may need more
	// precision than the modulus does; that is tried up to this limit only.
	partsLimit := uint(1024 + 16*digits)
	var last []Root
	for prec := uint(startPrecision + 4*digits); prec <= largestRootPrecision; prec *= 2 {
		r := newRefinement(c, z, prec)
		for range sweepsPerPrecision {
			if r.sweep() < -int(prec)*3/4 {
				break
			}
		}
		d := &discs{z: z, radius: r.radii(), symmetric: symmetric}
		if d.radius == nil || !d.separated(digits) {
			continue
		}
		if d.snap(digits) || prec > partsLimit {
			return d.roots(), nil
		}
		last = d.roots()
	}
	if last != nil {
		return last, nil
	}
	return nil, &RootsError{p.Degree(), largestRootPrecision}
}
