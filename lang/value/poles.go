package value

import (
	"math"
	"math/big"

	"gainwright/lang/diag"
)

// coercePoles takes a number, a pair or a list of numbers, splices pairs and checks that
// every complex pole has its conjugate. Quantities in 1/s or rad/s count at their SI value.
func coercePoles(p Param, v Value) (Value, error) {
	var items []Value
	switch x := v.(type) {
	case *List:
		items = x.Items
	case *Matrix:
		if x.rows != 1 && x.cols != 1 {
			return nil, needs(p, "a list of poles", v)
		}
		items, _ = Elements(x)
	case Number, Complex, Quantity:
		items = []Value{v}
	default:
		return nil, needs(p, "a list of poles", v)
	}
	out := &List{}
	for k, item := range items {
		if pair, ok := item.(*List); ok && pair.Pair {
			out.Items = append(out.Items, pair.Items...)
			continue
		}
		pole, err := poleOf(item)
		if err != nil {
			return nil, diag.New(diag.Type, "%s needs a list of poles; item %d is %s", p.Name, k+1, Describe(item))
		}
		out.Items = append(out.Items, pole)
	}
	_, err := pairUp(out.Items)
	return out, err
}

func poleOf(v Value) (Value, error) {
	switch x := v.(type) {
	case Number, Complex:
		return x, nil
	case Quantity:
		if x.Unit.Dim == perSecond || x.Unit.Dim.IsPlain() {
			n, err := x.SI()
			return n, err
		}
	}
	return nil, undefinedFor("a pole", v)
}

// polePart is a real pole or a conjugate pair.
type polePart struct {
	real  *Number
	first Complex // the member with the positive imaginary part, when real is nil
}

// pairUp joins complex poles with their conjugates, exact ones exactly, floating ones
// within their error estimates.
func pairUp(poles []Value) ([]polePart, error) {
	var parts []polePart
	used := make([]bool, len(poles))
	for k, pole := range poles {
		c, isComplex := pole.(Complex)
		if !isComplex {
			n, ok := pole.(Number)
			if !ok {
				return nil, undefinedFor("a pole", pole)
			}
			parts = append(parts, polePart{real: &n})
			continue
		}
		if used[k] {
			continue
		}
		found := -1
		for j := k + 1; j < len(poles) && found < 0; j++ {
			if d, ok := poles[j].(Complex); ok && !used[j] && areConjugate(c, d) {
				found = j
			}
		}
		if found < 0 {
			return nil, diag.New(diag.Type, "the complex pole %s comes without its conjugate", briefComplex(c)).
				WithHelp("write the pair as %s ± %si", brief(c.RealPart()), brief(absolute(c.ImaginaryPart())))
		}
		used[found] = true
		if c.ImaginaryPart().Sign() < 0 {
			c = poles[found].(Complex)
		}
		parts = append(parts, polePart{first: c})
	}
	return parts, nil
}

func absolute(n Number) Number {
	if n.Sign() < 0 {
		return negateNumber(n)
	}
	return n
}

func briefComplex(c Complex) string {
	im := c.ImaginaryPart()
	sign := " + "
	if im.Sign() < 0 {
		sign = " - "
	}
	return brief(c.RealPart()) + sign + brief(absolute(im)) + "i"
}

func areConjugate(a, b Complex) bool {
	if a.ExactRe != nil && b.ExactRe != nil {
		return a.ExactRe.Cmp(b.ExactRe) == 0 && new(big.Rat).Neg(a.ExactIm).Cmp(b.ExactIm) == 0
	}
	if a.Quadratic != nil && a.Quadratic == b.Quadratic {
		return imag(a.Complex128())*imag(b.Complex128()) < 0
	}
	x, ex := a.approx()
	y, ey := b.approx()
	return imag(x)*imag(y) < 0 && math.Abs(real(x)-real(y)) <= ex+ey && math.Abs(imag(x)+imag(y)) <= ex+ey
}

// PolynomialFromPoles gives the monic polynomial whose roots are the items of a pole list.
// It is exact when every real pole is exact and every pair is or has its quadratic exact.
func PolynomialFromPoles(poles *List) (*Polynomial, error) {
	return PolynomialWithRoots("s", poles.Items)
}

// PolynomialWithRoots gives the monic polynomial in the variable with the given roots; complex ones come with their conjugates.
func PolynomialWithRoots(variable string, roots []Value) (*Polynomial, error) {
	parts, err := pairUp(roots)
	if err != nil {
		return nil, err
	}
	product := ConstantPolynomial(variable, Int(1))
	for _, part := range parts {
		factor, err := part.factor(variable)
		if err != nil {
			return nil, err
		}
		if product, err = multiplyPolynomials(product, factor); err != nil {
			return nil, err
		}
	}
	return product, nil
}

// factor gives s − p, or the quadratic of a pair.
func (part polePart) factor(variable string) (*Polynomial, error) {
	if part.real != nil {
		return PolynomialOf(variable, []Number{Int(1), negateNumber(*part.real)})
	}
	if part.first.Quadratic != nil {
		return inVariable(part.first.Quadratic, variable), nil
	}
	pair, err := ConjugatePair(part.first.RealPart(), part.first.ImaginaryPart())
	if err != nil {
		return nil, err
	}
	c, ok := pair.Items[0].(Complex)
	if !ok {
		return nil, notANumber()
	}
	return inVariable(c.Quadratic, variable), nil
}
