package model

import (
	"fmt"
	"strings"

	"gainwright/lang/value"
)

// dimension holds exponents of m, kg, s, A, K, mol, cd in twelfths, so that roots of
// units can stand inside an equation. Open is the dimension of a signal without a
// declared unit: it fits any.
type dimension struct {
	exponents [7]int32
	open      bool
}

const twelfths = 12

// largest exponent of an intermediate result; a power beyond it is a slip, not physics
const largestExponent = 48

var (
	plain  = dimension{}
	open   = dimension{open: true}
	second = dimensionOf(value.Second().Dim)
)

func dimensionOf(d value.Dimension) dimension {
	var out dimension
	for k, e := range d {
		out.exponents[k] = twelfths * int32(e)
	}
	return out
}

func (d dimension) isPlain() bool { return !d.open && d == plain }

// fits tells whether two dimensions can be added.
func (d dimension) fits(e dimension) bool { return d.open || e.open || d == e }

// either is the known one of two dimensions that fit.
func (d dimension) either(e dimension) dimension {
	if d.open {
		return e
	}
	return d
}

// times gives the dimension of a product, or of a quotient with exponent −1.
func (d dimension) times(e dimension, exponent int32) dimension {
	if d.open || e.open {
		return open
	}
	for k := range d.exponents {
		d.exponents[k] += exponent * e.exponents[k]
	}
	return d
}

// power gives dᵖ for p = num/den; false when an exponent is no twelfth or out of bounds.
func (d dimension) power(num, den int64) (dimension, bool) {
	for k, e := range d.exponents {
		if e == 0 {
			continue
		}
		if num > 1000 || num < -1000 || den > 1000 || int64(e)*num%den != 0 {
			return d, false
		}
		d.exponents[k] = int32(int64(e) * num / den)
	}
	return d, d.bounded()
}

func (d dimension) bounded() bool {
	for _, e := range d.exponents {
		if e > largestExponent*twelfths || e < -largestExponent*twelfths {
			return false
		}
	}
	return true
}

// unit is the coherent unit of the dimension; false when an exponent is not whole.
func (d dimension) unit() (value.Unit, bool) {
	var dim value.Dimension
	for k, e := range d.exponents {
		if e%twelfths != 0 || !d.bounded() {
			return value.None(), false
		}
		dim[k] = int8(e / twelfths)
	}
	if dim.IsPlain() {
		return value.None(), true
	}
	return value.Unit{Text: dim.String(), Dim: dim}.SI(), true
}

// String names the coherent unit for messages.
func (d dimension) String() string {
	if d.open {
		return "any unit"
	}
	if d.isPlain() {
		return "no unit"
	}
	if u, ok := d.unit(); ok {
		return u.Text
	}
	var parts []string
	for k, symbol := range [...]string{"m", "kg", "s", "A", "K", "mol", "cd"} {
		e := d.exponents[k]
		switch {
		case e == 0:
		case e == twelfths:
			parts = append(parts, symbol)
		case e%twelfths == 0:
			parts = append(parts, fmt.Sprintf("%s^%d", symbol, e/twelfths))
		default:
			num, den := e, int32(twelfths)
			for _, p := range [...]int32{2, 2, 3} {
				if num%p == 0 && den%p == 0 {
					num, den = num/p, den/p
				}
			}
			parts = append(parts, fmt.Sprintf("%s^(%d/%d)", symbol, num, den))
		}
	}
	return strings.Join(parts, "*")
}
